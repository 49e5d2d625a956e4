"""Finding lines and levels over many atoms, and hints on what cools."""

import pytest

from levels import air
from levels.catalogue import Catalogue
from levels.errors import UnknownName
from levels.records import Atom
from levels.search import LevelWanted, Target, Wanted, find_levels, find_lines, usable
from levels.summary import cooling_lines


@pytest.fixture(scope="module")
def atoms(book: Catalogue) -> list[Atom]:
    """The reference isotope of every species."""
    return [book.species(name)[data.element.reference_isotope] for name, data in book.elements.items()]


def names(atoms: list[Atom], wanted: Wanted, target: Target | None = None) -> list[tuple[str, str]]:
    return [(found.line.atom, found.line.name) for found in find_lines(atoms, wanted, target)]


def test_units_and_media_mean_the_same_place(atoms: list[Atom]) -> None:
    """The Rb D2 line is found by its vacuum and air wavelength, its frequency and its wavenumber."""
    places = (
        Target(780.241, 0.01, "nm"),
        Target(780.027, 0.01, "nm", in_air=True),
        Target(384.2305, 0.001, "THz"),
        Target(12816.549, 0.01, "cm-1"),
    )
    assert [names(atoms, Wanted(), place) for place in places] == [[("87Rb", "780")]] * 4


def test_distances_count_from_the_target(atoms: list[Atom]) -> None:
    """The distance is signed: a line of longer wavelength lies at positive nm and negative GHz."""
    (found,) = find_lines(atoms, Wanted(), Target(780.0, 0.3))
    assert found.distance_nm == pytest.approx(0.2412, abs=1e-4)
    assert found.distance_ghz == pytest.approx(-299792.458 * 0.2412097 / (780.0 * 780.24121) * 1e3, rel=1e-6)
    (in_air,) = find_lines(atoms, Wanted(), Target(780.0, 0.3, in_air=True))
    assert in_air.distance_nm == pytest.approx(air.air_of_vacuum(found.vacuum_nm) - 780.0)


def test_nearest_comes_first(atoms: list[Atom]) -> None:
    """Lines are sorted by their distance, whatever the unit, and all lie within."""
    for target in (Target(423.0, 10.0), Target(700.0, 20.0, "THz"), Target(25000.0, 500.0, "cm-1")):
        found = find_lines(atoms, Wanted(), target)
        distances = [abs(one.distance_nm or 0.0 if target.unit == "nm" else one.distance_ghz or 0.0) for one in found]
        assert len(found) > 3
        assert distances == sorted(distances)


def test_a_two_photon_line_is_where_its_laser_is(atoms: list[Atom]) -> None:
    """The hydrogen 1S-2S line, 2466 THz in sum, is found at 243 nm."""
    assert ("1H", "243") in names(atoms, Wanted(), Target(243.13, 0.05))


def test_filters_narrow(atoms: list[Atom]) -> None:
    """Width, multipole and levels each leave only lines that have them; a line of unknown width has no width."""
    narrow = find_lines(atoms, Wanted(max_width_mhz=1e-6, lower="ground"))
    assert narrow
    assert all(one.line.upper.width is not None and one.line.upper.width.value <= 1e-6 for one in narrow)
    octupole = names(atoms, Wanted(multipole="E3"))
    assert octupole
    assert all(atom.endswith("Yb+") for atom, _ in octupole)
    assert ("88Sr", "707") in names(atoms, Wanted(lower="3P2", upper="3S1"))


def test_recalled_values_can_be_left_out(atoms: list[Atom]) -> None:
    """Without recalled values, fewer lines are left and none rests on memory."""
    wanted = Wanted(without_recalled=True)
    left = find_lines(atoms, wanted)
    assert 0 < len(left) < len(find_lines(atoms, Wanted()))
    assert {one.line.centroid.evidence for one in left if one.line.centroid} <= {"checked", "computed"}
    assert all(usable(one.line.upper.width, wanted) is None for one in left if _recalled(one.line.upper.width))


def _recalled(quantity: object) -> bool:
    return getattr(quantity, "evidence", "") == "recalled"


def test_a_level_that_no_atom_has_is_unknown(atoms: list[Atom]) -> None:
    """A misspelt level is told with its nearest names; a good one that nothing fits is an empty answer."""
    with pytest.raises(UnknownName) as caught:
        find_lines(atoms, Wanted(lower="5s_2S1/3"))
    assert "5s_2S1/2" in caught.value.nearest
    assert find_lines(atoms, Wanted(lower="5s_2S1/2", max_width_mhz=1e-30)) == []


def test_metastable_levels_are_found_by_lifetime(atoms: list[Atom]) -> None:
    """Levels that live more than a minute: 2 3S1 of helium (7870 s) and the octupole level of Yb+ among them."""
    found = {(level.atom, level.name) for level in find_levels(atoms, LevelWanted(min_lifetime_s=60.0))}
    assert ("4He", "2s_3S1") in found
    assert any(name == "4f13.6s2_2F7/2" for _, name in found)


def test_levels_are_found_by_quantum_numbers(atoms: list[Atom]) -> None:
    """Term, J and parity select; energies sort within an atom."""
    found = find_levels(atoms, LevelWanted(term="3P", twice_J=0, parity=-1))
    assert {level.term for level in found} == {"3P"}
    assert {(level.twice_J, level.parity) for level in found} == {(0, -1)}
    strontium = find_levels([atom for atom in atoms if atom.isotope.name == "88Sr"], LevelWanted())
    energies = [level.energy.value for level in strontium if level.energy]
    assert energies == sorted(energies)


def test_hints_on_cooling(book: Catalogue) -> None:
    """87Rb cools on a closed D2; 40Ca+ 397 leaks to 3d 2D3/2, from where 866 brings it back; 88Sr 461 leaks little."""
    rubidium = cooling_lines(book.atom("87Rb"))[0]
    assert (rubidium.line.name, rubidium.is_cycling, rubidium.is_closed, rubidium.leaks) == ("780", True, True, ())
    calcium = next(one for one in cooling_lines(book.atom("40Ca+")) if one.line.name == "397")
    assert calcium.is_closed is False
    assert [(leak.name, leak.lower.name) for leak in calcium.leaks] == [("866", "3d_2D3/2")]
    strontium = cooling_lines(book.atom("88Sr"))[0]
    assert (strontium.line.name, strontium.is_closed) == ("461", True)
    assert "6457" in [leak.name for leak in strontium.leaks]
