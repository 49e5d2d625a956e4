"""Runs every benchmark, or those named: `python -m tests.bench b c`.

Both sides of every ratio run with one BLAS thread unless the environment says otherwise, as a worker of the service
does: on a busy machine threads that wait for each other measure the machine.
"""

import os
import sys

from service.cli import FEW_THREADS

for name in FEW_THREADS:
    os.environ.setdefault(name, "1")

from tests.bench import algebra, lightshift, planning, requests, scans, spectra, start, startup, steady, strongfield  # noqa: E402 - numpy reads the environment when imported

BENCHMARKS = {
    "a": requests.run,
    "b": spectra.run,
    "c": algebra.run,
    "d": start.run,
    "e": steady.run,
    "f": startup.run,
    "g": scans.run,
    "l": lightshift.run,
    "p": planning.run,
    "s": strongfield.run,
}

for letter in sys.argv[1:] or BENCHMARKS:
    BENCHMARKS[letter]()
