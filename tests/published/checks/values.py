"""Constants that papers state and other checks rest on, compared with what the catalogue recommends."""

from collections.abc import Callable

from levels.catalogue import Catalogue
from levels.quantity import Quantity
from tests.published.checks.table import FOUND, Check

ROSENBAND = "Rosenband et al., Phys. Rev. Lett. 98, 220801 (2007)"
TWICE = "twice the published uncertainty"


def value(quantity: Quantity | None) -> float:
    assert quantity is not None
    return quantity.value


def g_I(atom: str, level: str) -> Callable[[Catalogue], float]:
    return lambda book: value(book.find_level(atom, level).g_I)


def g_ratio(book: Catalogue) -> float:
    level = book.find_level("87Rb", "5s_2S1/2")
    return abs(value(level.g_I) / value(level.g_J))


def reduced_ratio(atom: str, lines: tuple[str, str]) -> Callable[[Catalogue], float]:
    """|<P3/2||d||S>|^2 / |<P1/2||d||S>|^2 from the two lifetimes and frequencies, each level with one way out."""

    def computed(book: Catalogue) -> float:
        strong, weak = (book.find_line(atom, name) for name in lines)
        parts = [
            (line.upper.twice_J + 1) / value(line.upper.lifetime) / value(line.centroid) ** 3 for line in (strong, weak)
        ]
        return parts[0] / parts[1]

    return computed


def branching(atom: str, line: str) -> Callable[[Catalogue], float]:
    return lambda book: value(book.find_line(atom, line).branching)


CHECKS = (
    Check("be9-A", "A of 9Be+ 2s is -625008837.044(12) Hz at zero field",
          "Shiga, Itano, Bollinger, Phys. Rev. A 84, 012510 (2011)", FOUND, -625008837.044, 0.012, "Hz",
          "the published uncertainty", lambda book: value(book.find_level("9Be+", "2s_2S1/2").A) * 1e6),
    Check("al27-g-ground", "g of 27Al+ 1S0 is -0.00079248(14)", ROSENBAND, FOUND, -0.00079248, 1.4e-7, "muB",
          "the published uncertainty", g_I("27Al+", "3s2_1S0")),
    Check("al27-g-excited", "g of 27Al+ 3P0 is -0.00197686(21)", ROSENBAND, FOUND, -0.00197686, 2.1e-7, "muB",
          "the published uncertainty", g_I("27Al+", "3s.3p_3P0")),
    Check("sr87-g-ground", "g of 87Sr 1S0 is 1.306(52)e-4 (printed with a minus sign, in the opposite convention)",
          "Chin. Phys. Lett. 35, 043203 (2018)", FOUND, 1.306e-4, 2 * 0.052e-4, "muB", TWICE, g_I("87Sr", "5s2_1S0")),
    Check("sr88-g-3d1", "g of 88Sr 3D1 is 0.4995(88)", "arXiv:2007.10465 (2020)", FOUND, 0.4995, 0.0088, "1",
          "the published uncertainty", lambda book: value(book.find_level("88Sr", "5s.4d_3D1").g_J)),
    Check("hg199-g-3p0", "g of 199Hg 3P0 is -0.9485(49)e-3",
          "Porsev, Safronova, Safronova, Phys. Rev. A 96, 012509 (2017)", FOUND, -0.9485e-3, 0.0049e-3, "muB",
          "the published uncertainty", g_I("199Hg", "6s.6p_3P0")),
    Check("rb87-g-ratio", "|g_I/g_J| of 87Rb 5s is 4.9699147(44)e-4", "optical pumping measurement (1972)", FOUND,
          4.9699147e-4, 2 * 4.4e-10, "1", TWICE, g_ratio),
    Check("rb87-k39-g-ratio", "g_J(87Rb) / g_J(39K) is 1.00001845(7)", "optical pumping measurement (1972)", FOUND,
          1.00001845, 2 * 7e-8, "1", TWICE,
          lambda book: value(book.find_level("87Rb", "5s_2S1/2").g_J) / value(book.find_level("39K", "4s_2S1/2").g_J)),
    Check("rb87-reduced-ratio", "the squared reduced elements of the Rb D lines have the ratio 1.99221(3)",
          "Leonard, Fallon, Sackett, Safronova, Phys. Rev. A 92, 052501 (2015)", FOUND, 1.99221, 2 * 0.0020, "1",
          "twice what the lifetimes of the catalogue, 26.2348(77) and 27.679(27) ns, leave open",
          reduced_ratio("87Rb", ("780", "795"))),
    Check("cs133-reduced-ratio", "the squared reduced elements of the Cs D lines have the ratio 1.9808(2)",
          "Ratkata et al., Phys. Rev. A 104, 052813 (2021)", FOUND, 1.9808, 0.01, "1",
          "0.5 %: what lifetimes known to 0.15 to 0.25 % each leave open at twice their uncertainty",
          reduced_ratio("133Cs", ("852", "894"))),
)  # fmt: skip
