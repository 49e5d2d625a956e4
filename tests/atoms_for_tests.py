"""Small atoms with decays, written by hand: a lambda scheme and its cousins. INVENTED: all rates and shares."""

from dataclasses import replace
from typing import Any

from levels.quantity import Quantity
from levels.records import Atom, Isotope, Level, Line
from tests.records_for_tests import level, line, quantity

RATE = 1e8  # s-1 of every excited level


def energy(wavenumbers: float) -> Quantity:
    return quantity(wavenumbers, 0.001, "cm-1")


def named(name: str, twice_J: int, parity: int, at: float, twice_I: int = 0, **more: Any) -> Level:
    """A level; excited ones (odd) live 10 ns unless told otherwise."""
    if parity < 0:
        more.setdefault("lifetime", quantity(1 / RATE, None, "s"))
    more.setdefault("A", 500.0 if twice_I and twice_J else None)
    A = more.pop("A")
    g_I = -1e-3 if twice_I else None
    return level(twice_J, twice_I, A, g_J=1.3, g_I=g_I, name=name, parity=parity, energy=energy(at), **more)


def decay(lower: Level, upper: Level, share: float | None, spread: float | None = None, **more: Any) -> Line:
    """A line with its share in the upper level's decays; None: not published."""
    if lower.energy is None or upper.energy is None:
        raise ValueError("levels with energies")
    gap = upper.energy.value - lower.energy.value
    branching = None if share is None else quantity(share, spread)
    centroid = quantity(gap * 29979.2458, 1.0, "MHz")
    name = more.pop("name", f"{1e7 / gap:.0f}")
    return line(lower, upper, name=name, nominal_nm=1e7 / gap, branching=branching, centroid=centroid, **more)


def atom(lines: list[Line], extra: list[Level] | None = None, twice_I: int = 0) -> Atom:
    """The atom that these lines make."""
    levels = {item.name: item for one in lines for item in (one.lower, one.upper)} | {x.name: x for x in extra or []}
    ground = min(levels.values(), key=lambda item: item.energy.value if item.energy else 1e9)
    isotope = Isotope("Zz", "Zz", 0, 120, 300, twice_I, ground.name)
    return Atom(isotope, tuple(levels.values()), tuple(lines))


def lambda_atom(share: float = 0.9, spread: float | None = None, twice_I: int = 0) -> Atom:
    """S1/2 and metastable D3/2 below P1/2, which decays to S with the share and to D with the rest."""
    S, D = named("s_2S1/2", 1, 1, 0.0, twice_I), named("d_2D3/2", 3, 1, 10_000.0, twice_I)
    P = named("p_2P1/2", 1, -1, 25_000.0, twice_I)
    return atom([decay(S, P, share, spread, name="cool"), decay(D, P, 1 - share, spread, name="back")], twice_I=twice_I)


def ladder_atom() -> Atom:
    """The lambda atom with P3/2, which D3/2 can be pumped to and which leaks into a second metastable D5/2."""
    S, D3, D5 = named("s_2S1/2", 1, 1, 0.0), named("d_2D3/2", 3, 1, 10_000.0), named("d_2D5/2", 5, 1, 10_100.0)
    P1, P3 = named("p_2P1/2", 1, -1, 25_000.0), named("p_2P3/2", 3, -1, 25_300.0)
    return atom(
        [
            decay(S, P1, 0.9, 0.001, name="cool"),
            decay(D3, P1, 0.1, 0.001, name="back"),
            decay(S, P3, 0.8, name="over"),
            decay(D3, P3, 0.05, name="side"),
            decay(D5, P3, 0.15, name="more"),
        ]
    )


def unpublished_atom() -> Atom:
    """S and two metastable levels below P, which goes to S with 0.99; how the rest splits is not published."""
    S, D1, D2 = named("s_1S0", 0, 1, 0.0), named("d_3D1", 2, 1, 9_000.0), named("d_3D2", 4, 1, 9_200.0)
    P = named("p_1P1", 2, -1, 20_000.0)
    return atom(
        [decay(S, P, 0.99, 0.0001, name="cool"), decay(D1, P, None, name="one"), decay(D2, P, None, name="two")]
    )


def without_lifetime(some: Atom, name: str) -> Atom:
    """The atom with one level's lifetime unknown."""
    levels = {item.name: replace(item, lifetime=None) if item.name == name else item for item in some.levels}
    lines = tuple(replace(one, lower=levels[one.lower.name], upper=levels[one.upper.name]) for one in some.lines)
    return Atom(some.isotope, tuple(levels.values()), lines)
