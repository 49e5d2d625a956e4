"""Constants that papers state and other checks rest on, compared with what the catalogue recommends."""

from collections.abc import Callable

from levels.catalogue import Catalogue
from levels.quantity import Quantity
from tests.published.checks.table import FOUND, MEMORY, Check

Rows = tuple[tuple[str, str, float, float], ...]

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


def branches(name: str, claim: str, source: str, evidence: str, rows: Rows) -> tuple[Check, ...]:
    """One check for each published fraction of one upper level."""
    return tuple(
        Check(f"{name}-{line}", f"{claim}: {expected:g} by {line} nm", source, evidence, expected, within, "1",
              "the published uncertainty", branching(atom, line))
        for atom, line, expected, within in rows
    )  # fmt: skip


def lifetime(atom: str, level: str) -> Callable[[Catalogue], float]:
    return lambda book: value(book.find_level(atom, level).lifetime)


def s_to_d_ratio(book: Catalogue) -> float:
    """Of the decays of 40Ca+ 4p 2P3/2, those to S over those to D."""
    s, *d = (value(book.find_line("40Ca+", line).branching) for line in ("393", "850", "854"))
    return s / sum(d)


def through_3d1(book: Catalogue) -> float:
    """Share of the decays of Sr 5s5p 1P1 that end in 3P0 through 3D1."""
    return value(book.find_line("88Sr", "2825").branching) * value(book.find_line("88Sr", "2603").branching)


def width_ratio(book: Catalogue) -> float:
    upper = book.find_line("6Li", "323").upper
    return value(book.find_line("6Li", "670.96").upper.width) / value(upper.width)


CA, BA, YB = "Gerritsma et al., Eur. Phys. J. D 50, 13 (2008)", "Zhang et al., Phys. Rev. A 101, 062515 (2020)", (
    "Feldker et al., Phys. Rev. A 97, 032511 (2018)"
)
OKAMOTO = "Okamoto et al., arXiv:2406.18942 (2024)"
HEROLD = "Herold et al., Phys. Rev. Lett. 109, 243003 (2012)"
SR_RANGE = "Hunter, Walker, Weiss, Phys. Rev. Lett. 56, 823 (1986); Cooper et al., Phys. Rev. X 8, 041055 (2018)"

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
    *branches("ca40-p3", "40Ca+ 4p 2P3/2 decays", CA, FOUND, (
        ("40Ca+", "393", 0.9347, 3e-4), ("40Ca+", "850", 0.00661, 4e-5), ("40Ca+", "854", 0.0587, 2e-4))),
    Check("ca40-s-to-d", "40Ca+ 4p 2P3/2 decays 14.31(5) times as often to S as to D", CA, FOUND, 14.31, 0.05, "1",
          "the published uncertainty", s_to_d_ratio),
    *branches("ca40-p1", "40Ca+ 4p 2P1/2 decays", "Ramm et al., Phys. Rev. Lett. 111, 023004 (2013)", MEMORY, (
        ("40Ca+", "866", 0.06435, 7e-5), ("40Ca+", "397", 0.93565, 7e-5))),
    *branches("ba138-p1", "138Ba+ 6p 2P1/2 decays", "Arnold et al., Phys. Rev. A 100, 032503 (2019)", FOUND, (
        ("138Ba+", "650", 0.268177, 4.2e-5), ("138Ba+", "493", 0.731823, 4.2e-5))),
    *branches("ba138-p3", "138Ba+ 6p 2P3/2 decays", BA, FOUND, (
        ("138Ba+", "455", 0.741716, 7.1e-5), ("138Ba+", "585", 0.028031, 2.3e-5), ("138Ba+", "614", 0.230253, 6.1e-5))),
    *branches("ba138-d5", "138Ba+ 5d 2D5/2 decays", "Auchter et al., Phys. Rev. A 90, 060501 (2014)", FOUND, (
        ("138Ba+", "1762", 0.846, 0.025),)),
    *branches("yb-p3", "Yb+ 6p 2P3/2 decays", YB, FOUND, (
        ("174Yb+", "1346", 0.0017, 1e-4), ("174Yb+", "1650", 0.0108, 5e-4))),
    *branches("yb-p1", "171Yb+ 6p 2P1/2 decays", "Olmschenk et al., Phys. Rev. A 76, 052314 (2007)", MEMORY, (
        ("171Yb+", "2438", 0.00501, 1.5e-4),)),
    *branches("sr88-p1", "88Sr+ 5p 2P1/2 decays", "Likforman et al., Phys. Rev. A 93, 052507 (2016)", FOUND, (
        ("88Sr+", "422", 0.9453, 5e-4),)),
    *branches("ca40-1p1", "40Ca 4s4p 1P1 decays", "Beverini et al., Phys. Rev. A 40, 5632 (1989)", MEMORY, (
        ("40Ca", "5547", 1e-5, 0.5e-5),)),
    Check("ba138-1p1-leak", "138Ba 6s6p 1P1 decays to D levels once in 330 times",
          "De et al., Phys. Rev. A 79, 041402 (2009)", MEMORY, 1 / 330, 1e-4, "1", "one last digit of 0.9970",
          lambda book: 1 - value(book.find_line("138Ba", "553").branching)),
    Check("sr88-1p1-leak", "88Sr 5s5p 1P1 decays to 1D2 once in 50,000 to 20,000 times", SR_RANGE, MEMORY, 3.5e-5,
          1.5e-5, "1", "the range of the published values; the catalogue recommends 1:36,000 of 2025",
          lambda book: value(book.find_line("88Sr", "6457").branching)),
    Check("sr-1p1-3d1-3p0", "Sr 5s5p 1P1 ends in 3P0 through 3D1 once in 3.9e6 times", OKAMOTO,
          FOUND, 1 / 3.9e6, 0.39 / 3.9e6, "1", "their rate to 3D1 is 83(32) s-1", through_3d1),
    Check("yb-p1-lifetime", "Yb+ 6p 2P1/2 lives 8.12(2) ns", "Olmschenk et al., Phys. Rev. A 80, 022502 (2009)", FOUND,
          8.12, 0.02, "ns", "the published uncertainty", lambda book: lifetime("174Yb+", "6p_2P1/2")(book) * 1e9),
    Check("cd-1p1-lifetime", "Cd 5s5p 1P1 lives 1.60(5) ns", "Hofsaess et al., Phys. Rev. Research 5, 013043 (2023)",
          FOUND, 1.60, 0.05, "ns", "the published uncertainty",
          lambda book: lifetime("111Cd", "5s.5p_1P1")(book) * 1e9),
    Check("cd-3p1-width", "Cd 5s2 1S0 - 3P1 is 67 kHz wide", "arXiv:2408.08424 (2024)", FOUND, 67.0, 0.5, "kHz",
          "half of the last printed digit", lambda book: value(book.find_level("111Cd", "5s.5p_3P1").width) * 1e3),
    Check("er166-841-lifetime", "the upper level of the Er 841 nm line lives 20(4) us",
          "Ban, Jacka, Hanssen, Reader, McClelland, Opt. Express 13, 3185 (2005)", FOUND, 20.0, 4.0, "us",
          "the published uncertainty", lambda book: value(book.find_line("166Er", "841").upper.lifetime) * 1e6),
    Check("li6-323-width", "the 323 nm line of 6Li is 7 times narrower than D2",
          "Duarte et al., Phys. Rev. A 84, 061406 (2011)", FOUND, 7.0, 1.0, "1", "printed as a whole number",
          width_ratio),
    Check("rb-6p1-element", "<6p 2P1/2||er||5s> of Rb is 0.3235(9) e a0", HEROLD, FOUND, 0.3235, 9e-4, "e a0",
          "the published uncertainty", lambda book: value(book.find_line("87Rb", "422").reduced_dipole)),
    Check("rb-6p3-element", "<6p 2P3/2||er||5s> of Rb is 0.5230(8) e a0", HEROLD, FOUND, 0.5230, 8e-4, "e a0",
          "the published uncertainty", lambda book: value(book.find_line("87Rb", "420").reduced_dipole)),
)  # fmt: skip
