"""Uncertainty of a number that is a plain function of a few constants, by moving each through its own uncertainty.

The standard uncertainty is the root of the sum of [f(x + u) - f(x - u)]^2/4 over the constants, taken as independent
(JCGM 100:2008, 5.1.3, note 2). A constant that has no stated uncertainty and moves the result leaves it unknown and is
named.
"""

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass

from levels.quantity import Quantity

PROBE = 1e-6  # relative step that tells whether a constant without an uncertainty matters


@dataclass(frozen=True, slots=True)
class Estimate:
    """A number, its standard uncertainty (None where unknown) and the constants that leave it unknown."""

    value: float
    uncertainty: float | None
    lacking: tuple[str, ...] = ()


def propagate(function: Callable[[Mapping[str, float]], float], inputs: Mapping[str, Quantity]) -> Estimate:
    """Evaluate a function of named constants, in their own units, with its uncertainty.

    >>> from levels.quantity import read
    >>> mass = read("2.0(1) u", source="", evidence="checked", dimension="mass")
    >>> estimate = propagate(lambda given: 3 * given["mass"], {"mass": mass})
    >>> round(estimate.value, 9), round(estimate.uncertainty, 9)
    (6.0, 0.3)
    """
    values = {name: quantity.value for name, quantity in inputs.items()}
    value = function(values)
    spans, lacking = [0.0], []
    for name, quantity in inputs.items():
        if quantity.uncertainty is not None:
            spans.append(_span(function, values, name, quantity.uncertainty) / 2)
        elif abs(_span(function, values, name, PROBE * abs(quantity.value))) > PROBE**2 * abs(value):
            lacking.append(name)
    return Estimate(value, None if lacking else math.hypot(*spans), tuple(lacking))


def _span(
    function: Callable[[Mapping[str, float]], float], values: Mapping[str, float], name: str, step: float
) -> float:
    up, down = {**values, name: values[name] + step}, {**values, name: values[name] - step}
    return function(up) - function(down)
