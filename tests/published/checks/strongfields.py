"""Fine-structure terms in strong fields: a level crossing, and the shift of clock states out of their whole term."""

from collections.abc import Callable

from levels.catalogue import Catalogue
from levels.crossings import crossings
from levels.derive import lande
from levels.quantity import Quantity
from levels.records import Level
from levels.strongfield import term_sublevels
from levels.terms import ZERO_GAP, Term, term_of
from tests.published.checks.table import FOUND, MEMORY, Check, half

BUDICK = "Budick et al., Phys. Rev. 147, 1 (1966)"


def lithium_3p() -> Term:
    """Li 3p by itself: the catalogue has no energies of its levels. The nuclear spin is left out."""

    def of(twice_J: int) -> Level:
        name = f"3p_2P{twice_J}/2"
        return Level("7Li", name, twice_J, 0, -1, term="2P", g_J=lande(name, "2P", "LS", twice_J))

    gap = Quantity(2882.9, 1.2, "MHz", "2882.9(12) MHz", "budick1966", "checked")
    return Term(of(1), (of(1), of(3)), (ZERO_GAP, gap))


def quadratic_mhz_per_tesla2(atom: str, level: str) -> Callable[[Catalogue], float]:
    """Quadratic coefficient at zero field of a J = 0 level without nuclear spin, in its whole term."""

    def read(book: Catalogue) -> float:
        found = term_sublevels(term_of(book.atom(atom), book.find_level(atom, level)), 0.0)
        return float(found.quadratic_hz_per_gauss2[0, 0]) * 100

    return read


CHECKS = (
    Check(
        "li7-3p-crossing", "an interval of 2882.9(12) MHz in Li 3p makes |3/2,-3/2> meet |1/2,1/2> at 915 G",
        f"{BUDICK}: the interval found in its text, the field from memory", MEMORY, 915.0, half("915"), "G",
        "half of the last printed digit; the interval's uncertainty makes 0.4 G",
        lambda book: crossings(lithium_3p(), 5000.0)[0].field_gauss,
    ),
    Check(
        "sr88-3p0-term", "88Sr 3P0 falls by 23.38(5) MHz/T2, out of its whole term",
        "Lu et al., Chin. Phys. B 31, 043101 (2022)", FOUND, -23.38, 0.10, "MHz/T2", "twice the published uncertainty",
        quadratic_mhz_per_tesla2("88Sr", "5s.5p_3P0"),
    ),
    Check(
        "yb174-3p0-term", "174Yb 3P0 falls by 6.2 MHz/T2, out of its whole term",
        "Taichenachev et al., Phys. Rev. Lett. 96, 083001 (2006)", MEMORY, -6.2, half("6.2"), "MHz/T2",
        "half of the last printed digit", quadratic_mhz_per_tesla2("174Yb", "6s.6p_3P0"),
    ),
)  # fmt: skip
