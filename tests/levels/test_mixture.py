"""Isotope shifts on a line known for the natural mixture only."""

import pytest

from levels.catalogue import Catalogue
from levels.mixture import of_mixture
from levels.quantity import Quantity
from levels.sums import coarsened


def mhz(value: float, uncertainty: float | None, text: str) -> Quantity:
    return Quantity(value, uncertainty, "MHz", text, "nobody2026", "checked")


def share(value: float) -> Quantity:
    return Quantity(value, None, "1", str(value), "nobody2026", "checked")


SHIFTS = {302: mhz(400.0, 3.0, "400(3) MHz")}


def test_mean_over_the_mixture_is_its_frequency() -> None:
    """75 % at the reference and 25 % 400 MHz above it: the reference lies 100 MHz below the mixture's centre."""
    found = of_mixture(mhz(1e6, 10.0, "1000000(10) MHz"), SHIFTS, {300: share(0.75), 302: share(0.25)}, 300)
    assert {isotope: quantity.value for isotope, quantity in found.items()} == pytest.approx(
        {300: 999900.0, 302: 1000300.0}
    )


def test_spread_of_the_shifts_is_uncertainty() -> None:
    """The standard deviation over the mixture, 173 MHz, adds to the stated uncertainty."""
    found = of_mixture(mhz(1e6, 10.0, "1000000(10) MHz"), SHIFTS, {300: share(0.75), 302: share(0.25)}, 300)
    assert found[300].uncertainty == pytest.approx((10.0**2 + 0.75 * 0.25 * 400.0**2) ** 0.5)
    assert found[300].evidence == "computed"


def test_too_little_of_the_mixture_says_nothing() -> None:
    """Shifts over 80 % of the mixture give no isotope a frequency."""
    abundances = {300: share(0.55), 302: share(0.25), 301: share(0.2)}
    assert of_mixture(mhz(1e6, None, "1000000 MHz"), SHIFTS, abundances, 300) == {}


def test_digits_tell_the_resolution() -> None:
    """Without uncertainty the text stops where the coarsest term does."""
    assert coarsened(mhz(123456.789, None, "123456.789 MHz"), 40.0, 0.1).text == "123460 MHz"


def test_neon_isotopes_differ_by_the_published_shifts(book: Catalogue) -> None:
    """640.4 nm is natural neon's: 22Ne lies 1626.287 MHz (Ohayon 2017), 21Ne 855.7 MHz (Feldker 2011) above 20Ne."""
    lines = {name: book.find_line(name, "640.4") for name in ("20Ne", "21Ne", "22Ne")}
    values = {name: line.centroid.value for name, line in lines.items() if line.centroid}
    assert values["22Ne"] - values["20Ne"] == pytest.approx(1626.287, abs=1e-3)
    assert values["21Ne"] - values["20Ne"] == pytest.approx(855.7, abs=1e-3)
    assert [line.centroid_isotope for line in lines.values()] == ["20", "21", "22"]


def test_unused_shifts_are_told(book: Catalogue) -> None:
    """A line whose isotopes keep the mixture's frequency although shifts are published says so."""
    zinc = book.find_line("67Zn", "308")
    assert zinc.centroid_isotope == "natural"
    assert "too little of the mixture" in "; ".join(zinc.notes)
