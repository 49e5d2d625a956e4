"""Audit rules on constants: hyperfine ratios between isotopes, nuclear and electronic g factors, intervals."""

import math
from collections.abc import Iterator
from itertools import combinations

from levels.audit_spectrum import SIGMAS
from levels.audit_structure import Broken, Species
from levels.blocks import hyperfine_weights
from levels.constants import M_E_OVER_M_P
from levels.derive import lande
from levels.notation import parse_component, parse_half
from levels.quantity import Quantity, in_unit
from levels.records import Isotope, Level

# The nucleus is no point: A ratios leave the ratio of nuclear g by the hyperfine anomaly, 0.5 % at most in s1/2 of the
# pairs known; second-order shifts and core polarisation add to it elsewhere.
A_ALLOWANCE_S = 0.01
A_ALLOWANCE_OTHER = 0.02
B_ALLOWANCE = 0.02  # second-order hyperfine shifts sit in published B of fine-structure multiplets
SHIELDING_ALLOWANCE = 0.025  # a tabulated bare moment exceeds the atomic one by 0.01 % to 1.7 %
LANDE_ALLOWANCE = 0.02


def a_ratio(species: Species) -> Broken:
    """A of two isotopes in one level stand in the ratio of their nuclear g factors."""
    for name, pairs in _pairs(species):
        for (first, level), (second, other) in pairs:
            expected = _g_ratio(first, second)
            if level.A is None or other.A is None or expected is None:
                continue
            allowed = A_ALLOWANCE_S if "2S" in level.term and level.twice_J == 1 else A_ALLOWANCE_OTHER
            yield from _ratio(f"levels.{name}.A", first, second, (level.A, other.A), expected, allowed)


def b_ratio(species: Species) -> Broken:
    """B of two isotopes in one level stand in the ratio of their quadrupole moments."""
    for name, pairs in _pairs(species):
        for (first, level), (second, other) in pairs:
            if None in (level.B, other.B, first.quadrupole, second.quadrupole):
                continue
            expected = _quotient(first.quadrupole, second.quadrupole)
            yield from _ratio(f"levels.{name}.B", first, second, (level.B, other.B), expected, B_ALLOWANCE)


def _pairs(species: Species) -> Iterator[tuple[str, list[tuple[tuple[Isotope, Level], tuple[Isotope, Level]]]]]:
    atoms = [atom for atom in species.atoms.values() if atom.isotope.twice_I]
    for position, name in enumerate(species.data.levels):
        found = [(atom.isotope, atom.levels[position]) for atom in atoms]
        yield name, list(combinations(found, 2))


def _quotient(first: Quantity | None, second: Quantity | None) -> tuple[float, float] | None:
    """Ratio and its relative standard uncertainty (unstated ones count as exact)."""
    if first is None or second is None or first.value == 0 or second.value == 0:
        return None
    relative = math.hypot(*((item.uncertainty or 0.0) / item.value for item in (first, second)))
    return first.value / second.value, relative


def _g_ratio(first: Isotope, second: Isotope) -> tuple[float, float] | None:
    """Ratio of nuclear g factors: of tabulated moments, which share their shielding, else of atomic g_I."""
    moments = _quotient(first.moment, second.moment)
    if moments:
        return moments[0] * second.twice_I / first.twice_I, moments[1]
    return _quotient(first.g_I, second.g_I)


def _ratio(
    key: str,
    first: Isotope,
    second: Isotope,
    values: tuple[Quantity | None, Quantity | None],
    expected: tuple[float, float] | None,
    allowed: float,
) -> Broken:
    one, other = values
    if one is None or other is None or expected is None:
        return
    ratio, relative = expected
    scaled = ratio * other.value  # compared as a difference: B may be zero within its uncertainty
    spread = math.hypot(one.uncertainty or 0.0, ratio * (other.uncertainty or 0.0), relative * scaled)
    if abs(one.value - scaled) > allowed * abs(scaled) + SIGMAS * spread:
        message = f"{one.text} and {other.text}: the nuclear moments say a ratio of {ratio:.6g}"
        yield f"{key}.{first.mass_number}.{second.mass_number}", message


def a_sign(species: Species) -> Broken:
    """A of an s1/2 level has the sign of the nuclear moment: negative moments invert the structure."""
    for atom in species.atoms.values():
        g_I = atom.isotope.g_I
        for level in atom.levels:
            is_s = level.term == "2S" and level.twice_J == 1
            if is_s and level.A is not None and g_I is not None and level.A.value * g_I.value > 0:
                key = f"levels.{level.name}.A.{atom.isotope.mass_number}"
                yield key, f"A = {level.A.text} with g_I = {g_I.text}: a moment is opposite to its g_I and drives A"


def nuclear_g(species: Species) -> Broken:
    """A measured g_I is -mu/I in Bohr magnetons, smaller than the tabulated moment says by the shielding at most."""
    for atom in species.atoms.values():
        isotope = atom.isotope
        if isotope.g_I is None or isotope.moment is None or not isotope.twice_I:
            continue
        bare = -isotope.moment.value / (isotope.twice_I / 2) * M_E_OVER_M_P
        spread = SIGMAS * (isotope.moment.uncertainty or 0.0) / abs(isotope.moment.value)
        if abs(isotope.g_I.value / bare - 1) > SHIELDING_ALLOWANCE + spread:
            yield f"isotopes.{isotope.mass_number}.g_I", f"{isotope.g_I.text}, the moment gives {bare:.6g}"


def lande_factor(species: Species) -> Broken:
    """A published g_J that leaves its coupling's Lande factor by more than 2 % has a note that says why."""
    for name, level in species.data.levels.items():
        expected = lande(name, level.term, level.coupling, parse_half(level.J))
        tables = [(f"levels.{name}.g_J", level.g_J)]
        tables += [(f"levels.{name}.hyperfine.{number}.g_J", table.g_J) for number, table in level.hyperfine.items()]
        for key, table in tables:
            if table is None or expected is None:
                continue
            value = table.quantity()
            departure = value.value - expected.value
            is_far = abs(departure) > LANDE_ALLOWANCE * abs(expected.value) + SIGMAS * (value.uncertainty or 0.0)
            if is_far and not table.note:
                yield key, f"{value.text}, the Lande factor is {expected.value:.6g}: the departure needs a note"


def intervals(species: Species) -> Broken:
    """The hyperfine constants of a level reproduce each of its published intervals."""
    for atom in species.atoms.values():
        number = atom.isotope.mass_number
        for level in atom.levels:
            table = species.data.levels[level.name].hyperfine.get(number)
            for interval in table.intervals if table else ():
                key = f"levels.{level.name}.hyperfine.{number}.intervals.{interval.between}"
                if level.A is None:
                    yield key, "the intervals do not determine A"
                    continue
                measured = in_unit(interval.quantity(), "MHz")
                first, second = parse_component(interval.between)
                expected, spread = _interval(level, first, second)
                allowed = SIGMAS * math.hypot(measured.uncertainty or 0.0, spread)
                if abs(measured.value - expected) > allowed + 1e-9 * abs(expected):
                    yield key, f"{measured.text}, the constants give {expected:.9g} MHz"


def _interval(level: Level, twice_F: int, twice_F_up: int) -> tuple[float, float]:
    weights = [
        up - low
        for low, up in zip(
            hyperfine_weights(level.twice_J, level.twice_I, twice_F),
            hyperfine_weights(level.twice_J, level.twice_I, twice_F_up),
            strict=True,
        )
    ]
    constants = [constant for constant in zip(weights, (level.A, level.B, level.C), strict=True) if constant[1]]
    value = sum(weight * constant.value for weight, constant in constants if constant)
    spread = math.hypot(*(weight * (constant.uncertainty or 0.0) for weight, constant in constants if constant))
    return value, spread
