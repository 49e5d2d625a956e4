"""The questions about light: their numbers, their refusals, and that every level of the book answers."""

import csv
import io
import math
from urllib.parse import quote

import pytest
from starlette.testclient import TestClient

from levels.catalogue import Catalogue, load

SPECIES = list(load().elements)
GROUND = "/v1/atoms/87Rb"
BEAM = "level=5s_2S1/2&wavelength=1064&polarisation=pi&field=1&power=1W&waist=50um"


def numbers_in(value: object) -> list[float]:
    if isinstance(value, dict):
        return [number for part in value.values() for number in numbers_in(part)]
    if isinstance(value, list):
        return [number for part in value for number in numbers_in(part)]
    return [value] if isinstance(value, float) else []


def test_shift_is_the_polarisability_times_the_intensity(client: TestClient) -> None:
    """-alpha I/(2 eps0 c h): 4.6871e-5 Hz for 1 a0^3 in 1 mW/cm2 (CODATA 2022), row by row, with its uncertainty."""
    answer = client.get(f"{GROUND}/lightshift?level=5s_2S1/2&wavelength=1064&intensity=2kW/cm2&beam_angle=30").json()
    columns = answer["columns"]
    assert answer["intensity_mW_per_cm2"] == 2e6
    for alpha, spread, shift, sigma in zip(
        columns["polarisability_a03"],
        columns["polarisability_uncertainty_a03"],
        columns["shift_MHz"],
        columns["shift_uncertainty_MHz"],
        strict=True,
    ):
        assert shift == pytest.approx(-4.6871e-11 * alpha * 2e6, rel=1e-4)
        assert sigma / abs(shift) == pytest.approx(spread / alpha, rel=1e-9)


def test_shares_and_remainder_make_the_whole(client: TestClient) -> None:
    """The shares of the lines and the remainder add up to the scalar polarisability, which the curve has too."""
    answer = client.get(f"{GROUND}/lightshift?{BEAM}").json()
    whole = sum(share["scalar_a03"] for share in answer["shares"]) + answer["left_out"]["remainder"]["value"]
    assert whole == pytest.approx(answer["polarisability"]["scalar"]["value"], rel=1e-12)
    curve = client.get(f"{GROUND}/polarisability?level=5s_2S1/2&start=1064").json()
    assert curve["columns"]["scalar_a03"] == pytest.approx([whole], rel=1e-12)
    assert curve["static"]["scalar"]["value"] == pytest.approx(320.1)
    assert answer["left_out"]["remainder_of"] == "static"


def test_beam_makes_a_trap(client: TestClient) -> None:
    """1 W at 1064 nm in 50 um traps 87Rb 40 uK deep with 390 Hz; retro-reflected the depth is four times that."""
    single, lattice = (
        client.get(f"{GROUND}/lightshift?{BEAM}{more}").json()["trap"] for more in ("", "&retro_reflected=true")
    )
    assert single["depth_uK"] == pytest.approx(39.5, abs=0.2)
    assert single["frequency_x_Hz"] == pytest.approx(391, abs=2)
    assert lattice["depth_uK"] == pytest.approx(4 * single["depth_uK"], rel=1e-9)
    assert lattice["frequency_axial_Hz"] > 1e4
    none = client.get(f"{GROUND}/lightshift?level=5s_2S1/2&wavelength=1064").json()["trap"]
    assert none["depth_uK"] is None
    assert none["reason"]
    blue = client.get(f"{GROUND}/lightshift?level=5s_2S1/2&wavelength=700&power=1&waist=50&sublevel=2,2").json()["trap"]
    assert (blue["of"], blue["trapped"], blue["depth_uK"]) == ("2,2", False, None)


def test_polarisation_name_and_angles_are_the_same(client: TestClient) -> None:
    """sigma+ is a beam along the field with ellipticity 45; both spellings together are refused."""
    base = f"{GROUND}/lightshift?level=5s_2S1/2&wavelength=850&field=2"
    one = client.get(f"{base}&polarisation=sigma%2B").json()
    two = client.get(f"{base}&beam_angle=0&ellipticity=45").json()
    assert one["columns"] == two["columns"]
    assert one["fractions"] == {"sigma_minus": 0.0, "pi": 0.0, "sigma_plus": pytest.approx(1.0)}
    assert one["fictitious_field"]["z_G"] != 0
    response = client.get(f"{base}&polarisation=pi&ellipticity=10")
    assert (response.status_code, response.json()["parameter"]) == (422, "polarisation")


def test_elements_are_the_operator(client: TestClient) -> None:
    """Elements couple m that differ by at most 2; without a field they make labels ambiguous, and it is said."""
    url = f"{GROUND}/lightshift?level=5p_2P3/2&wavelength=850&beam_angle=90&azimuth=40&elements=true&intensity=1kW/cm2"
    answer = client.get(url).json()
    elements = answer["elements"]
    steps = [abs(a - b) for a, b in zip(elements["row_m"], elements["column_m"], strict=True)]
    assert steps
    assert max(steps) <= 2
    largest = max(map(math.hypot, elements["real_MHz"], elements["imaginary_MHz"]))
    assert largest == pytest.approx(max(answer["columns"]["coupling_MHz"]), rel=1e-9)
    assert any("overlap" in text for text in answer["warnings"])
    assert client.get(url.replace("true", "false")).json()["elements"]["row_F"] == []


@pytest.mark.parametrize(
    ("query", "parameter"),
    [
        ("level=5s_2S1/2&wavelength=780.24602", "wavelength"),
        ("level=5s_2S1/2&wavelength=10", "wavelength"),
        ("level=5s_2S1/2&wavelength=1064&power=1", "waist"),
        ("level=5s_2S1/2&wavelength=1064&power=1&waist=50&intensity=3", "intensity"),
        ("level=5s_2S1/2&wavelength=1064&ellipticity=50", "ellipticity"),
        ("level=5s_2S1/2&wavelength=1064&sublevel=3,0", "sublevel"),
        ("level=5s_2S1/2", "wavelength"),
    ],
)
def test_bad_light_is_refused_by_name(client: TestClient, query: str, parameter: str) -> None:
    """What cannot be is a problem that names the parameter; light on a component says how far it must be."""
    problem = client.get(f"{GROUND}/lightshift?{query}").json()
    assert problem["status"] in (404, 422)
    assert problem["parameter"] == parameter


def test_level_without_strengths_is_told(client: TestClient) -> None:
    """A level none of whose lines has a strength is not answered with zero."""
    response = client.get("/v1/atoms/133Cs/polarisability?level=8p_2P3/2&start=1064")
    assert response.status_code == 422
    assert response.json()["type"] == "/problems/not-published"


def test_curve_has_null_on_a_line(client: TestClient) -> None:
    """A wavelength within a line has null, with the reason; the others have numbers. CSV has the same columns."""
    url = f"{GROUND}/polarisability?level=5s_2S1/2&start=780.2412&stop=790&points=3"
    answer = client.get(url).json()
    assert answer["columns"]["scalar_a03"][0] is None
    assert all(answer["columns"]["scalar_a03"][1:])
    assert {"column": "scalar_a03", "reason": "the light is within a line, where the formula stops"} in answer[
        "missing"
    ]
    rows = list(csv.reader(io.StringIO(client.get(f"{url}&format=csv").text)))
    assert rows[0] == list(answer["columns"])
    assert rows[1][1] == ""


def test_too_long_a_curve_is_refused(client: TestClient) -> None:
    """More points than an answer may hold are refused with the bound."""
    response = client.get(f"{GROUND}/polarisability?level=5s_2S1/2&start=700&stop=800&points=100001")
    assert response.status_code == 422
    assert response.json()["parameter"] == "points"


# Magic


def test_tune_out_and_the_curve_agree(client: TestClient) -> None:
    """At the tune-out wavelength the curve of that F crosses zero."""
    found = client.get(f"{GROUND}/magic?solve=tune-out&level=5s_2S1/2&F=2&start=781&stop=794").json()
    value, spread = found["columns"]["wavelength_nm"][0], found["columns"]["uncertainty"][0]
    assert value == pytest.approx(790.0324, abs=2 * spread)
    curve = client.get(f"{GROUND}/polarisability?level=5s_2S1/2&F=2&start={value!r}").json()
    assert abs(curve["columns"]["scalar_a03"][0]) < 1e-6


def test_magic_ellipticity_makes_shifts_equal(client: TestClient) -> None:
    """The two sublevels' shifts in the light that was found are equal, by `lightshift`."""
    pair = "level=5s_2S1/2&lower=1,-1&upper=2,-2"
    found = client.get(f"{GROUND}/magic?solve=ellipticity&{pair}&wavelength=1064&beam_angle=0&field=1").json()
    (ellipticity,) = found["columns"]["ellipticity_deg"]
    url = f"{GROUND}/lightshift?level=5s_2S1/2&wavelength=1064&beam_angle=0&field=1&ellipticity={ellipticity!r}"
    columns = client.get(url).json()["columns"]
    shifts = dict(zip(zip(columns["F"], columns["m"], strict=True), columns["shift_MHz"], strict=True))
    assert shifts[1.0, -1.0] == pytest.approx(shifts[2.0, -2.0], rel=1e-10)


def test_no_solution_has_a_reason(client: TestClient) -> None:
    """Without a solution the columns are empty, in full, and the reason says why."""
    found = client.get(f"{GROUND}/magic?level=5s_2S1/2&lower=1,0&upper=2,0&start=900&stop=1100").json()
    assert found["columns"]["wavelength_nm"] == []
    assert "comes closest to zero" in found["why_none"]
    assert found["proved"]


def test_doubly_insensitive_condition(client: TestClient) -> None:
    """The ellipticity is solved at the pair's field-insensitive fields; a pair without one says so."""
    base = f"{GROUND}/magic?solve=field_and_ellipticity&level=5s_2S1/2&wavelength=1064&beam_angle=0&max_field=2000"
    found = client.get(f"{base}&lower=1,-1&upper=2,0").json()
    assert found["why_none"] or found["columns"]["field_G"][0] == pytest.approx(654.39, abs=0.01)
    assert "no field-insensitive point" in client.get(f"{base}&lower=1,0&upper=2,1").json()["why_none"]


@pytest.mark.parametrize(
    ("query", "parameter"),
    [
        ("solve=wavelength&lower=1,0&start=800&stop=900", "upper"),
        ("solve=wavelength&start=800&stop=900", "lower"),
        ("solve=wavelength&lower=1,0&upper=2,0&stop=900", "start"),
        ("solve=ellipticity&lower=1,0&upper=2,0", "wavelength"),
        ("solve=tune-out&lower=1,0&upper=2,0&start=800&stop=900", "upper"),
        ("solve=tune-out&lower=1,0&start=900&stop=800", "range"),
        ("solve=tune-out&lower=3,0&start=800&stop=900", "sublevel"),
        ("solve=everything", "solve"),
    ],
)
def test_incomplete_magic_questions_are_refused(client: TestClient, query: str, parameter: str) -> None:
    """What is missing or cannot be is named."""
    problem = client.get(f"{GROUND}/magic?level=5s_2S1/2&{query}").json()
    assert problem["parameter"] == parameter, problem


# Pairs


def test_pairs_are_ranked_and_agree_with_insensitive(client: TestClient) -> None:
    """The pairs are those of `insensitive`, best figure first; with light they have a ratio and its uncertainty."""
    ranked = client.get(f"{GROUND}/pairs?level=5s_2S1/2&wavelength=1064").json()["columns"]
    assert ranked["figure_Hz"] == sorted(ranked["figure_Hz"])
    plain = client.get(f"{GROUND}/insensitive?level=5s_2S1/2").json()["columns"]
    assert sorted(ranked["field_G"]) == pytest.approx(sorted(plain["field_G"]))
    assert all(isinstance(value, float) for value in ranked["light_ratio_uncertainty"])


def test_optical_qubit_has_its_line(client: TestClient) -> None:
    """40Ca+ pairs between 4s and 3d 2D5/2 at a field are driven by 729 nm, the least sensitive with 0.56 MHz/G."""
    url = "/v1/atoms/40Ca%2B/pairs?level=4s_2S1/2&upper_level=3d_2D5/2&field=4&limit=12"
    columns = client.get(url).json()["columns"]
    assert set(columns["drive_line"]) == {"729"}
    assert abs(columns["slope_MHz_per_G"][0]) == pytest.approx(0.56, abs=0.005)


# The whole book


@pytest.mark.parametrize("species", SPECIES)
def test_every_level_answers_or_says_what_is_missing(species: str, client: TestClient, book: Catalogue) -> None:
    """Light shift, curve and tune-outs of every level of the reference isotope: finite numbers, or what is missing."""
    whole = book.species(species)[book.elements[species].element.reference_isotope]
    atom = quote(whole.isotope.name)
    for level in whole.levels:
        name = quote(level.name)
        for question in (
            f"lightshift?level={name}&wavelength=1063.17&beam_angle=40&ellipticity=10&field=3.2&power=1&waist=40",
            f"polarisability?level={name}&start=300&stop=1500&points=30",
            f"magic?solve=tune-out&level={name}&start=300&stop=1500",
        ):
            response = client.get(f"/v1/atoms/{atom}/{question}")
            answer = response.json()
            if response.status_code == 200:
                assert all(map(math.isfinite, numbers_in(answer)))
            else:
                assert answer["type"] == "/problems/not-published", (question, answer["detail"])
                assert answer["parameter"]


@pytest.mark.parametrize(("given", "echoed"), [("1064", 1064.0), ("1.064um", 1064.0), ("1064.1e0", 1064.1)])
def test_wavelength_in_any_unit_echoes_as_nanometres(given: str, echoed: float, client: TestClient) -> None:
    """A number keeps its digits, and one with a unit lands on the digits it has in nm."""
    answer = client.get("/v1/atoms/87Rb/pairs", params={"level": "5s_2S1/2", "wavelength": given}).json()
    assert answer["query"]["wavelength"] == echoed


@pytest.mark.parametrize("given", ["1_064", "\u0661064", "1064 ducks"])
def test_numbers_are_written_in_plain_digits(given: str, client: TestClient) -> None:
    """Underscores, digits of other scripts and unknown units are refused."""
    response = client.get("/v1/atoms/87Rb/pairs", params={"level": "5s_2S1/2", "wavelength": given})
    assert (response.status_code, response.json()["parameter"]) == (422, "wavelength")


def test_angles_beside_a_named_polarisation(client: TestClient) -> None:
    """Angles that contradict a named polarisation are refused by name; spelt-out defaults are not."""
    asked = {"level": "5s_2S1/2", "wavelength": "1064", "polarisation": "sigma+", "beam_angle": "90"}
    assert client.get("/v1/atoms/87Rb/pairs", params=asked).status_code == 200
    problem = client.get("/v1/atoms/87Rb/pairs", params={**asked, "ellipticity": "10"}).json()
    assert problem["detail"] == "polarisation says it all: leave out ellipticity"
