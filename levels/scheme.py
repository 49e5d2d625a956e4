"""A scheme checked as a whole: what each beam drives, where the atoms end up, and what to change.

Every finding is a row of `findings` with the number behind it. Thresholds are judgements, listed in one place here and
in `beamcheck`.
"""

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from levels.beamcheck import NOTABLE_SHARE, beam_findings
from levels.beams import Scheme
from levels.constants import MU_B_MHZ_PER_GAUSS
from levels.cycling import Cycling, photons_before_leaving
from levels.darkstates import RESONANT_WIDTHS, DarkState, LowerManifold, lower_manifolds, raman_pairs
from levels.driven import PER_US, Driven, components_driven
from levels.errors import OutsideValidity
from levels.findings import SEVERITIES, Finding, finding
from levels.notation import format_half
from levels.pumping import Light, Outcome, Pumping, differ, prepare, pump, solve
from levels.records import Level
from levels.remedies import scan_field
from levels.structure import Label

FEW_PHOTONS = 1e3
MANY_PHOTONS = 1e6
DIM = 1e-3  # of Gamma/2
SLOW_MIXING = 0.3  # of the pumping rate
FAIR_SHARES = 1.5  # how much more than its equal share a dark state may hold without a word
GOOD_PURITY = 0.99
REMEDY_ANGLES = (0.0, 15.0, 30.0, 45.0, 60.0, 75.0, 90.0)
REMEDY_LARMOR = (0.03, 0.1, 0.3, 1.0)  # Bohr-magneton Larmor frequency over the natural width


@dataclass(frozen=True, slots=True, eq=False)
class Verdict:
    """Everything about one scheme: findings, worst first, and what they rest on."""

    light: Light
    outcome: Outcome
    pumping: Pumping | None
    driven: tuple[Driven, ...]
    manifolds: tuple[LowerManifold, ...]
    cycling: Cycling | None
    findings: tuple[Finding, ...]

    @property
    def works(self) -> bool:
        """Whether no finding is a problem."""
        return all(item.severity != "problem" for item in self.findings)


def check(
    scheme: Scheme,
    *,
    target: tuple[Level, Label] | None = None,
    initial: ArrayLike | None = None,
    linewidths: float = RESONANT_WIDTHS,
    model: str = "auto",
    remedies: bool = False,
) -> Verdict:
    """Check a scheme. `target` is the sublevel it should pump to; without one it should scatter.

    With `remedies` the best field is searched for schemes that go dark, which takes a few dozen solutions.
    """
    if not linewidths > 0.0:
        raise OutsideValidity("linewidths", linewidths, "a positive number")
    light = prepare(scheme, model)
    at = None if target is None else light.structure.position(*target)
    pumping = None if at is None else pump(light, at, initial)
    outcome = solve(light, initial) if pumping is None else pumping.outcome
    driven = tuple(components_driven(light.drive, beam.name) for beam in scheme.beams)
    manifolds = tuple(lower_manifolds(light.drive, linewidths))
    cycling = _cycling(scheme, model) if at is None else None
    found: list[Finding] = []
    for row, part in zip(driven, light.drive.couplings, strict=True):
        found += beam_findings(light.drive, row, part, linewidths)
    found += _unlit(outcome, manifolds)
    found += _dark(outcome, manifolds, at, remedies)
    found += _two_photon(light)
    found += _end(outcome, pumping, cycling)
    found += _model(outcome)
    ordered = sorted(found, key=lambda item: SEVERITIES.index(item.severity))
    return Verdict(light, outcome, pumping, driven, manifolds, cycling, tuple(ordered))


def _cycling(scheme: Scheme, model: str) -> Cycling | None:
    try:
        return photons_before_leaving(scheme, model=model)
    except OutsideValidity:  # no beam is near a component: there is no cycle to leave
        return None


def _unlit(outcome: Outcome, manifolds: tuple[LowerManifold, ...]) -> Iterable[Finding]:
    """Find levels that hold atoms and that no beam addresses."""
    structure = outcome.light.structure
    lit = {(manifold.level.name, manifold.twice_F) for manifold in manifolds if manifold.names}
    uppers = {item.beam.line.upper.name for item in outcome.light.drive.couplings}
    for level in structure.levels:
        part = structure.slice_of(level)
        for twice_F in np.unique(structure.twice_F[part]).tolist():
            held = float(outcome.populations[part][structure.twice_F[part] == twice_F].sum())
            if held > NOTABLE_SHARE and level.name not in uppers and (level.name, twice_F) not in lit:
                name = f"{level.name} {'F' if level.twice_I else 'J'}={format_half(twice_F)}"
                text = f"{held:.2%} of the atoms end in {name}, which no beam addresses"
                yield finding("unlit-level", name, text, held, f"add a beam from {name}")


def _dark(outcome: Outcome, manifolds: tuple[LowerManifold, ...], at: int | None, remedies: bool) -> Iterable[Finding]:
    """Judge the dark states that hold more atoms than their equal share of the lower sublevels."""
    fair = FAIR_SHARES / sum(manifold.size for manifold in manifolds)
    change = ""
    for manifold in manifolds:
        shares = [held_in(outcome, state) for state in manifold.dark]
        for state, held in zip(manifold.dark, shares, strict=True):
            if _is_target(outcome, state, at):
                text = (
                    f"the wanted state {state.text()} is dark: the field turns it at {state.mixing_mhz:.3g} MHz, light"
                    f" far from resonance excites it at {state.residual_per_us * 1e6:.3g} per second"
                )
                yield finding("dark-target", manifold.text(), text, state.residual_per_us * 1e6)
            elif held > fair:
                change = change or _remedy(outcome, remedies)
                yield _dark_finding(manifold, state, held, sum(shares), change)


def held_in(outcome: Outcome, state: DarkState) -> float:
    """Return the share of the atoms in a dark state, from the density matrix (or populations, without one)."""
    structure = outcome.light.structure
    at = [structure.position(state.level, label) for label in state.labels]
    if outcome.rho is None:
        return float(np.abs(state.vector) ** 2 @ outcome.populations[at])
    return float((state.vector.conj() @ outcome.rho[np.ix_(at, at)] @ state.vector).real)


def _is_target(outcome: Outcome, state: DarkState, at: int | None) -> bool:
    if at is None:
        return False
    positions = [outcome.light.structure.position(state.level, label) for label in state.labels]
    return at in positions and abs(state.vector[positions.index(at)]) ** 2 > 0.9


def _dark_finding(manifold: LowerManifold, state: DarkState, held: float, together: float, change: str) -> Finding:
    pump_mhz = manifold.pump_per_us / PER_US
    text = (
        f"{held:.2%} of the atoms are in the dark state {state.text()} of {manifold.text()}; the field turns it at"
        f" {state.mixing_mhz:.3g} MHz, the light excites other states at {pump_mhz:.3g} MHz"
    )
    slow = state.mixing_mhz < SLOW_MIXING * pump_mhz
    severity = "problem" if together > 0.5 and slow else "warning" if slow else "note"
    return finding("dark-state", manifold.text(), text, state.mixing_mhz, change, severity)


def _remedy(outcome: Outcome, search: bool) -> str:
    general = "a field at an angle to the polarisation, a modulated polarisation, or a second beam of another frequency"
    if not search:
        return general
    scheme, structure = outcome.light.drive.scheme, outcome.light.structure
    width = float(structure.width_mhz.max())
    magnitudes = [share * width / MU_B_MHZ_PER_GAUSS for share in REMEDY_LARMOR]
    magnitude, angle, rate = scan_field(scheme, magnitudes, REMEDY_ANGLES).best
    if rate <= outcome.scattering_per_s:
        return general
    return (
        f"a field of {magnitude:.3g} G at {angle:.0f} deg from the polarisation of beam {scheme.beams[0].name}, towards"
        f" its direction, scatters {rate:.3g} per second"
    )


def _two_photon(light: Light) -> Iterable[Finding]:
    """Point out Lambda systems whose two-photon detuning lies within the width of their dark resonance."""
    if light.model != "bloch":
        return
    structure = light.structure
    reach = float(structure.width_mhz.max())
    pairs = [p for p in raman_pairs(light.drive, light.frame, reach) if abs(p.detuning_mhz) < p.width_mhz]
    groups: dict[tuple[str, str], list[float]] = {}
    for pair in pairs:
        ends = tuple(sorted(_manifold_name(light, k) for k in (pair.first, pair.second)))
        groups.setdefault((ends[0], ends[1]), []).append(pair.detuning_mhz)
    for (one, other), detunings in groups.items():
        nearest = min(detunings, key=abs)
        width = max(p.width_mhz for p in pairs)
        text = (
            f"{len(detunings)} pairs of sublevels of {one} and {other} are in two-photon resonance, the nearest"
            f" {nearest:.3g} MHz off: atoms go dark between them if the lasers are coherent"
        )
        change = f"move one laser by about {width:.2g} MHz"
        yield finding("two-photon-resonance", f"{one} and {other}", text, nearest, change)


def _manifold_name(light: Light, position: int) -> str:
    structure = light.structure
    level = structure.levels[structure.level_index[position]]
    return f"{level.name} {'F' if level.twice_I else 'J'}={format_half(int(structure.twice_F[position]))}"


def _end(outcome: Outcome, pumping: Pumping | None, cycling: Cycling | None) -> Iterable[Finding]:
    """Judge what the light comes to: purity of a target, or scattering and its losses."""
    structure = outcome.light.structure
    if pumping is not None:
        name = structure.name(pumping.target)
        text = f"{pumping.purity:.3%} of the atoms end in {name}"
        fullest = structure.name(int(np.argmax(outcome.populations)))
        change = "" if fullest == name else f"these beams pump to {fullest} best"
        severity = "note" if pumping.purity >= GOOD_PURITY else "warning" if fullest == name else "problem"
        yield finding("purity", name, text, pumping.purity, change, severity)
    else:
        strongest = float(np.pi * 1e6 * structure.width_mhz.max())
        if outcome.scattering_per_s < DIM * strongest:
            text = f"{outcome.scattering_per_s:.3g} photons per second of {strongest:.3g} that the line could give"
            yield finding("low-scattering", "the scheme", text, outcome.scattering_per_s)
    if cycling is not None and cycling.photons is not None and cycling.photons < MANY_PHOTONS:
        ways = ", ".join(f"{way.name} {way.share:.1%}" for way in cycling.exits[:3])
        text = f"{cycling.photons:.3g} photons before an atom leaves, to {ways}"
        severity = "warning" if cycling.photons < FEW_PHOTONS else "note"
        change = f"a repump beam from {cycling.exits[0].name}"
        yield finding("leaves-cycle", "the scheme", text, cycling.photons, change, severity)
    if outcome.lost_per_s > 0.0:
        text = f"atoms are lost for good at {outcome.lost_per_s:.3g} per second"
        yield finding("atoms-lost", "the scheme", text, outcome.lost_per_s)


def _model(outcome: Outcome) -> Iterable[Finding]:
    """Say what the numbers rest on."""
    if outcome.light.model == "rate" and outcome.light.reason != "asked for":
        yield finding("rate-equations", "the model", f"rate equations are used: {outcome.light.reason}")
    rates, bloch = outcome.rate_scattering_per_s, outcome.scattering_per_s
    if rates is not None and differ(rates, bloch):
        text = f"rate equations would give {rates:.3g} photons per second instead of {bloch:.3g}"
        yield finding("rate-equations-mislead", "the model", text, rates)
    if not outcome.unique:
        yield finding("depends-on-start", "the scheme", "the steady state depends on where the atoms start")
    for note in (*outcome.light.structure.notes, *outcome.light.frame.notes):
        yield finding("model-note", "the model", note)
    for warning in outcome.warnings:
        if warning.startswith("rate equations leave out"):
            yield finding("rate-equations", "the model", warning)
