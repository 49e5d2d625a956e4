"""The hyperfine components of a line at zero field: exact strengths, offsets from the centroid, weak-field factors."""

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

from levels.angular import hyperfine_shares, line_strength
from levels.blocks import hyperfine_weights
from levels.components import strength_model
from levels.quantity import Quantity, combine
from levels.records import Level, Line
from levels.sublevels import constants_of, zero_field_mhz


@dataclass(frozen=True, slots=True)
class Hyperfine:
    """One hyperfine component F -> F' (doubled). `strength` is None where J and the multipole forbid the line."""

    twice_F: int
    twice_F_up: int
    strength: Fraction | None


@dataclass(frozen=True, slots=True)
class Estimate:
    """A number and its standard uncertainty, None when an input states none."""

    value: float
    uncertainty: float | None


def angular_momenta(level: Level) -> range:
    """List every doubled F of a level."""
    return range(abs(level.twice_J - level.twice_I), level.twice_J + level.twice_I + 1, 2)


def hyperfine_components(line: Line) -> list[Hyperfine]:
    """List every F -> F' of a line with |F' - F| up to its multipole rank, by F and then F'.

    Strengths are the shares of F' in all the absorption from F, so that they sum to 1 over F' for each F.
    """
    return [
        Hyperfine(F, F_up, _strength(line, F, F_up))
        for F in angular_momenta(line.lower)
        for F_up in angular_momenta(line.upper)
        if abs(F - F_up) <= 2 * line.rank <= F + F_up
    ]


def _strength(line: Line, twice_F: int, twice_F_up: int) -> Fraction | None:
    model = strength_model(line)
    if model == "F":
        return line_strength(twice_F, twice_F_up, 0, twice_F, twice_F_up, line.rank)
    if not model:
        return None
    lower, upper = line.lower, line.upper
    return line_strength(lower.twice_J, upper.twice_J, lower.twice_I, twice_F, twice_F_up, line.rank)


def zero_field_energy(level: Level, twice_F: int) -> Estimate:
    """Compute the energy of one F from the level's hyperfine centroid, in MHz."""
    weights = hyperfine_weights(level.twice_J, level.twice_I, twice_F)
    return Estimate(zero_field_mhz(constants_of(level), twice_F), _joined((level.A, level.B, level.C), weights))


def offset(line: Line, component: Hyperfine) -> Estimate:
    """Compute how far a hyperfine component lies from the line's centroid, in MHz."""
    low, up = zero_field_energy(line.lower, component.twice_F), zero_field_energy(line.upper, component.twice_F_up)
    return Estimate(up.value - low.value, combine(low.uncertainty, up.uncertainty))


def g_F(level: Level, twice_F: int) -> Estimate | None:
    """Compute the weak-field factor of one F, with E/h = g_F (muB/h) m B; None for F = 0."""
    if twice_F == 0:
        return None
    constants = constants_of(level)
    weights = [float(share) for share in hyperfine_shares(twice_F, level.twice_J, level.twice_I)]
    value = constants.g_J * weights[0] + constants.g_I * weights[1]
    return Estimate(value, _joined((level.g_J, level.g_I), weights))


def _joined(constants: Sequence[Quantity | None], weights: Sequence[float]) -> float | None:
    parts = [
        None if constant.uncertainty is None else constant.uncertainty * weight
        for constant, weight in zip(constants, weights, strict=True)
        if constant is not None and weight
    ]
    return combine(*parts)
