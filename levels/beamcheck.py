"""What is wrong with single beams: frequency, polarisation, geometry, unwanted components, other lines."""

from collections.abc import Iterable

import numpy as np

from levels.beams import Beam
from levels.driven import Coupling, Drive, Driven, other_lines
from levels.findings import Finding, finding
from levels.geometry import best_jones
from levels.jones import plates_for
from levels.notation import format_polarisation

PURE_ENOUGH = 0.999  # share of the wanted polarisation
NOTABLE_SHARE = 0.01
STRONG_SATURATION = 10.0
NOTABLE_RATE_PER_S = 1.0


def beam_findings(drive: Drive, driven: Driven, coupling: Coupling, linewidths: float) -> Iterable[Finding]:
    """Judge one beam against what it is meant for (`wanted_q`, `wanted_F`)."""
    beam = driven.beam
    yield from _frequency(driven, linewidths)
    if beam.wanted_q is not None:
        yield from _polarisation(drive, beam, coupling, beam.wanted_q)
    total = float(driven.scattering_per_s.sum())
    stray = float(driven.scattering_per_s[~driven.wanted].sum()) / total if total > 0 else 0.0
    if stray > NOTABLE_SHARE:
        near = driven.unwanted_within(linewidths).size
        text = f"{stray:.2%} of beam {beam.name}'s scattering is on unwanted components, {near} of them resonant"
        yield finding("unwanted-components", beam.name, text, stray)
    strongest = float(driven.saturation.max(initial=0.0))
    if strongest > STRONG_SATURATION:
        text = f"beam {beam.name} saturates its strongest component {strongest:.3g} times"
        yield finding("power-broadened", beam.name, text, strongest, "less intensity, where the width does harm")
    yield from _other_lines(drive, beam)


def _frequency(driven: Driven, linewidths: float) -> Iterable[Finding]:
    name, rows = driven.beam.name, np.flatnonzero(driven.wanted)
    if rows.size == 0:
        text = f"beam {name} drives no component that it is meant for"
        yield finding("beam-off-resonance", name, text, None, "another polarisation or direction")
        return
    row = rows[int(np.argmin(driven.linewidths[rows]))]
    near = float(driven.linewidths[row])
    if near > linewidths:
        text = f"beam {name} is {near:.3g} linewidths from the nearest component that it is meant for"
        offset = driven.beam.offset_mhz - float(driven.detuning_mhz[row])
        yield finding("beam-off-resonance", name, text, near, f"set its offset to {offset:.3f} MHz for resonance")


def _polarisation(drive: Drive, beam: Beam, coupling: Coupling, q: int) -> Iterable[Finding]:
    resolved, name = coupling.resolved, format_polarisation(q)
    best, now = float(resolved.attainable[q + resolved.rank]), resolved.fraction(q)
    if best < PURE_ENOUGH:
        text = f"beam {beam.name} at {resolved.angle_deg:.1f} deg from the field can be at most {best:.2%} {name}"
        turn = _turn(resolved.angle_deg, q) if resolved.multipole == "E1" else "turn the field or the beam"
        yield finding("geometry-limits-polarisation", beam.name, text, best, turn)
    if best - now > 1.0 - PURE_ENOUGH:
        shares = ", ".join(
            f"{share:.2%} {format_polarisation(k - resolved.rank)}"
            for k, share in enumerate(resolved.fractions)
            if k - resolved.rank != q and share > 1e-5
        )
        plates = _plates(drive, beam, q) if best > 1e-6 else ""
        yield finding("polarisation-impure", beam.name, f"beam {beam.name} has {shares}", 1.0 - now, plates)


def _turn(angle_deg: float, q: int) -> str:
    if q == 0:
        return f"turn the field by {abs(90.0 - angle_deg):.1f} deg, across the beam"
    return f"turn the field by {min(angle_deg, 180.0 - angle_deg):.1f} deg, along the beam"


def _plates(drive: Drive, beam: Beam, q: int) -> str:
    """Say which wave-plate angles make the best polarisation of this direction."""
    setting = plates_for(best_jones(beam.direction, drive.axes, q, beam.line.multipole))
    return (
        f"after a polariser along the first transverse axis, half-wave plate at {setting.half_wave_deg:.1f} deg, then"
        f" quarter-wave plate at {setting.quarter_wave_deg:.1f} deg (fast axes)"
    )


def _other_lines(drive: Drive, beam: Beam) -> Iterable[Finding]:
    lower = [level.name for level in drive.structure.levels]
    for item in other_lines(drive.structure.atom, beam, lower):
        if item.scattering_per_s > NOTABLE_RATE_PER_S:
            text = (
                f"beam {beam.name} also scatters on line {item.line.name}, {item.detuning_mhz / 1e3:.4g} GHz away,"
                f" at up to {item.scattering_per_s:.3g} per second"
            )
            yield finding("other-line-driven", beam.name, text, item.scattering_per_s)
