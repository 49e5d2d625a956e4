"""The hyperfine components of a line at zero field."""

from fractions import Fraction

import numpy as np
import pytest

from levels.catalogue import Catalogue
from levels.components import component
from levels.hyperfine import g_F, hyperfine_components, offset, zero_field_energy
from levels.sublevels import sublevels
from levels.uncertainty import component_spread, sublevel_spread

LINES = (("87Rb", "780"), ("133Cs", "894"), ("40K", "767"), ("87Sr", "689"), ("43Ca+", "729"), ("88Sr", "461"))


@pytest.mark.parametrize(("atom", "name"), LINES)
def test_strengths_of_one_lower_level_sum_to_one(book: Catalogue, atom: str, name: str) -> None:
    """S(F,F') is the share of F' in all the absorption from F: exactly 1 over all F'."""
    sums: dict[int, Fraction] = {}
    for part in hyperfine_components(book.find_line(atom, name)):
        assert part.strength is not None
        sums[part.twice_F] = sums.get(part.twice_F, Fraction(0)) + part.strength
    assert set(sums.values()) == {Fraction(1)}


def test_strengths_of_the_rubidium_line(book: Catalogue) -> None:
    """87Rb D2: 1/6, 5/12, 5/12 from F = 1 and 1/20, 1/4, 7/10 from F = 2 (common practice; checks.csv's table)."""
    found = {
        (part.twice_F // 2, part.twice_F_up // 2): str(part.strength)
        for part in hyperfine_components(book.find_line("87Rb", "780"))
    }
    assert found == {
        (1, 0): "1/6",
        (1, 1): "5/12",
        (1, 2): "5/12",
        (2, 1): "1/20",
        (2, 2): "1/4",
        (2, 3): "7/10",
    }


@pytest.mark.parametrize(("atom", "name"), LINES)
def test_energies_have_their_centroid_at_zero(book: Catalogue, atom: str, name: str) -> None:
    """Weighted with 2F+1, the hyperfine energies of a level sum to zero."""
    for level in (book.find_line(atom, name).lower, book.find_line(atom, name).upper):
        span = range(abs(level.twice_J - level.twice_I), level.twice_J + level.twice_I + 1, 2)
        energies = [(F + 1) * zero_field_energy(level, F).value for F in span]
        assert sum(energies) == pytest.approx(0.0, abs=1e-12 * max(1.0, *map(abs, energies)))


@pytest.mark.parametrize(("atom", "name"), LINES)
def test_offsets_are_those_of_the_components_at_zero_field(book: Catalogue, atom: str, name: str) -> None:
    """The offset of F - F' is that of each of its Zeeman components at zero field."""
    line = book.find_line(atom, name)
    for part in hyperfine_components(line):
        labels = (part.twice_F, part.twice_F % 2), (part.twice_F_up, part.twice_F_up % 2)
        expected = component(line, *labels, 0.0).offset_mhz
        assert offset(line, part).value == pytest.approx(expected, abs=1e-9 * max(1.0, abs(expected)))


@pytest.mark.parametrize(("atom", "name"), LINES)
def test_g_F_is_the_slope_in_a_weak_field(book: Catalogue, atom: str, name: str) -> None:
    """E/h = g_F (muB/h) m B: the slope of the sublevel m at zero field, muB/h = 1.39962449 MHz/G (CODATA 2022)."""
    level = book.find_line(atom, name).upper
    table = sublevels(level, 0.0)
    for F, m, slope in zip(table.twice_F, table.twice_m, table.slope_mhz_per_gauss[0], strict=True):
        factor = g_F(level, int(F))
        if factor is None:
            assert F == 0
            continue
        assert slope == pytest.approx(factor.value * 1.39962449171 * m / 2, abs=1e-9)


def test_uncertainty_of_a_sum_needs_all_its_parts(book: Catalogue) -> None:
    """An offset has an uncertainty where A and B state theirs, made of both levels' in quadrature."""
    line = book.find_line("87Rb", "780")
    part = next(part for part in hyperfine_components(line) if (part.twice_F, part.twice_F_up) == (4, 6))
    ends = zero_field_energy(line.lower, 4).uncertainty, zero_field_energy(line.upper, 6).uncertainty
    assert offset(line, part).uncertainty == pytest.approx(np.hypot(*ends))


def test_tables_of_uncertainties_are_those_of_their_rows(book: Catalogue) -> None:
    """Each row of the tables of uncertainties is that of the single component or sublevel, in the tables' order."""
    line, field = book.find_line("87Rb", "780"), 12.5
    table = component_spread(line, field, 1)
    from levels.components import pairs_of

    for row, (low, up) in enumerate(pairs_of(line, 1)):
        single = component(line, low, up, field).spread
        assert table.stated[:, 0, row] == pytest.approx(single.stated[:, 0, 0], rel=1e-9, abs=1e-15)
    stretched = sublevel_spread(line.lower, field).stated[:, 0, -1]
    assert np.all(stretched[[0, 1, 3]] > 0)
    assert stretched[2] == pytest.approx(0.0, abs=1e-9)
