"""Measures that several questions take, each with its bounds."""

from typing import Annotated

from service.parameters import NUMBER_OR_TEXT, measure

Kelvin = Annotated[float, measure("temperature", "K", 1e-9, 1e5), NUMBER_OR_TEXT]
Megahertz = Annotated[float, measure("frequency", "MHz", -1e7, 1e7), NUMBER_OR_TEXT]
Seconds = Annotated[float, measure("time", "s", 1e-9, 1e9), NUMBER_OR_TEXT]
PositiveMhz = Annotated[float, measure("frequency", "MHz", 0.0, 1e7), NUMBER_OR_TEXT]
LightMhz = Annotated[float, measure("frequency", "MHz", 1e5, 1e10), NUMBER_OR_TEXT]
