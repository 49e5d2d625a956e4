"""Loading the book, finding things in it, and deriving what follows from the published values."""

import shutil
import time
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.blocks import hyperfine_shift
from levels.catalogue import Catalogue, find_level, find_line, load
from levels.errors import DataError, OutsideValidity, OverlayError, UnknownName
from levels.records import Atom, Level, Line
from tests.conftest import FICTIONAL

MHZ_PER_WAVENUMBER = 29979.2458


def line(catalogue: Catalogue, atom: str, name: str) -> Line:
    """A line that must have a centroid."""
    found = catalogue.find_line(atom, name)
    assert found.centroid is not None
    return found


# Finding


@pytest.mark.parametrize("name", ["303Zz", "Zz-303", "zz303"])
def test_atoms_are_found_in_every_spelling(fictional: Catalogue, name: str) -> None:
    """The same record answers to each spelling, and is made once."""
    assert fictional.atom(name) is fictional.atom("303Zz")


@pytest.mark.parametrize(
    ("name", "nearest"),
    [("302Zz", "301Zz"), ("Zz", "300Zz"), ("Zz+", "300Zz"), ("303Zy", "303Zz"), ("40Ca", ""), ("", "")],
)
def test_an_unknown_atom_is_refused_with_the_nearest(fictional: Catalogue, name: str, nearest: str) -> None:
    """A wrong isotope names those there are; a bare element asks for one."""
    with pytest.raises((UnknownName, OutsideValidity)) as refused:
        fictional.atom(name)
    if nearest:
        assert nearest in refused.value.nearest  # type: ignore[union-attr]


def test_an_element_with_one_isotope_needs_no_mass_number(book: Catalogue) -> None:
    """Cs is 133Cs."""
    assert book.atom("Cs").isotope.name == "133Cs"


@pytest.mark.parametrize(
    ("name", "level"),
    [
        ("6p_2P3/2", "6p_2P3/2"), ("6P3/2", "6p_2P3/2"), ("6p3/2", "6p_2P3/2"), ("2P3/2", "6p_2P3/2"),
        ("6p 2P3/2", "6p_2P3/2"), ("P3/2", "6p_2P3/2"), ("3P0", "6s.6p_3P0"), ("6s6p 3P0", "6s.6p_3P0"),
        ("7S1/2", "7s_2S1/2"), ("3[3/2]1/2", "4f13.(2F7/2)5d.6s_3[3/2]1/2"),
        ("(8,1)9", "4f10.(5I8).6s.6p.(3P1)_(8,1)9"),
    ],
)  # fmt: skip
def test_levels_answer_to_short_names(fictional: Catalogue, name: str, level: str) -> None:
    """Full names, aliases, terms and nLJ find the level while only one fits."""
    assert fictional.find_level("301Zz", name).name == level


def test_an_ambiguous_level_names_those_that_fit(fictional: Catalogue) -> None:
    """2S1/2 is both 6s and 7s."""
    with pytest.raises(UnknownName, match="several") as refused:
        fictional.find_level("301Zz", "2S1/2")
    assert refused.value.nearest == ("6s_2S1/2", "7s_2S1/2")


@pytest.mark.parametrize(
    ("name", "found"),
    [
        ("800", "800"), ("800.0", "800"), ("800 nm", "800"), ("D2", "800"), ("d1", "833"), ("833.33", "833"),
        ("834", ""), ("clock", "1000.1"), ("6S1/2->6P3/2", "800"), ("6P3/2 -> 6S1/2", "800"), ("1000", "1000"),
        ("D3", ""),
    ],
)  # fmt: skip
def test_lines_answer_to_wavelength_alias_and_levels(fictional: Catalogue, name: str, found: str) -> None:
    """A wavelength rounded or cut to any number of digits, an alias in any case, or the two levels."""
    if found:
        assert fictional.find_line("300Zz", name).name == found
    else:
        with pytest.raises(UnknownName) as refused:
            fictional.find_line("300Zz", name)
        assert "833" in refused.value.nearest


def test_an_ambiguous_wavelength_names_the_lines_that_fit(fictional: Catalogue) -> None:
    """1000.0 nm fits two lines, which the answer names."""
    with pytest.raises(UnknownName, match="several") as refused:
        fictional.find_line("300Zz", "1000.00")
    assert refused.value.nearest == ("1000", "1000.1")


@given(st.text(max_size=40))
def test_any_text_finds_or_raises_our_errors(fictional: Catalogue, text: str) -> None:
    """Names that nobody gave raise UnknownName or OutsideValidity with something to say, never another exception."""
    atom = fictional.atom("301Zz")
    finders = (fictional.atom, lambda t: find_level(atom, t), lambda t: find_line(atom, t))
    for finder in finders:
        try:
            answer: object = finder(text)
        except (UnknownName, OutsideValidity) as error:
            answer = str(error)
        assert isinstance(answer, Atom | Level | Line | str)


def test_every_name_of_the_book_is_found(book: Catalogue) -> None:
    """Each isotope, level and line answers to its own name and aliases."""
    for name in book.names:
        atom = book.atom(name)
        assert atom.isotope.name == name
        assert [find_level(atom, level.name).name for level in atom.levels] == [level.name for level in atom.levels]
        for entry in atom.lines:
            assert [find_line(atom, alias).name for alias in (entry.name, *entry.aliases)] == [entry.name] * (
                1 + len(entry.aliases)
            )


# Deriving


def test_a_component_gives_the_centroid(fictional: Catalogue) -> None:
    """303Zz 2-3 lies 3094.5 MHz below its centroid: 2700 of the ground level and -105.5 of the upper one."""
    found = line(fictional, "303Zz", "800")
    assert found.centroid is not None
    assert found.centroid.value == pytest.approx(374740572.5 + 500.0, abs=1e-6)
    assert found.centroid_isotope == "303"
    spread_A = (2.25 * 0.1) ** 2 + (0.25 * 0.5) ** 2 + (0.75 * 0.002) ** 2 + 0.5**2
    assert found.centroid.uncertainty == pytest.approx(spread_A**0.5, rel=1e-6)


def test_an_isotope_shift_gives_the_other_isotope(fictional: Catalogue) -> None:
    """301Zz is the reference isotope plus its shift, uncertainties in quadrature."""
    found = line(fictional, "301Zz", "800")
    assert found.centroid is not None
    assert found.centroid.value == pytest.approx(374740772.5, abs=1e-6)
    assert found.centroid.uncertainty == pytest.approx((0.5**2 + 0.01**2) ** 0.5, rel=1e-6)


def test_a_line_nobody_measured_is_the_difference_of_two(fictional: Catalogue) -> None:
    """The 2000 nm line of 300Zz is 800 nm minus 1333 nm, and says so."""
    found = line(fictional, "300Zz", "2000")
    assert found.centroid is not None
    assert found.centroid.value == pytest.approx(374740572.5 - 224844343.5, abs=1e-6)
    assert (found.centroid.evidence, found.centroid.source) == ("computed", "zedd2001")
    assert "1333 nm" in found.centroid.note


def test_another_owners_frequency_is_confessed(fictional: Catalogue) -> None:
    """305Zz has no frequency of its own: the record names the reference isotope, or the natural mixture."""
    assert line(fictional, "305Zz", "800").centroid_isotope == "300"
    assert line(fictional, "305Zz", "833").centroid_isotope == "natural"
    assert any("own is not published" in note for note in line(fictional, "305Zz", "800").notes)


def test_an_air_wavelength_becomes_a_vacuum_frequency(fictional: Catalogue) -> None:
    """833.1044(5) nm in air is 12000.0 cm-1; the formula is named and the result is recalled like its input."""
    found = line(fictional, "300Zz", "833")
    assert found.centroid is not None
    assert found.centroid.value / MHZ_PER_WAVENUMBER == pytest.approx(12000.0, abs=0.002)
    assert found.centroid.sources == ("ciddor1996", "zyx1999")
    assert found.centroid.evidence == "recalled"


def test_a_two_photon_line_is_named_by_the_laser(fictional: Catalogue) -> None:
    """The frequency is the sum of both photons, the wavelength that of each."""
    found = line(fictional, "300Zz", "1000")
    assert found.centroid is not None
    assert found.wavelength is not None
    assert found.centroid.value * found.wavelength.value == pytest.approx(2 * 299792458e3, rel=1e-12)


def test_induced_lines_depend_on_the_nucleus(fictional: Catalogue) -> None:
    """The clock line is opened by the nuclear spin where there is one, else by a field."""
    assert line(fictional, "301Zz", "clock").induced == "hyperfine"
    assert line(fictional, "300Zz", "clock").induced == "magnetic field"


def test_hyperfine_constants_come_from_intervals(fictional: Catalogue) -> None:
    """A of the ground levels and A, B, C of 305Zz 6p 2P3/2 reproduce the intervals of the file."""
    assert fictional.find_level("301Zz", "6S1/2").A.value == 6000.0  # type: ignore[union-attr]
    level = fictional.find_level("305Zz", "6P3/2")
    constants = [constant.value for constant in (level.A, level.B, level.C) if constant]
    energy = {F: hyperfine_shift(3, 5, 2 * F, *constants) for F in (1, 2, 3, 4)}
    assert [energy[F + 1] - energy[F] for F in (1, 2, 3)] == pytest.approx([80.0, 135.0, 208.0], abs=1e-9)
    assert level.A is not None
    assert level.A.evidence == "recalled"


def test_what_an_isotope_has_of_its_own_wins(fictional: Catalogue) -> None:
    """g_J, g_I and lifetime of one isotope take precedence over those of the level and the nucleus."""
    own, other = (fictional.find_level(name, "6P3/2") for name in ("301Zz", "303Zz"))
    assert (own.g_J.value, own.g_J.evidence) == (1.335, "recalled")  # type: ignore[union-attr]
    assert other.g_J.evidence == "computed"  # type: ignore[union-attr]
    clock = fictional.find_level("301Zz", "3P0")
    assert (clock.g_I.value, clock.lifetime.value) == (-0.00055, 120.0)  # type: ignore[union-attr]
    assert fictional.find_level("300Zz", "3P0").lifetime is None


def test_g_I_falls_back_on_the_moment_without_an_uncertainty(fictional: Catalogue) -> None:
    """A measured g_I stands; elsewhere the bare moment gives one that claims no accuracy."""
    measured, derived, none = (fictional.atom(name).isotope.g_I for name in ("301Zz", "303Zz", "300Zz"))
    assert measured is not None
    assert derived is not None
    assert (measured.uncertainty, measured.evidence) == (2e-7, "recalled")
    assert (derived.uncertainty, derived.evidence) == (None, "computed")
    assert derived.value > 0 > measured.value
    assert none is None


def test_width_rate_and_branching_are_filled_in(fictional: Catalogue) -> None:
    """6.00(5) MHz is 26.526 ns; 0.980(2) of its decays make the D2 rate; A and branching give the 5d lifetime."""
    d2 = line(fictional, "300Zz", "D2")
    assert d2.upper.lifetime is not None
    assert d2.einstein_A is not None
    assert d2.upper.lifetime.value == pytest.approx(26.526e-9, abs=1e-12)
    assert d2.einstein_A.value == pytest.approx(0.98 / 26.526e-9, rel=1e-4)
    assert fictional.find_level("300Zz", "5D5/2").lifetime.value == pytest.approx(1.0)  # type: ignore[union-attr]


def test_an_untabulated_energy_follows_from_lines(fictional: Catalogue) -> None:
    """The 5d level lies at its line's frequency."""
    level = fictional.find_level("303Zz", "5D5/2")
    assert level.energy is not None
    assert level.energy.value == pytest.approx(7500.0, abs=1e-6)
    assert level.energy_of == "300"


def test_energies_are_wavenumbers_whatever_their_unit(fictional: Catalogue) -> None:
    """An energy published in MHz is served in cm-1, its text unchanged."""
    level = fictional.find_level("300Zz", "7S1/2")
    assert level.energy is not None
    assert (level.energy.unit, level.energy.text) == ("cm-1", "599584916(2) MHz")
    assert level.energy.value == pytest.approx(20000.0, abs=1e-6)


# Reading


def test_the_catalogue_lists_isotopes_by_charge_and_mass(book: Catalogue) -> None:
    """Isotopes come in the order of Z, ionic charge and mass number, each once."""
    order = [(isotope.Z, isotope.charge, isotope.mass_number) for isotope in book.atoms()]
    assert order == sorted(set(order))


def test_the_release_follows_the_content(fictional: Catalogue, tmp_path: Path) -> None:
    """The version is the file's, the suffix changes with any byte of data."""
    assert fictional.release.startswith("fictional.1+")
    copy = shutil.copytree(FICTIONAL, tmp_path / "data")
    assert load([copy]).release == fictional.release
    (copy / "Zz.toml").write_text((copy / "Zz.toml").read_text() + "# one more remark\n")
    assert load([copy]).release != fictional.release


@pytest.mark.parametrize(
    ("name", "content", "reason"),
    [
        ("Rb.toml", "[element", "not TOML"),
        ("Rb.toml", (FICTIONAL / "Zz.toml").read_text(), "is named Zz.toml"),
        ("references.json", "{}}", "CSL-JSON"),
        ("references.json", '[{"type": "book"}]', "id"),
    ],
)
def test_a_broken_file_stops_the_load(tmp_path: Path, name: str, content: str, reason: str) -> None:
    """A file that does not hold raises DataError with its name."""
    (tmp_path / name).write_text(content)
    with pytest.raises(DataError, match=reason) as refused:
        load([tmp_path])
    assert refused.value.file == name


def test_a_missing_directory_is_said(tmp_path: Path) -> None:
    """A wrong path is no empty catalogue."""
    with pytest.raises(DataError, match="no such"):
        load([tmp_path / "nowhere"])


def test_the_whole_book_loads_fast() -> None:
    """Reading every file costs less than 0.4 s of processor time (a third of that here) beyond the imports."""
    started = time.process_time()
    load()
    assert time.process_time() - started < 0.4


# Overlay


def overlay(tmp_path: Path, text: str, name: str = "ourlab.toml") -> Catalogue:
    """The fictional catalogue with one overlay file on it."""
    (tmp_path / name).write_text(text)
    return load([FICTIONAL], overlay=tmp_path)


HEAD = '[element]\nsymbol = "Zz"\n'


def test_a_lab_value_replaces_one_value_and_says_so(tmp_path: Path, fictional: Catalogue) -> None:
    """Only the overlaid constant changes, its source names the overlay, and the release is another."""
    text = HEAD + '[levels."6p_2P3/2".hyperfine.303]\nA = { value = "-48.10(2) MHz", source = "notebook 7" }\n'
    ours = overlay(tmp_path, text)
    level, before = ours.find_level("303Zz", "6P3/2"), fictional.find_level("303Zz", "6P3/2")
    assert level.A is not None
    assert (level.A.value, level.A.source) == (-48.1, "overlay:ourlab:notebook 7")
    assert level.B == before.B
    assert ours.release.startswith(f"{fictional.release}.overlay.")
    assert ours.overlaid == ("Zz",)


def test_a_lab_value_without_source_is_named_by_its_key(tmp_path: Path) -> None:
    """The file and the key are source enough for a lab's own number; the file may be named after the species."""
    ours = overlay(tmp_path, '[isotopes.303]\ng_I = { value = "3.260(3)e-4" }\n', "Zz.toml")
    g_I = ours.atom("303Zz").isotope.g_I
    assert g_I is not None
    assert (g_I.source, g_I.evidence) == ("overlay:Zz:isotopes.303.g_I", "checked")


def test_an_overlaid_frequency_is_visible_in_what_follows(tmp_path: Path) -> None:
    """A lab's reference frequency moves the other isotopes and the differences, and each names the overlay."""
    text = HEAD + '[lines.800]\nfrequency = [ { isotope = 300, value = "374740573.0(1) MHz" } ]\n'
    ours = overlay(tmp_path, text)
    for atom, name in (("300Zz", "800"), ("301Zz", "800"), ("300Zz", "2000")):
        centroid = line(ours, atom, name).centroid
        assert centroid is not None
        assert any(key.startswith("overlay:ourlab:") for key in centroid.sources)


def test_a_lifetime_displaces_the_width_and_intervals_displace_constants(tmp_path: Path) -> None:
    """The same fact said another way replaces the packaged one instead of contradicting it."""
    text = (
        HEAD + '[levels."6p_2P3/2"]\nlifetime = { value = "26.0(1) ns" }\n'
        '[levels."6p_2P1/2".hyperfine.301]\nintervals = [ { between = "0-1", value = "601.0(1) MHz" } ]\n'
    )
    ours = overlay(tmp_path, text)
    assert ours.find_level("301Zz", "6P3/2").lifetime.value == 26e-9  # type: ignore[union-attr]
    assert ours.find_level("301Zz", "6P1/2").A.value == 601.0  # type: ignore[union-attr]


@pytest.mark.parametrize(
    ("text", "key", "reason"),
    [
        (HEAD + '[levels."6p_2P3/2"]\ncolour = "red"\n', "levels.6p_2P3/2.colour", "unknown key"),
        (HEAD + '[isotopes.303]\ng_I = { value = "1 MHz" }\n', "isotopes.303.g_I", "one of 1"),
        (HEAD + '[lines.800]\nupper = "9p_2P3/2"\n', "", "no level '9p_2P3/2'"),
        (HEAD + "[isotopes.303", "", "not TOML"),
        ('[element]\nsymbol = "Qq"\ncharge = 0\n', "element.Z", "required"),
        ("[isotopes.303]\n", "element", "symbol and charge"),
    ],
)
def test_an_overlay_that_does_not_hold_stops_with_file_key_and_reason(
    tmp_path: Path, text: str, key: str, reason: str
) -> None:
    """There is no catalogue at all then: nothing is half applied."""
    with pytest.raises(OverlayError, match="ourlab") as refused:
        overlay(tmp_path, text)
    assert refused.value.file == "ourlab.toml"
    assert refused.value.key == key
    assert reason in refused.value.reason


def test_an_overlay_directory_must_exist(tmp_path: Path) -> None:
    """A mistyped SUBLEVEL_OVERLAY is not an empty overlay."""
    with pytest.raises(OverlayError, match="no such directory"):
        load([FICTIONAL], overlay=tmp_path / "nowhere")
