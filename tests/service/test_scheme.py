"""Schemes over HTTP: what beams drive, where atoms end, what goes dark, and what cannot be asked."""

from typing import Any

import numpy as np
import pytest
from starlette.testclient import TestClient

from levels.findings import KINDS
from service.client import Client, Refused
from service.routes.scheme import EXAMPLE
from tests.service.conftest import Server
from tests.service.test_problems import refused

COOLING, REPUMP = EXAMPLE["beams"]
PUMP: dict[str, Any] = {
    "name": "pump", "line": "D1", "component": "2-2", "direction": [0, 0, 1],
    "polarisation": {"handedness": "right"}, "saturation": 0.3,
}  # fmt: skip
PUMPING: dict[str, Any] = {
    "atom": "87Rb",
    "field": [0, 0, 1],
    "beams": [PUMP, {**PUMP, "name": "back", "component": "1-2", "linewidth": "1 MHz"}],
    "target": {"level": "5s_2S1/2", "sublevel": "2,2"},
}


def ask(client: TestClient, **changed: Any) -> dict[str, Any]:
    response = client.post("/v1/scheme", json={**EXAMPLE, **changed})
    assert response.status_code == 200, response.text
    answer: dict[str, Any] = response.json()
    return answer


def codes(answer: dict[str, Any]) -> list[str]:
    return [item["code"] for item in answer["findings"]]


def rows(columns: dict[str, list[Any]], **wanted: Any) -> list[dict[str, Any]]:
    """The rows of a table in which some columns have these cells."""
    cells = [dict(zip(columns, row, strict=True)) for row in zip(*columns.values(), strict=True)]
    return [row for row in cells if all(row[name] == value for name, value in wanted.items())]


def beam(**changed: Any) -> dict[str, Any]:
    """A request whose first beam is changed; None takes a member away."""
    first = {name: value for name, value in {**COOLING, **changed}.items() if value is not None}
    return {**EXAMPLE, "beams": [first, REPUMP]}


def test_populations_of_the_ion_are_whole(client: TestClient) -> None:
    """All eight sublevels of S1/2, D3/2 and P1/2 are there and their populations add up to 1."""
    populations = ask(client)["populations"]
    assert len(populations["population"]) == 8
    assert sum(populations["population"]) == pytest.approx(1.0)
    assert min(populations["population"]) >= 0.0


def test_photons_of_the_lines_add_up_to_the_scattering(client: TestClient) -> None:
    """The photons of each line add up, in the ratio of the branching of P1/2 (0.9357: Ramm et al. 2013)."""
    answer = ask(client)
    by_line = dict(zip(*answer["scattering_by_line"].values(), strict=True))
    assert sum(by_line.values()) == pytest.approx(answer["scattering"]["value"])
    assert by_line["397"] / (by_line["397"] + by_line["866"]) == pytest.approx(0.93565, abs=1e-4)


def test_linear_light_along_the_field_goes_dark(client: TestClient) -> None:
    """pi light leaves D3/2, m = +-3/2, dark (textbook): said as problems, with the vectors, and with a better field."""
    light = {"polarisation": {"linear": 0}}
    beams = [{**COOLING, **light}, {**REPUMP, **light}]
    answer = ask(client, field=[0, 0, 1], beams=beams, remedies=True)
    assert answer["works"] is False
    assert answer["scattering"]["value"] < 1e3
    dark = [item for item in answer["findings"] if item["code"] == "dark-state"]
    assert {item["severity"] for item in dark} == {"problem"}
    assert "scatters" in dark[0]["change"]
    table = answer["dark_amplitudes"]
    assert {(row["F"], abs(row["m"])) for row in rows(table) if abs(row["amplitude_re"]) > 0.9} == {(1.5, 1.5)}
    assert sum(state["held"]["value"] for state in answer["dark_states"]) > 0.99


def test_dark_vectors_are_normalised(client: TestClient) -> None:
    """Each dark state's amplitudes, in two columns, have norm 1."""
    table = ask(client)["dark_amplitudes"]
    for state in set(table["state"]):
        some = rows(table, state=state)
        assert sum(row["amplitude_re"] ** 2 + row["amplitude_im"] ** 2 for row in some) == pytest.approx(1.0)


def test_polarisations_along_the_field(client: TestClient) -> None:
    """Fractions are the squares of the amplitudes and add up to 1; none is more than attainable."""
    table = ask(client)["polarisations"]
    assert table["polarisation"] == ["sigma-", "pi", "sigma+"] * 2
    squares = np.array(table["amplitude_re"]) ** 2 + np.array(table["amplitude_im"]) ** 2
    assert squares == pytest.approx(table["fraction"])
    assert np.array(table["fraction"]).reshape(2, 3).sum(axis=1) == pytest.approx([1, 1])
    assert np.all(np.array(table["fraction"]) <= np.array(table["attainable"]) + 1e-12)


def test_plate_setting_of_the_answer_reaches_what_it_says(client: TestClient) -> None:
    """A beam that passes the plates as told has the share of sigma+ that was said to be attainable."""
    told = rows(ask(client, **beam(wanted="sigma+"))["polarisations"], beam="cooling", polarisation="sigma+")[0]
    plates = [{"kind": "half", "angle": told["half_wave_deg"]}, {"kind": "quarter", "angle": told["quarter_wave_deg"]}]
    again = ask(client, **beam(polarisation={"polariser": 0, "plates": plates}))
    reached = rows(again["polarisations"], beam="cooling", polarisation="sigma+")[0]
    assert reached["fraction"] == pytest.approx(told["attainable"], abs=1e-9)


def test_components_say_detuning_and_what_is_wanted(client: TestClient) -> None:
    """A beam tuned to a Zeeman component drives it on resonance, as the one that it is meant for."""
    tuned = beam(detuning=None, lower="1/2,1/2", upper="1/2,-1/2")
    table = ask(client, **tuned)["components"]
    wanted = [row for row in rows(table, beam="cooling") if row["wanted"]]
    assert [(row["lower_m"], row["upper_m"]) for row in wanted] == [(0.5, -0.5)]
    assert wanted[0]["detuning_MHz"] == pytest.approx(0.0, abs=1e-6)
    assert all(row["near"] == (row["detuning_linewidths"] <= 10) for row in rows(table))


def test_absolute_frequency_is_the_detuning_from_the_centroid(client: TestClient) -> None:
    """The laser's frequency of the answer, asked for as an absolute frequency, is the same scheme."""
    frequency = ask(client)["beams"][0]["frequency"]["value"]
    same = ask(client, **beam(detuning=None, frequency=f"{frequency!r} THz"))
    assert same["beams"][0]["offset"]["value"] == pytest.approx(-10.0, abs=1e-3)


def test_power_and_waist_make_the_intensity(client: TestClient) -> None:
    """10 uW in a waist of 100 um peak at 2P/(pi w^2) = 63.66 mW/cm2."""
    found = ask(client, **beam(saturation=None, power="10 uW", waist="100 um"))["beams"][0]
    assert found["intensity"]["value"] == pytest.approx(63.66, abs=0.01)


def test_conventions_of_handedness_are_opposite(client: TestClient) -> None:
    """Right by `helicity` is left by `optics` (Born and Wolf, section 1.4); both name the same light."""
    one = ask(client, **beam(polarisation={"handedness": "right"}))
    two = ask(client, **beam(polarisation={"handedness": "left", "convention": "optics"}))
    assert one["polarisations"] == two["polarisations"]
    assert one["beams"][0]["helicity"]["value"] == pytest.approx(1.0)
    assert one["beams"][0]["azimuth"] == {"value": None, "uncertainty": None, "unit": "deg",
                                          "reason": "circular light has no long axis"}  # fmt: skip


def test_d1_pumping_ends_in_the_dark_target(client: TestClient) -> None:
    """sigma+ on D1 pumps 87Rb to |2,2>, which is dark there (published: issue's check list)."""
    answer = ask(client, **PUMPING)
    assert answer["works"]
    assert answer["pumping"]["asked"]
    assert answer["pumping"]["target"] == "5s_2S1/2 2,2"
    assert answer["pumping"]["purity"]["value"] == pytest.approx(1.0, abs=1e-5)
    assert {"dark-target", "purity"} <= set(codes(answer))
    assert answer["cycling"]["photons"]["value"] is None
    assert "target" in answer["cycling"]["photons"]["reason"]


def test_misalignment_is_a_finding_with_its_angle(client: TestClient) -> None:
    """8.7 degrees between beam and field limit sigma+ to (1 + cos^2)/2; the finding says both."""
    tilted = [np.sin(np.radians(8.7)), 0, np.cos(np.radians(8.7))]
    beams = [{**one, "wanted": "sigma+"} for one in PUMPING["beams"]]
    answer = ask(client, **{**PUMPING, "field": tilted, "beams": beams})
    limit = next(item for item in answer["findings"] if item["code"] == "geometry-limits-polarisation")
    assert limit["value"] == pytest.approx((1 + np.cos(np.radians(8.7)) ** 2) / 2)
    assert "8.7 deg" in limit["text"]
    assert answer["pumping"]["purity"]["value"] < 0.99


def test_missing_repumper_leaves_the_cycle(client: TestClient) -> None:
    """Cooling light alone on 87Rb D2: F = 1 fills up, and the photons before that are counted."""
    light = {"name": "c", "line": "780", "component": "2-3", "detuning": -6, "saturation": 1,
             "direction": [1, 0, 1], "polarisation": {"linear": 0}}  # fmt: skip
    answer = ask(client, atom="87Rb", field=[0, 0, 0.5], beams=[light])
    assert {"unlit-level", "leaves-cycle"} <= set(codes(answer))
    assert answer["cycling"]["photons"]["value"] > 100
    assert answer["cycling"]["exits"]["name"] == ["5s_2S1/2 F=1"]
    assert "a beam from 5s_2S1/2 F=1" in next(f for f in answer["findings"] if f["code"] == "unlit-level")["change"]


def test_start_populations_decide_where_they_must(client: TestClient) -> None:
    """sigma+ on 87Rb D1 F = 2 - 1 leaves m = 1 and 2 dark: atoms stay where they start, and the answer says so."""
    body = {**PUMPING, "beams": [{**PUMP, "component": "2-1"}], "target": None,
            "initial": [{"level": "5s_2S1/2", "sublevel": "2,2", "share": 1}]}  # fmt: skip
    answer = ask(client, **body)
    assert rows(answer["populations"], level="5s_2S1/2", F=2.0, m=2.0)[0]["population"] > 0.9


def test_models_can_be_chosen(client: TestClient) -> None:
    """Rate equations on request are said to be; their scattering is what Bloch equations state beside theirs."""
    bloch, rate = ask(client), ask(client, model="rate")
    assert (bloch["model"], rate["model"], rate["model_reason"]) == ("bloch", "rate", "asked for")
    assert rate["scattering"]["value"] == pytest.approx(bloch["scattering_by_rates"]["value"])
    assert rate["scattering_by_rates"]["value"] is None
    assert rate["shared_dark"]["state"] == []


def test_two_photon_resonance_has_shared_dark_states(client: TestClient) -> None:
    """Equal detunings of 397 and 866 nm: dark superpositions of S1/2 and D3/2 exist, as vectors over both."""
    answer = ask(client, field=[0, 0, 0], beams=[COOLING, {**REPUMP, "detuning": -10}])
    levels = {row["level"] for row in rows(answer["shared_dark"], state=1)}
    assert levels == {"4s_2S1/2", "3d_2D3/2"}
    assert "two-photon-resonance" in codes(answer)


def test_other_lines_are_listed(client: TestClient) -> None:
    """Cooling light at 397 nm also drives 393 nm, thousands of GHz away."""
    found = rows(ask(client)["other_lines"], beam="cooling", line="393")
    assert len(found) == 1
    assert -10_000 < found[0]["detuning_GHz"] < -1_000


@pytest.mark.parametrize("table", ["findings", "components", "polarisations", "populations", "other_lines"])
def test_csv_holds_the_table_asked_for(client: TestClient, table: str) -> None:
    """`table` chooses what CSV holds: the same columns as in the JSON."""
    whole = ask(client)
    lines = client.post("/v1/scheme", json={**EXAMPLE, "table": table, "format": "csv"}).text.splitlines()
    part = whole[table]
    names = list(part[0]) if isinstance(part, list) else list(part)
    assert lines[0].split(",") == names
    assert len(lines) - 1 == (len(part) if isinstance(part, list) else len(part[names[0]]))


def test_every_code_of_an_answer_is_in_the_table(client: TestClient) -> None:
    """Findings of answers have codes and units of /v1/findings, which is the library's table."""
    table = {row["code"]: row for row in client.get("/v1/findings").json()["findings"]}
    assert list(table) == [kind.code for kind in KINDS]
    for body in (EXAMPLE, PUMPING, {**EXAMPLE, "field": [0, 0, 0]}):
        for item in ask(client, **body)["findings"]:
            assert table[item["code"]]["unit"] == item["unit"]


def test_sources_name_lifetimes_and_branchings(client: TestClient) -> None:
    """What the rates rest on is among the sources, and evidence=checked refuses what was recalled."""
    used = [name for source in ask(client)["sources"] for name in source["used_for"]]
    assert {"lifetime of 4p_2P1/2", "branching of 397", "g_J of 4s_2S1/2"} <= set(used)
    answer = client.post("/v1/scheme", json={**EXAMPLE, "evidence": "checked"})
    assert refused(answer, 422, "recalled-evidence")["errors"]


BAD: tuple[tuple[dict[str, Any], int, str, str], ...] = (
    (beam(direction=[0, 0, 0]), 422, "invalid-parameter", "beams.0.direction"),
    (beam(direction=[1, 0]), 422, "invalid-parameter", "beams.0.direction"),
    (beam(direction=None), 422, "invalid-parameter", "beams.0.direction"),
    (beam(angle_to_field=3), 422, "invalid-parameter", "beams.0.direction"),
    (beam(polarisation={"vector": [1, 0, 0]}), 422, "invalid-parameter", "beams.0.polarisation"),
    (beam(polarisation={"vector": [0, 0, 0]}), 422, "invalid-parameter", "beams.0.polarisation"),
    (beam(polarisation={}), 422, "invalid-parameter", "beams.0.polarisation"),
    (beam(polarisation={"linear": 0, "handedness": "left"}), 422, "invalid-parameter", "beams.0.polarisation"),
    (beam(polarisation={"handedness": "up"}), 422, "invalid-parameter", "beams.0.polarisation.handedness"),
    (beam(polarisation={"ellipticity": 46}), 422, "invalid-parameter", "beams.0.ellipticity"),
    (beam(polarisation={"jones": [[0, "1"], 1]}), 422, "invalid-parameter", "beams.0.polarisation.jones.0"),
    (
        beam(polarisation={"polariser": 0, "plates": [{"angle": 0}]}),
        422,
        "invalid-parameter",
        "beams.0.polarisation.plates",
    ),
    (beam(polarisation={"linear": 0, "impurity": 2}), 422, "invalid-parameter", "beams.0.polarisation.impurity"),
    (beam(saturation=None, power=-1, waist=1), 422, "invalid-parameter", "beams.0.power"),
    (beam(saturation=None, power=1), 422, "invalid-parameter", "beams.0.intensity"),
    (beam(saturation=None), 422, "invalid-parameter", "beams.0.intensity"),
    (beam(saturation=None, intensity="3 MHz"), 422, "invalid-parameter", "beams.0.intensity"),
    (beam(component="1-2"), 404, "unknown-name", "beams.0.component"),
    (beam(lower="3/2,1/2", upper="1/2,1/2"), 404, "unknown-name", "beams.0.sublevel"),
    (beam(lower="1/2,1/2"), 422, "invalid-parameter", "beams.0.detuning"),
    (beam(line="398"), 404, "unknown-name", "beams.0.line"),
    (beam(line=None), 422, "missing-parameter", "beams.0.line"),
    (beam(detunning=3), 422, "unknown-parameter", "beams.0.detunning"),
    ({**EXAMPLE, "beams": []}, 422, "invalid-parameter", "beams"),
    ({**EXAMPLE, "beams": [COOLING] * 25}, 422, "invalid-parameter", "beams"),
    ({**EXAMPLE, "beams": [COOLING, COOLING]}, 422, "invalid-parameter", "beam"),
    ({**EXAMPLE, "field": [0, 0]}, 422, "invalid-parameter", "field.vector"),
    ({**EXAMPLE, "field": [0, 0, 2e6]}, 422, "invalid-parameter", "field.vector.2"),
    ({**EXAMPLE, "field": {}}, 422, "invalid-parameter", "field"),
    ({**EXAMPLE, "field": {"magnitude": 1, "vector": [0, 0, 1]}}, 422, "invalid-parameter", "field"),
    ({**EXAMPLE, "atom": "41Ca+"}, 404, "unknown-name", "atom"),
    ({**EXAMPLE, "target": {"level": "4s_2S1/2", "sublevel": "3/2,1/2"}}, 422, "invalid-parameter", "sublevel"),
    ({**EXAMPLE, "target": {"level": "9s", "sublevel": "1/2,1/2"}}, 404, "unknown-name", "level"),
    ({**EXAMPLE, "initial": [{"level": "4s_2S1/2", "share": 0.5}]}, 422, "invalid-parameter", "initial"),
    ({**EXAMPLE, "linewidths": 0}, 422, "invalid-parameter", "linewidths"),
    ({**EXAMPLE, "model": "quantum"}, 422, "invalid-parameter", "model"),
    ({**EXAMPLE, "table": "sublevels"}, 422, "invalid-parameter", "table"),
)


@pytest.mark.parametrize(("body", "status", "name", "parameter"), BAD)
def test_what_cannot_be_is_a_problem_that_says_so(
    client: TestClient, body: dict[str, Any], status: int, name: str, parameter: str
) -> None:
    """Bad geometry, powers, frequencies, names and bounds: each is a problem with the member that is wrong."""
    problem = refused(client.post("/v1/scheme", json=body), status, name)
    assert problem["parameter"] == parameter
    assert problem["detail"]


def test_longitudinal_polarisation_is_told_what_would_do(client: TestClient) -> None:
    """The problem says how much of the polarisation points along the beam, and to turn it."""
    problem = client.post("/v1/scheme", json=beam(polarisation={"vector": [1, 0, 1]})).json()
    assert "across the beam" in problem["allowed"]
    assert "0.707" in problem["allowed"]


def test_client_asks_schemes_and_scans(server: Server) -> None:
    """The client's methods answer typed records; a scan comes line by line; a refusal raises."""
    with Client(server.url) as client:
        assert client.scheme(**EXAMPLE).model == "bloch"
        assert client.findings().findings[0].code == KINDS[0].code
        assert client.gradients("87Rb", line="780", component="2-3", detuning=-30, saturation=0.5).configurations
        assert client.geometry(field=[0, 0, 1], beams=[{k: COOLING[k] for k in ("name", "direction", "polarisation")}])
        times = {"stop": 1, "points": 3}
        assert client.evolution(**EXAMPLE, times=times).columns.population[0] == pytest.approx(0.5)
        assert client.remedies(**EXAMPLE, magnitudes=[1], angles=[30], modulations=[], shifts=[]).columns.remedy
        axes = [{"parameter": "field_magnitude", "values": [1, 2]}]
        whole = client.scan(**EXAMPLE, axes=axes)
        lines = list(client.scan_lines(**EXAMPLE, axes=axes))
        assert [line["type"] for line in lines] == ["meta", "row", "row", "end"]
        assert [line["scattering_per_s"] for line in lines[1:3]] == whole.columns["scattering_per_s"]
        with pytest.raises(Refused):
            list(client.scan_lines(**EXAMPLE, axes=[]))
        with pytest.raises(Refused) as caught:
            client.trapcheck(**EXAMPLE, gradient=0)
        assert caught.value.problem.parameter == "gradient"
