"""Times two ways of doing one thing in turn, and prints the ratio beside its bar."""

import statistics
import time
from collections.abc import Callable


def seconds(task: Callable[[], object]) -> float:
    """How long one run takes."""
    started = time.perf_counter()
    task()
    return time.perf_counter() - started


def median_ratio(slow: Callable[[], object], quick: Callable[[], object], pairs: int) -> float:
    """The median over pairs of runs, one right after the other, of slow over quick."""
    return statistics.median(seconds(slow) / seconds(quick) for _ in range(pairs))


def report(name: str, measured: str, bar: str, note: str = "") -> None:
    """One line: what, how much, what it should be."""
    print(f"{name:<58} {measured:>12}   bar {bar:<12} {note}", flush=True)
