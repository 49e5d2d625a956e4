"""The kinds of value that questions take: text of the trade's notation in, bare numbers inside, the same text echoed.

Fields become gauss and frequencies MHz; angular momenta are doubled integers inside and decimals in the echo.
"""

from functools import lru_cache
from typing import Annotated, Any

from pydantic import BeforeValidator, Field, PlainSerializer, WithJsonSchema

from levels.errors import OutsideValidity
from levels.notation import (
    LONGEST_NAME,
    format_half,
    format_sublevel,
    parse_half,
    parse_polarisation,
    parse_sublevel,
    shown,
)
from levels.quantity import convert, parse_quantity_input
from levels.sublevels import LARGEST_FIELD_GAUSS
from levels.units import CANONICAL

Name = Annotated[str, Field(min_length=1, max_length=LONGEST_NAME)]


def _text(given: Any, parameter: str, allowed: str) -> str:
    if isinstance(given, bool) or not isinstance(given, (str, int, float)):
        raise OutsideValidity(parameter, shown(str(given)), allowed)
    return given if isinstance(given, str) else repr(given)


def _plus(text: str) -> str:
    """A plus sign that a query string made a blank: "1e 3" and " 2.5" mean 1e+3 and +2.5."""
    return text.replace("e ", "e+").replace("E ", "E+")


def measure(dimension: str, unit: str, low: float, high: float) -> BeforeValidator:
    """Reads a number in `unit`, or text with any unit of the dimension, between two bounds in `unit`."""
    allowed = f"from {low:.12g} to {high:.12g} {unit}"

    def read(given: Any) -> float:
        if isinstance(given, str) and given.isascii() and given.replace(".", "", 1).isdigit() and len(given) < 25:
            value = float(given)  # a plain number, as programs send it, need not be taken apart
        else:
            value = _in_unit(_plus(_text(given, dimension, allowed)), dimension, unit)
        if not low <= value <= high:
            raise OutsideValidity(dimension, shown(str(given)), allowed)
        return value

    return BeforeValidator(read)


def _in_unit(text: str, dimension: str, unit: str) -> float:
    canonical = parse_quantity_input(text, dimension, unit)
    try:
        return float(text)  # in the unit already: a journey through another would change its last digit
    except ValueError:
        return float(f"{convert(canonical, CANONICAL[dimension], unit):.15g}")  # 1.064 um are 1064 nm


HALF = "[+-]?[0-9]{1,3}(/2|\\.[05])?"
NUMBER_WITH_UNIT = {
    "type": "string",
    "pattern": "^[+-]?([0-9]+\\.?[0-9]*|\\.[0-9]+)([eE][+-]?[0-9]{1,3})?( ?[A-Za-z]+(/[A-Za-z]+[0-9]?)?)?$",
}
NUMBER_OR_TEXT = WithJsonSchema({"anyOf": [{"type": "number"}, NUMBER_WITH_UNIT]}, mode="validation")


def _number_schema(low: float, high: float) -> WithJsonSchema:
    number = {"type": "number", "minimum": low, "maximum": high}
    return WithJsonSchema({"anyOf": [number, NUMBER_WITH_UNIT]}, mode="validation")


FIELD = (-LARGEST_FIELD_GAUSS, LARGEST_FIELD_GAUSS)
UP_TO_FIELD = (1e-6, LARGEST_FIELD_GAUSS)
ANY_MHZ, SPREAD_MHZ, TOLERANCE_MHZ = (-1e9, 1e9), (0.0, 1e9), (1e-9, 1e6)
INTENSITY, SPEED, GRADIENT, LENGTH, DEPTH = (1e-12, 1e12), (-1e6, 1e6), (1e-6, 1e6), (1e-6, 1e6), (1e-6, 1e9)
FieldGauss = Annotated[float, measure("field", "G", *FIELD), _number_schema(*FIELD)]
LargestField = Annotated[float, measure("field", "G", *UP_TO_FIELD), _number_schema(*UP_TO_FIELD)]
SplittingMhz = Annotated[float, measure("frequency", "MHz", *ANY_MHZ), _number_schema(*ANY_MHZ)]
SpreadMhz = Annotated[float, measure("frequency", "MHz", *SPREAD_MHZ), _number_schema(*SPREAD_MHZ)]
ToleranceMhz = Annotated[float, measure("frequency", "MHz", *TOLERANCE_MHZ), _number_schema(*TOLERANCE_MHZ)]
IntensityMwPerCm2 = Annotated[float, measure("intensity", "mW/cm2", *INTENSITY), _number_schema(*INTENSITY)]
VelocityMPerS = Annotated[float, measure("velocity", "m/s", *SPEED), _number_schema(*SPEED)]
GradientGaussPerCm = Annotated[float, measure("gradient", "G/cm", *GRADIENT), _number_schema(*GRADIENT)]
LengthCm = Annotated[float, measure("length", "cm", *LENGTH), _number_schema(*LENGTH)]
DepthMicrokelvin = Annotated[float, measure("temperature", "uK", *DEPTH), _number_schema(*DEPTH)]


_parse_sublevel = lru_cache(4096)(parse_sublevel)
_format_sublevel = lru_cache(4096)(format_sublevel)


def _sublevel(given: Any) -> tuple[int, int]:
    return _parse_sublevel(_text(given, "sublevel", "F,m such as 2,-1"))


def _half(given: Any) -> int:
    return parse_half(_text(given, "half-integer", "an integer or half-integer such as 2, 3/2 or 1.5"))


def _polarisation(given: Any) -> int:
    return parse_polarisation(_text(given, "polarisation", "sigma+, pi or sigma-")).q


Sublevel = Annotated[
    tuple[int, int],
    BeforeValidator(_sublevel),
    PlainSerializer(lambda pair: _format_sublevel(*pair), return_type=str),
    WithJsonSchema({"type": "string", "pattern": f"^{HALF},{HALF}$", "description": "F,m at zero field, as `2,-1`"}),
]
Half = Annotated[
    int,
    BeforeValidator(_half),
    PlainSerializer(lambda twice: format_half(twice), return_type=str),
    WithJsonSchema({"type": "string", "pattern": f"^{HALF}$", "description": "an integer or half-integer, as `3/2`"}),
]
POLARISATIONS = {1: "sigma+", 0: "pi", -1: "sigma-"}
PolarisationName = Annotated[
    int,
    BeforeValidator(_polarisation),
    PlainSerializer(lambda q: POLARISATIONS[q], return_type=str),
    WithJsonSchema({"type": "string", "enum": ["sigma+", "pi", "sigma-"]}),
]
