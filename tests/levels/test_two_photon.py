"""Components of lines of two equal photons: what they drive has rank 0 or 2."""

from fractions import Fraction

import pytest

from levels.catalogue import Catalogue
from levels.components import Components, component, components
from levels.errors import OutsideValidity
from tests.full_dimension import wig6jj

Label = tuple[int, int]


def strengths(found: Components) -> dict[tuple[Label, Label], Fraction]:
    """Zero-field strengths by ((2F, 2m), (2F', 2m'))."""
    lower = zip(found.lower_twice_F.tolist(), found.lower_twice_m.tolist(), strict=True)
    upper = zip(found.upper_twice_F.tolist(), found.upper_twice_m.tolist(), strict=True)
    return dict(zip(zip(lower, upper, strict=True), found.zero_field_strength, strict=True))


@pytest.mark.parametrize(("atom", "name"), [("87Rb", "760"), ("1H", "243")])
def test_between_s_levels_two_photons_are_a_scalar(atom: str, name: str, book: Catalogue) -> None:
    """5S-7S and 1S-2S change neither F nor m at zero field: every sublevel goes to its namesake with strength 1."""
    found = strengths(components(book.find_line(atom, name), 0.0))
    assert found
    assert all(strength == (1 if lower == upper else 0) for (lower, upper), strength in found.items())


def test_to_a_d_level_two_photons_are_a_quadrupole(book: Catalogue) -> None:
    """5S-5D5/2: m changes by up to 2, and F to F' has (2F'+1) (2F+1) (2J'+1) {1/2 5/2 2; F' F 3/2}^2 in sum."""
    found = strengths(components(book.find_line("87Rb", "778.1"), 0.0))
    totals: dict[Label, Fraction] = {}
    for (lower, upper), strength in found.items():
        pair = lower[0], upper[0]
        totals[pair] = totals.get(pair, Fraction(0)) + strength
    for (F, F_up), total in totals.items():
        expected = (F_up + 1) * (F + 1) * 6 * wig6jj(1, 5, 4, F_up, F, 3) ** 2
        assert float(total) == pytest.approx(expected, abs=1e-12)
    assert max(abs(upper[1] - lower[1]) for lower, upper in found) == 4


def test_what_two_photons_cannot_change_is_refused(book: Catalogue) -> None:
    """5S-7S with another m is told to be beyond two photons of this line."""
    with pytest.raises(OutsideValidity, match="2-photon line changes m by at most 0"):
        component(book.find_line("87Rb", "760"), (4, 0), (4, 2), 1.0)
