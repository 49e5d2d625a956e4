"""Vacuum wavelengths from wavelengths in standard air, by Ciddor's dispersion formula.

Standard air: dry, 15 C, 101325 Pa, 450 ppm CO2. Formula and constants: P. E. Ciddor, Appl. Opt. 35, 1566 (1996),
eq. (1), stated for 300 to 1690 nm; the index is good to about 1e-8 there, so a wavelength to about 1e-5 nm.
"""

from levels.errors import OutsideValidity

SHORTEST_NM, LONGEST_NM = 230.0, 1700.0
RELATIVE_UNCERTAINTY = 1e-8
_K0, _K1, _K2, _K3 = 238.0185, 5792105e-8, 57.362, 167917e-8  # um-2


def refractive_index(vacuum_nm: float) -> float:
    """The phase index of standard air at a vacuum wavelength.

    >>> round(refractive_index(633.0), 8)
    1.00027653
    """
    if not SHORTEST_NM <= vacuum_nm <= LONGEST_NM:
        allowed = f"{SHORTEST_NM:g} to {LONGEST_NM:g} nm, where the dispersion of air is known"
        raise OutsideValidity("wavelength_nm", vacuum_nm, allowed)
    sigma_squared = (1e3 / vacuum_nm) ** 2
    return 1.0 + _K1 / (_K0 - sigma_squared) + _K3 / (_K2 - sigma_squared)


def air_of_vacuum(vacuum_nm: float) -> float:
    """The wavelength in standard air of a vacuum wavelength."""
    return vacuum_nm / refractive_index(vacuum_nm)


def vacuum_of_air(air_nm: float) -> float:
    """The vacuum wavelength of a wavelength in standard air: the inverse of `air_of_vacuum`.

    >>> round(vacuum_of_air(588.995), 3)
    589.158
    """
    vacuum_nm = air_nm
    for _ in range(6):  # converges a factor 1e4 or more a step, the index being nearly constant
        vacuum_nm = air_nm * refractive_index(vacuum_nm)
    return vacuum_nm
