"""The small questions beside a scheme: geometry, evolution, remedies, traps, polarisation gradients."""

from typing import Any

import numpy as np
import pytest
from starlette.testclient import TestClient

from service.app import build_app
from service.routes.scheme import EXAMPLE
from service.routes.trapcheck import QUESTION as TRAPCHECK
from service.settings import Settings
from tests.service.test_problems import refused
from tests.service.test_scheme import rows

TRAP: dict[str, Any] = dict(TRAPCHECK.body_example or {})
GRADIENTS = "/v1/atoms/87Rb/gradients"


def ask(client: TestClient, name: str, body: dict[str, Any]) -> dict[str, Any]:
    response = client.post(f"/v1/{name}", json=body)
    assert response.status_code == 200, response.text
    answer: dict[str, Any] = response.json()
    return answer


def test_a_beam_across_the_field_is_never_pure_sigma(client: TestClient) -> None:
    """Across the field at most half of the light is sigma+, whatever the polarisation (textbook)."""
    beams = [
        {"name": name, "direction": [1, 0, 0], "polarisation": light}
        for name, light in (("a", {"best_for": "sigma+"}), ("b", {"handedness": "right"}), ("c", {"linear": 0}))
    ]
    columns = ask(client, "geometry", {"field": [0, 0, 2], "beams": beams})["columns"]
    sigma = rows(columns, polarisation="sigma+")
    assert [row["attainable"] for row in sigma] == pytest.approx([0.5] * 3)
    assert [row["fraction"] for row in sigma] == pytest.approx([0.5, 0.25, 0.0])
    assert rows(columns, beam="c", polarisation="pi")[0]["fraction"] == pytest.approx(1.0)


def test_reversing_the_field_exchanges_sigma(client: TestClient) -> None:
    """With the field reversed sigma+ and sigma- are exchanged and pi stays."""
    beam = {"name": "a", "direction": [1, 2, 3], "polarisation": {"ellipticity": 20, "azimuth": 40}}
    up, down = (
        ask(client, "geometry", {"field": [0, 0, sign], "beams": [beam]})["columns"]["fraction"] for sign in (1, -1)
    )
    assert down == pytest.approx(up[::-1])


def test_quadrupole_lines_have_five_polarisations(client: TestClient) -> None:
    """An E2 line has q from -2 to 2; along the field circular light drives q = +1 only."""
    beam = {"name": "a", "direction": [0, 0, 1], "polarisation": {"handedness": "right"}}
    columns = ask(client, "geometry", {"field": [0, 0, 1], "beams": [beam], "multipole": "E2"})["columns"]
    assert columns["q"] == [-2, -1, 0, 1, 2]
    assert columns["fraction"] == pytest.approx([0, 0, 0, 1, 0])
    assert columns["half_wave_deg"][0] is None  # no light along the field drives q = -2


def test_field_by_size_and_angles(client: TestClient) -> None:
    """A field of 1 mT at polar 90, azimuth 90 degrees lies along y and is 10 G."""
    beam = {"name": "a", "direction": [0, 1, 0], "polarisation": {"handedness": "right"}}
    body = {"field": {"magnitude": "1 mT", "polar": 90, "azimuth": "90 deg"}, "beams": [beam]}
    field = ask(client, "geometry", body)["field"]
    assert field["magnitude"]["value"] == pytest.approx(10.0)
    assert (field["x"], field["y"], field["z"]) == pytest.approx((0, 1, 0), abs=1e-12)


def test_bad_geometry_is_told_with_its_beam(client: TestClient) -> None:
    """A zero direction in the second beam is told as the second beam's."""
    good = {"name": "a", "direction": [0, 0, 1], "polarisation": {"linear": 0}}
    body = {"field": [0, 0, 1], "beams": [good, {**good, "name": "b", "direction": [0, 0, 0]}]}
    problem = refused(client.post("/v1/geometry", json=body), 422, "invalid-parameter")
    assert problem["parameter"] == "beams.1.direction"


def test_populations_start_as_told_and_end_in_the_steady_state(client: TestClient) -> None:
    """At time zero the populations are those given; after many lifetimes they are those of /v1/scheme."""
    start = [{"level": "3d_2D3/2", "sublevel": "3/2,3/2", "share": 1}]
    body = {**EXAMPLE, "initial": start, "times": {"values": [0, "1 us", 200]}}
    columns = ask(client, "evolution", body)["columns"]
    first, last = rows(columns, time_us=0.0), rows(columns, time_us=200.0)
    assert [row["population"] for row in first if row["m"] == 1.5] == pytest.approx([1.0])
    steady = ask(client, "scheme", EXAMPLE)["populations"]["population"]
    assert [row["population"] for row in last] == pytest.approx(steady, abs=1e-4)
    for time in (0.0, 1.0, 200.0):
        assert sum(row["population"] for row in rows(columns, time_us=time)) == pytest.approx(1.0)


def test_rabi_oscillation_of_a_closed_transition(client: TestClient) -> None:
    """Strong resonant light turns half of the atoms over at half a Rabi period, before decay tells."""
    light = {"name": "a", "line": "461", "direction": [0, 0, 1],
             "polarisation": {"handedness": "right"}, "saturation": 20_000}  # fmt: skip
    base = {"atom": "88Sr", "field": [0, 0, 1], "beams": [light], "model": "bloch"}
    rabi = max(ask(client, "scheme", base)["components"]["rabi_MHz"])
    columns = ask(client, "evolution", {**base, "times": {"values": [0, 0.5 / rabi]}})["columns"]
    upper = [row for row in rows(columns) if "1P1" in row["level"] and row["time_us"] > 0]
    assert sum(row["population"] for row in upper) == pytest.approx(1.0, abs=0.02)


@pytest.mark.parametrize(
    ("times", "parameter"),
    [
        ({}, "times"),
        ({"stop": 1, "values": [1]}, "times"),
        ({"stop": 1, "logarithmic": True}, "times.start"),
        ({"values": [2, 1]}, "times"),
        ({"values": [-1]}, "times.values.0"),
        ({"stop": 1, "points": 3000}, "times.points"),
        ({"stop": "1 MHz"}, "times.stop"),
    ],
)
def test_times_that_cannot_be_are_refused(client: TestClient, times: dict[str, Any], parameter: str) -> None:
    """Times are given in one way, rise, and are not too many."""
    problem = refused(client.post("/v1/evolution", json={**EXAMPLE, "times": times}), 422, "invalid-parameter")
    assert problem["parameter"] == parameter


def test_long_evolutions_are_bounded() -> None:
    """More numbers than an answer may hold are refused, naming the bound."""
    with TestClient(build_app(Settings(max_numbers=100))) as client:
        response = client.post("/v1/evolution", json={**EXAMPLE, "times": {"stop": 1, "points": 3}})
    assert refused(response, 422, "answer-too-large")["allowed"] == "100 numbers"


def test_remedies_are_ranked_and_brighten_a_dark_ion(client: TestClient) -> None:
    """Light linear along the field: another field and a modulated polarisation both bring the light back."""
    linear = {"polarisation": {"linear": 0}}
    body = {
        **EXAMPLE,
        "field": [0, 0, 1],
        "beams": [{**beam, **linear} for beam in EXAMPLE["beams"]],
        "beam": "repump",
        "magnitudes": [1.5],
        "angles": [0, 55],
        "modulations": [2],
        "shifts": [5],
    }
    answer = ask(client, "remedies", body)
    columns = answer["columns"]
    assert columns["scattering_per_s"] == sorted(columns["scattering_per_s"], reverse=True)
    assert answer["scattering"]["value"] < 1e3
    bright = {row["remedy"]: row["scattering_per_s"] for row in rows(columns) if row["angle_deg"] != 0.0}
    assert min(bright["field"], bright["modulation"], bright["second beam"]) > 1e5
    assert rows(columns, remedy="field", angle_deg=0.0)[0]["scattering_per_s"] < 1e3


def test_a_remedy_that_cannot_be_predicted_says_why(client: TestClient) -> None:
    """Modulated light needs Bloch equations: where there are none, the reason is a warning and the rest is answered."""
    light = {"line": "780", "component": "2-3", "direction": [0, 0, 1], "saturation": 1}
    beams = [
        {**light, "name": "a", "polarisation": {"handedness": "right"}},
        {**light, "name": "b", "detuning": 3, "polarisation": {"handedness": "left"}},
    ]
    body = {"atom": "87Rb", "field": [0, 0, 1], "beams": beams, "magnitudes": [], "modulations": [1], "shifts": [4]}
    answer = ask(client, "remedies", body)
    assert answer["columns"]["remedy"] == ["second beam"]
    assert any("not tried" in text for text in answer["warnings"])
    assert refused(client.post("/v1/remedies", json={**body, "beam": "c"}), 404, "unknown-name")["nearest"] == [
        "a",
        "b",
    ]


def test_trap_follows_from_beams_and_coils(client: TestClient) -> None:
    """The usual six beams trap and cool 87Rb; with the current reversed they do not trap, detuned blue they heat."""
    right = ask(client, "trapcheck", TRAP)
    assert (right["traps"], right["cools"]) == (True, True)
    assert all(axis["advice"] == "" for axis in right["axes"])
    assert [axis["gradient"]["value"] for axis in right["axes"]] == pytest.approx([10.0, -5.0, -5.0])
    wrong = ask(client, "trapcheck", {**TRAP, "gradient": "-0.1 T/m"})
    assert (wrong["traps"], wrong["cools"]) == (False, True)
    assert all("reverse the handedness" in axis["advice"] for axis in wrong["axes"])
    assert all(axis["frequency"]["value"] is None for axis in wrong["axes"])
    blue = ask(client, "trapcheck", {**TRAP, "beams": [{**beam, "detuning": 10} for beam in TRAP["beams"]]})
    assert blue["cools"] is False


def test_type_two_lines_carry_their_warning(client: TestClient) -> None:
    """F = 2 - 2 on D1 is of type II: the answer says what the model leaves out."""
    beams = [{**beam, "line": "795", "component": "2-2"} for beam in TRAP["beams"]]
    answer = ask(client, "trapcheck", {**TRAP, "beams": beams})
    assert any("F' <= F" in text for text in answer["warnings"])


def test_gradient_of_zero_is_refused(client: TestClient) -> None:
    """Coils without a current make no trap: refused with the range."""
    problem = refused(client.post("/v1/trapcheck", json={**TRAP, "gradient": 0}), 422, "invalid-parameter")
    assert problem["parameter"] == "gradient"


def test_gradients_answer_both_configurations(client: TestClient) -> None:
    """Red of 2 - 3 both configurations cool below Doppler; blue neither does, with the reason."""
    red = client.get(f"{GRADIENTS}?line=780&component=2-3&detuning=-30&saturation=0.5").json()["configurations"]
    assert [(one["configuration"], one["works"]) for one in red] == [("lin-perp-lin", True), ("sigma+sigma-", True)]
    assert red[0]["depth"]["value"] > 0.0
    assert red[1]["depth"]["value"] == 0.0
    assert red[0]["depth_temperature"]["value"] == pytest.approx(red[0]["depth"]["value"] * 47.99, rel=1e-3)  # h/kB
    blue = client.get(f"{GRADIENTS}?line=780&component=2-3&detuning=30&saturation=0.5").json()["configurations"]
    assert not any(one["works"] for one in blue)
    assert "red detuning" in blue[0]["reasons"][0]
    assert blue[0]["temperature"]["value"] is None


@pytest.mark.parametrize(
    ("query", "parameter"),
    [
        ("detuning=0&saturation=1", "detuning"),
        ("detuning=-30", "intensity"),
        ("detuning=-30&saturation=1&intensity=1", "intensity"),
        ("detuning=-30&saturation=-1", "saturation"),
    ],
)
def test_gradients_refuse_what_cannot_be(client: TestClient, query: str, parameter: str) -> None:
    """No detuning, no light, or two ways to say how much: refused by name."""
    answer = client.get(f"{GRADIENTS}?line=780&component=2-3&{query}")
    assert refused(answer, 422, "invalid-parameter")["parameter"] == parameter


def test_impurity_is_a_share_of_the_light(client: TestClient) -> None:
    """2.3 % impurity of circular light along the field is 2.3 % of the other sigma."""
    beam = {"name": "a", "direction": [0, 0, 1], "polarisation": {"handedness": "right", "impurity": 0.023}}
    columns = ask(client, "geometry", {"field": [0, 0, 1], "beams": [beam]})["columns"]
    assert np.array(columns["fraction"]) == pytest.approx([0.023, 0.0, 0.977])
