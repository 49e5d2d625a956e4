"""Clock pairs: field-insensitive points, quadratic coefficients, zero-field splittings and clock frequencies."""

from collections.abc import Callable

from levels.catalogue import Catalogue
from levels.constants import G_S, MU_B_MHZ_PER_GAUSS
from levels.multiplet import second_order
from tests.published.checks.table import FOUND, MEMORY, Check, Label, between, gap, half, slope_per_m, still_point

RB_PAIR = ((2, -2), (4, 2))
BE_PAIR = ((4, 0), (2, 2))
SZMUK = "Szmuk et al., Phys. Rev. A 92, 012106 (2015)"
LANGER = "Langer et al., Phys. Rev. Lett. 95, 060502 (2005)"


def zero_zero(atom: str, level: str, twice_F: int, twice_F_up: int) -> Callable[[Catalogue], float]:
    return lambda book: gap(book, atom, level, (twice_F, 0), (twice_F_up, 0)).quadratic_hz_per_gauss2


def splitting_hz(book: Catalogue, atom: str, level: str, twice_F: int, twice_F_up: int) -> float:
    twice_m = twice_F % 2
    return abs(gap(book, atom, level, (twice_F, twice_m), (twice_F_up, twice_m)).difference_mhz) * 1e6


def clock_quadratic(atom: str, lower: str, low: Label, upper: str, up: Label) -> Callable[[Catalogue], float]:
    return lambda book: between(book, atom, lower, low, upper, up).quadratic_hz_per_gauss2


def line_frequency_hz(book: Catalogue, atom: str, name: str) -> float:
    centroid = book.find_line(atom, name).centroid
    assert centroid is not None
    return centroid.value * 1e6


def carbon_like_calcium(book: Catalogue) -> float:
    """No element of the catalogue: 3P0, 3P1, 3P2 of Ca14+ from its coronal lines at 569.4 and 544.5 nm."""
    below, above = 299792458e3 / 569.4, 299792458e3 / 544.5
    lower = second_order(0, "3P", ((2, below),))[0]
    upper = second_order(2, "3P", ((0, -below), (4, above)))[1]
    return (upper - lower) * 1e6 * 100  # MHz/G2 to Hz/mT2


CHECKS = (
    Check(
        "rb87-trapped-clock-field", "87Rb |1,-1> - |2,1> stops moving at 3.2289 G",
        f"Harber et al., Phys. Rev. A 66, 053616 (2002); {SZMUK}", MEMORY, 3.2289, half("3.2289"), "G",
        "half of the last printed digit",
        lambda book: still_point(book, "87Rb", "5s_2S1/2", RB_PAIR, 50.0).field_gauss,
    ),
    Check(
        "rb87-trapped-clock-quadratic", "there it rises by 431.36 Hz/G2 (coefficient of (B - B0)^2)",
        SZMUK, MEMORY, 431.36, half("431.36"), "Hz/G2", "half of the last printed digit",
        lambda book: still_point(book, "87Rb", "5s_2S1/2", RB_PAIR, 50.0).quadratic_hz_per_gauss2,
    ),
    Check(
        "rb87-trapped-clock-frequency", "there it lies 4497.31 Hz below the zero-field hyperfine splitting",
        SZMUK, MEMORY, -4497.31, 0.1, "Hz", "0.1 Hz: the papers round the splitting itself to 1 mHz, g_I to 1e-6",
        lambda book: (
            still_point(book, "87Rb", "5s_2S1/2", RB_PAIR, 50.0).difference_mhz
            - gap(book, "87Rb", "5s_2S1/2", (2, 0), (4, 0)).difference_mhz
        ) * 1e6,
    ),
    Check(
        "be9-qubit-field", "9Be+ |2,0> - |1,1> stops moving at 119.4 G", LANGER, MEMORY, 119.4, half("119.4"), "G",
        "half of the last printed digit of 0.01194 T",
        lambda book: still_point(book, "9Be+", "2s_2S1/2", BE_PAIR, 500.0).field_gauss,
    ),
    Check(
        "be9-qubit-quadratic", "there it rises by 0.305 Hz/uT2", LANGER, MEMORY, 0.305, half("0.305"), "Hz/uT2",
        "half of the last printed digit",
        lambda book: still_point(book, "9Be+", "2s_2S1/2", BE_PAIR, 500.0).quadratic_hz_per_gauss2 * 1e-4,
    ),
    Check(
        "be9-qubit-frequency", "there the splitting is 1.2075 GHz", LANGER, MEMORY, 1.2075, half("1.2075"), "GHz",
        "half of the last printed digit",
        lambda book: still_point(book, "9Be+", "2s_2S1/2", BE_PAIR, 500.0).difference_mhz * 1e-3,
    ),
    Check(
        "be9-spin-flip", "9Be+ at 4.46 T flips the electron spin at 124 GHz (m_I = +3/2)",
        "Britton et al., Phys. Rev. A 93, 062511 (2016)", FOUND, 124.0, 0.5, "GHz", "printed to the GHz",
        lambda book: gap(book, "9Be+", "2s_2S1/2", (4, 2), (4, 4), 44600.0).difference_mhz * 1e-3,
    ),
    Check(
        "cs133-clock-quadratic", "133Cs |3,0> - |4,0> rises by 427.45 Hz/G2",
        "Vanier, Audoin, The Quantum Physics of Atomic Frequency Standards (1989)", MEMORY, 427.45, half("427.45"),
        "Hz/G2", "half of the last printed digit", zero_zero("133Cs", "6s_2S1/2", 6, 8),
    ),
    Check(
        "cs133-clock-dimensionless", "the Cs clock shifts by 8.7026e-10 / Hz times the squared spacing of its lines",
        "manufacturer's note for caesium standards, quoted on a mailing list (2008)", FOUND, 8.7026e-10, 5e-14, "1/Hz",
        "half of the last printed digit",
        lambda book: gap(book, "133Cs", "6s_2S1/2", (6, 0), (8, 0)).quadratic_hz_per_gauss2
        / ((slope_per_m(book, "133Cs", "6s_2S1/2", 8) - slope_per_m(book, "133Cs", "6s_2S1/2", 6)) * 1e6) ** 2,
    ),
    Check(
        "rb87-clock-quadratic", "87Rb |1,0> - |2,0> rises by 575.15 Hz/G2",
        "Steck, Rubidium 87 D Line Data (575.15); Vanier, Audoin (575.14)", MEMORY, 575.15, 0.01, "Hz/G2",
        "the two sources differ by 0.01", zero_zero("87Rb", "5s_2S1/2", 2, 4),
    ),
    Check(
        "rb85-clock-quadratic", "85Rb |2,0> - |3,0> rises by 1293.98 Hz/G2", "Steck, Rubidium 85 D Line Data", MEMORY,
        1293.98, half("1293.98"), "Hz/G2", "half of the last printed digit", zero_zero("85Rb", "5s_2S1/2", 4, 6),
    ),
    Check(
        "h1-clock-quadratic", "H |0,0> - |1,0> rises by 2750 Hz/G2", "hydrogen-maser literature (rounded)", MEMORY,
        2750.0, 0.01 * 2750.0, "Hz/G2",
        "1 %: the Breit-Rabi formula gives 2773.0 with the free-atom g factors, the printed number is a round one",
        zero_zero("1H", "1s_2S1/2", 0, 2),
    ),
    Check(
        "sr88-clock-quadratic", "88Sr 1S0 - 3P0 falls by 23.38(5) MHz/T2", "Lu et al., Chin. Phys. B 31, 043101 (2022)",
        FOUND, -0.2338, 2 * 0.0005, "Hz/G2", "twice the published uncertainty",
        clock_quadratic("88Sr", "5s2_1S0", (0, 0), "5s.5p_3P0", (0, 0)),
    ),
    Check(
        "sr88-clock-quadratic-2006", "88Sr 1S0 - 3P0 falls by 23.3 MHz/T2",
        "Taichenachev et al., Phys. Rev. Lett. 96, 083001 (2006)", MEMORY, -0.233, 0.0015, "Hz/G2",
        "half of the last digit, and 0.5 % because that estimate sets g_S = 2",
        clock_quadratic("88Sr", "5s2_1S0", (0, 0), "5s.5p_3P0", (0, 0)),
    ),
    Check(
        "yb174-clock-quadratic", "174Yb 1S0 - 3P0 falls by 6.2 MHz/T2",
        "Taichenachev et al., Phys. Rev. Lett. 96, 083001 (2006)", MEMORY, -0.062, half("0.062"), "Hz/G2",
        "half of the last printed digit", clock_quadratic("174Yb", "6s2_1S0", (0, 0), "6s.6p_3P0", (0, 0)),
    ),
    Check(
        "yb171-clock-quadratic", "171Yb 1S0 - 3P0 falls by 0.06095(7) Hz/G2", "McGrew et al., Nature 564, 87 (2018)",
        MEMORY, -0.06095, 0.003, "Hz/G2",
        "LS coupling is stated to be several percent off for Yb (it is 2.1 % here; another group finds 0.066(3))",
        clock_quadratic("171Yb", "6s2_1S0", (1, 1), "6s.6p_3P0", (1, 1)),
    ),
    Check(
        "al27-clock-quadratic", "27Al+ 1S0 - 3P0 falls by 71.988(48) MHz/T2",
        "Rosenband et al., Science 319, 1808 (2008)", MEMORY, -0.71988, 2 * 0.00048, "Hz/G2",
        "twice the published uncertainty", clock_quadratic("27Al+", "3s2_1S0", (5, 5), "3s.3p_3P0", (5, 5)),
    ),
    Check(
        "ca-14-plus-quadratic", "Ca14+ 3P0 - 3P1 (m = 0) rises by 0.39(4) Hz/mT2", "arXiv:2502.18926 (2025)", FOUND,
        0.39, 0.04, "Hz/mT2", "the published uncertainty; level distances from the coronal lines 569.4 and 544.5 nm",
        carbon_like_calcium,
    ),
    Check(
        "yb171-octupole-quadratic", "171Yb+ |0,0> - 2F7/2 |3,0> falls by 2.08(1) mHz/uT2",
        "Huntemann et al., Phys. Rev. Lett. 108, 090801 (2012); Godun et al., ibid. 113, 210801 (2014)", MEMORY,
        -20.8, 0.07 * 20.8, "Hz/G2", "7 %: A and g_J of 2F7/2 are known to a few percent (ours is 6.2 % lower)",
        clock_quadratic("171Yb+", "6s_2S1/2", (0, 0), "2F7/2", (6, 0)),
    ),
    Check(
        "yb171-quadrupole-quadratic", "171Yb+ |0,0> - 2D3/2 |2,0> rises by 52.1 mHz/uT2",
        "Tamm et al., Phys. Rev. A 80, 043403 (2009); Godun et al., Phys. Rev. Lett. 113, 210801 (2014)", MEMORY,
        521.0, 0.03 * 521.0, "Hz/G2", "3 %: A of 2D3/2 is known to 10 % only, and it carries a third of the shift",
        clock_quadratic("171Yb+", "6s_2S1/2", (0, 0), "5d_2D3/2", (4, 0)),
    ),
    Check(
        "hg199-quadrupole-quadratic", "199Hg+ |0,0> - 2D5/2 |2,0> falls by 18925(28) Hz/mT2",
        "Itano, J. Res. NIST 105, 829 (2000)", MEMORY, -189.25, 0.01 * 189.25, "Hz/G2",
        "1 %: g_J of 2D5/2 is the LS one, while the paper fits its own",
        clock_quadratic("199Hg+", "6s_2S1/2", (0, 0), "2D5/2", (4, 0)),
    ),
    Check(
        "mg25-splitting", "25Mg+ 3s splits by 1788762752.85(13) Hz", "Brewer et al., Phys. Rev. A 100, 013409 (2019)",
        FOUND, 1788762752.85, 0.13, "Hz", "the published uncertainty",
        lambda book: splitting_hz(book, "25Mg+", "3s_2S1/2", 4, 6),
    ),
    Check(
        "cd113-splitting", "113Cd+ 5s splits by 15199862855.02799(27) Hz", "Miao et al. (2023)", FOUND,
        15199862855.02799, 1e-4, "Hz", "the published uncertainty",
        lambda book: splitting_hz(book, "113Cd+", "5s_2S1/2", 0, 2),
    ),
    Check(
        "tm169-splitting", "169Tm ground level splits by 1496550658.23(3) Hz", "Mishin et al., arXiv:2406.20002 (2024)",
        FOUND, 1496550658.23, 0.03, "Hz", "the published uncertainty",
        lambda book: splitting_hz(book, "169Tm", "2F7/2", 6, 8),
    ),
    Check(
        "al27-clock-frequency", "27Al+ 1S0 - 3P0 is at 1121015393207851(8) Hz",
        "Rosenband et al., Phys. Rev. Lett. 98, 220801 (2007)", FOUND, 1121015393207851.0, 2 * 8.0, "Hz",
        "twice the published uncertainty; the catalogue recommends a later measurement",
        lambda book: line_frequency_hz(book, "27Al+", "267.4"),
    ),
    Check(
        "sr88-clock-closed-form", "the LS quadratic shift of 88Sr 3P0 is -(2/3)(g_S-1)^2 (muB/h)^2 / (E(3P1) - E(3P0))",
        "Taichenachev et al., Phys. Rev. Lett. 96, 083001 (2006), formula", MEMORY,
        -2 / 3 * ((G_S - 1) * MU_B_MHZ_PER_GAUSS) ** 2 / (434829121.311 - 429228066.418) * 1e6, 1e-6, "Hz/G2",
        "rounding of the two line frequencies in this row",
        clock_quadratic("88Sr", "5s2_1S0", (0, 0), "5s.5p_3P0", (0, 0)),
    ),
)  # fmt: skip
