"""Numbers with units that questions take: text or a number in, a number in the stated unit inside and in the echo."""

from typing import Annotated, Any

from pydantic import BeforeValidator

from levels.errors import OutsideValidity
from levels.notation import shown
from levels.quantity import convert, parse_quantity_input
from levels.units import CANONICAL
from service.parameters import NUMBER_OR_TEXT


def _measure(dimension: str, unit: str, low: float, high: float) -> BeforeValidator:
    """Reads a number in `unit`, or text with any unit of the dimension, between two bounds in `unit`."""
    allowed = f"from {low:.12g} to {high:.12g} {unit}, or with its unit"

    def read(given: Any) -> float:
        if isinstance(given, bool) or not isinstance(given, (str, int, float)):
            raise OutsideValidity(dimension, shown(str(given)), allowed)
        if isinstance(given, str):
            text = given.replace("e ", "e+").replace("E ", "E+")
            value = convert(parse_quantity_input(text, dimension, unit), CANONICAL[dimension], unit)
        else:
            value = float(given)  # in the unit already: a journey through another would change its last digit
        if not low <= value <= high:
            raise OutsideValidity(dimension, shown(str(given)), allowed)
        return value

    return BeforeValidator(read)


Kelvin = Annotated[float, _measure("temperature", "K", 1e-9, 1e5), NUMBER_OR_TEXT]
Megahertz = Annotated[float, _measure("frequency", "MHz", -1e7, 1e7), NUMBER_OR_TEXT]
Seconds = Annotated[float, _measure("time", "s", 1e-9, 1e9), NUMBER_OR_TEXT]
PositiveMhz = Annotated[float, _measure("frequency", "MHz", 0.0, 1e7), NUMBER_OR_TEXT]
LightMhz = Annotated[float, _measure("frequency", "MHz", 1e5, 1e10), NUMBER_OR_TEXT]
