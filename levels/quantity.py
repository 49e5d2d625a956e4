"""A number with its standard uncertainty, unit, source and evidence; reading and converting published digits.

A published number keeps its digits in `text`; `value` and `uncertainty` are the same in the unit named by `unit`.
Uncertainties are standard (one sigma); digits without a parenthesis have none known (None), never a guessed one.

Evidence of a derived value: a mere change of unit keeps evidence and source; anything else is `computed`, unless an
input was `recalled`, which makes the result `recalled`: refusing recalled numbers refuses what was made from them.
"""

import math
import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from decimal import Decimal
from fractions import Fraction

from levels.constants import MHZ_NM, MHZ_PER_WAVENUMBER
from levels.errors import OutsideValidity
from levels.units import CANONICAL, UNITS, factor, spellings

EVIDENCE = ("checked", "recalled", "computed")
LONGEST_NUMBER = 60  # characters; no published value comes near, and giant exponents are refused before they cost time

_NUMBER = re.compile(
    r"(?P<digits>[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+))(?P<brackets>(?:\([0-9.]+\)|\(\+[0-9.]+/?-[0-9.]+\))*)"
    r"(?:[eE](?P<exponent>[+-]?[0-9]{1,2}))?",
    re.ASCII,
)
_BRACKET = re.compile(r"\((?:([0-9.]+)|\+([0-9.]+)/?-([0-9.]+))\)", re.ASCII)


@dataclass(frozen=True, slots=True)
class Quantity:
    """A value with what is known about it. `source` names publications by key, several joined by "; "."""

    value: float
    uncertainty: float | None
    unit: str
    text: str
    source: str
    evidence: str
    note: str = ""
    alternatives: tuple["Quantity", ...] = ()

    @property
    def sources(self) -> tuple[str, ...]:
        """The keys of the publications this number rests on."""
        return tuple(part for part in self.source.split("; ") if part)


def parse_number(text: str) -> tuple[float, float | None]:
    """Reads published digits: value and standard uncertainty.

    The parenthesis counts in the last digits ("1.3362(13)"); with its own point it is absolute ("22.3(1.5)"). Several
    are added in quadrature; of an asymmetric one ("0.9453(+7-5)") the larger side counts.

    >>> parse_number("84.7185(20)")
    (84.7185, 0.002)
    >>> parse_number("0.9453(+7-5)")
    (0.9453, 0.0007)
    """
    exact, uncertainty = _parse_exact(text)
    return float(exact), uncertainty


def is_asymmetric(text: str) -> bool:
    """Whether the digits carry an asymmetric uncertainty, of which `parse_number` keeps the larger side."""
    return "(+" in text


def _parse_exact(text: str) -> tuple[Fraction, float | None]:
    match = _NUMBER.fullmatch(text) if len(text) <= LONGEST_NUMBER else None
    if match is None:
        raise OutsideValidity("number", _shown(text), "digits such as 6834.682(90), -1.306(52)e-4 or 0.9453(+7-5)")
    exponent = int(match["exponent"] or 0)
    digits = Decimal(match["digits"])
    sizes = [
        max(_bracket_size(part, match["digits"]) for part in found.groups() if part)
        for found in _BRACKET.finditer(match["brackets"])
    ]
    exact = Fraction(digits) * Fraction(10) ** exponent
    if not sizes:
        return exact, None
    scale = Fraction(10) ** exponent
    if len(sizes) == 1:
        return exact, float(sizes[0] * scale)
    return exact, math.hypot(*(float(size * scale) for size in sizes))


def _bracket_size(part: str, digits: str) -> Fraction:
    if part.count(".") > 1 or part == ".":
        raise OutsideValidity("uncertainty", _shown(part), "digits in the parenthesis")
    if "." in part:
        return Fraction(part)
    decimals = len(digits.partition(".")[2])
    return Fraction(int(part), 10**decimals)


def resolution(text: str) -> float:
    """The size of one unit in the last printed digit, in the text's own unit.

    >>> resolution("25191.51 cm-1")
    0.01
    """
    match = _NUMBER.match(text)
    if match is None:
        raise OutsideValidity("number", _shown(text), "published digits")
    decimals = len(match["digits"].partition(".")[2])
    return float(Fraction(10) ** (int(match["exponent"] or 0) - decimals))


def significant_digits(text: str) -> int:
    """How many significant digits a published number prints.

    >>> significant_digits("0.00420 MHz")
    3
    """
    match = _NUMBER.match(text)
    return len(match["digits"].replace(".", "").lstrip("+-0")) if match else 0


def read(
    text: str,
    *,
    source: str,
    evidence: str,
    dimension: str | Sequence[str],
    note: str = "",
    alternatives: Iterable[Quantity] = (),
) -> Quantity:
    """Reads "84.7185(20) MHz" into a Quantity in its own unit, of one of the allowed dimensions.

    >>> read("84.7185(20) MHz", source="ye1996", evidence="checked", dimension="frequency").uncertainty
    0.002
    """
    number, _, unit = text.strip().partition(" ")
    unit = unit.strip() or "1"
    allowed = (dimension,) if isinstance(dimension, str) else tuple(dimension)
    row = UNITS.get(unit)
    if row is None or row.dimension not in allowed:
        raise OutsideValidity("unit", f"{_shown(unit)} in {_shown(text)!r}", f"one of {', '.join(spellings(*allowed))}")
    value, uncertainty = parse_number(number)
    if is_asymmetric(number):
        note = "; ".join(filter(None, (note, "asymmetric uncertainty as published, the larger side counts")))
    return Quantity(value, uncertainty, unit, text.strip(), source, evidence, note, tuple(alternatives))


def convert(value: float, from_unit: str, to_unit: str) -> float:
    """Converts a bare number between two units of one dimension.

    >>> convert(0.32, "mT", "G")
    3.2
    """
    numerator, denominator = factor(from_unit, to_unit)
    return value * numerator / denominator


def in_unit(quantity: Quantity, unit: str) -> Quantity:
    """The same quantity in another unit of its dimension; `text` keeps the published digits with their own unit."""
    if unit == quantity.unit:
        return quantity
    value = _from_digits(quantity, unit)
    if value is None:
        value = convert(quantity.value, quantity.unit, unit)
    spread = quantity.uncertainty
    return replace(
        quantity,
        value=value,
        uncertainty=None if spread is None else abs(convert(spread, quantity.unit, unit)),
        unit=unit,
        alternatives=tuple(
            in_unit(other, unit) if UNITS[other.unit].dimension == UNITS[unit].dimension else other
            for other in quantity.alternatives
        ),
    )


def _from_digits(quantity: Quantity, unit: str) -> float | None:
    """The value converted from the published digits, which rounds once: clock frequencies in Hz have 16 of them."""
    number, _, text_unit = quantity.text.partition(" ")
    if (text_unit.strip() or "1") != quantity.unit or not _NUMBER.fullmatch(number):
        return None
    exact, _ = _parse_exact(number)
    numerator, denominator = factor(quantity.unit, unit)
    is_same = float(exact) == quantity.value  # a value worked out from the digits keeps them in its text
    return float(exact * Fraction(numerator) / Fraction(denominator)) if is_same else None


def derived(
    value: float,
    uncertainty: float | None,
    unit: str,
    formula: str,
    sources: Iterable[str] = (),
    *,
    inputs: Iterable[Quantity] = (),
) -> Quantity:
    """A computed Quantity: the formula is its note, and its sources and evidence come from what it was made of."""
    used = tuple(inputs)
    keys = dict.fromkeys((*sources, *(key for item in used for key in item.sources)))
    evidence = "recalled" if any(item.evidence == "recalled" for item in used) else "computed"
    digits = format_number(value, uncertainty)
    text = digits if unit == "1" else f"{digits} {unit}"
    return Quantity(value, uncertainty, unit, text, "; ".join(keys), evidence, f"computed: {formula}")


def format_number(value: float, uncertainty: float | None = None) -> str:
    """Writes a number the published way, two digits of uncertainty in the parenthesis.

    >>> format_number(384230406.373, 0.014)
    '384230406.373(14)'
    """
    if uncertainty is None or not uncertainty > 0 or not math.isfinite(uncertainty):
        return f"{value:.12g}"
    place = math.floor(math.log10(uncertainty)) - 1
    if place <= 0:
        in_last = round(uncertainty * 10.0**-place)
        return f"{value:.{-place}f}({in_last})"
    step = 10.0**place
    return f"{round(value / step) * step:.0f}({round(uncertainty / step) * step:.0f})"


def combine(*uncertainties: float | None) -> float | None:
    """Adds standard uncertainties in quadrature; one unknown makes the sum unknown."""
    known = [item for item in uncertainties if item is not None]
    return math.hypot(*known) if len(known) == len(uncertainties) else None


_INPUT = re.compile(r"\s*([+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]{1,4})?)\s*(.*?)\s*", re.ASCII)


def parse_quantity_input(text: str, dimension: str, default_unit: str, parameter: str = "") -> float:
    """Reads a number a caller typed, with or without a unit, into the dimension's canonical unit.

    >>> parse_quantity_input("0.32mT", "field", "G")
    3.2
    """
    name = parameter or dimension
    match = _INPUT.fullmatch(text) if len(text) <= LONGEST_NUMBER else None
    row = UNITS.get(match[2] or default_unit) if match else None
    value = math.nan
    if match and row and row.dimension == dimension:
        value = convert(float(match[1]), row.spelling, CANONICAL[dimension])
    if not math.isfinite(value):
        units = ", ".join(spellings(dimension))
        raise OutsideValidity(name, _shown(text), f"a finite number, {default_unit} or with its unit ({units})")
    return value


def _shown(text: str) -> str:
    return text if len(text) <= 60 else text[:57] + "..."


# Spectroscopic conversions. They are exact (c is), so the published evidence stays.


def frequency_of(quantity: Quantity) -> Quantity:
    """The frequency in MHz of a frequency, a wavenumber or a vacuum wavelength."""
    dimension = UNITS[quantity.unit].dimension
    alone = replace(quantity, alternatives=())
    if dimension == "length":
        result = _reciprocal(in_unit(alone, "nm"), MHZ_NM, "MHz")
    elif dimension == "wavenumber":
        result = _scaled(in_unit(alone, "cm-1"), MHZ_PER_WAVENUMBER, "MHz")
    else:
        result = in_unit(alone, "MHz")
    return replace(result, alternatives=tuple(map(frequency_of, quantity.alternatives)))


def wavenumber_of(quantity: Quantity) -> Quantity:
    """The wavenumber in cm-1 of a wavenumber, a frequency or a vacuum wavelength."""
    alone = replace(quantity, alternatives=())
    if UNITS[quantity.unit].dimension == "wavenumber":
        result = in_unit(alone, "cm-1")
    else:
        result = _scaled(frequency_of(alone), 1.0 / MHZ_PER_WAVENUMBER, "cm-1")
    return replace(result, alternatives=tuple(map(wavenumber_of, quantity.alternatives)))


def wavelength_of(quantity: Quantity, photons: int = 1) -> Quantity:
    """The vacuum wavelength in nm of each of the equal photons that add up to a frequency or wavenumber."""
    result = _reciprocal(frequency_of(replace(quantity, alternatives=())), MHZ_NM * photons, "nm")
    return replace(result, alternatives=tuple(wavelength_of(other, photons) for other in quantity.alternatives))


def width_of_lifetime(lifetime: Quantity) -> Quantity:
    """The full natural width Gamma/2pi in MHz of a lifetime."""
    result = _reciprocal(in_unit(lifetime, "s"), 1e-6 / (2 * math.pi), "MHz")
    return replace(result, alternatives=tuple(map(width_of_lifetime, lifetime.alternatives)))


def lifetime_of_width(width: Quantity) -> Quantity:
    """The lifetime in s of a full natural width Gamma/2pi."""
    result = _reciprocal(in_unit(width, "MHz"), 1e-6 / (2 * math.pi), "s")
    return replace(result, alternatives=tuple(map(lifetime_of_width, width.alternatives)))


def _scaled(quantity: Quantity, scale: float, unit: str) -> Quantity:
    spread = None if quantity.uncertainty is None else quantity.uncertainty * abs(scale)
    return replace(quantity, value=quantity.value * scale, uncertainty=spread, unit=unit)


def _reciprocal(quantity: Quantity, numerator: float, unit: str) -> Quantity:
    if quantity.value == 0:
        raise OutsideValidity("value", quantity.text, "different from zero")
    value = numerator / quantity.value
    spread = None if quantity.uncertainty is None else abs(quantity.uncertainty / quantity.value * value)
    return replace(quantity, value=value, uncertainty=spread, unit=unit)
