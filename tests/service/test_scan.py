"""Scans in this process: the same rows in every representation, bounds, refusals, and pools that break."""

import asyncio
import json
import os
import signal
from concurrent.futures import Executor, Future
from typing import Any

import numpy as np
import pytest
from starlette.testclient import TestClient

from levels.grid import Scan
from levels.vary import PARAMETERS
from service.app import build_app
from service.executors import Place
from service.problems import Problem
from service.routes.scan import ScanAsked, job_of, rows
from service.scans import Scans
from service.settings import Settings
from tests.service.scan_bodies import SMALL, columns_of, read_lines
from tests.service.test_formats import read_csv
from tests.service.test_problems import refused


def test_three_representations_hold_the_same_rows(client: TestClient) -> None:
    """JSON, NDJSON and CSV of a scan have the same columns, to the last bit."""
    whole = client.post("/v1/scan", json=SMALL).json()
    assert whole["points"] == 16
    rows_, others = read_lines(client.post("/v1/scan", json={**SMALL, "format": "ndjson"}).text)
    assert columns_of(rows_) == whole["columns"]
    assert [line["type"] for line in others][:1] == ["meta"]
    assert others[-1] == {"type": "end", "done": 16, "points": 16, "seconds": others[-1]["seconds"]}
    text = client.post("/v1/scan", json=SMALL, headers={"Accept": "text/csv"}).text
    lines = text.splitlines(keepends=True)
    table = read_csv("".join(line for line in lines if not line.startswith("# ")))
    assert list(table) == list(whole["columns"])
    assert [float(cell) for cell in table["scattering_per_s"]] == whole["columns"]["scattering_per_s"]
    assert json.loads(lines[0][2:])["type"] == "meta"
    assert json.loads(lines[-1][2:])["type"] == "end"


def test_meta_says_what_the_answer_would(client: TestClient) -> None:
    """The first line has the query with its defaults, axes, sources, release and warnings."""
    whole = client.post("/v1/scan", json=SMALL).json()
    meta = read_lines(client.post("/v1/scan", json={**SMALL, "format": "ndjson"}).text)[1][0]
    for name in ("query", "atom", "points", "axes", "sources", "release", "warnings", "uncertainty_excludes"):
        assert meta[name] == whole[name]
    assert [axis["key"] for axis in meta["axes"]] == ["field_magnitude_G", "detuning_MHz", "linear_deg"]


def test_grid_runs_with_the_last_axis_fastest(client: TestClient) -> None:
    """Values with units are in the axis' own unit, and the last axis runs fastest."""
    columns = client.post("/v1/scan", json=SMALL).json()["columns"]
    assert columns["field_magnitude_G"] == pytest.approx([0.5] * 8 + [3.0] * 8)
    assert columns["detuning_MHz"][:4] == [-30.0, -30.0, -20.0, -20.0]
    assert columns["linear_deg"][:4] == [0.0, 45.0, 0.0, 45.0]


def test_each_point_is_the_scheme_answered_alone(client: TestClient) -> None:
    """The row of a point has the scattering that /v1/scheme gives for the scheme described with its values."""
    columns = client.post("/v1/scan", json=SMALL).json()["columns"]
    cooling, repump = SMALL["beams"]
    direction = np.array(SMALL["field"]) / np.linalg.norm(SMALL["field"])
    body = {
        "atom": "40Ca+",
        "field": (3.0 * direction).tolist(),
        "beams": [{**cooling, "detuning": -20}, {**repump, "polarisation": {"linear": 45}}],
    }
    alone = client.post("/v1/scheme", json=body).json()
    assert columns["scattering_per_s"][11] == pytest.approx(alone["scattering"]["value"], rel=1e-6)


def test_missing_numbers_say_why(client: TestClient) -> None:
    """Where nothing leaves the cycle there is no number of photons: null, with the reason beside."""
    whole = client.post("/v1/scan", json=SMALL).json()
    assert set(whole["columns"]["photons_before_loss"]) == {None}
    assert [item["column"] for item in whole["missing"]] == ["photons_before_loss"]


def test_two_axes_of_one_parameter_have_their_own_columns(client: TestClient) -> None:
    """Both detunings scanned: the keys carry the axis' number."""
    axes = [{"parameter": "detuning", "beam": name, "values": [-5, 5]} for name in ("cooling", "repump")]
    columns = client.post("/v1/scan", json={**SMALL, "axes": axes}).json()["columns"]
    assert list(columns)[:2] == ["detuning_1_MHz", "detuning_2_MHz"]


def test_pumping_is_scanned_against_impurity_and_misalignment(client: TestClient) -> None:
    """87Rb D1 pumping into |2,2>: the purity falls with impurity and misalignment, and the photons are counted."""
    beams = [
        {"name": "pump", "line": "D1", "component": "2-2", "direction": [0, 0, 1],
         "polarisation": {"handedness": "right"}, "saturation": 0.3},
        {"name": "back", "line": "D1", "component": "1-2", "direction": [0, 0, 1],
         "polarisation": {"handedness": "right"}, "saturation": 0.3, "linewidth": 1},
    ]  # fmt: skip
    body = {
        "atom": "87Rb",
        "field": [0, 0, 1],
        "beams": beams,
        "target": {"level": "5s_2S1/2", "sublevel": "2,2"},
        "axes": [
            {"parameter": "impurity", "beam": "pump", "values": ["0", "1 %"]},
            {"parameter": "misalignment", "values": [0, 5]},
        ],
        "columns": ["purity", "pumping_time_us", "pumping_photons", "heating_uK", "fullest"],
    }
    columns = client.post("/v1/scan", json=body).json()["columns"]
    clean, tilted, impure, both = columns["purity"]
    assert clean == pytest.approx(1.0, abs=1e-6)
    assert both < impure < clean
    assert both < tilted < clean
    assert columns["fullest"][0] == "5s_2S1/2 2,2"
    assert columns["impurity"] == pytest.approx([0, 0, 0.01, 0.01])


INVALID = "invalid-parameter"
BAD: tuple[tuple[dict[str, Any], str, str], ...] = (
    ({"axes": []}, "invalid-parameter", "axes"),
    ({"axes": [{"parameter": "colour", "values": [1]}]}, "invalid-parameter", "axes.0.parameter"),
    ({"axes": [{"parameter": "detuning", "values": [1]}]}, "invalid-parameter", "axes.0.beam"),
    ({"axes": [{"parameter": "field_polar", "beam": "cooling", "values": [1]}]}, "invalid-parameter", "axes.0.beam"),
    ({"axes": [{"parameter": "field_polar"}]}, "invalid-parameter", "axes.0"),
    ({"axes": [{"parameter": "field_polar", "values": [1], "start": 1}]}, "invalid-parameter", "axes.0"),
    ({"axes": [{"parameter": "field_polar", "values": ["1 G"]}]}, "invalid-parameter", "axes.0"),
    ({"axes": [{"parameter": "field_polar", "values": [True]}]}, "invalid-parameter", "axes.0.values.0"),
    (
        {"axes": [{"parameter": "field_magnitude", "start": -1, "stop": 1, "points": 3, "logarithmic": True}]},
        "invalid-parameter",
        "axes.0",
    ),
    ({"axes": [{"parameter": "ellipticity", "beam": "cooling", "values": [50]}]}, INVALID, "axes.0.values"),
    ({"axes": [{"parameter": "saturation", "beam": "cooling", "values": [-1]}]}, INVALID, "axes.0.values"),
    ({"axes": [{"parameter": "field_magnitude", "values": [2e6]}]}, INVALID, "axes.0.values"),
    ({"columns": ["colour"]}, "invalid-parameter", "columns.0"),
    ({"columns": ["purity"]}, "invalid-parameter", "target"),
    ({"axes": [{"parameter": "field_polar", "start": 0, "stop": 1, "points": 200_000}]}, "answer-too-large", "axes"),
)  # fmt: skip


@pytest.mark.parametrize("kind", ["json", "ndjson", "csv"])
@pytest.mark.parametrize(("changed", "name", "parameter"), BAD)
def test_scans_that_cannot_be_are_problems_not_streams(
    client: TestClient, changed: dict[str, Any], name: str, parameter: str, kind: str
) -> None:
    """What can be known before the first point is a problem with its status, in every representation."""
    problem = refused(client.post("/v1/scan", json={**SMALL, **changed, "format": kind}), 422, name)
    assert problem["parameter"] == parameter


def test_what_fails_on_the_way_is_the_last_line(client: TestClient) -> None:
    """A point that cannot be solved ends the stream with its problem, after the rows before it."""
    pump = {"name": "p", "line": "780", "component": "2-3", "direction": [0, 0, 1], "saturation": 1}
    body = {
        "atom": "87Rb",
        "field": [0, 0, 1],
        "model": "bloch",
        "beams": [
            {**pump, "polarisation": {"handedness": "right"}},
            {**pump, "name": "q", "polarisation": {"handedness": "left"}},
        ],
        "axes": [{"parameter": "detuning", "beam": "q", "values": [0, 2]}],
    }
    rows_, others = read_lines(client.post("/v1/scan", json={**body, "format": "ndjson"}).text)
    assert len(rows_) == 1
    assert (others[-1]["type"], others[-1]["parameter"]) == ("error", "model")
    assert "frame" in others[-1]["allowed"]
    text = client.post("/v1/scan", json={**body, "format": "csv"}).text.splitlines()
    assert json.loads(text[-1][2:])["type"] == "error"
    assert refused(client.post("/v1/scan", json=body), 422, "invalid-parameter")["parameter"] == "model"


def test_error_lines_of_problems_keep_the_problems_type(client: TestClient) -> None:
    """A stream's error line has a `type` of its own: the problem's stands under `problem`."""
    pump = {"name": "p", "line": "780", "component": "2-3", "direction": [0, 0, 1], "saturation": 1}
    body = {
        "atom": "87Rb", "field": [0, 0, 1], "model": "bloch", "format": "ndjson",
        "beams": [{**pump, "polarisation": {"handedness": "right"}},
                  {**pump, "name": "q", "detuning": 2, "polarisation": {"handedness": "left"}}],
        "axes": [{"parameter": "field_magnitude", "values": [1]}],
    }  # fmt: skip
    error = read_lines(client.post("/v1/scan", json=body).text)[1][-1]
    assert (error["type"], error["problem"]) == ("error", "/problems/invalid-parameter")


def test_scans_at_the_same_time_are_bounded() -> None:
    """Beyond the bound a scan is refused with Retry-After; a place that was left is free again."""
    scans = Scans(Settings(scans_at_once=1))
    with scans.admitted():
        with pytest.raises(Problem) as caught, scans.admitted():
            pass
        assert (caught.value.type.name, caught.value.headers) == ("busy", {"Retry-After": "5"})
    with scans.admitted():
        pass


def test_seconds_are_bounded() -> None:
    """A scan that would take longer than allowed ends with a problem that names the bound."""
    with TestClient(build_app(Settings(max_scan_seconds=0.001, scan_workers=1))) as client:
        rows_, others = read_lines(client.post("/v1/scan", json={**SMALL, "format": "ndjson"}).text)
    assert rows_ == []
    assert (others[-1]["problem"], others[-1]["allowed"]) == ("/problems/took-too-long", "0.001 s")


def test_points_are_bounded() -> None:
    """A grid beyond the bound of this server is refused, naming it."""
    with TestClient(build_app(Settings(max_scan_points=15))) as client:
        assert refused(client.post("/v1/scan", json=SMALL), 422, "answer-too-large")["allowed"] == "15 points"


def job(client: TestClient) -> Scan:
    return job_of(client.app.api.state.running.context, ScanAsked.model_validate(SMALL))  # type: ignore[attr-defined]


def test_a_killed_process_of_the_pool_is_made_good(client: TestClient) -> None:
    """When a process of the pool is killed the pool is made again, and the scan goes on to the same rows."""

    async def run() -> tuple[list[Any], list[Any]]:
        scans = Scans(Settings(scan_workers=1))
        whole = job(client)
        before = [piece async for piece in scans.pieces(whole)]
        place = await scans._executors.place()
        for process in list(place.executor._processes.values()):  # type: ignore[attr-defined]
            os.kill(process.pid, signal.SIGKILL)
        after = [piece async for piece in scans.pieces(whole)]
        await scans.close()
        return before, after

    before, after = asyncio.run(run())
    cells = [[cell for piece in pieces for cell in piece.columns["scattering_per_s"]] for pieces in (before, after)]
    assert cells[0] == cells[1]
    assert len(cells[0]) == 16


class Refusing(Executor):
    """An executor that cancels whatever it is given, as one whose scheduler went away does."""

    def submit(self, fn: Any, /, *given: Any, **named: Any) -> "Future[Any]":
        future: Future[Any] = Future()
        future.cancel()
        return future


def test_an_executor_that_gives_pieces_up_is_tried_again_and_then_told(client: TestClient) -> None:
    """Pieces that the executor cancels of its own are sent again a few times; then the scan fails, it does not end."""

    async def run() -> None:
        scans = Scans(Settings())
        scans._executors._place = Place(Refusing(), 1, lambda: None)

        async def place() -> Place:
            return Place(Refusing(), 1, lambda: None)

        scans._executors.place = place  # type: ignore[method-assign]
        [piece async for piece in scans.pieces(job(client))]

    with pytest.raises(RuntimeError, match="gave a piece up"):
        asyncio.run(run())


def test_rows_are_those_of_the_library(client: TestClient) -> None:
    """The streamed tables, joined, have one row for each point of the grid."""

    async def run() -> int:
        scans = Scans(Settings(scan_workers=1))
        context = client.app.api.state.running.context  # type: ignore[attr-defined]
        count = sum([table.rows async for table in rows(scans, context, ScanAsked.model_validate(SMALL))])
        await scans.close()
        return count

    assert asyncio.run(run()) == 16


def test_models_name_the_rows_of_the_librarys_tables() -> None:
    """The names that a request may use are exactly those of the library's tables of parameters and columns."""
    from typing import get_args

    from levels.grid import COLUMNS
    from service.routes.scan import ColumnName, ParameterName

    assert get_args(ParameterName) == tuple(PARAMETERS)
    assert get_args(ColumnName) == tuple(COLUMNS)
