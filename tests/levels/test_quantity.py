"""Published digits, units and spectroscopic conversions."""

import math

import pint
import pytest
import scipy.constants
import uncertainties
from hypothesis import given
from hypothesis import strategies as st

from levels import constants
from levels.errors import OutsideValidity
from levels.quantity import (
    Quantity,
    convert,
    derived,
    format_number,
    frequency_of,
    in_unit,
    parse_number,
    parse_quantity_input,
    read,
    resolution,
    wavelength_of,
    width_of_lifetime,
)
from levels.units import CANONICAL, UNITS, spellings

PINT_NAME = {
    "cm-1": "1/cm", "cm^-1": "1/cm", "1/cm": "1/cm", "m-1": "1/m", "A": "angstrom", "a0": "a_0", "y": "365.25 day",
    "yr": "365.25 day", "Gy": "365.25e9 day", "h": "hour", "d": "day", "G": "1e-4 tesla", "mG": "1e-7 tesla",
    "uG": "1e-10 tesla", "kG": "0.1 tesla", "T": "tesla", "u": "dalton", "Da": "dalton", "%": "0.01", "ppm": "1e-6",
    "percent": "0.01", "ppb": "1e-9", "s-1": "1/s", "1/s": "1/s", "/s": "1/s", "ms-1": "1/ms", "us-1": "1/us",
    "muN": "nuclear_magneton", "muB": "bohr_magneton", "b": "barn", "mb": "millibarn", "fm2": "fm**2",
    "a0^3": "a_0**3", "a.u.": "a_0**3", "au": "a_0**3", "A^3": "angstrom**3", "mW/cm2": "mW/cm**2",
    "W/cm2": "W/cm**2", "W/m2": "W/m**2", "uW/cm2": "uW/cm**2", "kW/cm2": "kW/cm**2", "W/mm2": "W/mm**2",
    "e*a0": "elementary_charge*a_0", "e a0": "elementary_charge*a_0", "ea0": "elementary_charge*a_0",
    "muB/h": "bohr_magneton/planck_constant", "m/s2": "m/s**2", "G/cm": "1e-4 tesla/cm", "G/mm": "1e-4 tesla/mm",
    "mT/cm": "mT/cm", "1": "1",
}  # fmt: skip


def pint_name(unit: str) -> str:
    """The general library's expression for one of our spellings."""
    if unit in PINT_NAME:
        return PINT_NAME[unit]
    if UNITS[unit].dimension in ("quadratic", "slope"):
        energy, _, field = unit.partition("/")
        squared = field.endswith("2")
        field = {"G": "(1e-4 tesla)"}.get(field.rstrip("2"), f"({field.rstrip('2')})")
        return f"{energy}/{field}" + ("**2" if squared else "")
    return unit


@pytest.fixture(scope="module")
def registry() -> pint.UnitRegistry:
    """A general-purpose units library, the authority for the table."""
    return pint.UnitRegistry()


@pytest.mark.parametrize("unit", UNITS)
def test_every_unit_has_the_size_a_general_units_library_gives_it(registry: pint.UnitRegistry, unit: str) -> None:
    """Every accepted spelling converts to its canonical unit as pint says (1e-8: other CODATA vintage)."""
    canonical = CANONICAL[UNITS[unit].dimension]
    expected = registry.Quantity(pint_name(unit)).to(registry.Quantity(pint_name(canonical)).units)
    expected_ratio = expected.magnitude / registry.Quantity(pint_name(canonical)).magnitude
    assert convert(1.0, unit, canonical) == pytest.approx(expected_ratio, rel=1e-8)


@pytest.mark.parametrize("dimension", CANONICAL)
def test_a_canonical_unit_is_the_unit_of_its_dimension(dimension: str) -> None:
    """Every dimension's canonical unit is in the table, of that dimension, with size one."""
    row = UNITS[CANONICAL[dimension]]
    assert (row.dimension, row.size) == (dimension, 1)


@pytest.mark.parametrize("text", ["6834.682610904290(90)", "-1.3062(52)", "1.3362(13)", "84.7185(20)", "22.3(1.5)"])
def test_the_parenthesis_means_what_a_general_library_reads(text: str) -> None:
    """Value and uncertainty agree with the `uncertainties` library where both read the form."""
    value, uncertainty = parse_number(text)
    expected = uncertainties.ufloat_fromstr(text)
    assert (value, uncertainty) == (expected.nominal_value, pytest.approx(expected.std_dev, rel=1e-12))


@pytest.mark.parametrize(
    ("text", "value", "uncertainty"),
    [
        ("-1.306(52)e-4", -1.306e-4, 5.2e-6),
        ("0.9453(+7-5)", 0.9453, 0.0007),
        ("167(+79/-40)", 167.0, 79.0),
        ("0.268177(37)(20)", 0.268177, math.hypot(37e-6, 20e-6)),
        ("780.24", 780.24, None),
        ("+3", 3.0, None),
        ("1.4e8", 1.4e8, None),
    ],
)
def test_forms_that_papers_print(text: str, value: float, uncertainty: float | None) -> None:
    """Exponents, asymmetric and separate uncertainties are read; no parenthesis means no known uncertainty."""
    expected = uncertainty if uncertainty is None else pytest.approx(uncertainty, rel=1e-12)
    assert parse_number(text) == (value, expected)


@pytest.mark.parametrize(
    "text", ["", "nan", "inf", "1..2", "(5)", "1(2", "1.5(.)", "٣", "1e999", "9" * 99, "1,5", "--1"]
)
def test_what_is_not_a_number_is_refused(text: str) -> None:
    """Text that is no finite ASCII number raises OutsideValidity."""
    with pytest.raises(OutsideValidity):
        parse_number(text)


def test_a_clock_frequency_rounds_once() -> None:
    """The 87Sr clock frequency in Hz keeps all digits a float can hold when it becomes MHz."""
    clock = read("429228004229873.00(7) Hz", source="x", evidence="checked", dimension="frequency")
    assert in_unit(clock, "MHz").value == 429228004.229873
    assert in_unit(clock, "MHz").text == "429228004229873.00(7) Hz"


def test_an_asymmetric_uncertainty_is_said_in_the_note() -> None:
    """Taking the larger side is never silent."""
    asymmetric = read("0.9453(+7-5)", source="x", evidence="checked", dimension="number")
    assert "asymmetric" in asymmetric.note


def test_a_unit_of_another_dimension_is_refused_with_the_units_that_would_do() -> None:
    """Reading nanoseconds as a frequency names the frequency units."""
    with pytest.raises(OutsideValidity, match="MHz"):
        read("26 ns", source="x", evidence="checked", dimension="frequency")


def test_codata_2022_is_what_scipy_carries() -> None:
    """The Bohr magneton is CODATA 2022's 1.39962449171(44) MHz/G, not an earlier vintage's."""
    assert pytest.approx(1.39962449171, abs=1e-14) == constants.MU_B_MHZ_PER_GAUSS
    assert pytest.approx(scipy.constants.h, rel=1e-15) == constants.H


def test_rubidium_wavelength_and_width() -> None:
    """87Rb D2 at 384.230484468 THz is 780.241210 nm; 26.2348 ns is 6.0666 MHz (Steck, Rubidium 87 D Line Data)."""
    frequency = read("384230484.4685(62) MHz", source="x", evidence="checked", dimension="frequency")
    lifetime = read("26.2348(77) ns", source="x", evidence="checked", dimension="time")
    assert wavelength_of(frequency).value == pytest.approx(780.241209686, abs=1.3e-8)
    assert width_of_lifetime(lifetime).value == pytest.approx(6.0666, abs=0.0018)
    assert width_of_lifetime(lifetime).uncertainty == pytest.approx(0.0018, abs=5e-5)


def test_wavenumbers_become_frequencies_with_their_uncertainty() -> None:
    """1 cm-1 is 29979.2458 MHz exactly, for value and uncertainty alike."""
    energy = read("2.0(5) cm-1", source="x", evidence="checked", dimension="wavenumber")
    assert frequency_of(energy).value == pytest.approx(59958.4916, rel=1e-15)
    assert frequency_of(energy).uncertainty == pytest.approx(14989.6229, rel=1e-15)


def test_a_derived_value_is_recalled_when_an_input_is() -> None:
    """Refusing recalled numbers also refuses what was made from them."""
    checked = read("2(1) MHz", source="a", evidence="checked", dimension="frequency")
    recalled = read("3(1) MHz", source="b", evidence="recalled", dimension="frequency")
    assert derived(2.0, 1.0, "MHz", "copy", inputs=(checked,)).evidence == "computed"
    both = derived(5.0, 1.4, "MHz", "sum", inputs=(checked, recalled))
    assert (both.evidence, both.sources) == ("recalled", ("a", "b"))


def test_alternatives_follow_the_unit() -> None:
    """A converted quantity's alternatives can still be compared with it."""
    other = read("6(1) ns", source="b", evidence="recalled", dimension="time")
    first = read("5(1) ns", source="a", evidence="checked", dimension="time", alternatives=[other])
    assert in_unit(first, "s").alternatives[0].value == pytest.approx(6e-9, rel=1e-15)


@pytest.mark.parametrize(
    ("text", "gauss"),
    [("3.2", 3.2), ("3.2 G", 3.2), ("0.32mT", 3.2), ("-320uT", -3.2), ("3.2e-4 T", 3.2), (" .5 ", 0.5)],
)
def test_a_field_may_come_with_a_unit(text: str, gauss: float) -> None:
    """A bare number is in the default unit, others are converted."""
    assert parse_quantity_input(text, "field", "G") == pytest.approx(gauss, rel=1e-15)


@pytest.mark.parametrize(
    "text", ["", "nan", "inf", "-Infinity", "1e999", "3 ns", "3 foo", "G", "1_0", "٣", "1e9999999", "3\x00"]
)
def test_a_field_that_is_none_is_refused_with_the_units(text: str) -> None:
    """NaN, infinity and foreign units are refused, naming the parameter and the units."""
    with pytest.raises(OutsideValidity, match="mT") as refused:
        parse_quantity_input(text, "field", "G")
    assert refused.value.parameter == "field"


@given(st.text(max_size=80))
def test_any_text_is_a_number_or_our_error(text: str) -> None:
    """No text makes the readers raise anything but OutsideValidity, or yield a non-finite number."""
    for reader in (lambda t: parse_number(t)[0], lambda t: parse_quantity_input(t, "field", "G")):
        try:
            value = reader(text)
        except OutsideValidity:
            continue
        assert math.isfinite(value)


@given(st.floats(-1e15, 1e15), st.floats(1e-12, 1e6))
def test_writing_and_reading_again_keeps_value_and_uncertainty(value: float, uncertainty: float) -> None:
    """A formatted number reads back within its uncertainty's second digit."""
    again, spread = parse_number(format_number(value, uncertainty))
    assert spread == pytest.approx(uncertainty, rel=0.06)
    assert again == pytest.approx(value, abs=0.06 * uncertainty, rel=1e-14)


@given(st.sampled_from(sorted(UNITS)), st.floats(-1e6, 1e6))
def test_conversion_there_and_back_changes_nothing(unit: str, value: float) -> None:
    """Every unit converts to its dimension's canonical unit and back."""
    canonical = CANONICAL[UNITS[unit].dimension]
    assert convert(convert(value, unit, canonical), canonical, unit) == pytest.approx(value, rel=1e-14)


@pytest.mark.parametrize(("text", "last_digit"), [("25191.51 cm-1", 0.01), ("43349 cm-1", 1.0), ("1.4e8 s-1", 1e7)])
def test_the_last_printed_digit_is_the_resolution(text: str, last_digit: float) -> None:
    """A number without uncertainty still says how finely it was printed."""
    assert resolution(text) == pytest.approx(last_digit, rel=1e-15)


def test_a_refused_conversion_lists_units_of_the_dimension() -> None:
    """Converting between dimensions is refused with the spellings that would do."""
    with pytest.raises(OutsideValidity, match="kHz"):
        convert(1.0, "ns", "MHz")
    assert "mT" in spellings("field")


def test_sources_are_separate_keys() -> None:
    """A quantity made from several publications names each."""
    assert Quantity(1.0, None, "1", "1", "a; b", "computed").sources == ("a", "b")
