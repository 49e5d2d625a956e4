"""What a strong field leaves of a line: counts of components, the anomalous Zeeman patterns of sodium, strengths."""

from collections.abc import Callable
from dataclasses import replace

import numpy as np

from levels.catalogue import Catalogue
from levels.components import Components, components
from levels.records import Line
from tests.published.checks.table import FOUND, MEMORY, PRACTICE, Check, in_magnetons

CASES = "Sargsyan et al., Opt. Lett. 39, 2270 (2014), arXiv:1309.5775"
CASES_D2 = "Sargsyan et al., arXiv:1405.7655 (2014)"
NOTES = "university notes on the anomalous Zeeman effect of the sodium D lines (2001)"
DIPOLES = "Steck, Rubidium 87 D Line Data, dipole tables"
PI_PAIRS = "Sargsyan et al., Phys. Lett. A, arXiv:2406.15607 (2024)"


def count_all(line: str) -> Callable[[Catalogue], float]:
    return lambda book: float(components(book.find_line("87Rb", line), 10.0, q=1).q.size)


def count_strong(line: str) -> Callable[[Catalogue], float]:
    """Components of sigma+ light at 1 T with more than a tenth of the strongest one's strength."""

    def computed(book: Catalogue) -> float:
        strength = components(book.find_line("87Rb", line), 1e4, q=1).strength[0]
        return float(np.count_nonzero(strength > 0.1 * strength.max()))

    return computed


def intense_pi(atom: str, line: str) -> Callable[[Catalogue], float]:
    """Of the pi components F - F+2 from the lower F at 500 G, how many have a tenth of the strongest or more."""

    def computed(book: Catalogue) -> float:
        found = components(book.find_line(atom, line), 500.0, q=0)
        lowest = found.lower_twice_F.min()
        strength = found.strength[0, (found.lower_twice_F == lowest) & (found.upper_twice_F == lowest + 4)]
        assert strength.size == lowest + 1
        return float(np.count_nonzero(strength >= 0.1 * strength.max()))

    return computed


def leaving(line: str, label: tuple[int, int]) -> Callable[[Catalogue], float]:
    """How many sigma+ components leave one lower sublevel."""

    def computed(book: Catalogue) -> float:
        found = components(book.find_line("87Rb", line), 1.0, q=1)
        return float(np.count_nonzero((found.lower_twice_F == label[0]) & (found.lower_twice_m == label[1])))

    return computed


def alone(line: Line) -> Line:
    """The line without fine-structure mixing: textbooks' patterns hold between hyperfine and fine structure."""
    return replace(line, lower=replace(line.lower, neighbours=()), upper=replace(line.upper, neighbours=()))


def strong_field(book: Catalogue, line: str, q: int) -> Components:
    return components(alone(book.find_line("23Na", line)), 1e5, q=q)


def outermost(line: str, q: int, rank: int) -> Callable[[Catalogue], float]:
    """The rank-th largest slope, in Lorentz units, of the strong components of one polarisation."""

    def computed(book: Catalogue) -> float:
        found = strong_field(book, line, q)
        slopes = found.slope_mhz_per_gauss[0, found.strength[0] > 0.05]
        distinct = sorted({round(in_magnetons(float(value)), 2) for value in slopes}, reverse=True)
        nearest = slopes[np.argmin(np.abs(slopes / 1.39962449 - distinct[rank]))]
        return in_magnetons(float(nearest))

    return computed


def strength_ratio(book: Catalogue) -> float:
    """Strong D2 sigma+ components come in two strengths; their ratio."""
    found = strong_field(book, "D2", 1)
    strong = np.sort(found.strength[0, found.strength[0] > 0.05])
    return float(strong[-1] / strong[0])


def lorentz(name: str, line: str, q: int, rank: int, expected: float, text: str) -> Check:
    return Check(
        f"na23-{name}", f"23Na {line} {text} in a strong field, in Lorentz units", NOTES, FOUND, expected, 0.004,
        "muB/h", "0.2 %: the notes set g_S = 2; nuclear terms are below 0.001", outermost(line, q, rank),
    )  # fmt: skip


def reduced(low: tuple[int, int], up: tuple[int, int]) -> Callable[[Catalogue], float]:
    """|<F m|d|F' m'>|^2 over |<J||d||J'>|^2 in the convention (2J+1)/(2J'+1) times our strength."""

    def computed(book: Catalogue) -> float:
        found = components(book.find_line("87Rb", "780"), 0.0)
        rows = zip(found.lower_twice_F, found.lower_twice_m, found.upper_twice_F, found.upper_twice_m, strict=True)
        at = list(rows).index((*low, *up))
        return float(found.zero_field_strength[at]) * 2 / 4

    return computed


def dipole(text: str, low: tuple[int, int], up: tuple[int, int], expected: float) -> Check:
    return Check(
        f"rb87-dipole-{text}", f"87Rb D2: the squared element of {text} is {expected:.6g} of |<J||er||J'>|^2", DIPOLES,
        MEMORY, expected, 1e-15, "1", "exact fractions", reduced(low, up),
    )  # fmt: skip


CHECKS = (
    Check("rb87-d1-sigma-all", "87Rb D1 has 12 sigma+ components", CASES, FOUND, 12, 0, "1", "a count",
          count_all("795")),
    Check("rb87-d1-sigma-strong", "of them 4 are left above 0.5 T", CASES, FOUND, 4, 0, "1", "a count",
          count_strong("795")),
    Check("rb87-d2-sigma-all", "87Rb D2 has 22 sigma+ components, F' - F = +-2 among them", CASES_D2, FOUND, 22, 0,
          "1", "a count", count_all("780")),
    Check("rb87-d2-sigma-strong", "of them 8 are left", CASES_D2, FOUND, 8, 0, "1", "a count", count_strong("780")),
    *(
        Check(f"pi-dF2-{atom.lower()}", f"{atom} D2: of the 2F+1 pi components F - F+2 one is intense at 500 G",
              PI_PAIRS, FOUND, 1, 0, "1", "a count", intense_pi(atom, line))
        for atom, line in (("87Rb", "780"), ("85Rb", "780"), ("133Cs", "852"))
    ),
    lorentz("d1-pi", "D1", 0, 0, 2 / 3, "pi components move by +-2/3"),
    lorentz("d1-sigma", "D1", 1, 0, 4 / 3, "sigma+ components move by 4/3"),
    lorentz("d2-pi", "D2", 0, 0, 1 / 3, "pi components move by +-1/3"),
    lorentz("d2-sigma-outer", "D2", 1, 0, 5 / 3, "weak sigma+ components move by 5/3"),
    lorentz("d2-sigma-inner", "D2", 1, 1, 1.0, "strong sigma+ components move by 1"),
    Check("na23-d2-sigma-strengths", "23Na D2: the inner sigma components are 3 times as strong as the outer", NOTES,
          FOUND, 3.0, 0.02, "1", "what hyperfine coupling is left at 10 T", strength_ratio),
    Check("rb87-d1-dark", "87Rb |2,2> has no sigma+ component on D1", "NeuroImage 199, 598 (2019), PMC6988110", FOUND,
          0, 0, "1", "a count", leaving("795", (4, 4))),
    Check("rb87-d2-bright", "and exactly one on D2, the cycling line", "standard", PRACTICE, 1, 0, "1", "a count",
          leaving("780", (4, 4))),
    dipole("sigma-2,2-3,3", (4, 4), (6, 6), 1 / 2),
    dipole("pi-2,0-3,0", (4, 0), (6, 0), 3 / 10),
    dipole("pi-2,1-3,1", (4, 2), (6, 2), 4 / 15),
    dipole("pi-2,2-3,2", (4, 4), (6, 4), 1 / 6),
)  # fmt: skip
