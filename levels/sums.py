"""Sums of measured quantities that print no finer than their coarsest term."""

import math
from collections.abc import Iterable
from dataclasses import replace

from levels.quantity import Quantity, combine, derived, parse_number, resolution


def signed_sum(terms: Iterable[tuple[Quantity, int]], formula: str) -> Quantity:
    """The sum in MHz of terms with their signs; without uncertainty where a term states none."""
    parts = list(terms)
    value = sum(sign * item.value for item, sign in parts)
    spread = combine(*(item.uncertainty for item, _ in parts))
    result = derived(value, spread, "MHz", formula, inputs=[item for item, _ in parts])
    return result if spread is not None else coarsened(result, *(spread_of(item) for item, _ in parts))


def coarsened(quantity: Quantity, *spreads: float) -> Quantity:
    """A quantity in MHz without uncertainty, its text cut to the digits that some spreads leave: they tell it."""
    place = math.floor(math.log10(2 * math.hypot(*spreads)))
    return replace(quantity, text=f"{round(quantity.value, -place):.{max(0, -place)}f} MHz")


def spread_of(quantity: Quantity) -> float:
    """The standard uncertainty, or half the last printed digit where none is stated, in the quantity's unit."""
    if quantity.uncertainty is not None:
        return quantity.uncertainty
    last_digit = abs(resolution(quantity.text))
    number, _, text_unit = quantity.text.partition(" ")
    text_value, _ = parse_number(number)
    if text_unit == quantity.unit or text_value == 0:
        return last_digit / 2
    return abs(quantity.value * last_digit / text_value) / 2  # right for proportional and for reciprocal units
