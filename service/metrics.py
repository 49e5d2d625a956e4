"""Counters and latencies for Prometheus, labelled by route template; a path that is no route counts as one constant.

With several workers each writes to files in `PROMETHEUS_MULTIPROC_DIR` (set by `sublevel serve`) and any of them
answers for all.
"""

import os

from prometheus_client import CollectorRegistry, Counter, Histogram, generate_latest
from prometheus_client.multiprocess import MultiProcessCollector

UNMATCHED = "unmatched"
METHODS = frozenset({"GET", "HEAD", "POST", "OPTIONS", "PUT", "PATCH", "DELETE"})
CONTENT_TYPE = "text/plain; version=0.0.4; charset=utf-8"
SECONDS = (0.001, 0.0025, 0.005, 0.01, 0.025, 0.05, 0.1, 0.25, 0.5, 1.0, 2.5, 5.0, 10.0, 30.0, 60.0)


class Metrics:
    """The measurements of one application."""

    def __init__(self) -> None:
        self._registry = CollectorRegistry()
        self._requests = Counter(
            "sublevel_requests", "Requests answered", ("route", "method", "status"), registry=self._registry
        )
        self._seconds = Histogram(
            "sublevel_request_seconds", "Time to answer", ("route",), buckets=SECONDS, registry=self._registry
        )
        self._counters: dict[tuple[str, str, int], Counter] = {}
        self._histograms: dict[str, Histogram] = {}

    def count(self, route: str, method: str, status: int, seconds: float) -> None:
        """Count one request. The labelled children are kept: finding them again costs more than counting."""
        method = method if method in METHODS else "other"
        counter = self._counters.get((route, method, status))
        if counter is None:
            counter = self._counters[route, method, status] = self._requests.labels(route, method, str(status))
            self._histograms.setdefault(route, self._seconds.labels(route))
        counter.inc()
        self._histograms[route].observe(seconds)

    def render(self) -> bytes:
        """Everything measured, by this worker or by all, as Prometheus text."""
        if "PROMETHEUS_MULTIPROC_DIR" not in os.environ:
            return bytes(generate_latest(self._registry))
        everyone = CollectorRegistry()
        MultiProcessCollector(everyone)  # type: ignore[no-untyped-call]
        return bytes(generate_latest(everyone))
