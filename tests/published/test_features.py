"""Lock points and hyperfine offsets of the catalogue against published intervals."""

import pytest

from levels.catalogue import Catalogue, load
from levels.features import Sample, doppler_width_mhz, features
from levels.notation import parse_feature
from levels.positions import place_of_feature


@pytest.fixture(scope="module")
def book() -> Catalogue:
    return load()


@pytest.mark.parametrize(
    ("atom", "line", "feature", "from_", "expected_mhz", "tolerance_mhz", "source"),
    [
        ("87Rb", "780", "2-(2,3)", "2-3", -266.650 / 2, 0.02, "Ye et al., Opt. Lett. 21, 1280 (1996): 266.650(9) MHz"),
        ("87Rb", "780", "2-(1,3)", "2-3", -(266.650 + 156.947) / 2, 0.02, "Ye et al. (1996): and 156.947(7) MHz"),
        ("87Rb", "780", "1-2", "2-3", 6568.03, 0.05, "common practice: the 6.568 GHz repump sideband"),
        ("85Rb", "780", "3-(3,4)", "3-4", -120.640 / 2, 0.1, "Barwood et al., Appl. Phys. B 53, 142 (1991)"),
        ("85Rb", "780", "2-3", "3-4", 3035.7324 - 120.640, 0.2, "Tetu et al. (1976) and Barwood et al. (1991)"),
        ("133Cs", "852", "4-(4,5)", "4-5", -251.0916 / 2, 0.02, "Gerginov et al., PRL 91, 72301 (2003)"),
        ("133Cs", "852", "3-4", "4-5", 9192.631770 - 251.0916, 0.02, "SI second and Gerginov et al. (2003)"),
        (
            "23Na",
            "589.2",
            "1-2",
            "2-3",
            1771.626129 - 58.326,
            0.1,
            "Beckmann et al. (1974), Yei et al. (1993)",
        ),
        ("40K", "767", "7/2-9/2", "9/2-11/2", -1285.79 + 44.1, 0.5, "Eisinger et al. (1952), Falke et al. (2006)"),
        ("39K", "767", "1-2", "2-3", 461.7197202 - 21.1, 0.3, "Beckmann et al. (1974), Falke et al. (2006)"),
        ("7Li", "670.96", "1-2", "2-3", 803.5040866 + 9.386, 0.3, "Beckmann et al. (1974), Orth et al. (1975)"),
        (
            "171Yb+",
            "369",
            "0-1",
            "1-0",
            12642.812118 + 2104.9,
            1.5,
            "14.7 GHz: Fisk (1997), Martensson (1994)",
        ),
        ("171Yb+", "935", "2-1", "1-0", -(2209.5 + 860.0), 3.0, "3.07 GHz, common practice: 935 nm sideband"),
    ],
)
def test_published_offsets(
    book: Catalogue,
    atom: str,
    line: str,
    feature: str,
    from_: str,
    expected_mhz: float,
    tolerance_mhz: float,
    source: str,
) -> None:
    """Offsets between features of one line agree with those that published intervals make."""
    found = book.find_line(atom, line)
    one, other = (place_of_feature(found, parse_feature(text)) for text in (feature, from_))
    assert one.offset_mhz - other.offset_mhz == pytest.approx(expected_mhz, abs=tolerance_mhz), source


def test_inverted_ground_state_of_40K(book: Catalogue) -> None:
    """40K has F = 9/2 below 7/2 (Eisinger et al. 1952: A = -285.73 MHz), so its repump lies red of cooling."""
    line = book.find_line("40K", "767")
    found = features(Sample(book.atom("40K").isotope, line, 1.0), 300.0, crossovers=False)
    at = dict(zip(found.names, found.offset_mhz, strict=True))
    assert at["7/2-9/2"] < at["9/2-11/2"]


@pytest.mark.parametrize(
    ("atom", "line", "kelvin", "expected_mhz"), [("87Rb", "780", 293.15, 505), ("133Cs", "852", 293.15, 374)]
)
def test_doppler_widths(book: Catalogue, atom: str, line: str, kelvin: float, expected_mhz: float) -> None:
    """Room-temperature Doppler widths: nu 7.16e-7 sqrt(T/M), the handbook form (Demtroeder, Laser Spectroscopy)."""
    record = book.atom(atom)
    found = book.find_line(atom, line)
    width = doppler_width_mhz(found, record.isotope, kelvin)
    assert found.centroid is not None
    assert record.isotope.mass is not None
    handbook = 7.16e-7 * found.centroid.value * (kelvin / record.isotope.mass.value) ** 0.5
    assert width == pytest.approx(handbook, rel=2e-3)
    assert width == pytest.approx(expected_mhz, abs=3)
