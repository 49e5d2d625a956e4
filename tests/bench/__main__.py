"""Runs every benchmark, or those named: `python -m tests.bench b c`."""

import sys

from tests.bench import algebra, requests, spectra, start

BENCHMARKS = {"a": requests.run, "b": spectra.run, "c": algebra.run, "d": start.run}

for letter in sys.argv[1:] or BENCHMARKS:
    BENCHMARKS[letter]()
