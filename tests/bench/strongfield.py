"""(s) All sublevels of large levels and of whole terms at 1,000 fields, and the other answers about strong fields."""

import statistics
from collections.abc import Callable

import numpy as np

from levels.catalogue import load
from levels.cooling import cooling
from levels.crossings import crossings
from levels.fits import Source, formula
from levels.strongfield import term_sublevels
from levels.sublevels import constants_of, sublevels
from levels.terms import term_of
from levels.trapping import trapping
from tests.bench.measure import report, seconds
from tests.records_for_tests import LARGE, RB87_P3

FIELDS = np.linspace(0.0, 1000.0, 1000)


def median_ms(task: Callable[[], object], runs: int = 7) -> float:
    """The median time of a task in ms, once it is warm."""
    task()
    return 1e3 * statistics.median(seconds(task) for _ in range(runs))


def run() -> None:
    """Print each time beside its bar, where it has one."""
    book = load()
    holmium = book.find_level("165Ho", book.atom("165Ho").isotope.ground)
    levels = (("128 sublevels (165Ho ground level)", holmium), ("128 sublevels (invented)", LARGE))
    for name, level in levels:
        time = median_ms(lambda level=level: sublevels(level, FIELDS))  # type: ignore[misc]
        report(f"{name} at 1,000 fields", f"{time:.0f} ms", "200 ms")
    for atom_name, level_name in (("7Li", "2p_2P3/2"), ("4He", "2p_3P1"), ("87Sr", "5s.5p_3P2")):
        atom = book.atom(atom_name)
        term = term_of(atom, book.find_level(atom, level_name))
        time = median_ms(lambda term=term: term_sublevels(term, FIELDS))  # type: ignore[misc]
        report(f"{atom_name} {level_name} in its whole term at 1,000 fields", f"{time:.0f} ms", "none")
    lithium = book.atom("7Li")
    term = term_of(lithium, book.find_level(lithium, "2p_2P3/2"))
    report("crossings of 7Li 2p below 5 kG", f"{median_ms(lambda: crossings(term, 5000.0), 3):.0f} ms", "none")
    rubidium = book.atom("87Rb")
    ground, line = book.find_level(rubidium, "5s_2S1/2"), book.find_line(rubidium, "780")
    report("cooling figures of 87Rb 780", f"{median_ms(lambda: cooling(rubidium, line)):.1f} ms", "none")
    report("magnetic trap of 87Rb 5s", f"{median_ms(lambda: trapping(rubidium.isotope, ground)):.0f} ms", "none")
    source = (Source(1, constants_of(RB87_P3), (6, 2)),)
    report("fit of 87Rb 5p |3,1> over 100 G", f"{median_ms(lambda: formula(source, 0.0, 100.0, 1e-3)):.0f} ms", "none")
