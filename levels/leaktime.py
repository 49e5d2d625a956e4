"""How long an atom scatters before it is lost, by rate equations between levels with stimulated emission.

Levels are filled evenly over their sublevels, so that strong light on one transition ends with populations in the ratio
of the multiplicities. Unknown branching is taken at its worst, as in the number of photons it goes with.
"""

import numpy as np
from numpy.typing import NDArray

from levels import absorbing
from levels.walks import Outcome, Walk

Array = NDArray[np.float64]


def chosen_option(walk: Walk, outcome: Outcome, state: int) -> Array | None:
    """Return where a state's own decays go under the outcome's choices; None for a state without decays."""
    options = walk.graph.options[state]
    if not len(options):
        return None
    place = walk.place(state)
    at = next((k for k, (stop, _) in enumerate(walk.choices) if stop == place), None)
    row: Array = options[0 if at is None else int(outcome.chosen[0, at])]
    return row


def seconds_before_loss(walk: Walk, outcome: Outcome, entered: Array) -> tuple[float | None, str]:
    """Compute the mean time; None with the reason where the lifetime of a state on the way is not known.

    `entered` counts the entries into every state, as `leaks` follows them.
    """
    graph = walk.graph
    light = np.sum(walk.rates, axis=0)
    weights = np.array([state.weight for state in graph.states], dtype=np.float64)
    rates = light + (light * weights[:, None] / weights[None, :]).T
    loss = np.zeros(graph.size)
    for k in range(graph.size):
        place = walk.place(k)
        option = chosen_option(walk, outcome, k)
        is_dark = place >= 0 and bool(walk.dark[place])
        if option is None or is_dark:
            if is_dark:
                rates[k], loss[k] = 0.0, 1.0
            continue
        if np.isnan(graph.rates[k]):
            if entered[k] > 0:
                return None, f"the lifetime of {graph.states[k].level.name} is not in the catalogue"
            continue
        rates[k] += graph.rates[k] * option
        missing = 1.0 - float(option.sum())
        loss[k] = graph.rates[k] * missing if missing > 1e-12 else 0.0
    start = int(walk.stops[0])
    order = np.array([start, *(k for k in range(graph.size) if k != start)])
    chain = absorbing.reduce(*absorbing.closed_off(rates[np.ix_(order, order)][None], loss[order][None]))
    return float(absorbing.visits(chain)[0].sum()), ""
