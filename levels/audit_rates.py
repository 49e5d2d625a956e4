"""Audit rules on decays: rates, lifetimes, branching fractions and strengths of one level or one multiplet agree."""

import math
import statistics

from levels.angular import six_j
from levels.audit_spectrum import SIGMAS
from levels.audit_structure import Broken, Species
from levels.constants import ALPHA
from levels.derive import rate_of_dipole, rate_of_oscillator_strength
from levels.errors import NotPublished
from levels.notation import term_quantum_numbers
from levels.quantity import Quantity, in_unit
from levels.records import Level, Line

UNSTATED_RATE = 0.10  # a rate or lifetime without stated uncertainty is trusted to 10 %
LS_ALLOWANCE = 0.02  # spin-orbit mixing takes line strengths from LS coupling by some (Z alpha)^2 more


def branching_sum(species: Species) -> Broken:
    """The branching fractions of one upper level sum to at most one."""
    for name in species.data.levels:
        published = [
            line.branching.quantity()
            for line in species.data.lines.values()
            if line.upper == name and line.branching is not None
        ]
        values = [in_unit(item, "1") for item in published]
        total = sum(item.value for item in values)
        spread = math.hypot(*(item.uncertainty or 0.0 for item in values)) if values else 0.0
        if total > 1 + 1e-3 + SIGMAS * spread:
            yield f"levels.{name}.branching", f"fractions sum to {total:.5f}"


def lifetime(species: Species) -> Broken:
    """The partial rates of one upper level sum to at most its inverse lifetime, and each is its branching share."""
    for level in species.reference.levels:
        table = species.data.levels[level.name]
        if level.lifetime is None or not (table.lifetime or table.width):
            continue
        total, spread = 0.0, 0.0
        for name, line in species.data.lines.items():
            if line.upper != level.name or line.einstein_A is None:
                continue
            rate = in_unit(line.einstein_A.quantity(), "s-1")
            total += rate.value
            spread = math.hypot(spread, _rate_spread(rate))
            if line.branching is not None:
                yield from _share(name, rate, in_unit(line.branching.quantity(), "1"), level.lifetime)
        allowed = SIGMAS * math.hypot(spread, _rate_spread(level.lifetime) / level.lifetime.value**2)
        if total > 1 / level.lifetime.value + allowed:
            message = f"rates sum to {total:.4g} s-1, 1/lifetime is {1 / level.lifetime.value:.4g} s-1"
            yield f"levels.{level.name}.lifetime", message


def _rate_spread(quantity: Quantity) -> float:
    if quantity.uncertainty is None:
        return UNSTATED_RATE / SIGMAS * abs(quantity.value)
    return quantity.uncertainty


def _share(name: str, rate: Quantity, branching: Quantity, lifetime_s: Quantity) -> Broken:
    share = rate.value * lifetime_s.value
    relative = math.hypot(*(_rate_spread(item) / item.value for item in (rate, lifetime_s)), 0.0)
    allowed = SIGMAS * math.hypot(share * relative, branching.uncertainty or 0.0)
    if abs(share - branching.value) > allowed:
        yield f"lines.{name}.branching", f"{branching.text}, rate times lifetime gives {share:.4g}"


def line_strength(species: Species) -> Broken:
    """Oscillator strength, reduced dipole element and rate of one line tell the same strength."""
    for line in species.reference.lines:
        table = species.data.lines[line.name]
        if line.centroid is None or line.einstein_A is None:
            continue
        others = []
        if table.oscillator_strength:
            strength = table.oscillator_strength.quantity()
            twice_J, twice_J_up = line.lower.twice_J, line.upper.twice_J
            others.append(("f", rate_of_oscillator_strength(strength, line.centroid, twice_J, twice_J_up)))
        if table.reduced_dipole:
            element = table.reduced_dipole.quantity()
            others.append(("dipole element", rate_of_dipole(element, line.centroid, line.upper.twice_J)))
        for kind, rate in others:
            allowed = SIGMAS * math.hypot(_rate_spread(rate), _rate_spread(line.einstein_A))
            if abs(rate.value - line.einstein_A.value) > allowed:
                yield (
                    f"lines.{line.name}.strength",
                    f"the {kind} gives {rate.value:.4g} s-1, the rate is {line.einstein_A.text}",
                )


def decay_sum(species: Species) -> Broken:
    """Where a file gives the rate to every lower level that a dipole reaches, the rates sum to the inverse lifetime."""
    for level in species.reference.levels:
        table = species.data.levels[level.name]
        if level.lifetime is None or not (table.lifetime or table.width):
            continue
        lines = [line for line in species.data.lines.items() if line[1].upper == level.name and line[1].einstein_A]
        reached = {line.lower for _, line in lines}
        below = {other.name for other in species.reference.levels if _decays(level, other)}
        if not below or not below <= reached:
            continue
        rates = [in_unit(line.einstein_A.quantity(), "s-1") for _, line in lines if line.einstein_A]
        share = sum(rate.value for rate in rates) * level.lifetime.value
        spread = math.hypot(*(_rate_spread(rate) * level.lifetime.value for rate in rates))
        allowed = SIGMAS * math.hypot(spread, _rate_spread(level.lifetime) / level.lifetime.value)
        if abs(share - 1) > allowed:
            message = f"the rates of all channels sum to {share:.3f} of 1/lifetime, {allowed:.3f} allowed"
            yield f"levels.{level.name}.rates", message


def _decays(upper: Level, lower: Level) -> bool:
    if upper.energy is None or lower.energy is None or lower.energy.value >= upper.energy.value:
        return False
    is_triangle = abs(upper.twice_J - lower.twice_J) <= 2 <= upper.twice_J + lower.twice_J
    return upper.parity != lower.parity and is_triangle


def multiplet_strength(species: Species) -> Broken:
    """The electric-dipole lines of one LS multiplet share a strength: each S(J, J') over its 6j weight is the same."""
    allowed = LS_ALLOWANCE + (species.data.element.Z * ALPHA) ** 2
    for lines in _multiplets(species):
        shares = {line.name: _share_of_multiplet(line) for line in lines}
        middle = statistics.median(share for share, _ in shares.values())
        excess = {name: abs(share / middle - 1) - SIGMAS * relative for name, (share, relative) in shares.items()}
        worst = max(excess, key=excess.__getitem__)
        if excess[worst] > allowed:
            rest = ", ".join(name for name in shares if name != worst)
            message = (
                f"{shares[worst][0] / middle:.3f} of the middle strength that it and {rest} nm have in LS coupling"
            )
            yield f"lines.{worst}.multiplet", message


def _multiplets(species: Species) -> list[list[Line]]:
    found: dict[tuple[str, ...], list[Line]] = {}
    for line in species.reference.lines:
        lower, upper = line.lower, line.upper
        is_dipole = line.multipole == "E1" and not line.induced and line.reduced_dipole is not None
        if is_dipole and lower.coupling == upper.coupling == "LS" and _ls_weight(line) > 0:
            found.setdefault((lower.configuration, lower.term, upper.configuration, upper.term), []).append(line)
    return [lines for lines in found.values() if len(lines) > 1]


def _ls_weight(line: Line) -> float:
    """(2J+1)(2J'+1) {L J S; J' L' 1}^2, zero for intercombination lines."""
    low, up = term_quantum_numbers(line.lower.term), term_quantum_numbers(line.upper.term)
    if low["S"] != up["S"]:
        return 0.0
    twice_J, twice_J_up = line.lower.twice_J, line.upper.twice_J
    recoupling = float(six_j(low["L"], twice_J, low["S"], twice_J_up, up["L"], 2))
    return (twice_J + 1) * (twice_J_up + 1) * recoupling**2


def _share_of_multiplet(line: Line) -> tuple[float, float]:
    """Line strength over its LS weight, and its relative uncertainty."""
    dipole = line.reduced_dipole
    if dipole is None:
        raise NotPublished("reduced dipole element", line.name)
    relative = UNSTATED_RATE / SIGMAS if dipole.uncertainty is None else 2 * dipole.uncertainty / abs(dipole.value)
    return dipole.value**2 / _ls_weight(line), relative
