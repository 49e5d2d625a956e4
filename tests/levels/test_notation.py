"""The trade's notation, read and written."""

from collections.abc import Callable

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from levels import notation
from levels.errors import OutsideValidity, UnknownName
from levels.notation import (
    LevelName,
    format_half,
    format_isotope,
    format_polarisation,
    format_sublevel,
    level_keys,
    nearest,
    parse_component,
    parse_feature,
    parse_half,
    parse_isotope,
    parse_level,
    parse_line,
    parse_polarisation,
    parse_sublevel,
    squeeze,
    term_quantum_numbers,
)

READERS: list[Callable[[str], object]] = [
    parse_half, parse_isotope, parse_level, parse_line, parse_sublevel, parse_polarisation, parse_feature,
    parse_component, term_quantum_numbers,
]  # fmt: skip


@pytest.mark.parametrize(
    ("text", "name"),
    [
        ("87Rb", "87Rb"), ("Rb-87", "87Rb"), ("Rb87", "87Rb"), ("rb-87", "87Rb"), ("87RB", "87Rb"), ("^{87}Rb", "87Rb"),
        ("40Ca+", "40Ca+"), ("Ca-40+", "40Ca+"), ("40Ca II", "40Ca+"), ("40Ca I", "40Ca"), ("Ca II", "Ca+"),
        ("40Ca1+", "40Ca+"), ("176Lu2+", "176Lu2+"), ("27Al III", "27Al2+"), ("Sr", "Sr"), ("4He*", "4He"),
        ("127I", "127I"), ("1H", "1H"),
    ],
)  # fmt: skip
def test_isotopes_are_read_in_every_common_spelling(text: str, name: str) -> None:
    """Mass number before or after, charge as plus signs or spectrum number, any case."""
    assert str(parse_isotope(text)) == name


@pytest.mark.parametrize("text", ["Xx", "87", "87Rb87", "8787Rb", "", " ", "Rb--87", "٨٧Rb", "87Rb\n85Rb", "Rb" * 90])
def test_no_isotope_is_refused(text: str) -> None:
    """Text that names no element is refused with an example."""
    with pytest.raises((UnknownName, OutsideValidity), match="87Rb"):
        parse_isotope(text)


@given(st.sampled_from(["Rb", "Ca", "I", "Yb", "H"]), st.integers(1, 299), st.integers(0, 3))
def test_a_written_isotope_reads_back(symbol: str, mass_number: int, charge: int) -> None:
    """Formatting and parsing are inverse."""
    name = parse_isotope(format_isotope(symbol, mass_number, charge))
    assert (name.symbol, name.mass_number, name.charge) == (symbol, mass_number, charge)


@pytest.mark.parametrize(
    ("text", "twice"),
    [
        ("3/2", 3),
        ("1.5", 3),
        ("2", 4),
        ("2.0", 4),
        ("-1/2", -1),
        ("+1/2", 1),
        ("0", 0),
        ("4/2", 4),
        ("4/1", 8),
        ("−1", -2),
    ],
)
def test_half_integers(text: str, twice: int) -> None:
    """Fractions and decimals become doubled integers."""
    assert parse_half(text) == twice


@pytest.mark.parametrize("text", ["", "1.25", "1/3", "x", "1e3", "²", "३", "999999", "1.50001", "--1", "1/0"])
def test_what_is_no_half_integer_is_refused(text: str) -> None:
    """Quarter steps, exponents, foreign digits and giants are refused."""
    with pytest.raises(OutsideValidity, match="half-integer"):
        parse_half(text)


@given(st.integers(-200, 200))
def test_half_integers_round_trip(twice: int) -> None:
    """Formatting and parsing are inverse."""
    assert parse_half(format_half(twice)) == twice


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("5p_2P3/2", LevelName("5p", "2P", 3)),
        ("5s.5p_3P1", LevelName("5s.5p", "3P", 2)),
        ("4f13.6s2_2F7/2", LevelName("4f13.6s2", "2F", 7)),
        ("4f13.(2F7/2)5d.6s_3[3/2]1/2", LevelName("4f13.(2F7/2)5d.6s", "3[3/2]", 1)),
        ("4f10.6s.6p_(8,1)9", LevelName("4f10.6s.6p", "(8,1)", 18)),
    ],
)
def test_levels_in_three_couplings(text: str, expected: LevelName) -> None:
    """LS, JK and jj names fall into configuration, term and J."""
    assert parse_level(text) == expected


@pytest.mark.parametrize("text", ["5p", "_2P3/2", "5p_2P", "5p_", "5p_2PP1", "5p_2P9999", "", "5p_٢P3/2"])
def test_no_level_name_is_refused(text: str) -> None:
    """A name without configuration, term or J is refused with an example."""
    with pytest.raises((UnknownName, OutsideValidity)):
        parse_level(text)


def test_the_short_spellings_of_a_level() -> None:
    """5P3/2, 2P3/2 and 5p2P3/2 are all ways to ask for 5p_2P3/2."""
    assert level_keys("5p_2P3/2") == ("5p_2p3/2", "5p2p3/2", "2p3/2", "5p3/2")
    assert squeeze("5s5p 3P1") == squeeze("5s.5p_3P1") == squeeze("5s5p 3Po1")


@pytest.mark.parametrize(
    ("term", "numbers"),
    [
        ("2P", {"S": 1, "L": 2}),
        ("5I", {"S": 4, "L": 12}),
        ("3[3/2]", {"multiplicity": 3, "K": 3}),
        ("(8,1)", {"j1": 16, "j2": 2}),
        ("(15/2,1)", {"j1": 15, "j2": 2}),
    ],
)
def test_quantum_numbers_of_a_term(term: str, numbers: dict[str, int]) -> None:
    """A term states S and L, or K, or the two j; letters skip J, as the trade's do."""
    assert term_quantum_numbers(term) == numbers


def test_lines_are_asked_for_by_wavelength_alias_or_levels() -> None:
    """780, 780.24 nm, D2 and a pair of levels are told apart."""
    assert parse_line("780").wavelength == parse_line("780nm").wavelength == "780"
    assert parse_line("670.98").wavelength == "670.98"
    assert parse_line("D2").alias == "D2"
    assert parse_line("5s_2S1/2 -> 5p_2P3/2").levels == ("5s_2S1/2", "5p_2P3/2")
    assert parse_line("1S0-3P1").levels == ("1S0", "3P1")


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("2,-1", (4, -2)), ("1/2,1/2", (1, 1)), ("1.5,0.5", (3, 1)), ("3/2, -3/2", (3, -3)), ("|2,-1>", (4, -2)),
        ("F=2,m=-1", (4, -2)), ("F=2, mF=0", (4, 0)), ("(0,0)", (0, 0)), ("2,+2", (4, 4)),
    ],
)  # fmt: skip
def test_sublevels(text: str, expected: tuple[int, int]) -> None:
    """F,m with fractions, decimals and the brackets people type."""
    assert parse_sublevel(text) == expected


@pytest.mark.parametrize("text", ["", "2", "2,3", "2,1/2", "-1,0", "2,-1,0", ",", "a,b", "2;1", "9999999999,0", "2,²"])
def test_impossible_sublevels_are_refused(text: str) -> None:
    """|m| beyond F, half steps and other nonsense are refused."""
    with pytest.raises(OutsideValidity):
        parse_sublevel(text)


@given(st.integers(0, 100), st.data())
def test_sublevels_round_trip(twice_F: int, data: st.DataObject) -> None:
    """Formatting and parsing are inverse for every sublevel."""
    twice_m = twice_F - 2 * data.draw(st.integers(0, twice_F))
    assert parse_sublevel(format_sublevel(twice_F, twice_m)) == (twice_F, twice_m)


@pytest.mark.parametrize(
    ("text", "q"),
    [
        ("sigma+", 1), ("sigma plus", 1), ("σ+", 1), ("s+", 1), ("sigma ", 1), ("Sigma+", 1), ("pi", 0), ("π", 0),
        ("sigma-", -1), ("sigma minus", -1), ("σ−", -1), ("s-", -1),
    ],
)  # fmt: skip
def test_polarisations(text: str, q: int) -> None:
    """Every common spelling, and what a query string makes of an unescaped plus, gives q = m_upper - m_lower."""
    assert parse_polarisation(text).q == q
    assert parse_polarisation(format_polarisation(q)).q == q


@pytest.mark.parametrize("text", ["", "sigma", "circular", "2", "sigma+-"])
def test_unclear_polarisations_are_refused(text: str) -> None:
    """The bare word sigma has no sign; the answer names the three and the escape."""
    with pytest.raises(OutsideValidity, match="sigma%2B"):
        parse_polarisation(text)


def test_a_crossover_averages_two_components() -> None:
    """2-(2,3) joins 2-2 and 2-3; a lower-level crossover (1,2)-2 works alike."""
    assert parse_feature("2-(2,3)").components == ((4, 4), (4, 6))
    assert parse_feature("(1,2)-2").components == ((2, 4), (4, 4))
    assert str(parse_feature("2 - (3, 2)")) == "2-(2,3)"
    assert not parse_feature("1/2-3/2").is_crossover


def test_components() -> None:
    """F-F' with arrows and labels; a crossover is no component."""
    assert parse_component("2-3") == parse_component("F=2->F'=3") == parse_component("2 → 3") == (4, 6)
    with pytest.raises(OutsideValidity, match="not a crossover"):
        parse_component("2-(2,3)")


@pytest.mark.parametrize(
    "text", ["", "2", "2-", "-2-3", "2-(3)", "2-(3,3)", "2-(1,2,3)", "(1,2)-(2,3)", "(2-3", "2-3-4", "2-x"]
)
def test_nonsense_features_are_refused(text: str) -> None:
    """What joins no two hyperfine levels is refused."""
    with pytest.raises(OutsideValidity):
        parse_feature(text)


@pytest.mark.parametrize("reader", READERS)
@given(text=st.one_of(st.text(max_size=90), st.text("0123456789/.,-+()[]_FmspdPD RbCa→", max_size=12)))
@example(text="\x00")
@example(text="²,²")
@example(text="1" * 5000)
def test_any_text_parses_or_raises_our_errors(reader: Callable[[str], object], text: str) -> None:
    """Unicode digits, control characters, giants: a value or UnknownName/OutsideValidity, never another exception."""
    try:
        answer = reader(text)
    except (UnknownName, OutsideValidity) as error:
        answer = str(error)
    assert answer is not None
    assert len(str(answer)) < 500


def test_misspelt_names_find_their_neighbours() -> None:
    """Nearest names ignore case and put the closest first."""
    assert nearest("87rv", ["87Rb", "85Rb", "40Ca+"])[0] == "87Rb"
    assert nearest("", ["87Rb"]) == []
    assert notation.MULTIPOLE_RANK["E3"] == 3
