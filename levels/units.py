"""The closed table of units that data and queries may use, with exact factors between units of one dimension.

Why a table and not a units library at run time: factors here are exact fractions (a clock frequency in Hz rounds once
on its way to MHz), constants are of the one CODATA vintage named in `constants`, gauss converts to tesla without a
change of unit system, and nothing is imported. The tests hold every row against a general units library.
"""

from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache

from levels.constants import A0, MU_B, MU_N, H, U
from levels.errors import OutsideValidity

CANONICAL = {
    "frequency": "MHz",
    "wavenumber": "cm-1",
    "length": "nm",
    "time": "s",
    "field": "G",
    "mass": "u",
    "number": "1",
    "rate": "s-1",
    "moment": "muN",
    "area": "b",
    "polarisability": "a0^3",
    "intensity": "mW/cm2",
    "temperature": "uK",
    "velocity": "m/s",
    "quadratic": "Hz/G2",
    "slope": "MHz/G",
    "dipole": "e*a0",
    "power": "mW",
    "angle": "rad",
    "acceleration": "m/s2",
    "gradient": "G/cm",
}
_YEAR_S = Fraction(31557600)  # Julian year, 365.25 d, as half-life tables use it
_A0_CM3 = Fraction(A0) ** 3 * 10**6
_PI = Fraction("3.14159265358979323846264338327950288")

# spelling -> (dimension, size in the dimension's canonical unit)
_ROWS: dict[str, dict[str, Fraction | int | str]] = {
    "frequency": {"uHz": "1e-12", "mHz": "1e-9", "Hz": "1e-6", "kHz": "1e-3", "MHz": 1, "GHz": 1000, "THz": 10**6},
    "wavenumber": {"cm-1": 1, "cm^-1": 1, "1/cm": 1, "m-1": "0.01"},
    "length": {
        "nm": 1,
        "pm": "1e-3",
        "um": 1000,
        "mm": 10**6,
        "cm": 10**7,
        "m": 10**9,
        "A": "0.1",
        "a0": Fraction(A0) * 10**9,
    },
    "time": {
        "s": 1,
        "ms": "1e-3",
        "us": "1e-6",
        "ns": "1e-9",
        "ps": "1e-12",
        "min": 60,
        "h": 3600,
        "d": 86400,
        "y": _YEAR_S,
        "yr": _YEAR_S,
        "Gy": _YEAR_S * 10**9,
    },
    "field": {"G": 1, "mG": "1e-3", "uG": "1e-6", "kG": 1000, "T": 10**4, "mT": 10, "uT": "1e-2", "nT": "1e-5"},
    "mass": {"u": 1, "Da": 1, "kg": 1 / Fraction(U)},
    "number": {"1": 1, "%": "0.01", "percent": "0.01", "ppm": "1e-6", "ppb": "1e-9"},
    "rate": {"s-1": 1, "1/s": 1, "/s": 1, "ms-1": 1000, "us-1": 10**6},
    "moment": {"muN": 1, "muB": Fraction(MU_B) / Fraction(MU_N)},
    "area": {"b": 1, "barn": 1, "mb": "1e-3", "fm2": "0.01"},
    "polarisability": {"a0^3": 1, "a.u.": 1, "au": 1, "A^3": Fraction(10) ** -24 / _A0_CM3},
    "intensity": {"mW/cm2": 1, "W/cm2": 1000, "W/m2": "0.1", "uW/cm2": "1e-3", "kW/cm2": 10**6, "W/mm2": 10**5},
    "temperature": {"K": 10**6, "mK": 1000, "uK": 1, "nK": "1e-3"},
    "velocity": {"m/s": 1, "cm/s": "0.01", "mm/s": "1e-3", "km/s": 1000},
    "quadratic": {
        "Hz/G2": 1,
        "kHz/G2": 1000,
        "MHz/G2": 10**6,
        "mHz/G2": "1e-3",
        "Hz/T2": "1e-8",
        "kHz/T2": "1e-5",
        "MHz/T2": "1e-2",
        "GHz/T2": 10,
        "Hz/mT2": "1e-2",
        "kHz/mT2": 10,
        "mHz/mT2": "1e-5",
        "mHz/uT2": 10,
        "Hz/uT2": 10**4,
    },
    "slope": {
        "MHz/G": 1,
        "kHz/G": "1e-3",
        "Hz/G": "1e-6",
        "mHz/G": "1e-9",
        "GHz/G": 1000,
        "MHz/T": "1e-4",
        "GHz/T": "0.1",
        "kHz/mT": "1e-4",
        "Hz/mT": "1e-7",
        "Hz/uT": "1e-4",
        "kHz/uT": "0.1",
        "muB/h": Fraction(MU_B) / Fraction(H) / 10**10,
    },
    "dipole": {"e*a0": 1, "e a0": 1, "ea0": 1},
    "power": {"mW": 1, "W": 1000, "uW": "1e-3", "nW": "1e-6", "kW": 10**6},
    "angle": {"rad": 1, "mrad": "1e-3", "urad": "1e-6", "deg": _PI / 180},
    "acceleration": {"m/s2": 1},
    "gradient": {"G/cm": 1, "mT/cm": 10, "T/m": 100, "mT/m": "0.1", "G/mm": 10},
}


@dataclass(frozen=True, slots=True)
class Unit:
    """One accepted spelling: its dimension and its size in the dimension's canonical unit."""

    spelling: str
    dimension: str
    size: Fraction


UNITS: dict[str, Unit] = {
    spelling: Unit(spelling, dimension, Fraction(size))
    for dimension, rows in _ROWS.items()
    for spelling, size in rows.items()
}


def spellings(*dimensions: str) -> tuple[str, ...]:
    """The accepted spellings of the units of some dimensions, in the table's order."""
    return tuple(unit.spelling for unit in UNITS.values() if unit.dimension in dimensions)


@lru_cache(maxsize=1024)
def factor(from_unit: str, to_unit: str) -> tuple[float, float]:
    """Numerator and denominator of a conversion: one of them is 1 for powers of ten, so that it rounds once."""
    have, want = UNITS.get(from_unit), UNITS.get(to_unit)
    if have is None or want is None or have.dimension != want.dimension:
        allowed = spellings(want.dimension if want else have.dimension if have else "")
        raise OutsideValidity("unit", from_unit, f"a unit that converts to {to_unit}: {', '.join(allowed)}")
    ratio = have.size / want.size
    return (1.0, float(ratio.denominator)) if ratio.numerator == 1 else (float(ratio), 1.0)
