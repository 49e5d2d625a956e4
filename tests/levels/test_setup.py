"""What a laboratory says about its beams becomes the scheme that it means; what it cannot mean is refused by name."""

from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from levels.beams import intensity_of_saturation, offset_of_component, offset_of_hyperfine
from levels.errors import NotPublished, OutsideValidity, UnknownName
from levels.geometry import axes_of, resolve
from levels.jones import plate
from levels.setup import BeamSetup, Optics, Setup, Share, Tuning, build, populations_of
from levels.structure import structure_of
from tests.levels.pumping_records import CA40, RB87_D2

D2 = RB87_D2.lines[0]
UP = (0.0, 0.0, 1.0)


def setup(field: Any = UP, **given: Any) -> Setup:
    beam: dict[str, Any] = {"optics": Optics(linear_deg=0.0), "direction": UP, "saturation": 1.0, **given}
    if "angle_to_field_deg" in given:
        beam["direction"] = None
    return Setup(RB87_D2, (BeamSetup("a", D2, **beam),), field)


def one(**given: Any) -> Any:
    return build(setup(**given)).beams[0]


@pytest.mark.parametrize(
    ("optics", "fractions"),
    [
        (Optics(handedness="right"), (0, 0, 1)),
        (Optics(handedness="right", convention="optics"), (1, 0, 0)),
        (Optics(handedness="left"), (1, 0, 0)),
        (Optics(linear_deg=37.0), (0.5, 0, 0.5)),
        (Optics(ellipticity_deg=45.0), (0, 0, 1)),
        (Optics(jones=(1, 1j)), (0, 0, 1)),
        (Optics(vector=(1, -1j, 0)), (1, 0, 0)),
        (Optics(polariser_deg=0.0, plates=(plate("quarter", -45.0),)), (0, 0, 1)),
        (Optics(polariser_deg=0.0, plates=(plate("half", 20.0), plate("quarter", -5.0))), (0, 0, 1)),
        (Optics(best_q=-1), (1, 0, 0)),
        (Optics(handedness="right", impurity=0.03), (0.03, 0, 0.97)),
    ],
)
def test_every_way_to_say_a_polarisation(optics: Optics, fractions: tuple[float, ...]) -> None:
    """Along the field, positive helicity is sigma+ in whichever way it is said; impurity is a share."""
    beam = one(optics=optics)
    found = resolve(beam.direction, beam.polarisation, axes_of(UP)).fractions
    assert found == pytest.approx(fractions, abs=1e-12)


def test_reference_turns_the_transverse_axes() -> None:
    """With the reference along y, linear light at 0 degrees is along y."""
    beam = one(optics=Optics(linear_deg=0.0, reference=(0.0, 1.0, 0.0)))
    assert np.abs(beam.polarisation) == pytest.approx([0, 1, 0], abs=1e-12)


def test_angles_from_the_field_give_the_direction() -> None:
    """A beam at 60 degrees from a field along x has this angle to it; without an azimuth it lies in the x'z' plane."""
    beam = one(field=(2.0, 0.0, 0.0), angle_to_field_deg=60.0)
    assert beam.direction @ np.array([1.0, 0, 0]) == pytest.approx(0.5)
    turned = one(field=(2.0, 0.0, 0.0), angle_to_field_deg=60.0, around_field_deg=90.0)
    assert beam.direction @ turned.direction == pytest.approx(0.25)


@pytest.mark.parametrize(
    ("tuning", "offset"),
    [
        (Tuning(-7.0), -7.0),
        (Tuning(-7.0, component=(4, 6)), offset_of_hyperfine(D2, 4, 6, -7.0)),
        (Tuning(2.0, lower=(4, 4), upper=(6, 6)), offset_of_component(D2, (4, 4), (6, 6), 3.0, 2.0)),
        (Tuning(1.5, frequency_mhz=D2.centroid.value + 250.0), 251.5),  # type: ignore[union-attr]
    ],
)
def test_every_way_to_say_a_frequency(tuning: Tuning, offset: float) -> None:
    """Detunings count from the centroid, a hyperfine component, a Zeeman component at the field, or a frequency."""
    assert one(field=(0.0, 3.0, 0.0), tuning=tuning).offset_mhz == pytest.approx(offset, abs=1e-6)


def test_every_way_to_say_the_brightness() -> None:
    """Saturation 1 is the saturation intensity; 1 mW in a waist of 1 mm peaks at 63.66 mW/cm2 (2P/pi w^2)."""
    bright = {"saturation": None}
    assert one().intensity_mw_per_cm2 == pytest.approx(intensity_of_saturation(RB87_D2, D2, 1.0))
    assert one(**bright, power_mw=1.0, waist_mm=1.0).intensity_mw_per_cm2 == pytest.approx(63.66, abs=0.01)
    assert one(**bright, intensity_mw_per_cm2=0.0).intensity_mw_per_cm2 == 0.0


def test_what_a_beam_is_meant_for_follows_from_its_tuning() -> None:
    """A named component is wanted, a Zeeman component with its polarisation; what is said wins."""
    assert one(tuning=Tuning(component=(4, 6))).wanted_F == (4, 6)
    zeeman = one(tuning=Tuning(lower=(4, 4), upper=(6, 6)))
    assert (zeeman.wanted_q, zeeman.wanted_F) == (1, (4, 6))
    assert one(tuning=Tuning(component=(4, 6)), wanted_F=(4, 4), wanted_q=0).wanted_F == (4, 4)


@pytest.mark.parametrize(
    ("given", "parameter"),
    [
        ({"direction": (0.0, 0.0, 0.0)}, "beams.0.direction"),
        ({"direction": None}, "beams.0.direction"),
        ({"optics": Optics()}, "beams.0.polarisation"),
        ({"optics": Optics(linear_deg=0.0, handedness="left")}, "beams.0.polarisation"),
        ({"optics": Optics(vector=(0, 0, 1))}, "beams.0.polarisation"),
        ({"optics": Optics(linear_deg=0.0, plates=(plate("half", 0.0),))}, "beams.0.polarisation"),
        ({"optics": Optics(linear_deg=0.0, reference=UP)}, "beams.0.reference"),
        ({"optics": Optics(ellipticity_deg=50.0)}, "beams.0.ellipticity"),
        ({"optics": Optics(best_q=0)}, "beams.0.polarisation"),
        ({"saturation": None, "power_mw": -1.0, "waist_mm": 1.0}, "beams.0.power"),
        ({"saturation": None, "power_mw": 1.0}, "beams.0.intensity"),
        ({"saturation": -1.0}, "beams.0.saturation"),
        ({"power_mw": 1.0, "waist_mm": 1.0}, "beams.0.intensity"),
        ({"tuning": Tuning(component=(4, 6), frequency_mhz=3e8)}, "beams.0.detuning"),
        ({"tuning": Tuning(lower=(4, 4))}, "beams.0.detuning"),
        ({"linewidth_mhz": -1.0}, "beams.0.linewidth"),
    ],
)
def test_what_cannot_be_is_told_with_the_beams_place(given: dict[str, Any], parameter: str) -> None:
    """Zero vectors, longitudinal light, negative powers, two ways at once: refused with the member that is wrong."""
    with pytest.raises(OutsideValidity) as caught:
        one(**given)
    assert caught.value.parameter == parameter


def test_component_that_the_line_lacks_is_told_as_it_was_given() -> None:
    """F = 1 - 7 does not exist on D2: the component and the beam's place are named, and what F there are."""
    with pytest.raises(UnknownName) as caught:
        one(tuning=Tuning(component=(2, 14)))
    assert (caught.value.kind, caught.value.given) == ("beams.0.component", "1-7")
    assert "0, 1, 2, 3" in caught.value.hint


def test_absolute_frequency_needs_a_published_one() -> None:
    """Without the line's frequency an absolute laser frequency says nothing."""
    whole = setup(tuning=Tuning(frequency_mhz=3e8))
    beam = replace(whole.beams[0], line=replace(D2, centroid=None))
    with pytest.raises(NotPublished):
        build(replace(whole, beams=(beam,)))


def test_shares_make_start_populations() -> None:
    """Half in one sublevel and half spread over D3/2; sums other than 1 and levels out of reach are refused."""
    structure = structure_of(CA40, CA40.lines[:2], 1.0)
    S, D = structure.levels[0], structure.levels[1]
    start = populations_of(structure, [Share(S, (1, 1), 0.5), Share(D, None, 0.5)])
    assert start is not None
    assert start[structure.position(S, (1, 1))] == 0.5
    assert start[structure.slice_of(D)] == pytest.approx(np.full(4, 0.125))
    assert populations_of(structure, []) is None
    with pytest.raises(OutsideValidity, match="add up to 1"):
        populations_of(structure, [Share(S, None, 0.9)])
    with pytest.raises(OutsideValidity, match="light or decays reach"):
        populations_of(structure, [Share(replace(S, name="other"), None, 1.0)])
