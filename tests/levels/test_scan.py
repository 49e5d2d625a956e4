"""Scans: the grid and its order, what each parameter changes, chunks that do not matter, and refusals."""

import pickle

import numpy as np
import pytest

from levels.errors import OutsideValidity
from levels.geometry import axes_of
from levels.jones import ellipse_of
from levels.pumping import prepare, solve
from levels.scan import KINDS, Parameter, changed, check_parameters, points, solve_points
from levels.trapcheck import helicity_of
from tests.levels.pumping_records import RB87_D1
from tests.levels.test_pumping import ion_scheme, pumping_scheme

SCHEME = ion_scheme((0.0, 1.0, 1.0), 20.0)


def at(kind, value, beam="red"):
    return changed(SCHEME, [Parameter(kind, (value,), beam)], [value])


def red(scheme):
    return next(beam for beam in scheme.beams if beam.name == "red")


def test_points_run_with_the_last_parameter_fastest():
    """The grid is the product of the values in the order given; any stretch of it can be taken."""
    grid = [Parameter("field", (1.0, 2.0)), Parameter("detuning", (0.0, 5.0, 9.0), "red")]
    assert check_parameters(SCHEME, grid) == 6
    whole = list(points(grid))
    assert whole[:4] == [(1.0, 0.0), (1.0, 5.0), (1.0, 9.0), (2.0, 0.0)]
    assert list(points(grid, 2, 3)) == whole[2:5]


def test_each_parameter_changes_its_own_thing():
    """Field keeps its direction, its angle its size; a beam keeps everything but the one thing scanned."""
    assert at("field", 3.0).field_gauss == pytest.approx(3.0 * np.array([0, 1, 1]) / np.sqrt(2))
    turned = at("field_angle", 30.0).field_gauss
    assert np.linalg.norm(turned) == pytest.approx(np.sqrt(2))
    assert turned @ SCHEME.field_gauss / 2 == pytest.approx(np.cos(np.radians(30.0)))
    assert red(at("detuning", 7.0)).offset_mhz == pytest.approx(17.0)
    assert red(at("intensity", 7.0)).intensity_mw_per_cm2 == 7.0
    assert helicity_of(red(at("ellipticity", 45.0))) == pytest.approx(1.0)
    assert abs(np.vdot(red(at("impurity", 0.1)).polarisation, red(SCHEME).polarisation)) ** 2 == pytest.approx(0.9)
    from levels.geometry import transverse_basis

    jones = transverse_basis(red(SCHEME).direction) @ red(at("azimuth", 50.0)).polarisation
    assert ellipse_of(jones).azimuth_deg == pytest.approx(50.0)
    assert at("detuning", 7.0).beams[0] is SCHEME.beams[0]


def test_rows_are_single_solutions_whatever_the_chunks():
    """Each row is the outcome of its scheme, and two chunks give what one gives."""
    grid = [Parameter("field", (0.5, 2.0)), Parameter("detuning", (-5.0, 5.0), "red")]
    chunk = list(points(grid))
    whole = solve_points(SCHEME, grid, chunk)
    for row, values in enumerate(chunk):
        single = solve(prepare(changed(SCHEME, grid, values)))
        assert whole.scattering_per_s[row] == pytest.approx(single.scattering_per_s, rel=1e-9)
    parts = [solve_points(SCHEME, grid, chunk[:1]), solve_points(SCHEME, grid, chunk[1:])]
    assert np.concatenate([part.scattering_per_s for part in parts]).tolist() == whole.scattering_per_s.tolist()
    assert whole.models == ("bloch",) * 4
    assert whole.target.size == 0


def test_target_is_followed():
    """With a wanted sublevel its share of the atoms is a column: it falls with the impurity."""
    grid = [Parameter("impurity", (0.0, 0.02), "pump")]
    scheme = pumping_scheme(linewidth_mhz=1.0)
    rows = solve_points(scheme, grid, list(points(grid)), target=(RB87_D1.lines[0].lower, (4, 4)))
    assert rows.target[0] == pytest.approx(1.0, abs=1e-6)
    assert rows.target[1] < 0.99


def test_schemes_travel_between_processes():
    """A scheme pickles, and the copy gives the same rows."""
    grid = [Parameter("field", (1.0,))]
    copy = pickle.loads(pickle.dumps(SCHEME))
    assert axes_of(copy.field_gauss).magnitude_gauss == pytest.approx(np.sqrt(2))
    ours, theirs = (solve_points(scheme, grid, [(1.0,)]).scattering_per_s for scheme in (SCHEME, copy))
    assert ours.tolist() == theirs.tolist()


@pytest.mark.parametrize(
    ("grid", "parameter"),
    [
        ([], "parameters"),
        ([Parameter("field", (1.0,))] * 4, "parameters"),
        ([Parameter("colour", (1.0,))], "parameter"),
        ([Parameter("detuning", (1.0,), "green")], "beam"),
        ([Parameter("ellipticity", (50.0,), "red")], "ellipticity"),
        ([Parameter("field", (float("nan"),))], "field"),
        ([Parameter("field", ())], "field"),
        ([Parameter("field", tuple(range(2000))), Parameter("detuning", tuple(range(2000)), "red")], "grid"),
    ],
)
def test_impossible_grids_name_their_parameter(grid, parameter):
    """Unknown kinds and beams, values out of range and endless grids are refused by name."""
    with pytest.raises(OutsideValidity) as caught:
        check_parameters(SCHEME, grid)
    assert caught.value.parameter == parameter


def test_table_of_kinds_is_sound():
    """Every kind has a unit, a range and a meaning."""
    assert all(kind.unit and kind.meaning and kind.low < kind.high for kind in KINDS.values())
