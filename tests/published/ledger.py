"""The ledgers of evidence: what every `checked` value was compared with, and whether the two agree digit by digit.

`evidence/texts.csv` holds numbers as they stood in a publication's text (its abstract, mostly), `evidence/tables.csv`
numbers copied once from open data sets inside packages. `key` is the path of the value in its data file, with
`.alternatives.0` for the first alternative. A row is never edited to fit; `relation` says how the catalogue's value
follows from it where it is not the same number, and `why` gives the reason. The nuclear data sets that a test
environment has installed are compared live (`nuclear_tables`).
"""

import csv
import re
import sqlite3
from collections.abc import Iterator, Mapping
from contextlib import closing
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction
from functools import lru_cache
from importlib.util import find_spec
from pathlib import Path
from typing import Any

import periodictable
import scipy.constants

from levels.audit_values import values_of
from levels.errors import OutsideValidity
from levels.published import Value
from levels.quantity import parse_number, resolution
from levels.schema import DataFile
from levels.units import factor

FOLDER = Path(__file__).parent / "evidence"
# the texts' spellings of units that the catalogue spells otherwise
SPELLINGS = {"fraction": "1", "e a0": "e*a0", "mu_N": "muN", "625.9088 (air wavelength) nm": "nm", "Ga": "Gy", "": "1"}
RELATIONS = ("", "negated", "one minus", "three sigma", "rounded", "relative", "reciprocal", "sign")
SAME_DIGITS = Fraction(1, 1000)  # of a unit in the last printed digit: less than any change of a digit
Key = tuple[str, str]


@dataclass(frozen=True, slots=True)
class Row:
    """One line of a ledger: digits as printed, uncertainty where the table has it in a column of its own."""

    species: str
    key: str
    digits: str
    unit: str
    relation: str
    uncertainty: str = ""
    is_table: bool = False


def rows() -> list[Row]:
    """Both ledgers."""
    with (FOLDER / "texts.csv").open(encoding="utf-8", newline="") as texts:
        found = [Row(r["species"], r["key"], r["number"], r["unit"], r["relation"]) for r in csv.DictReader(texts)]
    with (FOLDER / "tables.csv").open(encoding="utf-8", newline="") as tables:
        for r in csv.DictReader(tables):
            found.append(Row(r["species"], r["key"], r["value"], r["unit"], r["relation"], r["uncertainty"], True))
    return found


def every_value(data: DataFile) -> Iterator[tuple[str, Value]]:
    """Every value of a data file with its key, alternatives too."""
    for key, value in values_of(data):
        yield from _with_alternatives(key, value)


def _with_alternatives(key: str, value: Value) -> Iterator[tuple[str, Value]]:
    yield key, value
    for place, other in enumerate(value.alternatives):
        yield from _with_alternatives(f"{key}.alternatives.{place}", other)


def exact(digits: str) -> Fraction:
    """The number of published digits without its uncertainty, exactly."""
    return Fraction(Decimal(re.sub(r"\([^)]*\)(?:stat|sys)?", "", digits.replace(" ", ""))))


def spread(digits: str) -> float | None:
    """The uncertainty in published digits."""
    return parse_number(re.sub(r"stat|sys|\s", "", digits))[1]


def sides(digits: str) -> list[str]:
    """The digits of the uncertainties as they stand, both sides of an asymmetric one, without point."""
    inside = "".join(re.findall(r"\([^)]*\)", digits.replace(" ", "")))
    return [part.replace(".", "").lstrip("0") for part in re.findall(r"[0-9.]+", inside)]


def spread_step(digits: str) -> float:
    """One unit in the last digit of a printed uncertainty."""
    number = digits.partition(" ")[0]
    inside = re.findall(r"\(([^)]*)\)", number)
    exponent = float(f"1e{number.rpartition('e')[2]}") if "e" in number else 1.0
    steps = [10.0 ** -len(part.partition(".")[2]) * exponent if "." in part else resolution(number) for part in inside]
    return min(steps, default=0.0)


def disagreement(value: Value, row: Row) -> str:
    """Why a ledger's row does not support a value, or nothing."""
    given = value.quantity()
    digits = value.value.partition(" ")[0]
    mine, printed = exact(digits), exact(row.digits)
    if row.relation == "sign":
        return "" if (mine < 0) == (printed < 0) else f"{value.value} has another sign than {row.digits}"
    unit = SPELLINGS.get(row.unit, row.unit)
    related, sigma = _related(printed, spread(row.digits), row)
    try:
        if row.relation == "reciprocal":
            numerator, denominator = factor("s", given.unit)
        else:
            numerator, denominator = factor(unit, given.unit)
    except OutsideValidity:
        return f"{value.value} is not of the kind of {row.digits} {row.unit}"
    scale = Fraction(numerator) / Fraction(denominator)
    is_rounded = row.is_table or row.relation == "rounded"
    allowed = (Fraction(501, 1000) if is_rounded else SAME_DIGITS) * Fraction(resolution(digits))
    if abs(mine - related * scale) > allowed:
        return f"{value.value} is not {row.digits} {row.unit} {row.relation}"
    return _spread_disagreement(value, given.uncertainty, sigma, float(scale), row)


def _related(printed: Fraction, sigma: float | None, row: Row) -> tuple[Fraction, float | None]:
    """The value and uncertainty that a row's number says the catalogue should have, in the row's unit."""
    kind, _, size = row.relation.partition(" ") if row.relation.startswith("relative") else (row.relation, "", "")
    if row.uncertainty.endswith(" dex"):
        sigma = float(printed) * (10 ** float(row.uncertainty.removesuffix(" dex")) - 1)
    elif row.uncertainty:
        sigma = float(row.uncertainty)
    if kind == "negated":
        return -printed, sigma
    if kind == "one minus":
        return 1 - printed, sigma
    if kind == "three sigma":
        return printed, None if sigma is None else sigma / 3
    if kind == "relative":
        return printed, float(size) * float(printed)
    if kind == "reciprocal":
        return 1 / printed, None
    return printed, sigma


def _spread_disagreement(value: Value, mine: float | None, sigma: float | None, scale: float, row: Row) -> str:
    if row.relation in ("rounded", "reciprocal") or (value.exact and sigma is None):
        return ""
    if mine is None:  # a table's uncertainty may be left out, a text's may not
        return "" if sigma is None or row.is_table else f"{value.value} lacks the uncertainty of {row.digits}"
    if sigma is None:
        return f"{value.value} has an uncertainty that {row.digits} does not print"
    is_exact = not row.is_table and row.relation in ("", "negated", "one minus")
    if is_exact and "-" in row.digits.partition("(")[2] and sides(value.value) != sides(row.digits):
        return f"{value.value} has not the two sides of {row.digits}"
    step = 0.0 if is_exact else 0.501 * spread_step(value.value)
    if abs(mine - sigma * scale) > step + 1e-9 * mine:
        return f"{value.value} has not the uncertainty {sigma * scale:.3g} of {row.digits} {row.uncertainty}"
    return ""


# Nuclear data sets compared live: which source means which of them.
LIVE = {
    "mass": ("wang2021",),
    "abundance": ("meija2016", "delaeter2003", "kondev2021", "ciaaw2014", "ciaaw2021", "sansonetti2005"),
    "half_life": ("kondev2021",),
    "moment": ("stone2019", "mohr2025"),
    "quadrupole": ("stone2021",),
}
LOST_SIGN = {("Ag", 109), ("Ba", 133)}  # of g in mendeleev 1.3; the ledger has the sign from another table
CODATA = {
    ("H", 1): "proton mag. mom. to nuclear magneton ratio",
    ("H", 2): "deuteron mag. mom. to nuclear magneton ratio",
    ("He", 3): "helion mag. mom. to nuclear magneton ratio",
}
FLOAT32 = 7e-8  # mendeleev keeps g and Q in single precision
PERIODS = {
    "sec": "s",
    "minute": "min",
    "hour": "h",
    "day": "d",
    "year": "y",
    "kyear": "y",
    "Gyear": "Gy",
}


def nuclear_support(data: DataFile, key: str, value: Value) -> bool:
    """Whether an isotope's value is what an installed nuclear data set has."""
    parts = key.split(".")
    if parts[0] != "isotopes" or value.source not in LIVE.get(parts[2], ()):
        return False
    mass_number = int(parts[1])
    published = nuclear_tables(data.element.symbol, mass_number).get(parts[2], ())
    lost = parts[2] == "moment" and (data.element.symbol, mass_number) in LOST_SIGN
    is_single = parts[2] in ("moment", "quadrupole") and value.source != "mohr2025"
    return any(_agrees(value, *entry, lost, is_single) for entry in published)


def _agrees(value: Value, expected: float, sigma: float | None, unit: str, lost_sign: bool, is_single: bool) -> bool:
    given = value.quantity()
    numerator, denominator = factor(unit, given.unit)
    scale = float(numerator / denominator)
    mine = abs(given.value) if lost_sign else given.value
    step = resolution(value.value)
    if abs(mine - expected * scale) > 0.501 * step + (FLOAT32 * abs(mine) if is_single else 0.0):
        return False
    if given.uncertainty is None or not sigma:
        return given.uncertainty is None
    return abs(given.uncertainty - sigma * scale) <= 0.501 * spread_step(value.value) + 1e-6 * given.uncertainty


@lru_cache(maxsize=1)
def _nuclides() -> Mapping[tuple[str, int], Mapping[str, Any]]:
    """The table of isotopes inside mendeleev, read without importing the package, which costs seconds."""
    package = find_spec("mendeleev")
    assert package is not None
    assert package.submodule_search_locations is not None
    file = Path(package.submodule_search_locations[0]) / "elements.db"
    with closing(sqlite3.connect(f"file:{file}?mode=ro", uri=True)) as database:
        database.row_factory = sqlite3.Row
        query = "select e.symbol, i.* from isotopes i join elements e on e.atomic_number = i.atomic_number"
        return {(row["symbol"], row["mass_number"]): dict(row) for row in database.execute(query)}


def nuclear_tables(symbol: str, mass_number: int) -> Mapping[str, list[tuple[float, float | None, str]]]:
    """Value, uncertainty and unit by kind: AME2020 masses and CIAAW abundances (periodictable), AME2020, NUBASE2020
    and the IAEA tables of moments (mendeleev), and the helion's moment (CODATA 2022 in scipy)."""
    one = _nuclides()[symbol, mass_number]
    other = getattr(periodictable, symbol)[mass_number]
    spin, period = float(nuclear_spin(symbol, mass_number)), one["half_life_unit"]
    years = 1000.0 if period == "kyear" else 1.0
    table: dict[str, list[tuple[float | None, float | None, str]]] = {
        "mass": [(other.mass, other._mass_unc, "u"), (one["mass"], one["mass_uncertainty"], "u")],
        "abundance": [
            (other.abundance, other._abundance_unc, "%"),
            (one["abundance"], one["abundance_uncertainty"], "%"),
        ],
        "half_life": [
            (_times(one["half_life"], years), _times(one["half_life_uncertainty"], years), PERIODS.get(period, "s"))
        ],
        "moment": [(_times(one["g_factor"], spin), _times(one["g_factor_uncertainty"], spin), "muN")],
        "quadrupole": [(one["quadrupole_moment"], one["quadrupole_moment_uncertainty"], "b")],
    }
    if (symbol, mass_number) in CODATA:  # single precision does not tell the last digits of these
        moment, _, sigma = scipy.constants.physical_constants[CODATA[symbol, mass_number]]
        return {"moment": [(moment, sigma, "muN")]} | {k: _known(v) for k, v in table.items() if k != "moment"}
    return {kind: _known(entries) for kind, entries in table.items()}


def _known(entries: list[tuple[float | None, float | None, str]]) -> list[tuple[float, float | None, str]]:
    return [(value, sigma, unit) for value, sigma, unit in entries if value is not None]


def _times(value: float | None, scale: float) -> float | None:
    return None if value is None else value * scale


def nuclear_spin(symbol: str, mass_number: int) -> Fraction:
    """The nuclear spin in NUBASE2020 (mendeleev)."""
    return Fraction(str(_nuclides()[symbol, mass_number]["spin"]))
