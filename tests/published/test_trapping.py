"""Published and common numbers about magnetic traps, out of `trapping` on the catalogue's real data."""

import pytest

from levels.catalogue import Catalogue
from levels.trapping import Trapped, trapping

GROUND = {"87Rb": "5s_2S1/2", "85Rb": "5s_2S1/2", "133Cs": "6s_2S1/2", "23Na": "3s_2S1/2", "40K": "4s_2S1/2"}


def trapped(book: Catalogue, atom: str, level: str, largest: float = 1000.0) -> dict[tuple[int, int], Trapped]:
    isotope = book.atom(atom).isotope
    found = trapping(isotope, book.find_level(atom, level), 0.0, largest)
    return {one.label: one for one in found}


@pytest.mark.parametrize(("label", "expected"), [((2, -2), 30.5), ((4, 4), 15.3)])
def test_gradients_that_hold_rubidium_against_gravity(book: Catalogue, label: tuple[int, int], expected: float) -> None:
    """87Rb |1,-1> is held against gravity by 30.5 G/cm (Lin et al., Phys. Rev. A 79, 063631 (2009), from memory) and
    |2,2> by 15.3 G/cm (common practice); 1 % because the printed numbers take g_F = 1/2."""
    assert trapped(book, "87Rb", GROUND["87Rb"])[label].levitation_gauss_per_cm == pytest.approx(expected, rel=0.01)


def test_sodium_turns_where_traps_end(book: Catalogue) -> None:
    """23Na |1,-1> turns over at 316 G (trap papers of the time, from memory; half of the last printed digit)."""
    one = trapped(book, "23Na", GROUND["23Na"])[2, -2]
    assert one.turning_gauss == pytest.approx(316, abs=0.5)


@pytest.mark.parametrize(
    ("atom", "held"),
    [
        ("87Rb", {(1, -1), (2, 1), (2, 2)}),
        ("85Rb", {(2, -2), (2, -1), (3, 1), (3, 2), (3, 3)}),
        ("133Cs", {(3, -3), (3, -2), (3, -1), (4, 1), (4, 2), (4, 3), (4, 4)}),
        ("23Na", {(1, -1), (2, 1), (2, 2)}),
    ],
)
def test_weak_field_seekers(book: Catalogue, atom: str, held: set[tuple[int, int]]) -> None:
    """The sublevels with a moment that seek weak field are those of every textbook (common practice): g_F m > 0."""
    found = trapped(book, atom, GROUND[atom], 100.0)
    seekers = {label for label, one in found.items() if one.slope_mhz_per_gauss > 0}
    assert seekers == {(2 * F, 2 * m) for F, m in held}
    assert all(found[label].seeks == "weak field" for label in seekers)


def test_inverted_hyperfine_structure_changes_no_sign(book: Catalogue) -> None:
    """40K (A < 0): m > 0 of F = 9/2 and m < 0 of F = 7/2 seek weak field, as in an upright structure (textbook)."""
    found = trapped(book, "40K", GROUND["40K"], 10.0)
    for (F, m), one in found.items():
        assert (one.slope_mhz_per_gauss > 0) == (m > 0 if F == 9 else m < 0)


@pytest.mark.parametrize(("atom", "moment"), [("52Cr", 6.0), ("164Dy", 10.0)])
def test_moments_of_stretched_ground_states(book: Catalogue, atom: str, moment: float) -> None:
    """52Cr has 6 muB and 164Dy 10 muB in the stretched ground state (Maier et al., Opt. Lett. 39, 3138 (2014), found in
    its introduction; rounded, 1 %)."""
    one = list(trapped(book, atom, book.atom(atom).isotope.ground).values())[-1]
    assert -one.moment_mu_b == pytest.approx(moment, rel=0.01)
