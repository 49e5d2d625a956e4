"""A real server: sockets, headers, shutdown, several workers."""

import http.client
import json
import signal
import socket
import threading
import time
from concurrent.futures import ThreadPoolExecutor

import httpx2
import pytest

from tests.service.conftest import Server, start_server, stop_server

SHIFT = "/v1/atoms/87Rb/shift?line=780&lower=2,2&upper=3,3&field=3.2"


def raw(server: Server, request: bytes, seconds: float = 5.0) -> bytes:
    """What comes back for raw bytes on a connection of its own."""
    with socket.create_connection(("127.0.0.1", server.port), timeout=seconds) as connection:
        connection.sendall(request)
        answer = b""
        try:
            while piece := connection.recv(65536):
                answer += piece
        except TimeoutError:
            pass
        return answer


def test_answers_have_a_length_and_stay_connected(server: Server) -> None:
    """Answers carry Content-Length and the connection is kept for the next request."""
    connection = http.client.HTTPConnection("127.0.0.1", server.port)
    for _ in range(3):
        connection.request("GET", SHIFT)
        response = connection.getresponse()
        assert int(response.headers["Content-Length"]) == len(response.read())
        assert not response.isclosed() or not response.will_close
    connection.close()


def test_head_sends_no_body(server: Server) -> None:
    """HEAD over a real connection: the length of GET, no bytes of body."""
    answer = raw(server, f"HEAD {SHIFT} HTTP/1.1\r\nHost: x\r\nConnection: close\r\n\r\n".encode())
    head, _, body = answer.partition(b"\r\n\r\n")
    assert head.startswith(b"HTTP/1.1 200")
    assert b"content-length: " in head
    assert body == b""


@pytest.mark.parametrize("path", [SHIFT, "/v1/atoms/87Rc", "/nowhere", "/docs", "/health/live"])
def test_every_answer_has_the_same_safety_headers(server: Server, path: str) -> None:
    """Every answer, also a refusal, has a request id, CORS and security headers, and no server software name."""
    headers = httpx2.get(f"{server.url}{path}", headers={"Origin": "http://lab.example"}).headers
    assert headers["access-control-allow-origin"] == "*"
    assert "ETag" in headers["access-control-expose-headers"]
    assert headers["x-content-type-options"] == "nosniff"
    assert headers["referrer-policy"] == "no-referrer"
    assert "default-src 'none'" in headers["content-security-policy"]
    assert "unsafe" not in headers["content-security-policy"]
    assert headers["x-request-id"]
    assert "server" not in headers


def test_preflight_is_answered(server: Server) -> None:
    """A browser's preflight for a posted sweep is allowed."""
    asked = {
        "Origin": "http://lab.example",
        "Access-Control-Request-Method": "POST",
        "Access-Control-Request-Headers": "content-type",
    }
    response = httpx2.options(f"{server.url}/v1/sweep", headers=asked)
    assert response.status_code == 200
    assert "POST" in response.headers["access-control-allow-methods"]


def test_request_id_is_taken_over_only_when_harmless(server: Server) -> None:
    """A client's own request id comes back; one with odd characters is replaced."""
    assert httpx2.get(server.url + SHIFT, headers={"X-Request-ID": "run-7"}).headers["x-request-id"] == "run-7"
    odd = httpx2.get(server.url + SHIFT, headers={"X-Request-ID": "a b<script>"}).headers["x-request-id"]
    assert odd != "a b<script>"


def test_giant_body_is_told_before_it_is_taken(server: Server) -> None:
    """A body of 5 MB is refused with a problem that the client gets to see, with a length and chunked."""
    giant = b" " * 5_000_000
    for content in (giant, iter([giant[:500_000]] * 10)):
        response = httpx2.post(f"{server.url}/v1/sweep", content=content)
        assert response.status_code == 413
        assert response.json()["type"] == "/problems/body-too-large"


@pytest.mark.parametrize(
    "request_text",
    [
        "GET /v1/atoms/87Rb/shift?line=%ZZ HTTP/1.1\r\nHost: x\r\nConnection: close\r\n\r\n",
        "GET /v1/atoms/%00/shift HTTP/1.1\r\nHost: x\r\nConnection: close\r\n\r\n",
        "GET //v1//atoms HTTP/1.1\r\nHost: x\r\nConnection: close\r\n\r\n",
        "POST /v1/sweep HTTP/1.1\r\nHost: x\r\nContent-Length: 99999999999999999999\r\nConnection: close\r\n\r\n",
        "BREW /v1/atoms HTTP/1.1\r\nHost: x\r\nConnection: close\r\n\r\n",
        "GET /v1/atoms HTTP/1.1\r\nHost: x\r\nAccept: \xff\xfe\r\nConnection: close\r\n\r\n",
        "nonsense\r\n\r\n",
    ],
)
def test_odd_requests_are_refused_without_a_failure(server: Server, request_text: str) -> None:
    """What is odd on the wire gets a 4xx, never a 5xx, and the server goes on."""
    answer = raw(server, request_text.encode("latin-1"))
    assert answer[:10] in (b"HTTP/1.1 4", b"HTTP/1.0 4"), answer[:200]
    assert httpx2.get(f"{server.url}/health/live").status_code == 200


def test_fast_requests_are_not_held_up_by_long_ones(server: Server) -> None:
    """While long sweeps run, a lookup still answers in far less than a sweep takes."""
    body = {"atom": "133Cs", "line": "852", "fields": {"start": 0, "stop": 500, "points": 200}}
    with ThreadPoolExecutor(2) as pool:
        started = time.perf_counter()
        sweeps = [pool.submit(httpx2.post, f"{server.url}/v1/sweep", json=body, timeout=60) for _ in range(2)]
        times = []
        with httpx2.Client(base_url=server.url) as client:
            while not all(sweep.done() for sweep in sweeps):
                asked = time.perf_counter()
                assert client.get(SHIFT).status_code == 200
                times.append(time.perf_counter() - asked)
        took = time.perf_counter() - started
    assert all(sweep.result().status_code == 200 for sweep in sweeps)
    assert sorted(times)[len(times) // 2] < took / 4


def test_metrics_count_by_route_template(server: Server) -> None:
    """Requests are counted under their route's template, and paths that do not exist under one constant."""
    httpx2.get(server.url + SHIFT)
    for path in ("/scan1", "/scan2", "/wp-admin"):
        httpx2.get(server.url + path)
    text = httpx2.get(f"{server.url}/metrics").text
    assert 'sublevel_requests_total{method="GET",route="/v1/atoms/{atom}/shift",status="200"}' in text
    assert 'route="unmatched",status="404"' in text
    assert "scan1" not in text
    assert "sublevel_request_seconds_bucket" in text


def test_stop_signal_lets_running_requests_finish() -> None:
    """SIGTERM while a sweep runs: the sweep is delivered whole, then the server ends cleanly."""
    process, server = start_server()
    body = {"atom": "133Cs", "line": "852", "fields": {"start": 0, "stop": 500, "points": 300}}
    answers: list[httpx2.Response] = []
    asking = threading.Thread(
        target=lambda: answers.append(httpx2.post(f"{server.url}/v1/sweep", json=body, timeout=60))
    )
    asking.start()
    time.sleep(0.15)
    process.send_signal(signal.SIGTERM)
    asking.join(timeout=60)
    output = stop_server(process)
    assert answers[0].status_code == 200
    assert answers[0].json()["columns"]["field_G"][-1] == 500.0
    assert process.returncode in (0, -signal.SIGTERM)
    assert b"Traceback" not in output


def test_two_workers_share_one_set_of_metrics() -> None:
    """With two workers any of them answers the metrics of both."""
    process, server = start_server("--workers", "2")
    try:
        for _ in range(40):  # a new connection each, so that both workers get some
            assert httpx2.get(server.url + SHIFT).status_code == 200
        lines = httpx2.get(f"{server.url}/metrics").text.splitlines()
    finally:
        output = stop_server(process)
    counted = [line for line in lines if "requests_total" in line and "/shift" in line]
    assert [float(line.rpartition(" ")[2]) for line in counted] == [40.0]
    assert b"Traceback" not in output


@pytest.mark.parametrize(
    ("options", "environment", "reason"),
    [
        (("--workers", "0"), {}, "workers"),
        (("--workers", "many"), {}, "workers"),
        ((), {"SUBLEVEL_MAX_NUMBERS": "none"}, "max_numbers"),
        ((), {"SUBLEVEL_OVERLAY": "/nowhere"}, "/nowhere: no such directory"),
    ],
)
def test_bad_settings_stop_the_start_with_a_reason(
    options: tuple[str, ...], environment: dict[str, str], reason: str
) -> None:
    """A setting that cannot be, or an overlay that is not there, ends the start with a line that names it."""
    with pytest.raises(RuntimeError, match=reason) as caught:
        start_server(*options, **environment)
    assert "Traceback" not in str(caught.value)


def test_answers_in_process_and_over_the_wire_are_the_same(server: Server) -> None:
    """Nothing between the application and the client changes an answer."""
    one = httpx2.get(server.url + SHIFT)
    two = httpx2.get(server.url + SHIFT)
    assert one.content == two.content
    assert json.loads(one.content)["line"] == "780"
