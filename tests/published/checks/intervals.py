"""Hyperfine intervals and offsets between components at zero field, and the field where J and I part."""

from collections.abc import Callable

from levels.catalogue import Catalogue
from levels.constants import MU_B_MHZ_PER_GAUSS
from levels.sublevels import constants_of
from tests.published.checks.table import FOUND, MEMORY, PRACTICE, Check, gap, half, zero_field_offset

GERGINOV = "Gerginov, Derevianko, Tanner, Phys. Rev. Lett. 91, 072501 (2003)"
YE = "Ye, Swartz, Jungner, Hall, Opt. Lett. 21, 1280 (1996)"
PUTLITZ = "zu Putlitz, Z. Phys. 175, 543 (1963)"
HEIDER = "Heider, Brink, Phys. Rev. A 16, 1371 (1977)"
LICHTEN = "McDermott, Lichten, Phys. Rev. 119, 134 (1960)"
# atom, level, 2F of the two, E(second) - E(first) in MHz, tolerance in MHz, its reason, source, evidence
TWICE, DIGIT = "twice the published uncertainty", "half of the last printed digit"
INTERVALS = (
    ("133Cs", "6p_2P3/2", 4, 6, 151.2247, 2 * 0.0016, TWICE, GERGINOV, MEMORY),
    ("133Cs", "6p_2P3/2", 6, 8, 201.2871, 2 * 0.0011, TWICE, GERGINOV, MEMORY),
    ("133Cs", "6p_2P3/2", 8, 10, 251.0916, 2 * 0.0020, TWICE, GERGINOV, MEMORY),
    ("87Rb", "5p_2P3/2", 0, 2, 72.218, 2 * 0.004, TWICE, YE, MEMORY),
    ("87Rb", "5p_2P3/2", 2, 4, 156.947, 2 * 0.007, TWICE, YE, MEMORY),
    ("87Rb", "5p_2P3/2", 4, 6, 266.650, 2 * 0.009, TWICE, YE, FOUND),
    ("85Rb", "5p_2P3/2", 2, 4, 29.372, half("29.372"), DIGIT, "Steck, Rubidium 85 D Line Data", MEMORY),
    ("85Rb", "5p_2P3/2", 4, 6, 63.401, 1e-3, "one last digit: A and B are printed rounded", "Steck, ibid.", MEMORY),
    ("85Rb", "5p_2P3/2", 6, 8, 120.640, half("120.640"), DIGIT, "Steck, Rubidium 85 D Line Data", MEMORY),
    ("87Sr", "5s.5p_3P1", 7, 9, -1130.26, half("1130.26"), DIGIT, PUTLITZ, MEMORY),
    ("87Sr", "5s.5p_3P1", 9, 11, -1463.16, half("1463.16"), DIGIT, PUTLITZ, MEMORY),
    ("87Sr", "5s.5p_3P2", 9, 11, -1170.208, 2 * 0.006, TWICE, HEIDER, FOUND),
    ("87Sr", "5s.5p_3P2", 11, 13, -1346.497, 2 * 0.006, TWICE, HEIDER, FOUND),
    ("199Hg", "6s.6p_3P2", 3, 5, 22666.559, 2 * 0.005, TWICE, LICHTEN, MEMORY),
    ("201Hg", "6s.6p_3P2", 1, 3, -5377.492, 1e-3, "printed to 1 kHz, sign by mu < 0", LICHTEN, MEMORY),
    ("201Hg", "6s.6p_3P2", 3, 5, -8629.522, 1e-3, "printed to 1 kHz, sign by mu < 0", LICHTEN, MEMORY),
    ("201Hg", "6s.6p_3P2", 5, 7, -11382.629, 1e-3, "printed to 1 kHz, sign by mu < 0", LICHTEN, MEMORY),
)  # fmt: skip


def interval(atom: str, level: str, low: int, up: int, expected: float, within: float, *rest: str) -> Check:
    """One measured hyperfine interval."""
    why, source, evidence = rest
    names = (f"{low // 2}", f"{up // 2}") if low % 2 == 0 else (f"{low}/2", f"{up}/2")
    m = low % 2
    return Check(
        f"interval-{atom.lower()}-{level.replace('/', '').replace('_', '-').lower()}-{up}-{low}",
        f"{atom} {level}: E(F = {names[1]}) - E(F = {names[0]}) = {expected} MHz",
        source, evidence, expected, within, "MHz", why,
        lambda book: gap(book, atom, level, (low, m), (up, m)).difference_mhz,
    )  # fmt: skip


def repump_minus_cooling(atom: str, line: str, F: int) -> Callable[[Catalogue], float]:
    """Frequency of F - F'=F+1 less that of F+1 - F'=F+2 (doubled F)."""
    return lambda book: zero_field_offset(book, atom, line, ((F, 0), (F + 2, 0))) - zero_field_offset(
        book, atom, line, ((F + 2, 0), (F + 4, 0))
    )


def decoupling(atom: str, level: str) -> Callable[[Catalogue], float]:
    """A/muB in kG, where the Zeeman energy of the electron is the hyperfine constant."""
    return lambda book: constants_of(book.find_level(atom, level)).A_mhz / MU_B_MHZ_PER_GAUSS * 1e-3


def b0(atom: str, level: str, printed: float, evidence: str) -> Check:
    return Check(
        f"decoupling-{atom.lower()}", f"{atom}: B0 = A/muB is {printed} kG",
        "Sargsyan, Hakhumyan, Leroy, Sarkisyan and others, papers on nanometric cells (2014 to 2022)", evidence,
        printed, 0.04 * printed, "kG", "4 %: printed rounded (Cs as 1.7 kG for 1.642 kG)", decoupling(atom, level),
    )  # fmt: skip


CHECKS = (
    *(interval(*row) for row in INTERVALS),
    Check(
        "rb87-repump-offset", "87Rb D2 1 - 2' lies 6568.03 MHz above 2 - 3'",
        "modulator frequency of Rb gravimeters (6.568 GHz)", PRACTICE, 6568.03, 0.05, "MHz",
        "the intervals are printed to some 10 kHz", repump_minus_cooling("87Rb", "780", 2),
    ),
    Check(
        "rb85-repump-offset", "85Rb D2 2 - 3' lies 2915.09 MHz above 3 - 4'", "laboratory practice (2.915 GHz)",
        PRACTICE, 2915.09, 0.1, "MHz", "the intervals are known to 0.1 MHz", repump_minus_cooling("85Rb", "780", 4),
    ),
    Check(
        "na23-repump-offset", "23Na D2 1 - 2' lies 1713.3 MHz above 2 - 3'", "laboratory practice (1.713 GHz)",
        PRACTICE, 1713.3, half("1713.3"), "MHz", "half of the last printed digit",
        repump_minus_cooling("23Na", "D2", 2),
    ),
    b0("87Rb", "5s_2S1/2", 2.4, MEMORY),
    b0("85Rb", "5s_2S1/2", 0.7, MEMORY),
    b0("133Cs", "6s_2S1/2", 1.7, MEMORY),
    b0("39K", "4s_2S1/2", 0.17, FOUND),
)  # fmt: skip
