"""The parts that requests pass: the cache, the queue of long work, what happens when something breaks."""

import asyncio
import threading
from typing import Any

import pytest
from starlette.testclient import TestClient

from levels.quantity import Quantity
from service.answers import curated, sources_of, uncertain, uncertainty_columns
from service.app import build_app
from service.cache import AnswerCache, Reply
from service.citations import cite
from service.problems import Problem
from service.settings import Settings
from service.work import HeavyWork

SHIFT = "/v1/atoms/87Rb/shift?line=780&lower=2,2&upper=3,3&field=3.2"


def test_cache_is_bounded_and_forgets_the_oldest() -> None:
    """The cache never holds more than its bytes; what was used last stays."""
    cache = AnswerCache(100_000)
    replies = {number: Reply(200, (), bytes(5_000)) for number in range(30)}
    for number, reply in replies.items():
        cache.put(("/", str(number).encode(), b""), reply)
        cache.get(("/", b"0", b""))
        assert cache.held_bytes <= 100_000
    assert cache.get(("/", b"0", b"")) is replies[0]
    assert cache.get(("/", b"29", b"")) is replies[29]
    assert cache.get(("/", b"1", b"")) is None


def test_cache_refuses_what_would_fill_it() -> None:
    """One large answer does not push out all others."""
    cache = AnswerCache(10_000)
    cache.put(("/", b"", b""), Reply(200, (), bytes(9_000)))
    assert cache.held_bytes == 0


def test_work_beyond_the_queue_is_refused_at_once() -> None:
    """When threads and queue are full the next computation is refused with Retry-After, and later ones run again."""

    async def run() -> None:
        heavy = HeavyWork(Settings(heavy_threads=1, heavy_queue=1))
        gate = threading.Event()
        waiting = [asyncio.create_task(heavy.run(gate.wait)) for _ in range(2)]
        await asyncio.sleep(0.05)
        with pytest.raises(Problem) as caught:
            await heavy.run(gate.wait)
        assert (caught.value.type.name, caught.value.headers) == ("busy", {"Retry-After": "2"})
        gate.set()
        assert await asyncio.gather(*waiting) == [True, True]
        await asyncio.sleep(0.05)
        assert await heavy.run(lambda: 7) == 7
        heavy.close()

    asyncio.run(run())


def test_work_has_a_bound_on_its_seconds() -> None:
    """A computation over the bound is answered with a problem that names the bound."""

    async def run() -> None:
        heavy = HeavyWork(Settings(max_seconds=0.05))
        gate = threading.Event()
        with pytest.raises(Problem) as caught:
            await heavy.run(lambda: gate.wait(5))
        assert (caught.value.type.name, caught.value.allowed) == ("took-too-long", "0.05 s")
        gate.set()
        heavy.close()

    asyncio.run(run())


@pytest.mark.parametrize(
    "broken", ["service.asking.Work.answer", "service.asking.Work.pieces", "service.asking.choose"]
)
def test_own_mistakes_are_problems_without_details(broken: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """An unexpected exception anywhere is a 500 problem with CORS and request id; what it said stays in the log."""

    def fail(*given: Any) -> None:
        raise RuntimeError("a secret of the house")

    monkeypatch.setattr(broken, fail)
    with TestClient(build_app(Settings()), raise_server_exceptions=False) as client:
        response = client.get(SHIFT, headers={"Origin": "http://lab.example"})
    assert response.status_code == 500
    assert response.json()["type"] == "/problems/internal-error"
    assert response.headers["access-control-allow-origin"] == "*"
    assert response.json()["request_id"] == response.headers["x-request-id"]
    assert "secret" not in response.text


def test_a_number_that_is_not_finite_is_our_mistake(monkeypatch: pytest.MonkeyPatch) -> None:
    """A computed NaN becomes a 500 problem, never a null."""
    monkeypatch.setattr("service.routes.shift.numbers", lambda line, found: {"x": uncertain(float("nan"), 0, 0, "MHz")})
    with TestClient(build_app(Settings()), raise_server_exceptions=False) as client:
        assert client.get(SHIFT).json()["type"] == "/problems/internal-error"


def test_questions_before_the_start_are_told_to_wait() -> None:
    """Until the catalogue is loaded questions and readiness answer 503 with Retry-After; liveness answers."""
    client = TestClient(build_app(Settings()), raise_server_exceptions=False)  # not entered: its lifespan has not run
    for path in (SHIFT, "/health/ready"):
        response = client.get(path)
        assert (response.status_code, response.headers["retry-after"]) == (503, "1")
        assert response.json()["type"] == "/problems/not-ready"
    assert client.get("/health/live").json() == {"status": "live"}


def quantity(evidence: str = "checked", source: str = "a2000", note: str = "") -> Quantity:
    return Quantity(1.0, 0.1, "MHz", "1.0(1) MHz", source, evidence, note)


def test_sources_join_what_they_were_used_for() -> None:
    """One record for each publication and evidence; a number of several publications counts for each."""
    used = [
        ("A", quantity()),
        ("B", quantity(source="a2000; b2001")),
        ("C", quantity("recalled")),
        ("g", quantity("computed", "", "computed: a formula")),
        ("O", quantity(source="overlay:lab:A")),
    ]
    records = sources_of(used, {})
    assert [(record["id"], record["evidence"], record["used_for"]) for record in records] == [
        ("a2000", "checked", ["A", "B"]),
        ("b2001", "checked", ["B"]),
        ("a2000", "recalled", ["C"]),
        ("computed", "computed", ["g"]),
        ("overlay:lab:A", "checked", ["O"]),
    ]
    assert records[3]["citation"] == "computed: a formula"


def test_unknown_uncertainty_is_null_with_a_reason() -> None:
    """NaN, the library's sign of an unknown uncertainty, is null with a reason; values never are."""
    number = uncertain(1.5, float("nan"), 0.2, "MHz")
    assert (number["value"], number["uncertainty"]) == (1.5, None)
    assert "0.2 MHz" in number["reason"]
    columns, reasons = uncertainty_columns({"x": [1.0, float("nan")], "y": [1.0, 2.0]})
    assert columns["x"] == [1.0, None]
    assert list(reasons) == ["x"]
    assert curated(None, "MHz", "I = 0")["reason"] == "I = 0"


@pytest.mark.parametrize(
    ("item", "citation"),
    [
        ({"author": [{"family": "Ye"}, {"literal": "et al."}], "issued": {"date-parts": [[1996]]}}, "Ye et al. (1996)"),
        ({"author": [{"family": name} for name in "ABCDE"], "container-title": "J"}, "A et al., J"),
        ({"title": "Tables", "publisher": "Press"}, "Tables, Press"),
        ({}, ""),
    ],
)
def test_citations_say_what_is_known(item: dict[str, Any], citation: str) -> None:
    """A citation has what the entry has, and nothing else."""
    assert cite(item) == citation
