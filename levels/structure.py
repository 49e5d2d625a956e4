"""All sublevels that light and decays reach at one field: energies, labels and the signed amplitudes between them.

Levels are taken whole, lower ones first: those of the beams' lines, then whatever they decay to, and so on. A level
that decays reach but whose constants are not published ends the chain: its share counts as lost, with a note.

States are made unique by their phases: each has a positive overlap with its zero-field state |F m>, J and I coupled in
this order with Condon-Shortley phases. Amplitudes of lines follow `components`: real, their squares are the strengths.
"""

from collections.abc import Iterable
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from levels.angular import clebsch_gordan, multipole_elements
from levels.components import strength_model
from levels.decays import Decay, decay_of, driven_decay
from levels.errors import NotPublished, OutsideValidity
from levels.notation import format_sublevel
from levels.records import Atom, Level, Line
from levels.sublevels import Constants, cautions, constants_of, labels_of, solve_block

Array = NDArray[np.float64]
Label = tuple[int, int]
LARGEST_SUBLEVELS = 400


@dataclass(frozen=True, slots=True, eq=False)
class Structure:
    """Sublevels in one list, level after level, each by F and then m; energies in MHz from their level's centroid.

    `amplitudes` has one real matrix (upper sublevels, lower sublevels) per line between these levels. `lost_per_s` is,
    per sublevel, the rate of decays to levels that are not in the list.
    """

    atom: Atom
    magnitude_gauss: float
    levels: tuple[Level, ...]
    decays: tuple[Decay, ...]
    slices: tuple[slice, ...]
    level_index: NDArray[np.int64]
    twice_F: NDArray[np.int64]
    twice_m: NDArray[np.int64]
    energy_mhz: Array
    width_mhz: Array
    lost_per_s: Array
    lines: tuple[Line, ...]
    amplitudes: dict[str, Array]
    notes: tuple[str, ...]

    @property
    def size(self) -> int:
        """How many sublevels there are."""
        return int(self.level_index.size)

    def index_of(self, level: Level) -> int:
        """Return the position of a level."""
        return next(k for k, held in enumerate(self.levels) if held.name == level.name)

    def slice_of(self, level: Level) -> slice:
        """Return where a level's sublevels stand."""
        return self.slices[self.index_of(level)]

    def position(self, level: Level, label: Label) -> int:
        """Return the position of one sublevel (2F, 2m)."""
        part = self.slice_of(level)
        same = (self.twice_F[part] == label[0]) & (self.twice_m[part] == label[1])
        if not same.any():
            raise OutsideValidity("sublevel", format_sublevel(*label), f"a sublevel of {level.name}")
        return int(part.start) + int(np.argmax(same))

    def name(self, position: int) -> str:
        """Write a sublevel as `5s_2S1/2 2,1`."""
        label = format_sublevel(int(self.twice_F[position]), int(self.twice_m[position]))
        return f"{self.levels[self.level_index[position]].name} {label}"


@lru_cache(maxsize=256)
def _coupled(twice_J: int, twice_I: int) -> Array:
    """Return <m_J m_I | F m>, product states as rows (m_I fastest), |F m> as columns in the order of `labels_of`."""
    labels = labels_of(Constants(twice_J, twice_I))
    table = np.zeros((len(labels), len(labels)))
    for column, (F, m) in enumerate(labels):
        for row in range(len(labels)):
            mJ, mI = _product(row, twice_J, twice_I)
            if mJ + mI == m:
                table[row, column] = float(clebsch_gordan(twice_J, mJ, twice_I, mI, F, m))
    table.setflags(write=False)
    return table


def _product(row: int, twice_J: int, twice_I: int) -> tuple[int, int]:
    over, under = divmod(row, twice_I + 1)
    return 2 * over - twice_J, 2 * under - twice_I


@lru_cache(maxsize=256)
def _spread_multipole(twice_J: int, twice_J_up: int, twice_I: int, rank: int) -> Array:
    """Return the multipole elements between product states (upper rows, lower columns); the nuclear spin looks on."""
    elements = np.zeros((twice_J_up + 1, twice_J + 1))
    for (mJ, mJ_up), value in multipole_elements(twice_J, twice_J_up, rank).items():
        elements[(mJ_up + twice_J_up) // 2, (mJ + twice_J) // 2] = value
    table: Array = np.asarray(np.kron(elements, np.eye(twice_I + 1)), dtype=np.float64)
    table.setflags(write=False)
    return table


def _solve(constants: Constants, magnitude_gauss: float) -> tuple[Array, Array]:
    """Return energies (s,) and states (product states as rows, sublevels as columns) with fixed phases."""
    twice_J, twice_I = constants.twice_J, constants.twice_I
    labels = labels_of(constants)
    order = {label: k for k, label in enumerate(labels)}
    energy, states = np.zeros(len(labels)), np.zeros((len(labels), len(labels)))
    field = np.array([magnitude_gauss])
    for twice_m in sorted({m for _, m in labels}):
        eigen = solve_block(constants, twice_m, field)
        at = [order[F, twice_m] for F in eigen.twice_F]
        rows = [
            (mJ + twice_J) // 2 * (twice_I + 1) + (mI + twice_I) // 2
            for mJ, mI in zip(eigen.block.twice_mJ, eigen.block.twice_mI, strict=True)
        ]
        energy[at] = eigen.energy_mhz[0]
        states[np.ix_(rows, at)] = eigen.states[0]
    overlap = np.einsum("rs,rs->s", _coupled(twice_J, twice_I), states)
    fixed: Array = states * np.where(overlap < 0, -1.0, 1.0)
    return energy, fixed


def line_amplitudes(line: Line, lower: Array, upper: Array) -> Array:
    """Compute the signed amplitudes (upper, lower) of a line between solved states; zero where no model gives them."""
    model = strength_model(line)
    if not model:
        return np.zeros((upper.shape[1], lower.shape[1]))
    if model == "F":
        return _spread_multipole(line.lower.twice_I, line.upper.twice_I, 0, line.rank)
    coupling = _spread_multipole(line.lower.twice_J, line.upper.twice_J, line.lower.twice_I, line.rank)
    result: Array = upper.T @ (coupling @ lower)
    result[np.abs(result) < 1e-14] = 0.0
    return result


def _reached(atom: Atom, driven: Iterable[Line]) -> tuple[list[Decay], list[str]]:
    """Follow the decays from the driven lines' levels; levels without constants are left out with a note."""
    lines = list(driven)
    for line in lines:
        driven_decay(atom, line)
    waiting = [level for line in lines for level in (line.lower, line.upper)]
    needed = {level.name for level in waiting}
    found: dict[str, Decay] = {}
    notes: dict[str, None] = {}
    while waiting:
        level = waiting.pop(0)
        if level.name in found:
            continue
        try:
            constants_of(level)
        except NotPublished as missing:
            if level.name in needed:
                raise
            notes[f"{missing}: decays to {level.name} count as lost"] = None
            continue
        found[level.name] = decay_of(atom, level)
        waiting += [channel.line.lower for channel in found[level.name].channels]
    return list(found.values()), list(notes)


def _by_energy(decays: list[Decay]) -> list[Decay]:
    """Order levels by energy where it is known, else as found (levels decay downwards, so it hardly matters)."""
    if any(decay.level.energy is None for decay in decays):
        return sorted(decays, key=lambda decay: decay.total_per_s)
    return sorted(decays, key=lambda decay: decay.level.energy.value if decay.level.energy else 0.0)


def structure_of(atom: Atom, driven: Iterable[Line], magnitude_gauss: float) -> Structure:
    """Solve every level that the driven lines and all decays reach, in a field of this magnitude."""
    reached, notes = _reached(atom, driven)
    decays = tuple(_by_energy(reached))
    levels = tuple(decay.level for decay in decays)
    constants = [constants_of(level) for level in levels]
    sizes = [(c.twice_J + 1) * (c.twice_I + 1) for c in constants]
    if sum(sizes) > LARGEST_SUBLEVELS:
        raise OutsideValidity("beams", f"{sum(sizes)} sublevels", f"at most {LARGEST_SUBLEVELS} in all levels reached")
    ends = np.cumsum([0, *sizes]).tolist()
    solved = [_solve(c, magnitude_gauss) for c in constants]
    labels = np.array([label for c in constants for label in labels_of(c)], dtype=np.int64)
    level_index = np.repeat(np.arange(len(levels)), sizes)
    place = {level.name: k for k, level in enumerate(levels)}
    lines = _lines_between(decays, place)
    states = [part for _, part in solved]
    return Structure(
        atom,
        magnitude_gauss,
        levels,
        decays,
        tuple(slice(ends[k], ends[k + 1]) for k in range(len(levels))),
        level_index,
        labels[:, 0],
        labels[:, 1],
        np.concatenate([energy for energy, _ in solved]),
        np.array([decay.width_mhz for decay in decays])[level_index],
        np.array([_lost(decay, place) for decay in decays])[level_index],
        lines,
        {v.name: line_amplitudes(v, states[place[v.lower.name]], states[place[v.upper.name]]) for v in lines},
        (
            *notes,
            *(note for decay in decays for note in decay.notes),
            *(n for level in levels for n in cautions(level)),
        ),
    )


def _lines_between(decays: tuple[Decay, ...], place: dict[str, int]) -> tuple[Line, ...]:
    return tuple(channel.line for decay in decays for channel in decay.channels if channel.line.lower.name in place)


def _lost(decay: Decay, place: dict[str, int]) -> float:
    gone = sum(channel.rate_per_s for channel in decay.channels if channel.line.lower.name not in place)
    return decay.leak_per_s + gone
