"""Cooling, forces, slowers and traps over HTTP: the numbers are the library's, and bad questions say what would do."""

import csv
import io
from typing import Any

import pytest
from starlette.testclient import TestClient

from levels.catalogue import Catalogue
from levels.cooling import cooling
from levels.trapping import trapping

COOLING = "/v1/atoms/87Rb/cooling?line=780"
TRAP = "/v1/atoms/87Rb/trap?level=5s_2S1/2"


def figures(client: TestClient, url: str) -> dict[str, Any]:
    answer = client.get(url)
    assert answer.status_code == 200, answer.text
    found: dict[str, Any] = answer.json()["figures"]
    return found


def test_every_figure_is_the_librarys(client: TestClient, book: Catalogue) -> None:
    """Each figure has value, uncertainty, unit, reason, formula, validity and source, as the library computed them."""
    found = figures(client, COOLING)
    expected = cooling(book.atom("87Rb"), book.find_line("87Rb", "780")).figures
    assert list(found) == list(expected)
    for name, figure in expected.items():
        record = found[name]
        assert (record["value"], record["uncertainty"], record["unit"]) == (
            figure.value,
            figure.uncertainty,
            figure.unit,
        )
        assert record["formula"]
        assert record["validity"]
        assert record["formula_source"]
        assert record["reason"] or record["uncertainty"] is not None


def test_settings_take_units(client: TestClient) -> None:
    """Detuning, intensity, velocity, gradient and distance come with units; the echo is in the canonical ones."""
    one = client.get(f"{COOLING}&detuning=-12MHz&intensity=30W/m2&velocity=50cm/s&gradient=0.1T/m&distance=5mm").json()
    two = client.get(f"{COOLING}&detuning=-12&intensity=3&velocity=0.5&gradient=10&distance=0.5").json()
    assert one["figures"] == two["figures"]
    assert one["query"]["distance"] == pytest.approx(0.5)
    assert (one["query"]["detuning"], one["query"]["intensity"]) == (-12.0, 3.0)


def test_narrow_line_and_ion_say_so(client: TestClient) -> None:
    """88Sr 689 nm is narrow and warns; 40Ca+ has no slower and says why, and no cycling component on 397 nm."""
    narrow = client.get("/v1/atoms/88Sr/cooling?line=689").json()
    assert narrow["regime"] == "narrow"
    assert any("Doppler limit lies below the recoil temperature" in text for text in narrow["warnings"])
    ion = client.get("/v1/atoms/40Ca%2B/cooling?line=397").json()
    assert (ion["lower_sublevel"], ion["upper_sublevel"]) == ("", "")
    assert ion["figures"]["slower_length"]["reason"] == "an ion is held and slowed by electric fields"
    named = figures(client, "/v1/atoms/40Ca%2B/cooling?line=397&lower=1/2,1/2&upper=1/2,-1/2")
    assert named["saturation_intensity"]["value"] > 0


def test_figures_as_rows(client: TestClient) -> None:
    """As CSV there is one row for each figure with its unit."""
    rows = list(csv.DictReader(io.StringIO(client.get(f"{COOLING}&format=csv").text)))
    by_name = {row["figure"]: row for row in rows}
    assert float(by_name["recoil_velocity"]["value"]) == pytest.approx(5.8845, abs=1e-4)
    assert by_name["recoil_velocity"]["unit"] == "mm/s"


def test_force_is_drawn_against_each_of_three(client: TestClient) -> None:
    """Against one of three the other two stay put; with no force the columns are null and say why."""
    for against, column in (
        ("velocity", "velocity_m_per_s"),
        ("detuning", "detuning_MHz"),
        ("intensity", "intensity_mW_per_cm2"),
    ):
        url = f"/v1/atoms/87Rb/force?line=780&against={against}&start=1&stop=3&points=3&detuning=-9&intensity=2"
        columns = client.get(url).json()["columns"]
        assert columns[column] == [1.0, 2.0, 3.0]
        others = [
            columns[name] for name in ("velocity_m_per_s", "detuning_MHz", "intensity_mW_per_cm2") if name != column
        ]
        assert all(len(set(values)) == 1 for values in others)
    answer = client.get("/v1/atoms/40Ca%2B/force?line=397&points=2").json()
    assert answer["columns"]["scattering_rate_per_s"] == [None, None]
    assert answer["missing"][0]["reason"].startswith("the line has no cycling component")


def test_slower_runs_from_speed_to_speed(client: TestClient) -> None:
    """The profile starts and ends at the asked speeds; its span is that of the figures."""
    answer = client.get("/v1/atoms/23Na/slower?line=D2&initial_speed=1000&final_speed=0&detuning=-50&points=11").json()
    field = answer["columns"]["field_G"]
    assert answer["columns"]["speed_m_per_s"][0] == 1000.0
    assert answer["columns"]["speed_m_per_s"][-1] == pytest.approx(0.0, abs=1e-6)
    assert field[0] - field[-1] == pytest.approx(answer["field_span"]["value"], rel=1e-12)
    assert answer["field_span"]["value"] == pytest.approx(1213, rel=1e-3)  # 0.12 T: Foot, Atomic Physics (2005)
    assert answer["columns"]["position_cm"][-1] == pytest.approx(answer["length"]["value"])


def test_trap_rows_are_the_librarys(client: TestClient, book: Catalogue) -> None:
    """Each row is the library's, with reasons where a number does not exist."""
    answer = client.get(f"{TRAP}&bottom=1&max_field=3000&depth=1mK").json()
    atom = book.atom("87Rb")
    expected = trapping(atom.isotope, book.find_level(atom, "5s_2S1/2"), 1.0, 3000.0, 1000.0)
    columns = answer["columns"]
    assert columns["F"] == [one.label[0] / 2 for one in expected]
    assert columns["turning_field_G"] == [one.turning_gauss for one in expected]
    assert columns["depth_MHz"] == [one.depth_mhz for one in expected]
    assert columns["knife_frequency_MHz"] == [one.knife and one.knife.frequency_mhz for one in expected]
    row = list(zip(columns["F"], columns["m"], strict=True)).index((1.0, -1.0))
    assert columns["turning_field_G"][row] == pytest.approx(1220.9, abs=0.1)
    assert columns["levitation_gradient_G_per_cm"][row] == pytest.approx(30.5, rel=0.01)  # common practice
    missing = {item["column"]: item["reason"] for item in answer["missing"]}
    nulls = {name for name, column in columns.items() if None in column}
    assert nulls == missing.keys()
    assert answer["losses"][0] == {
        "channel": "collisions with background gas",
        "acts": "always; set by the vacuum",
        "rate": {"value": None, "uncertainty": None, "unit": "s-1", "reason": "not in the catalogue"},
    }
    assert any("mass" in source["used_for"] for source in answer["sources"])


def test_metastable_level_decays_out_of_its_trap(client: TestClient) -> None:
    """88Sr 3P2 is held by its moment of 3 muB in the stretched sublevel; its decay is among the losses."""
    answer = client.get("/v1/atoms/88Sr/trap?level=5s.5p_3P2").json()
    assert answer["columns"]["moment_muB"][-1] == pytest.approx(-3.0, abs=0.01)
    assert any(loss["channel"] == "radiative decay of the level" for loss in answer["losses"])


BAD = (
    (f"{COOLING}&detuning=red", "detuning", "MHz"),
    (f"{COOLING}&intensity=0", "intensity", "mW/cm2"),
    (f"{COOLING}&gradient=5 parsec", "gradient", "G/cm"),
    (f"{COOLING}&lower=2,2", "upper", "together"),
    (f"{COOLING}&lower=2,2&upper=3,0", "upper", "from m = 2"),
    (f"{COOLING}&slower_share=2", "slower_share", ""),
    (f"{COOLING}&initial_speed=10&final_speed=20", "final_speed", "initial_speed"),
    ("/v1/atoms/87Rb/force?line=780&against=time", "against", "velocity"),
    ("/v1/atoms/87Rb/force?line=780&points=1", "points", ""),
    ("/v1/atoms/87Rb/force?line=780&against=intensity&start=-1", "start", "below zero"),
    ("/v1/atoms/87Rb/slower?line=795", "line", "no cycling component"),
    ("/v1/atoms/40Ca%2B/slower?line=393", "line", "electric fields"),
    ("/v1/atoms/87Rb/slower?line=780&initial_speed=5&final_speed=5", "final_speed", "below initial_speed"),
    (f"{TRAP}&bottom=-1", "max_field", "bottom from 0 G"),
    (f"{TRAP}&bottom=3000", "max_field", "above it"),
    (f"{TRAP}&depth=0", "depth", "uK"),
    (f"{TRAP}&depth=3 G", "depth", "uK"),
)


@pytest.mark.parametrize(("url", "parameter", "allowed"), BAD, ids=[case[0] for case in BAD])
def test_bad_questions_say_what_would_do(client: TestClient, url: str, parameter: str, allowed: str) -> None:
    """Each is refused as an invalid parameter with what would do."""
    response = client.get(url)
    body = response.json()
    assert (response.status_code, body["type"]) == (422, "/problems/invalid-parameter"), body
    assert body["parameter"] == parameter
    assert allowed in body["allowed"]


def test_every_line_and_level_is_answered(client: TestClient, book: Catalogue) -> None:
    """Whatever the catalogue holds, cooling and trap answer 200, or name the constant that is missing."""
    for name in ("87Rb", "88Sr", "171Yb", "40Ca+", "52Cr", "164Dy", "4He", "133Cs"):
        atom = book.atom(name)
        for line in atom.lines:
            response = client.get(f"/v1/atoms/{name.replace('+', '%2B')}/cooling", params={"line": line.name})
            assert response.status_code == 200, response.text
        for level in atom.levels[:8]:
            response = client.get(f"/v1/atoms/{name.replace('+', '%2B')}/trap", params={"level": level.name})
            assert response.status_code == 200 or response.json()["type"] == "/problems/not-published", response.text
