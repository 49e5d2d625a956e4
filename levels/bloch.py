"""The optical Bloch equations of a scheme, and their generator as a real sparse matrix.

    d rho/dt = -i [H, rho] + sum_k (L_k rho L_k^+ - {L_k^+ L_k, rho}/2) - (laser linewidths)

in the rotating frame of `frames`, times in us and H in rad/us. Each line has one jump operator per q (and per frame
difference, which keeps only terms that stand still), with the amplitudes of all its sublevels inside: spontaneous
emission carries coherences down, as the Hanle effect needs. Light that is not in the frame jumps between single
sublevels. Neglected: coherences that emission on two different lines would share, collisions, motion.

The unknowns are real: the populations, then Re and Im of each coherence above the diagonal that can be non-zero. An
index table like the density matrix numbers them: Re rho_jk at (j, k), Im rho_jk at (k, j) for j < k, else -1.
"""

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_matrix

from levels.driven import PER_US, Coupling, Drive
from levels.frames import Frame

Array = NDArray[np.float64]
Complex = NDArray[np.complexfloating[Any, Any]]
Indices = NDArray[np.signedinteger[Any]]
Triplets = tuple[Indices, Indices, Indices, Indices, Complex]  # rho[row] gains value * rho[column]: 4 indices, value


@dataclass(frozen=True, slots=True, eq=False)
class Jump:
    """One jump operator: from sublevels `start` to `end` with real amplitudes in us^-1/2."""

    end: Indices
    start: Indices
    amplitude: Array


@dataclass(frozen=True, slots=True, eq=False)
class Bloch:
    """The equations of one scheme. `coupling` is the off-diagonal H; `decay` the total outflow of each sublevel.

    `coherence_decay` has the rates of all coherences (its diagonal is `decay`), `lost` the outflow per sublevel that
    leaves the list of levels. `hops` are the single moves (end, start) of incoherent light with their rates.
    `group` numbers the level of each sublevel.
    """

    energy: Array
    coupling: Complex
    decay: Array
    coherence_decay: Array
    jumps: tuple[Jump, ...]
    hops: tuple[Indices, Indices, Array]
    lost: Array
    group: Indices

    @property
    def size(self) -> int:
        """How many sublevels there are."""
        return int(self.energy.size)


def bloch_of(drive: Drive, frame: Frame) -> Bloch:
    """Write the optical Bloch equations of a scheme in its rotating frame."""
    structure = drive.structure
    energy = structure.energy_mhz - frame.shift_mhz
    coupling = np.zeros((structure.size, structure.size), dtype=np.complex128)
    hopping = np.zeros((structure.size, structure.size))
    for item, coherent in zip(drive.couplings, frame.coherent, strict=True):
        coupling[item.upper, item.lower] += np.where(coherent, item.rabi_mhz, 0.0) / 2 * PER_US
        energy = energy + _light_shift(item, coherent, structure.size)
        rate = np.where(coherent, 0.0, item.pump_per_us)
        hopping[item.upper, item.lower] += rate
        hopping[item.lower, item.upper] += rate.T
    decay = structure.width_mhz * PER_US + hopping.sum(axis=0)
    widths = np.array([item.beam.linewidth_mhz for item in drive.couplings]) * PER_US
    between = frame.photons[:, None, :] - frame.photons[None, :, :]
    coherence = (decay[:, None] + decay[None, :] + between**2 @ widths) / 2
    end, start = np.nonzero(hopping)
    return Bloch(
        energy * PER_US,
        coupling + coupling.conj().T,
        decay,
        coherence,
        tuple(_emission(drive, frame)),
        (end, start, hopping[end, start]),
        structure.lost_per_s * 1e-6,
        structure.level_index,
    )


def _light_shift(item: Coupling, coherent: NDArray[np.bool_], size: int) -> Array:
    """Return the light shift in MHz that the incoherent components make."""
    shift = np.zeros(size)
    square = np.where(coherent, 0.0, np.abs(item.rabi_mhz) ** 2)
    part = square * item.detuning_mhz / (item.width_mhz**2 + 4 * item.detuning_mhz**2)
    shift[item.lower] += part.sum(axis=0)
    shift[item.upper] -= part.sum(axis=1)
    return shift


def _emission(drive: Drive, frame: Frame) -> Iterable[Jump]:
    structure = drive.structure
    for line in structure.lines:
        lower, upper = structure.slice_of(line.lower), structure.slice_of(line.upper)
        rate = structure.decays[structure.index_of(line.upper)].rate_of(line) * 1e-6
        up, low = np.nonzero(structure.amplitudes[line.name])
        amplitude = structure.amplitudes[line.name][up, low] * np.sqrt(rate)
        start, end = up + upper.start, low + lower.start
        kind = (structure.twice_m[start] - structure.twice_m[end]) // 2
        gap = np.round(frame.shift_mhz[start] - frame.shift_mhz[end], 6)
        _, group = np.unique(np.stack([kind, gap]), axis=1, return_inverse=True)
        for k in range(int(group.max()) + 1):
            chosen = group == k
            yield Jump(end[chosen], start[chosen], amplitude[chosen])


def reachable(bloch: Bloch, populated: NDArray[np.bool_] | None = None) -> NDArray[np.bool_]:
    """Find which elements of the density matrix can become non-zero from populations alone.

    `populated` tells which sublevels may start with atoms (all, when not given).
    """
    links = (bloch.coupling != 0).astype(np.float32)
    moves = np.zeros((len(bloch.jumps), bloch.size, bloch.size), dtype=np.float32)
    for move, jump in zip(moves, bloch.jumps, strict=True):
        move[jump.end, jump.start] = 1.0
    end, start, _ = bloch.hops
    pattern = np.diag(np.ones(bloch.size) if populated is None else populated).astype(np.float32)
    count = -1
    while count != (now := int(np.count_nonzero(pattern))):
        count = now
        half = links @ pattern
        grown = pattern + half + half.T
        for move in moves:
            grown += move @ pattern @ move.T
        grown[end, end] += pattern[start, start]
        pattern = (grown > 0).astype(np.float32)
    result: NDArray[np.bool_] = pattern > 0
    return result


def index_table(pattern: NDArray[np.bool_]) -> Indices:
    """Number the real unknowns of a pattern: the populations first, then the others."""
    table = np.full(pattern.shape, -1, dtype=np.int64)
    inside = np.flatnonzero(np.diag(pattern))
    table[inside, inside] = np.arange(inside.size)
    rows, columns = np.nonzero(pattern & ~np.eye(pattern.shape[0], dtype=np.bool_))
    table[rows, columns] = inside.size + np.arange(rows.size)
    return table


def to_real(rho: Complex, table: Indices) -> Array:
    """Put a density matrix into the real unknowns of an index table."""
    rows, columns = np.nonzero(table >= 0)
    values = np.where(rows <= columns, rho[rows, columns].real, rho[columns, rows].imag)
    result = np.zeros(rows.size)
    result[table[rows, columns]] = values
    return result


def to_complex(values: Array, table: Indices) -> Complex:
    """Make the density matrix of real unknowns."""
    full = np.where(table >= 0, values[np.maximum(table, 0)], 0.0)
    above = np.triu(full, 1) + 1j * np.tril(full, -1).T
    result: Complex = above + above.conj().T + np.diag(np.diag(full))
    return result


def real_triplets(parts: Iterable[Triplets], table: Indices) -> tuple[Indices, Indices, Array]:
    """Turn complex triplets into those of the real unknowns; only rows on or above the diagonal are read."""
    j, k, l, m, value = (np.concatenate(column) for column in zip(*parts, strict=True))
    keep = (j <= k) & (table[j, k] >= 0) & (table[l, m] >= 0)
    j, k, l, m, value = j[keep], k[keep], l[keep], m[keep], value[keep]
    low, high = np.minimum(l, m), np.maximum(l, m)
    sign = np.where(l <= m, 1.0, -1.0)
    re_row, im_row, re_col, im_col = table[j, k], table[k, j], table[low, high], table[high, low]
    above, right = j < k, l != m
    both = above & right
    rows = np.concatenate([re_row, re_row[right], im_row[above], im_row[both]])
    columns = np.concatenate([re_col, im_col[right], re_col[above], im_col[both]])
    imaginary, signed = value.imag, value.real * sign
    values = np.concatenate([value.real, -(imaginary * sign)[right], imaginary[above], signed[both]])
    return rows, columns, values


def jump_triplets(bloch: Bloch) -> Iterable[Triplets]:
    """Give what the jumps bring: rho[g, g'] gains c_ge c_g'e' rho[e, e']."""
    for jump in bloch.jumps:
        n = jump.end.size
        p, q = _pairs(n)
        value = (jump.amplitude[p] * jump.amplitude[q]).astype(np.complex128)
        yield jump.end[p], jump.end[q], jump.start[p], jump.start[q], value
    end, start, rate = bloch.hops
    yield end, end, start, start, rate.astype(np.complex128)


def generator(bloch: Bloch, table: Indices) -> csc_matrix:
    """Build d(unknowns)/dt = M unknowns over the given index table, as a sparse real matrix."""
    rows, columns, values = real_triplets((*_coherent_triplets(bloch), *jump_triplets(bloch)), table)
    size = int(table.max()) + 1
    return csc_matrix((values, (rows, columns)), shape=(size, size))


def _pairs(size: int) -> tuple[Indices, Indices]:
    """List every pair (p, q) of numbers below size, q fastest."""
    p, q = np.divmod(np.arange(size * size, dtype=np.int64), size)
    return p.astype(np.int64), q.astype(np.int64)


def _coherent_triplets(bloch: Bloch) -> Iterable[Triplets]:
    N = bloch.size
    j, k = _pairs(N)
    turning: Complex = -1j * (bloch.energy[j] - bloch.energy[k]) - bloch.coherence_decay.ravel()
    yield j, k, j, k, turning
    a, b = np.nonzero(bloch.coupling)
    value = np.asarray(np.tile(1j * bloch.coupling[a, b], N), dtype=np.complex128)
    each = np.repeat(np.arange(N, dtype=np.int64), a.size)
    a, b = np.tile(a, N).astype(np.int64), np.tile(b, N).astype(np.int64)
    yield a, each, b, each, -value  # -i H rho
    yield each, b, each, a, value  # +i rho H
