"""Components asked for one field after the other are those solved directly."""

import numpy as np
import pytest

from levels.catalogue import Catalogue
from levels.components import component
from levels.errors import OutsideValidity, UnknownName
from levels.lookup import ComponentLookup

HZ = 1e-6  # MHz
CASES = (
    ("87Rb", "780", (4, 4), (6, 6)),
    ("87Rb", "780", (2, -2), (4, 0)),
    ("133Cs", "852", (8, -2), (10, 0)),
    ("40K", "767", (9, 1), (11, 3)),
    ("87Sr", "689", (9, 3), (11, 1)),
    ("43Ca+", "729", (8, 0), (6, 2)),
    ("88Sr", "689", (0, 0), (2, 2)),
    ("171Yb+", "369", (2, 0), (0, 0)),
)
FIELDS = (0.0, 1e-3, -0.37, 2.9999, 3.2289, 64.0, -999.9, 12345.6)


@pytest.mark.parametrize(("atom", "name", "lower", "upper"), CASES)
def test_lookup_is_the_component(
    book: Catalogue, atom: str, name: str, lower: tuple[int, int], upper: tuple[int, int]
) -> None:
    """At any field a look-up gives what solving the component there gives: to 1 mHz, and uncertainties to 1e-6."""
    line = book.find_line(atom, name)
    lookup = ComponentLookup(line, lower, upper)
    for field in FIELDS:
        found, solved = lookup.at(field), component(line, lower, upper, field)
        assert found.offset_mhz == pytest.approx(solved.offset_mhz, abs=1e-3 * HZ)
        assert found.shift_mhz == pytest.approx(solved.shift_mhz, abs=1e-3 * HZ)
        assert found.slope_mhz_per_gauss == pytest.approx(solved.slope_mhz_per_gauss, rel=1e-10, abs=1e-11)
        assert found.quadratic_hz_per_gauss2 == pytest.approx(solved.quadratic_hz_per_gauss2, rel=1e-7, abs=1e-5)
        assert found.strength == pytest.approx(solved.strength, abs=1e-11)
        largest = solved.spread.stated.max(axis=(1, 2), keepdims=True)
        assert np.all(np.abs(found.spread.stated - solved.spread.stated) <= 1e-6 * largest + 1e-12)
        assert np.array_equal(np.isnan(found.spread.uncertainty), np.isnan(solved.spread.uncertainty))
        assert found.spread.excludes == solved.spread.excludes
        assert (found.frequency_mhz, found.q) == (pytest.approx(solved.frequency_mhz, abs=1e-7), solved.q)


def test_same_field_gives_the_same_bits_whatever_came_before(book: Catalogue) -> None:
    """An answer does not depend on what was asked before: strong ETags rest on it."""
    line = book.find_line("87Rb", "780")
    first, second = (ComponentLookup(line, (2, 0), (4, 2)) for _ in range(2))
    fields = [3.2, 5.0, 7.99, 0.4, 400.0, -3.2]
    forward = [first.at(field) for field in fields]
    for field in reversed(fields):
        for other in (1e4, field, 0.01):
            second.at(other)
    backward = [second.at(field) for field in fields]
    for one, two in zip(forward, backward, strict=True):
        assert one.offset_mhz == two.offset_mhz
        assert one.quadratic_hz_per_gauss2 == two.quadratic_hz_per_gauss2
        assert np.array_equal(one.spread.stated, two.spread.stated)


def test_what_does_not_exist_is_refused(book: Catalogue) -> None:
    """A sublevel that does not exist, a forbidden component and an impossible field are refused as ever."""
    line = book.find_line("87Rb", "780")
    with pytest.raises(UnknownName):
        ComponentLookup(line, (6, 0), (4, 0))
    with pytest.raises(OutsideValidity, match="changes m by at most 1"):
        ComponentLookup(line, (4, 4), (6, 0))
    lookup = ComponentLookup(line, (4, 4), (6, 6))
    for field in (1e9, float("nan"), float("inf")):
        with pytest.raises(OutsideValidity):
            lookup.at(field)


def test_pieces_are_bounded(book: Catalogue) -> None:
    """However many fields are asked for, only so many pieces are held."""
    lookup = ComponentLookup(book.find_line("87Rb", "780"), (2, 0), (4, 2))
    for field in np.geomspace(0.01, 1e5, 400):
        lookup.at(float(field))
    assert 0 < len(lookup._pieces) <= 24
