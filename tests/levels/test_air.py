"""Standard air against published indices and wavelengths."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.air import air_of_vacuum, refractive_index, vacuum_of_air
from levels.errors import OutsideValidity


def edlen_1953(vacuum_nm: float) -> float:
    """Edlen's older dispersion formula, J. Opt. Soc. Am. 43, 339 (1953), for standard air without CO2 change."""
    sigma_squared = (1e3 / vacuum_nm) ** 2
    return 1 + 1e-8 * (6432.8 + 2949810 / (146 - sigma_squared) + 25540 / (41 - sigma_squared))


@pytest.mark.parametrize("vacuum_nm", [300.0, 400.0, 589.0, 780.0, 1064.0, 1550.0])
def test_the_index_agrees_with_the_older_standard_formula(vacuum_nm: float) -> None:
    """Two independent fits of the index of standard air agree to 3e-8, some 0.03 pm in a wavelength."""
    assert refractive_index(vacuum_nm) == pytest.approx(edlen_1953(vacuum_nm), abs=3e-8)


@pytest.mark.parametrize(
    ("vacuum_nm", "air_nm"),
    [(589.1583, 588.9950), (589.7558, 589.5924), (626.082, 625.909), (854.4434, 854.209), (404.53, 404.41)],
)
def test_wavelengths_printed_both_ways(vacuum_nm: float, air_nm: float) -> None:
    """Na D2 and D1, Dy 626, Ca+ 854 and K 404 nm as handbooks print them both ways, to 1 pm or as printed."""
    assert air_of_vacuum(vacuum_nm) == pytest.approx(air_nm, abs=6e-3 if air_nm == 404.41 else 1e-3)


@given(st.floats(231.0, 1699.0))
def test_air_and_vacuum_are_inverse(vacuum_nm: float) -> None:
    """Going to air and back loses nothing."""
    assert vacuum_of_air(air_of_vacuum(vacuum_nm)) == pytest.approx(vacuum_nm, rel=1e-14)


@pytest.mark.parametrize("wavelength_nm", [121.6, 5000.0, 0.0, -1.0])
def test_outside_the_fit_there_is_no_index(wavelength_nm: float) -> None:
    """Vacuum ultraviolet and mid infrared wavelengths are refused, not extrapolated."""
    with pytest.raises(OutsideValidity, match="230"):
        vacuum_of_air(wavelength_nm)
