"""Dark states as exact vectors: combinations of sublevels that the light of a scheme does not excite.

A lower manifold is one hyperfine level F (J without nuclear spin). Its dark states are the null space of the driven
coupling: the rows are the upper sublevels that any laser frequency reaches within some natural widths of resonance,
each frequency on its own. A vector in it does not absorb; whether it stays dark is another matter: the field turns it
into other combinations, and light far from resonance excites it slowly. Both are given as numbers.

For a single line J - J' without a field there are two dark states if J' = J - 1, one if J' = J is integer, none if it
is half-integer unless the light is circular (then one), and none if J' = J + 1 (Berkeland and Boshier, Phys. Rev. A 65,
033413 (2002)).
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.driven import PER_US, Coupling, Drive
from levels.frames import SAME_FREQUENCY_MHZ, Frame
from levels.notation import format_half, format_sublevel
from levels.records import Level

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
RESONANT_WIDTHS = 10.0
NULL_TOLERANCE = 1e-9
SHOWN_AMPLITUDE = 1e-3


@dataclass(frozen=True, slots=True, eq=False)
class DarkState:
    """One dark state of a lower manifold.

    `vector` are its amplitudes on the manifold's sublevels `labels` (doubled F and m). `mixing_mhz` is how fast the
    Hamiltonian (field and light-independent detunings) turns it out of the dark subspace, |(1 - P) H psi| over 2 pi;
    `residual_per_us` is its excitation rate by light that is further from resonance than the manifold was tested for.
    """

    level: Level
    twice_F: int
    labels: tuple[tuple[int, int], ...]
    vector: Complex
    mixing_mhz: float
    residual_per_us: float

    @property
    def is_stationary(self) -> bool:
        """Whether the field leaves it dark for good."""
        return self.mixing_mhz < NULL_TOLERANCE

    def text(self) -> str:
        """Write the state as `0.707 |1,1> - 0.707 |1,-1>`."""
        parts = [
            f"{_coefficient(value)} |{format_sublevel(*label)}>"
            for label, value in zip(self.labels, self.vector, strict=True)
            if abs(value) > SHOWN_AMPLITUDE
        ]
        return " + ".join(parts).replace("+ -", "- ")


@dataclass(frozen=True, slots=True, eq=False)
class LowerManifold:
    """One lower manifold: its dark states, and how strongly light excites what is not dark.

    `pump_per_us` is the largest excitation rate of any state in it; zero means that no beam is near its resonances and
    atoms there are simply unlit. `names` are the beams that reach it.
    """

    level: Level
    twice_F: int
    size: int
    names: tuple[str, ...]
    pump_per_us: float
    dark: tuple[DarkState, ...]

    def text(self) -> str:
        """Write the manifold as `5s_2S1/2 F=2`."""
        return f"{self.level.name} {'F' if self.level.twice_I else 'J'}={format_half(self.twice_F)}"


def _coefficient(value: complex) -> str:
    if abs(value.imag) < 1e-6:
        return f"{value.real:.4g}"
    if abs(value.real) < 1e-6:
        return f"{value.imag:.4g}i"
    return f"({value.real:.4g}{value.imag:+.4g}i)"


def lower_manifolds(drive: Drive, linewidths: float = RESONANT_WIDTHS) -> list[LowerManifold]:
    """Find the dark states of every hyperfine level that is the lower end of a driven line."""
    structure = drive.structure
    found = []
    for level in structure.levels:
        part = structure.slice_of(level)
        couplings = [item for item in drive.couplings if item.lower == part]
        if couplings:
            held = structure.twice_F[part]
            for twice_F in np.unique(held).tolist():
                found.append(_manifold(drive, level, twice_F, np.flatnonzero(held == twice_F), couplings, linewidths))
    return found


def _manifold(
    drive: Drive, level: Level, twice_F: int, inside: NDArray[np.int64], couplings: list[Coupling], linewidths: float
) -> LowerManifold:
    near, far = _split(drive, couplings, inside, linewidths)
    names = tuple(dict.fromkeys(name for _, _, parts in near for name in parts))
    if not near:
        return LowerManifold(level, twice_F, inside.size, (), 0.0, ())
    rows = np.concatenate([rabi for rabi, _, _ in near])
    strengths = np.concatenate([rabi * np.sqrt(rate)[:, None] for rabi, rate, _ in near])
    _, sizes, right = np.linalg.svd(rows)
    rank = int(np.sum(sizes > NULL_TOLERANCE * sizes[0]))
    null: Complex = right[rank:].conj().T
    pump = float(np.linalg.norm(strengths, 2) ** 2)
    labels = tuple((twice_F, int(m)) for m in drive.structure.twice_m[drive.structure.slice_of(level)][inside])
    energy = drive.structure.energy_mhz[drive.structure.slice_of(level)][inside]
    states = tuple(
        DarkState(level, twice_F, labels, vector, _mixing(null, vector, energy), _residual(far, vector))
        for vector in _tidy(null, np.array([m for _, m in labels]) / 2)
    )
    return LowerManifold(level, twice_F, inside.size, names, pump, states)


Rows = list[tuple[Complex, Array, list[str]]]  # Rabi rows (upper, manifold), rate per squared Rabi frequency, beams


def _split(drive: Drive, couplings: list[Coupling], inside: NDArray[np.int64], linewidths: float) -> tuple[Rows, Rows]:
    """Sort the upper sublevels of each laser frequency into near resonance and far from it."""
    near: Rows = []
    far: Rows = []
    for group in _by_frequency(couplings):
        rabi = np.sum([item.rabi_mhz[:, inside] for item in group], axis=0)
        width = np.max([item.width_mhz[:, inside].max(axis=1) for item in group], axis=0)
        detuning = np.abs(group[0].detuning_mhz[:, inside]).min(axis=1)
        rate = PER_US * width / (width**2 + 4 * detuning**2)
        close = detuning <= linewidths * width
        driven = np.abs(rabi).max(axis=1) > 0
        names = [item.beam.name for item in group]
        for target, chosen in ((near, close & driven), (far, ~close & driven)):
            if chosen.any():
                target.append((rabi[chosen], rate[chosen], names))
    return near, far


def _by_frequency(couplings: list[Coupling]) -> list[list[Coupling]]:
    groups: list[list[Coupling]] = []
    for item in couplings:
        for group in groups:
            same_line = group[0].beam.line.name == item.beam.line.name
            if same_line and abs(group[0].beam.offset_mhz - item.beam.offset_mhz) <= SAME_FREQUENCY_MHZ:
                group.append(item)
                break
        else:
            groups.append([item])
    return groups


def _tidy(null: Complex, m: Array) -> list[Complex]:
    """Choose the basis of the dark subspace that is diagonal in m, so that single sublevels show as such.

    Phases make the largest amplitude real and positive.
    """
    if null.shape[1] == 0:
        return []
    _, turn = np.linalg.eigh(null.conj().T @ (m[:, None] * null))
    basis = null @ turn
    states = []
    for vector in basis.T:
        largest = vector[int(np.argmax(np.abs(vector) > np.abs(vector).max() - 1e-9))]
        vector = vector * abs(largest) / largest
        vector[np.abs(vector) < 1e-12] = 0.0
        states.append(vector)
    return states


def _mixing(null: Complex, vector: Complex, energy: Array) -> float:
    moved = energy * vector - np.vdot(vector, energy * vector) * vector
    outside = moved - null @ (null.conj().T @ moved)
    return float(np.linalg.norm(outside))


def _residual(far: Rows, vector: Complex) -> float:
    return float(sum(np.sum(rate * np.abs(rabi @ vector) ** 2) for rabi, rate, _ in far))


@dataclass(frozen=True, slots=True, eq=False)
class SharedDark:
    """A stationary dark state of the whole scheme: positions of its sublevels in the structure, and amplitudes."""

    positions: NDArray[np.int64]
    vector: Complex


def stationary_dark(drive: Drive, frame: Frame) -> list[SharedDark]:
    """Find the exactly stationary dark states, superpositions of several manifolds included.

    In the rotating frame they are the null vectors of the coherent coupling among lower sublevels of equal energy; at a
    two-photon resonance these belong to different manifolds.
    """
    V, below = _coherent(drive, frame)
    energy = (drive.structure.energy_mhz - frame.shift_mhz)[below]
    scale = float(np.abs(V).max())
    found = []
    for value in _distinct(energy):
        at = below[np.abs(energy - value) < SAME_FREQUENCY_MHZ]
        _, sizes, right = np.linalg.svd(V[:, at])
        rank = int(np.sum(sizes > NULL_TOLERANCE * scale))
        null: Complex = right[rank:].conj().T
        found += [SharedDark(at, vector) for vector in _tidy(null, drive.structure.twice_m[at] / 2)]
    return found


def _coherent(drive: Drive, frame: Frame) -> tuple[Complex, NDArray[np.int64]]:
    """Return the coherent Rabi matrix over all sublevels, and the long-lived sublevels that light reaches."""
    structure = drive.structure
    V = np.zeros((structure.size, structure.size), dtype=np.complex128)
    lower = np.zeros(structure.size, dtype=np.bool_)
    upper = lower.copy()
    for item, coherent in zip(drive.couplings, frame.coherent, strict=True):
        V[item.upper, item.lower] += np.where(coherent, item.rabi_mhz, 0.0)
        lower[item.lower] = True
        upper[item.upper] = True
    return V, np.flatnonzero(lower & ~upper)


def _distinct(values: Array) -> list[float]:
    kept: list[float] = []
    for value in np.sort(values):
        if not kept or value - kept[-1] > SAME_FREQUENCY_MHZ:
            kept.append(float(value))
    return kept


@dataclass(frozen=True, slots=True)
class RamanPair:
    """Two lower sublevels of different manifolds that light joins through one upper level: a Lambda system.

    `detuning_mhz` is the two-photon detuning; the dark resonance there is about `width_mhz` wide, (O1^2 + O2^2)/Gamma
    for resonant light, larger Rabi frequencies and detunings neglected.
    """

    first: int
    second: int
    upper: int
    detuning_mhz: float
    width_mhz: float


def raman_pairs(drive: Drive, frame: Frame, within_mhz: float) -> list[RamanPair]:
    """List the two-photon resonances between different lower manifolds, nearest first.

    Each pair of sublevels appears once, with the upper sublevel that joins it most strongly.
    """
    V, below = _coherent(drive, frame)
    structure = drive.structure
    energy = structure.energy_mhz - frame.shift_mhz
    found = []
    for k, a in enumerate(below):
        for b in below[k + 1 :]:
            same = structure.level_index[a] == structure.level_index[b] and structure.twice_F[a] == structure.twice_F[b]
            gap = float(energy[a] - energy[b])
            joint = np.abs(V[:, a] * V[:, b])
            if same or abs(gap) > within_mhz or joint.max() == 0.0:
                continue
            up = int(np.argmax(joint))
            width = float((abs(V[up, a]) ** 2 + abs(V[up, b]) ** 2) / structure.width_mhz[up])
            found.append(RamanPair(int(a), int(b), up, gap, width))
    return sorted(found, key=lambda pair: abs(pair.detuning_mhz))
