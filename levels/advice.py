"""What modulator would do where a plan does not reach: from each lock, the shift that is missing and what makes it.

The ranges are common practice: acousto-optic modulators reach 40 to 400 MHz in one pass and twice that in two,
electro-optic sidebands up to some 25 GHz; beyond that another lock point or a beat between two lasers is the way.
"""

from levels.locks import Lock, Point, Wanted
from levels.plan import Plan

ACOUSTO_RANGE_MHZ = (40.0, 400.0)
DOUBLE_PASS_MHZ = 800.0
ELECTRO_MHZ = 25_000.0
SUGGESTED = 3


def would_do(plan: Plan, wanted: Wanted) -> list[str]:
    """Suggest modulators from the nearest lock points, nearest first."""
    gaps = []
    for lock in plan.order.locks:
        if lock.partner == wanted.name or (wanted.locks and lock.name not in wanted.locks):
            continue
        gap = _gap(wanted, plan.points[lock.name], lock)
        gaps.append((abs(gap), lock.name, gap))
    return [f"from {name}: {_suggestion(gap)}" for _, name, gap in sorted(gaps)[:SUGGESTED]]


def _gap(wanted: Wanted, point: Point, lock: Lock) -> float:
    gap = wanted.point.frequency_mhz - point.frequency_mhz
    if not lock.spacing_mhz:
        return gap
    tooth = max(-lock.last_tooth, min(lock.last_tooth, round(gap / lock.spacing_mhz)))
    return gap - tooth * lock.spacing_mhz


def _suggestion(gap_mhz: float) -> str:
    size, sign = abs(gap_mhz), "+" if gap_mhz >= 0 else "-"
    low, high = ACOUSTO_RANGE_MHZ
    if size < low:
        pair = f"{low + size:.1f} and {low:.1f} MHz"
        return f"{gap_mhz:+.3f} MHz, two acousto-optic modulators of opposite order about {pair}"
    if size <= high:
        return f"{gap_mhz:+.3f} MHz, an acousto-optic modulator at {size:.3f} MHz, one pass, order {sign}1"
    if size <= DOUBLE_PASS_MHZ:
        return f"{gap_mhz:+.3f} MHz, an acousto-optic modulator at {size / 2:.3f} MHz, two passes, order {sign}1"
    if size <= ELECTRO_MHZ:
        return f"{gap_mhz:+.3f} MHz, an electro-optic sideband of order {sign}1 at {size:.3f} MHz"
    return f"{gap_mhz / 1e6:+.6f} THz, out of reach of modulators: another lock point, a comb, or a harmonic stage"
