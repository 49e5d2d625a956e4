"""Long grids read off polynomials against the direct evaluation at every field."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from levels.fieldgrid import POINTS, on_grid
from levels.sublevels import sublevels
from tests import full_dimension
from tests.records_for_tests import CS133_P3, LARGE, RB87_GROUND, RB87_P3, level

Array = NDArray[np.float64]


class Counted:
    """Columns that count at how many fields they were computed."""

    def __init__(self, *functions: np.ufunc) -> None:
        self.functions, self.fields = functions, 0

    def __call__(self, fields: Array) -> Array:
        self.fields += fields.size
        return np.stack([function(fields) for function in self.functions], axis=1)


def waves() -> Counted:
    return Counted(lambda b: np.sin(b / 7), lambda b: 1e3 / (1 + (b / 40) ** 2), lambda b: b)


TOLERANCE = np.array([1e-13, 1e-10, 1e-12])


def grids() -> dict[str, Array]:
    rng = np.random.default_rng(7)
    rising = np.linspace(0.0, 100.0, 2001)
    return {
        "rising": rising,
        "falling": rising[::-1],
        "negative": -rising,
        "both signs": np.linspace(-60.0, 90.0, 1500),
        "shuffled": rng.permutation(rising),
        "duplicates": np.repeat(rng.uniform(-20.0, 80.0, 400), 3),
        "constant": np.full(1000, 3.25),
        "two values": np.tile([1.0, 2.0], 500),
        "clusters": np.concatenate([np.linspace(0, 1e-3, 500), np.linspace(50, 50.001, 500), [1e3]]),
        "logarithmic": np.geomspace(1e-6, 1e5, 1000),
        "one": np.array([4.0]),
        "none": np.empty(0),
    }


@pytest.mark.parametrize("name", grids())
def test_any_grid_equals_the_direct_way(name: str) -> None:
    """Sorted or not, with duplicates, of either sign, constant or empty: every field gets its own numbers."""
    grid = grids()[name]
    expected, actual = waves()(grid), on_grid(waves(), grid, TOLERANCE)
    assert actual.shape == expected.shape
    assert np.all(np.abs(actual - expected) <= 50 * TOLERANCE)


def test_a_smooth_long_grid_costs_a_few_points() -> None:
    """10,001 fields of a smooth function need no more than a few hundred evaluations."""
    counted = waves()
    on_grid(counted, np.linspace(0, 100, 10001), TOLERANCE)
    assert counted.fields <= 10 * POINTS


def test_a_short_grid_is_computed_directly() -> None:
    """Below a hundred or so fields nothing is interpolated."""
    counted, grid = waves(), np.linspace(0, 100, 100)
    assert np.array_equal(on_grid(counted, grid, TOLERANCE), waves()(grid))
    assert counted.fields == 100


@settings(max_examples=200)
@given(st.one_of(st.floats(0, 1000), st.floats(0, 2), st.floats(998, 1000), st.floats(499, 501)))
def test_no_narrow_crossing_is_missed(centre: float) -> None:
    """An avoided crossing 1e-10 G wide is seen wherever it lies, also next to the ends of an interval."""
    grid = np.linspace(0.0, 1000.0, 10001)

    def columns(field: Array) -> Array:
        root = np.hypot(field - centre, 1e-10)
        return np.stack([root, (field - centre) / root], axis=1)

    tolerance = np.array([1e-9, 1e-12])
    assert np.abs(on_grid(columns, grid, tolerance) - columns(grid)).max() <= 1e-8


def test_noise_falls_back_to_the_direct_way() -> None:
    """A column that no polynomial follows is computed at every field, exactly."""

    def jagged(field: Array) -> Array:
        return np.sign(np.sin(1e4 * field))[:, None]

    grid = np.linspace(0, 10, 3000)
    assert np.array_equal(on_grid(jagged, grid, np.array([1e-12])), jagged(grid))


LEVELS = {
    "87Rb 5s": (RB87_GROUND, 1e4),
    "87Rb 5p3/2": (RB87_P3, 500.0),
    "133Cs 6p3/2": (CS133_P3, 2000.0),
    "128 sublevels": (LARGE, 3000.0),
    # INVENTED: B far larger than A brings crossings 0.3 kHz wide between 5 and 9 G.
    "narrow": (level(8, 5, -3.0, 900.0, None, 1.2, -0.0004), 40.0),
    # 7Li 2p 2P3/2 in round numbers: the fine-structure neighbour 10 GHz below bends the sublevels strongly.
    "mixed": (level(3, 3, -3.055, -0.221, None, 1.335, -0.00118, term="2P", neighbours=((1, -10053.2),)), 1000.0),
    "I = 0": (level(4, 0, g_J=1.5), 1e5),
}


@pytest.mark.parametrize("name", LEVELS)
@pytest.mark.parametrize("start", [0.0, -0.3])
def test_sublevels_on_a_long_grid_are_the_direct_ones(name: str, start: float) -> None:
    """On 3,001 fields energies, slopes and quadratic coefficients are those of single fields, to rounding error.

    1e-12 of the largest term, 1e-11 of dH/dB (looser by term over gap), 1e-7 of the largest quadratic coefficient.
    """
    of, largest = LEVELS[name]
    grid = np.linspace(start * largest, largest, 3001)
    swept = sublevels(of, grid)
    pieces = [sublevels(of, part) for part in np.array_split(grid, 40)]
    scale = full_dimension.largest_term(of, largest)
    zeeman = np.abs(full_dimension.zeeman(of)).max()
    energy = np.concatenate([piece.energy_mhz for piece in pieces])
    slope = np.concatenate([piece.slope_mhz_per_gauss for piece in pieces])
    quadratic = np.concatenate([piece.quadratic_hz_per_gauss2 for piece in pieces])
    assert np.abs(swept.energy_mhz - energy).max() <= 1e-12 * scale
    assert np.abs(swept.slope_mhz_per_gauss - slope).max() <= 1e-11 * zeeman
    assert np.abs(swept.quadratic_hz_per_gauss2 - quadratic).max() <= 1e-7 * max(np.abs(quadratic).max(), 1e-9)
