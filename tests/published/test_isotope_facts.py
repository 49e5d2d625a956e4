"""Masses, spins, abundances and bare moments of every isotope against two general reference libraries.

periodictable carries the masses of AME2020 and the abundances in use, mendeleev spins, abundances, Stone's moments of
2019 and quadrupole moments of 2021 (in single precision). What those tables are known to have wrong is named here and
compared with other numbers instead, never with ours.
"""

import math
from fractions import Fraction
from typing import Any

import periodictable
import pytest
from mendeleev.fetch import fetch_table

from levels.catalogue import Catalogue
from levels.quantity import in_unit
from levels.records import Isotope

MASS = 5e-9  # relative: both sides are AME2020, printed to the last digit
ROUNDED = 1e-9  # relative: files print a mass with different numbers of digits
ABUNDANCE_PERCENT = 0.3  # absolute: what separates the tables in use (171Yb: 14.086, 14.216, 14.28)
LITHIUM_PERCENT = 3.0  # mendeleev and periodictable print the middle, 4.85 and 95.15, of the interval found in nature
TABLE_MOMENT = 1e-6  # relative: mendeleev's single precision, on the same Stone 2019 table
QUADRUPOLE = 0.05  # relative: what separates the tables of two decades
WRONG_SIGN = {"133Ba", "109Ag"}  # mendeleev lost the minus sign of these moments
# mendeleev's quadrupole moments of potassium are ten times too large: Stone 2014 as easyspyn 0.2.0 prints it
QUADRUPOLE_BARN = {"39K": 0.0585, "40K": -0.073, "41K": 0.0711}
# 87Sr: three determinations agree on 0.33 b, the table's 0.305 b is 7 % lower; kept as the data file explains
# Tables of 67Zn differ by 20 %. For 135Ba the calculated field gradient of Tang 2025 (0.161(2) b) is 5.2 % above the
# table of 2021 and agrees with that of 2005; for 137Ba the two are 4.2 % apart.
DOUBTED_QUADRUPOLE = {"87Sr": 0.10, "67Zn": 0.20, "135Ba": 0.06}


@pytest.fixture(scope="module")
def isotopes(book: Catalogue) -> list[Isotope]:
    return list(book.atoms())


@pytest.fixture(scope="module")
def table() -> dict[tuple[int, int], Any]:
    """mendeleev's isotopes by nuclear charge and mass number."""
    rows = fetch_table("isotopes").itertuples()
    return {(row.atomic_number, row.mass_number): row for row in rows}


def plain(isotope: Isotope) -> str:
    """The nucleus, whatever the charge."""
    return f"{isotope.mass_number}{isotope.symbol}"


def test_masses(isotopes: list[Isotope]) -> None:
    """Every isotope has a mass, and it is that of AME2020 to 5e-9."""
    wrong = []
    for isotope in isotopes:
        assert isotope.mass is not None
        ours = in_unit(isotope.mass, "u").value
        theirs = periodictable.elements.symbol(isotope.symbol)[isotope.mass_number].mass
        if abs(ours / theirs - 1) > MASS:
            wrong.append((isotope.name, ours, theirs))
    assert wrong == []


def test_spins(isotopes: list[Isotope], table: dict[tuple[int, int], Any]) -> None:
    """Every nuclear spin is the table's, exactly."""
    wrong = []
    for isotope in isotopes:
        spin = Fraction(str(table[isotope.Z, isotope.mass_number].spin))
        if spin != Fraction(isotope.twice_I, 2):
            wrong.append((isotope.name, isotope.twice_I, spin))
    assert wrong == []


def test_abundances(isotopes: list[Isotope], table: dict[tuple[int, int], Any]) -> None:
    """Every stable isotope's abundance is that of one of the two tables to 0.3 % of all atoms (lithium to 3 %)."""
    wrong = []
    for isotope in isotopes:
        tables = [
            periodictable.elements.symbol(isotope.symbol)[isotope.mass_number].abundance,
            table[isotope.Z, isotope.mass_number].abundance,
        ]
        ours = 0.0 if isotope.abundance is None else in_unit(isotope.abundance, "%").value
        allowed = LITHIUM_PERCENT if isotope.symbol == "Li" else ABUNDANCE_PERCENT
        if min(abs(ours - (0.0 if math.isnan(theirs) else theirs)) for theirs in tables) > allowed:
            wrong.append((isotope.name, ours, tables))
    assert wrong == []


def test_abundances_of_an_element_are_at_most_everything(isotopes: list[Isotope]) -> None:
    """The isotopes in the book make up no more than all atoms of their species, within the tables' rounding."""
    totals: dict[tuple[str, int], float] = {}
    for isotope in isotopes:
        if isotope.abundance is not None:
            key = (isotope.symbol, isotope.charge)
            totals[key] = totals.get(key, 0.0) + in_unit(isotope.abundance, "%").value
    assert {key: total for key, total in totals.items() if total > 100.05} == {}


def test_atom_and_ion_share_their_nucleus(isotopes: list[Isotope]) -> None:
    """Spin and mass of a nucleus are the same in the atom's file and in the ion's, where both hold the neutral mass."""
    seen: dict[str, Isotope] = {}
    for isotope in isotopes:
        other = seen.setdefault(plain(isotope), isotope)
        assert isotope.mass is not None
        assert other.mass is not None
        assert isotope.twice_I == other.twice_I
        assert isotope.mass.value == pytest.approx(other.mass.value, rel=ROUNDED)


def test_bare_moments(isotopes: list[Isotope], table: dict[tuple[int, int], Any]) -> None:
    """Magnetic moments given as bare ones are those of Stone's table of 2019, with its sign."""
    wrong, compared = [], 0
    for isotope in isotopes:
        if isotope.moment is None or "stone2019" not in isotope.moment.sources:
            continue
        theirs = table[isotope.Z, isotope.mass_number].g_factor * isotope.twice_I / 2
        theirs *= -1 if plain(isotope) in WRONG_SIGN else 1
        compared += 1
        if abs(in_unit(isotope.moment, "muN").value / theirs - 1) > TABLE_MOMENT:
            wrong.append((isotope.name, isotope.moment.value, theirs))
    assert wrong == []
    assert compared > 50


def test_free_atom_g_factors_lie_below_the_bare_ones(isotopes: list[Isotope]) -> None:
    """A ground-level g_I is the bare moment's less a shielding that grows from 0 to 2 % with the nuclear charge.

    Arimondo et al. 1977 against Stone 2019: Li 0.01 %, Na 0.06 %, K 0.14 %, Rb 0.38 %, Cs 0.6 %; Hg 1.6 %.
    """
    wrong, compared = [], 0
    for isotope in isotopes:
        if isotope.g_I is None or isotope.moment is None:
            continue
        bare = -in_unit(isotope.moment, "muN").value / (isotope.twice_I / 2) / 1836.152673426
        compared += 1
        if not -0.003 <= 1 - isotope.g_I.value / bare <= 0.005 + 2e-6 * isotope.Z**2:
            wrong.append((isotope.name, 1 - isotope.g_I.value / bare))
    assert wrong == []
    assert compared > 20


def test_quadrupole_moments(isotopes: list[Isotope], table: dict[tuple[int, int], Any]) -> None:
    """Nuclear quadrupole moments are the table's to 5 %, sign included."""
    wrong, compared = [], 0
    for isotope in isotopes:
        if isotope.quadrupole is None:
            continue
        name = plain(isotope)
        theirs = QUADRUPOLE_BARN.get(name)
        if theirs is None:
            theirs = table[isotope.Z, isotope.mass_number].quadrupole_moment
        compared += 1
        if abs(in_unit(isotope.quadrupole, "b").value / theirs - 1) > DOUBTED_QUADRUPOLE.get(name, QUADRUPOLE):
            wrong.append((isotope.name, isotope.quadrupole.value, theirs))
    assert wrong == []
    assert compared > 40
