"""Scans: each point is the scheme that the same description would make, whatever the piece that solves it."""

import pickle
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from levels.cycling import photons_before_leaving
from levels.errors import OutsideValidity
from levels.geometry import axes_of, resolve
from levels.grid import COLUMNS, Scan, Solver, check_scan, solve_points
from levels.jones import plate
from levels.pumping import prepare, pump, solve
from levels.setup import BeamSetup, Optics, Setup, Share, Tuning, build
from levels.vary import PARAMETERS, Axis
from tests.levels.pumping_records import CA40, RB87_D1, simple_atom

BLUE, RED, D1 = CA40.lines[0], CA40.lines[1], RB87_D1.lines[0]
WAVE = Optics(polariser_deg=0.0, plates=(plate("half", 10.0), plate("quarter", 5.0)))


def ion(field: Any = (0.0, 0.0, 1.0), **given: Any) -> Setup:
    blue = {"optics": Optics(linear_deg=30.0), "tuning": Tuning(-10.0), "saturation": 1.0, **given}
    red = BeamSetup("red", RED, Optics(linear_deg=30.0), Tuning(15.0), (1.0, 0.0, 0.0), saturation=3.0)
    return Setup(CA40, (BeamSetup("blue", BLUE, direction=(1.0, 0.0, 0.0), **blue), red), field)


def axis(parameter: str, *values: float, beam: str = "", **more: Any) -> Axis:
    return Axis(parameter, np.array(values), beam, **more)


def scan(
    *axes: Axis, setup: Setup | None = None, columns: tuple[str, ...] = ("scattering_per_s",), **more: Any
) -> Scan:
    return Scan(setup or ion(), axes, columns, **more)


def scattering(whole: Scan) -> list[Any]:
    check_scan(whole)
    return solve_points(whole, 0, whole.size).columns["scattering_per_s"]


def test_pieces_do_not_matter() -> None:
    """Whole, in pieces and after a journey through pickle a grid gives the same bits; the last axis is fastest."""
    whole = scan(axis("field_magnitude", 0.5, 2.0), axis("detuning", -30.0, -20.0, -10.0, beam="blue"))
    check_scan(whole)
    together = solve_points(whole, 0, 6)
    travelled = pickle.loads(pickle.dumps(whole))
    apart = [solve_points(travelled, k, k + 1) for k in (4, 0, 5, 1, 3, 2)]
    for name, column in together.columns.items():
        assert [piece.columns[name][0] for piece in sorted(apart, key=lambda piece: piece.start)] == column
    assert [value for _, value in whole.at(1)] == [0.5, -20.0]
    assert (whole.size, whole.shape, together.size) == (6, (2, 3), 6)


def test_a_point_is_the_scheme_of_its_description() -> None:
    """Field and detuning scanned give the scattering of schemes described with these numbers."""
    found = scattering(scan(axis("field_magnitude", 0.5, 2.0), axis("detuning", -30.0, -10.0, beam="blue")))
    expected = [
        solve(prepare(build(ion((0.0, 0.0, field), tuning=Tuning(detuning))))).scattering_per_s
        for field in (0.5, 2.0)
        for detuning in (-30.0, -10.0)
    ]
    assert found == pytest.approx(expected, rel=1e-9)


@pytest.mark.parametrize(
    ("given", "described"),
    [
        (axis("intensity", 7.0, beam="blue"), {"saturation": None, "intensity_mw_per_cm2": 7.0}),
        (axis("saturation", 7.0, beam="blue"), {"saturation": 7.0}),
        (axis("linewidth", 3.0, beam="blue"), {"linewidth_mhz": 3.0}),
        (axis("linear", 70.0, beam="blue"), {"optics": Optics(linear_deg=70.0)}),
        (axis("ellipticity", 20.0, beam="blue"), {"optics": Optics(ellipticity_deg=20.0, azimuth_deg=30.0)}),
        (axis("azimuth", 50.0, beam="blue"), {"optics": Optics(linear_deg=50.0)}),
        (axis("impurity", 0.2, beam="blue"), {"optics": Optics(linear_deg=30.0, impurity=0.2)}),
    ],
    ids=lambda item: item.parameter if isinstance(item, Axis) else "",
)
def test_each_parameter_of_a_beam(given: Axis, described: dict[str, Any]) -> None:
    """A beam's parameter scanned is that parameter described."""
    expected = solve(prepare(build(ion(**described)))).scattering_per_s
    assert scattering(scan(given)) == pytest.approx([expected], rel=1e-7)


def test_optics_and_power_are_scanned_as_described() -> None:
    """Polariser, either wave plate and the power: each changes its own number and keeps the others."""
    described = {"optics": WAVE, "saturation": None, "power_mw": 0.1, "waist_mm": 2.0}
    setup = ion(**described)
    turned = replace(WAVE, plates=(WAVE.plates[0], plate("quarter", 33.0)))
    for given, changed in (
        (axis("polariser", 25.0, beam="blue"), {"optics": replace(WAVE, polariser_deg=25.0)}),
        (axis("plate", 33.0, beam="blue", plate=2), {"optics": turned}),
        (axis("power", 0.7, beam="blue"), {"power_mw": 0.7}),
    ):
        expected = solve(prepare(build(ion(**{**described, **changed})))).scattering_per_s
        assert scattering(scan(given, setup=setup)) == pytest.approx([expected], rel=1e-9)


def test_two_parameters_of_one_polarisation_go_together() -> None:
    """Ellipticity and azimuth on two axes make the ellipse of both; two plates likewise."""
    both = scan(axis("azimuth", 10.0, 80.0, beam="blue"), axis("ellipticity", -20.0, 40.0, beam="blue"))
    beam = Solver(both).scheme(both.at(3)).beams[0]
    wanted = build(ion(optics=Optics(ellipticity_deg=40.0, azimuth_deg=80.0))).beams[0]
    assert abs(np.vdot(wanted.polarisation, beam.polarisation)) == pytest.approx(1.0)


def test_field_turns_from_the_polarisation_to_the_beam() -> None:
    """At 0 degrees the field lies along the linear polarisation (all pi), at 90 along the beam (no pi)."""
    whole = scan(axis("field_from_polarisation", 0.0, 54.7, 90.0, beam="blue"))
    check_scan(whole)
    pi = []
    for point in range(3):
        scheme = Solver(whole).scheme(whole.at(point))
        light = scheme.beams[0]
        pi.append(resolve(light.direction, light.polarisation, axes_of(scheme.field_gauss)).fraction(0))
    assert pi == pytest.approx([1.0, np.cos(np.radians(54.7)) ** 2, 0.0], abs=1e-12)


def test_field_angles_are_those_of_the_laboratory() -> None:
    """Polar 90 and azimuth 90 degrees is the laboratory y; misalignment leaves the direction by its angle."""
    whole = scan(axis("field_polar", 90.0), axis("field_azimuth", 90.0), axis("field_magnitude", -2.0))
    assert Solver(whole).scheme(whole.at(0)).field_gauss == pytest.approx([0, -2, 0], abs=1e-12)
    tilted = scan(axis("misalignment", 8.5))
    field = Solver(tilted).scheme(tilted.at(0)).field_gauss
    assert field[2] == pytest.approx(np.cos(np.radians(8.5)))


def test_lasers_stay_when_the_field_moves() -> None:
    """A laser set to a Zeeman component at the setup's field keeps its frequency while the field is scanned."""
    setup = ion((0.0, 0.0, 1.0), tuning=Tuning(lower=(1, 1), upper=(1, -1)))
    whole = scan(axis("field_magnitude", 1.0, 10.0), setup=setup)
    first, second = (Solver(whole).scheme(whole.at(k)).beams[0].offset_mhz for k in (0, 1))
    assert first == second


def test_pumping_and_cycling_columns() -> None:
    """Purity, time and photons of pumping, and photons before loss, are those of the library's own functions."""
    pumping = BeamSetup("p", D1, Optics(handedness="right"), Tuning(component=(4, 4)), (0.0, 0.0, 1.0), saturation=0.3)
    back = replace(pumping, name="r", tuning=Tuning(component=(2, 4)), linewidth_mhz=1.0)
    setup = Setup(RB87_D1, (pumping, back), (0.0, 0.0, 1.0))
    names = tuple(COLUMNS)
    whole = scan(axis("misalignment", 0.0, 5.0), setup=setup, columns=names, target=(D1.lower, (4, 4)))
    check_scan(whole)
    piece = solve_points(whole, 0, 2)
    assert list(piece.columns) == ["model", *names]
    light = prepare(build(setup))
    expected = pump(light, light.structure.position(D1.lower, (4, 4)))
    assert piece.columns["purity"][0] == pytest.approx(expected.purity)
    assert piece.columns["pumping_photons"][0] == pytest.approx(expected.photons)
    assert piece.columns["fullest"][0] == "s_2S1/2 2,2"
    assert piece.columns["purity"][1] < piece.columns["purity"][0]  # type: ignore[operator]
    assert piece.columns["photons_before_loss"][0] == photons_before_leaving(build(setup)).photons


def test_start_populations_count_where_they_decide() -> None:
    """Sigma+ light on J = 2 - 1 leaves m = 1 and m = 2 dark: atoms that start in one of them all stay there."""
    atom = simple_atom(4, 2)
    line = atom.lines[0]
    beam = BeamSetup("a", line, Optics(handedness="right"), direction=(0.0, 0.0, 1.0), saturation=1.0)
    for m in (2, 4):
        whole = scan(
            axis("detuning", -10.0, beam="a"),
            setup=Setup(atom, (beam,), (0.0, 0.0, 1.0)),
            columns=("fullest", "fullest_share", "unique"),
            initial=(Share(line.lower, (4, m), 1.0),),
        )
        check_scan(whole)
        columns = solve_points(whole, 0, 1).columns
        assert columns["fullest"] == [f"g 2,{m // 2}"]
        assert columns["fullest_share"] == pytest.approx([1.0], abs=1e-9)
        assert columns["unique"] == [0.0]


@pytest.mark.parametrize(
    ("axes", "more", "parameter"),
    [
        ((), {}, "axes"),
        ((axis("linear", 0.0, beam="blue"),) * 4, {}, "axes"),
        ((axis("colour", 0.0),), {}, "axes.0.parameter"),
        ((axis("linear", 0.0),), {}, "axes.0.beam"),
        ((axis("field_polar", 0.0, beam="blue"),), {}, "axes.0.beam"),
        ((axis("linear", beam="blue"),), {}, "axes.0.values"),
        ((axis("linear", np.nan, beam="blue"),), {}, "axes.0.values"),
        ((axis("linear", 0.0, beam="blue"), axis("linear", 1.0, beam="blue")), {}, "axes"),
        ((axis("field_polar", 0.0), axis("field_from_polarisation", 1.0, beam="red")), {}, "axes"),
        ((axis("ellipticity", 0.0, 60.0, beam="blue"),), {}, "axes.0.values"),
        ((axis("power", 1.0, beam="blue"),), {}, "waist"),
        ((axis("plate", 1.0, beam="blue"),), {}, "plate"),
        ((axis("polariser", 1.0, beam="blue"),), {}, "polarisation"),
        ((axis("field_polar", 1.0),), {"columns": ("colour",)}, "columns"),
        ((axis("field_polar", 1.0),), {"columns": ("purity",)}, "target"),
        ((axis("field_polar", 1.0),), {"target": (BLUE.lower, (3, 1))}, "sublevel"),
        ((axis("field_polar", 1.0),), {"initial": (Share(BLUE.lower, None, 0.5),)}, "initial"),
    ],
)
def test_scans_that_cannot_be_are_refused_before_they_start(
    axes: tuple[Axis, ...], more: dict[str, Any], parameter: str
) -> None:
    """Axes, columns, targets and the ends of the grid are checked first, each fault with its name."""
    with pytest.raises(OutsideValidity) as caught:
        check_scan(scan(*axes, **more))
    assert caught.value.parameter == parameter


def test_tables_say_what_their_rows_are() -> None:
    """Each parameter and column has a meaning; names are identifiers."""
    for row in (*PARAMETERS.values(), *COLUMNS.values()):
        assert row.meaning
        assert row.name.isidentifier()
