"""Gives every wanted frequency one of its options so that no modulator is used twice, at the least total cost.

Exact dynamic programming over the sets of modulators in use: after each item, the cheapest way to have spent every set.
An item is one wanted frequency, or several that share something; each of its variants lists the options of its members
in turn. A member may go without, at a cost that outweighs all others.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Indices = NDArray[np.int64]
WITHOUT = 1e7  # the cost of a wanted frequency that is not reached


@dataclass(frozen=True, slots=True, eq=False)
class Variant:
    """One way to serve an item: the modulators it takes as a whole, its own cost, and its members' options.

    Each member has masks (o,), costs (o,) and the options' numbers (o,).
    """

    mask: int
    cost: float
    members: tuple[tuple[Indices, Array, Indices], ...]


@dataclass(frozen=True, slots=True)
class Choice:
    """What an item got: its variant, and for each member an option's number, or -1 for none."""

    variant: int
    options: tuple[int, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Step:
    """How one item was served, by set of modulators in use: the variant, and each member's option and set before."""

    which: Indices
    tracks: list[list[tuple[Indices, Indices]]]
    masks: list[int]


def cheapest_by_mask(masks: Indices, costs: Array) -> Indices:
    """Return the positions of the cheapest option of each mask: no others can be part of a cheapest assignment."""
    order = np.lexsort((costs, masks))
    first = np.ones(order.size, dtype=np.bool_)
    first[1:] = masks[order][1:] != masks[order][:-1]
    return order[first]


def assign(items: Sequence[Sequence[Variant]], modulators: int) -> list[Choice]:
    """Choose a variant for each item and an option for each member."""
    sets = np.arange(1 << modulators)
    free: dict[int, Indices] = {}

    def without(mask: int) -> Indices:
        if mask not in free:
            free[mask] = sets[(sets & mask) == 0]
        return free[mask]

    now = np.full(sets.size, np.inf)
    now[0] = 0.0
    history: list[Step] = []
    for variants in items:
        best, which, tracks = np.full(sets.size, np.inf), np.zeros(sets.size, dtype=np.int64), []
        for k, variant in enumerate(variants):
            after, steps = _through(now, variant, without)
            tracks.append(steps)
            better = after < best
            best[better], which[better] = after[better], k
        history.append(Step(which, tracks, [variant.mask for variant in variants]))
        now = best
    return _traced(history, int(np.argmin(now)))


def _through(
    now: Array, variant: Variant, without: Callable[[int], Indices]
) -> tuple[Array, list[tuple[Indices, Indices]]]:
    """Serve one variant: costs after it by set, and for each member which option led there and from which set."""
    start = without(variant.mask)
    current = np.full(now.size, np.inf)
    current[start | variant.mask] = now[start] + variant.cost
    steps = []
    for masks, costs, numbers in variant.members:
        following = current + WITHOUT
        option = np.full(now.size, -1, dtype=np.int64)
        before = np.arange(now.size)
        for mask, cost, number in zip(masks.tolist(), costs.tolist(), numbers.tolist(), strict=True):
            source = without(mask)
            target = source | mask
            candidate = current[source] + cost
            better = candidate < following[target]
            chosen = target[better]
            following[chosen], option[chosen], before[chosen] = candidate[better], number, source[better]
        steps.append((option, before))
        current = following
    return current, steps


def _traced(history: list[Step], end: int) -> list[Choice]:
    """Walk back from the cheapest end to what each item got."""
    choices = []
    at = end
    for step in reversed(history):
        variant = int(step.which[at])
        options = []
        for option, before in reversed(step.tracks[variant]):
            options.append(int(option[at]))
            at = int(before[at])
        at ^= step.masks[variant]
        choices.append(Choice(variant, tuple(reversed(options))))
    return choices[::-1]
