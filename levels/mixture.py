"""Isotope shifts laid on a line whose frequency is known for the natural mixture only.

The mixture's centre is taken as the mean over its isotopes, weighted by abundance: nu(ref) = nu(natural) - <delta nu>,
then every isotope its shift away. Where the centre of an unresolved line lies depends on the light source, so the
standard deviation of the shifts over the mixture counts as uncertainty; differences between isotopes are the shifts.
"""

import math
from collections.abc import Mapping

from levels.quantity import Quantity, combine, derived
from levels.sums import coarsened, spread_of

LEAST_SHARE = 0.9  # of the mixture that must have a shift; the rest is taken to lie at the mean of those that have one
TOO_LITTLE = "; isotope shifts are, but of too little of the mixture to tell the isotopes' frequencies from its own"
FORMULA = "frequency of the natural mixture, and isotope shifts over {share:.0%} of it weighted by abundance"
NOTE = "from the natural mixture and isotope shifts: good between isotopes, not as an absolute frequency"


def of_mixture(
    natural: Quantity, shifts: Mapping[int, Quantity], abundances: Mapping[int, Quantity], reference: int
) -> dict[int, Quantity]:
    """The frequency in MHz of each isotope that has a shift from the reference isotope, and of the latter.

    Empty where the shifts cover too little of the mixture.
    """
    own = Quantity(0.0, 0.0, "MHz", "0 MHz", "", "computed")
    known = {**{isotope: shift for isotope, shift in shifts.items() if isotope != reference}, reference: own}
    weights = {isotope: abundances[isotope].value for isotope in known if isotope in abundances}
    share = math.fsum(weights.values())
    if share < LEAST_SHARE:
        return {}
    mean = math.fsum(weight * known[isotope].value for isotope, weight in weights.items()) / share
    width = math.sqrt(math.fsum(w * (known[A].value - mean) ** 2 for A, w in weights.items()) / share)
    formula = FORMULA.format(share=min(share, 1.0))
    inputs = (natural, *(known[isotope] for isotope in weights if isotope != reference))
    found = {}
    for isotope, shift in known.items():
        spread = combine(natural.uncertainty, width, shift.uncertainty)
        value = natural.value - mean + shift.value
        result = derived(value, spread, "MHz", formula, inputs=inputs)
        found[isotope] = result if spread is not None else coarsened(result, spread_of(natural), width)
    return found
