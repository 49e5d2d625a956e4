"""(b) Energies and slopes on 10,001 fields against full-dimension `numpy.linalg.eigh` giving the same."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from levels.records import Level
from levels.sublevels import sublevels
from tests import full_dimension
from tests.bench.measure import median_ratio, report, seconds
from tests.records_for_tests import CS133_P3, LARGE, RB87_GROUND, RB87_P3

Array = NDArray[np.float64]
FIELDS = 10_001
NUMBERS_AT_ONCE = 100_000  # matrix elements in one batch: 0.8 MB, about where eigh is quickest


class Case(NamedTuple):
    """What to solve, up to which field, how many times quicker it should be, and how often to compare."""

    name: str
    levels: tuple[Level, ...]
    largest_gauss: float
    bar: int
    pairs: int


CASES = (
    Case("87Rb D2, both levels, 24 sublevels", (RB87_GROUND, RB87_P3), 500.0, 5, 25),
    Case("133Cs 6p 2P3/2, 32 sublevels", (CS133_P3,), 500.0, 15, 11),
    Case("J = 15/2, I = 7/2, 128 sublevels (invented)", (LARGE,), 1000.0, 60, 1),
)


def plain(level: Level, fields: Array) -> tuple[Array, Array]:
    """Energies and slopes (n, s) of one level by a batched eigh of the whole Hamiltonian, in rising energy."""
    still, moving = full_dimension.still(level), np.diag(full_dimension.zeeman(level)).copy()
    size = moving.size
    energy, slope = np.empty((fields.size, size)), np.empty((fields.size, size))
    for some in np.array_split(np.arange(fields.size), max(1, fields.size * size**2 // NUMBERS_AT_ONCE)):
        matrix = np.repeat(still[None], some.size, axis=0)
        matrix.reshape(some.size, -1)[:, :: size + 1] += fields[some, None] * moving
        energy[some], states = np.linalg.eigh(matrix)
        slope[some] = moving @ (states * states)
    return energy, slope


def ours(level: Level, fields: Array) -> tuple[Array, Array]:
    """The same from the library, labelled by F and m."""
    solved = sublevels(level, fields, quadratic=False)
    return solved.energy_mhz, solved.slope_mhz_per_gauss


def compare(case: Case) -> tuple[float, float]:
    """The ratio of times, and the library's own time in seconds."""
    fields = np.linspace(0.0, case.largest_gauss, FIELDS)

    def slow() -> None:
        for level in case.levels:
            plain(level, fields)

    def quick() -> None:
        for level in case.levels:
            ours(level, fields)

    for level in case.levels:
        plain(level, fields[:50])
    quick()
    return median_ratio(slow, quick, case.pairs), min(seconds(quick) for _ in range(3))


def run() -> None:
    for case in CASES:
        ratio, took = compare(case)
        name = f"(b) {case.name}, {FIELDS} fields"
        report(name, f"{ratio:.1f} x", f"{case.bar} x", f"ours {took * 1e3:.0f} ms")
