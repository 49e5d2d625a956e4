"""Sweeps: the same numbers as single answers, within bounds, streamed when large."""

from typing import Any

import pytest
from starlette.testclient import TestClient

LEVEL: dict[str, Any] = {"atom": "87Rb", "level": "5s_2S1/2"}
LINE: dict[str, Any] = {"atom": "87Rb", "line": "780"}


def swept(client: TestClient, body: dict[str, Any]) -> dict[str, Any]:
    response = client.post("/v1/sweep", json=body)
    assert response.status_code == 200, response.text
    answer: dict[str, Any] = response.json()
    return answer


def test_rows_of_a_level_are_those_of_sublevels(client: TestClient) -> None:
    """At each field the rows are those that `sublevels` answers, in the same order."""
    names = ["energy_MHz", "shift_MHz", "slope_MHz_per_G", "quadratic_Hz_per_G2", "moment_muB"]
    columns = swept(client, {**LEVEL, "fields": {"values": [-2, "0.5mT", 700]}, "columns": names})["columns"]
    assert list(columns) == ["field_G", "F", "m", *names]
    for at, field in enumerate((-2.0, 5.0, 700.0)):
        single = client.get(f"/v1/atoms/87Rb/sublevels?level=5s_2S1/2&field={field}").json()["columns"]
        rows = slice(8 * at, 8 * at + 8)
        assert columns["field_G"][rows] == [field] * 8
        for name in ("F", "m", *names):
            assert columns[name][rows] == pytest.approx(single[name], rel=1e-11, abs=1e-9)


def test_rows_of_a_line_are_those_of_components(client: TestClient) -> None:
    """At each field the rows are those that `components` answers, in the same order."""
    names = ["offset_MHz", "frequency_THz", "shift_MHz", "slope_MHz_per_G", "quadratic_Hz_per_G2", "strength"]
    body = {**LINE, "fields": {"start": 1, "stop": 3, "points": 2}, "columns": names, "polarisation": "sigma-"}
    columns = swept(client, body)["columns"]
    single = client.get("/v1/atoms/87Rb/components?line=780&field=3&polarisation=sigma-").json()["columns"]
    rows = len(single["strength"])
    for name in ("lower_F", "lower_m", "upper_F", "upper_m", *names):
        assert columns[name][rows:] == pytest.approx(single[name], rel=1e-11, abs=1e-9)
    assert set(columns["polarisation"]) == {"sigma-"}


def test_states_can_be_chosen(client: TestClient) -> None:
    """Only the chosen sublevels or components come, in the chosen order."""
    columns = swept(client, {**LEVEL, "fields": {"values": [1]}, "sublevels": ["2,1", "1,-1"]})["columns"]
    assert list(zip(columns["F"], columns["m"], strict=True)) == [(2.0, 1.0), (1.0, -1.0)]
    columns = swept(client, {**LINE, "fields": {"values": [1]}, "lower": "2,2", "upper": "3,3"})["columns"]
    assert columns["slope_MHz_per_G"] == pytest.approx([1.3996], abs=2e-4)


def test_large_answer_is_streamed_whole(client: TestClient) -> None:
    """An answer near the bound comes without a Content-Length, complete, and the same in JSON and CSV."""
    body = {**LEVEL, "fields": {"start": 0, "stop": 1000, "points": 20_001}}
    response = client.post("/v1/sweep", json=body)
    assert "content-length" not in response.headers
    columns = response.json()["columns"]
    assert {len(column) for column in columns.values()} == {20_001 * 8}
    assert columns["field_G"][-1] == 1000.0
    text = client.post("/v1/sweep", json={**body, "format": "csv"})
    lines = text.text.splitlines()
    assert len(lines) == 20_001 * 8 + 1
    assert [float(cell) for cell in lines[-1].split(",")] == [columns[name][-1] for name in columns]


def test_bound_counts_every_number(client: TestClient) -> None:
    """The bound is on the numbers of the whole answer, labels included; just below it the sweep answers."""
    points = 1_000_000 // (8 * 5)
    over = client.post("/v1/sweep", json={**LEVEL, "fields": {"start": 0, "stop": 1, "points": points + 1}})
    assert over.status_code == 422
    assert over.json()["given"] == str((points + 1) * 40)
    assert over.json()["allowed"] == "1000000 numbers"
    under = client.post("/v1/sweep", json={**LEVEL, "fields": {"start": 0, "stop": 1, "points": points}})
    assert under.status_code == 200


def test_missing_frequency_is_null_with_a_reason(client: TestClient) -> None:
    """Absolute frequencies of a line without a centroid are null, and the answer says why."""
    for atom in client.get("/v1/atoms").json()["atoms"]:
        for line in client.get(f"/v1/atoms/{atom['name']}/lines").json()["lines"]:
            if line["frequency"]["value"] is not None:
                continue
            body = {"atom": atom["name"], "line": line["name"], "fields": {"values": [1]}, "columns": ["frequency_THz"]}
            response = client.post("/v1/sweep", json=body)
            if response.status_code == 200:
                answer = response.json()
                assert set(answer["columns"]["frequency_THz"]) == {None}
                assert answer["missing"] == [
                    {
                        "column": "frequency_THz",
                        "reason": "the frequency of this line's centroid is not in the catalogue",
                    }
                ]
                return
    pytest.fail("every line of the catalogue has a frequency: hold this against a lab overlay instead")
