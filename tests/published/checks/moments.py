"""Magnetic moments: who is trapped where, turning points of trapped states, gradients that balance gravity."""

from collections.abc import Callable

import numpy as np
from scipy.optimize import brentq

from levels.catalogue import Catalogue
from levels.constants import KB, H, U
from levels.sublevels import sublevels
from tests.published.checks.table import FOUND, MEMORY, PRACTICE, Check, half, slope

STANDARD_GRAVITY = 9.80665
SEEKERS = {
    "87Rb": ("5s_2S1/2", {(2, -2), (4, 2), (4, 4)}),
    "85Rb": ("5s_2S1/2", {(4, -2), (4, -4), (6, 2), (6, 4), (6, 6)}),
    "133Cs": ("6s_2S1/2", {(6, -2), (6, -4), (6, -6), (8, 2), (8, 4), (8, 6), (8, 8)}),
    "23Na": ("3s_2S1/2", {(2, -2), (4, 2), (4, 4)}),
    "40K": ("4s_2S1/2", {(9, m) for m in (1, 3, 5, 7, 9)} | {(7, -m) for m in (1, 3, 5, 7)}),
}


def sign_at_low_field(atom: str, level: str, label: tuple[int, int]) -> Callable[[Catalogue], float]:
    """+1 for a weak-field seeker (energy rises with the field), -1 for a strong-field seeker."""
    return lambda book: float(np.sign(slope(book, atom, level, label, 1.0)))


def trapped(atom: str) -> Callable[[Catalogue], float]:
    """How many of the ground sublevels at 0.1 G disagree with the printed list of weak-field seekers (0 m left out)."""

    def computed(book: Catalogue) -> float:
        level, expected = SEEKERS[atom]
        solved = sublevels(book.find_level(atom, level), 0.1)
        labels = zip(solved.twice_F.tolist(), solved.twice_m.tolist(), strict=True)
        rising = {
            label for label, s in zip(labels, solved.slope_mhz_per_gauss[0], strict=True) if s > 0 and label[1] != 0
        }
        return float(len(rising ^ expected))

    return computed


def turning_point(atom: str, level: str, label: tuple[int, int]) -> Callable[[Catalogue], float]:
    """The field where a weak-field seeker stops rising, from its slope."""
    return lambda book: float(brentq(lambda b: slope(book, atom, level, label, b), 1.0, 2000.0, xtol=1e-6))


def depth_millikelvin(atom: str, level: str, label: tuple[int, int]) -> Callable[[Catalogue], float]:
    """How far it has risen there from zero field, as a temperature."""

    def computed(book: Catalogue) -> float:
        solved = sublevels(book.find_level(atom, level), turning_point(atom, level, label)(book))
        at = np.nonzero((solved.twice_F == label[0]) & (solved.twice_m == label[1]))[0]
        return float(solved.shift_mhz[0, at][0]) * 1e6 * H / KB * 1e3

    return computed


def holding_gradient(label: tuple[int, int]) -> Callable[[Catalogue], float]:
    """Gradient in G/cm at which the magnetic force on 87Rb is its weight."""

    def computed(book: Catalogue) -> float:
        mass = book.atom("87Rb").isotope.mass
        assert mass is not None
        force = slope(book, "87Rb", "5s_2S1/2", label, 1.0) * 1e6 * H * 1e4  # J/T
        return mass.value * U * STANDARD_GRAVITY / force * 100  # T/m to G/cm

    return computed


def stretched_moment(atom: str, level: str) -> Callable[[Catalogue], float]:
    return lambda book: float(sublevels(book.find_level(atom, level), 1.0).moment_mu_b.max())


def seeking(atom: str, level: str, label: tuple[int, int], sign: int, source: str) -> Check:
    kind = "weak" if sign > 0 else "strong"
    return Check(
        f"seeker-{atom.lower()}-{label[0] // 2}-{label[1] // 2}",
        f"{atom} |{label[0] // 2},{label[1] // 2}> is {kind}-field seeking",
        source, FOUND, sign, 0, "1", "a sign", sign_at_low_field(atom, level, label),
    )  # fmt: skip


HARRIS = "Harris, Tierney, Cornish, J. Phys. B 41, 035303 (2008)"
MAIER = "Maier et al., Opt. Lett. 39, 3138 (2014)"
SCHRECK = "Schreck et al., Phys. Rev. Lett. 87, 080403 (2001)"
KETTERLE = "trap papers of the Ketterle group (2001)"
DIGIT = "half of the last printed digit"
CHECKS = (
    seeking("133Cs", "6s_2S1/2", (6, -6), 1, HARRIS),
    seeking("87Rb", "5s_2S1/2", (2, -2), 1, HARRIS),
    seeking("23Na", "3s_2S1/2", (4, -4), -1, "Goerlitz et al., Phys. Rev. Lett. 90, 090401 (2003)"),
    *(
        Check(f"seekers-{atom.lower()}", f"the weak-field seekers of the {atom} ground level are those with g_F m > 0",
              "standard list of magnetically trappable states", PRACTICE, 0, 0, "1", "a list", trapped(atom))
        for atom in SEEKERS
    ),
    Check("cr52-moment", "52Cr in its stretched ground sublevel has 6 muB", MAIER,
          FOUND, 6.0, 0.5, "muB", "printed to the magneton", stretched_moment("52Cr", "3d5.4s_7S3")),
    Check("dy164-moment", "164Dy in its stretched ground sublevel has 10 muB", MAIER,
          FOUND, 10.0, 0.5, "muB", "printed to the magneton", stretched_moment("164Dy", "4f10.6s2_5I8")),
    Check("na23-turning-field", "23Na |1,-1> stops being trapped at 316 G", KETTERLE,
          MEMORY, 316.0, half("316"), "G", DIGIT, turning_point("23Na", "3s_2S1/2", (2, -2))),
    Check("li7-turning-field", "7Li |1,-1> stops being trapped at 140 G", SCHRECK,
          MEMORY, 140.0, 5.0, "G", "printed to two digits; ours is 143.6 G", turning_point("7Li", "2s_2S1/2", (2, -2))),
    Check("li7-trap-depth", "7Li |1,-1> is at most 2.4 mK deep", SCHRECK,
          MEMORY, 2.4, 0.25, "mK",
          "10 %: ours is 2.595 mK from zero field; a trap's bottom lies at some gauss, each of which takes 0.03 mK, "
          "and the printed number does not say where it counts from", depth_millikelvin("7Li", "2s_2S1/2", (2, -2))),
    Check("rb87-holding-1-1", "87Rb |1,-1> is held against gravity by 30.5 G/cm",
          "Lin et al., Phys. Rev. A 79, 063631 (2009) and others", MEMORY, 30.5, 0.3, "G/cm",
          "1 %: printed with g_F = 1/2, without g_I", holding_gradient((2, -2))),
    Check("rb87-holding-22", "87Rb |2,2> is held against gravity by 15.3 G/cm", "standard", PRACTICE, 15.3,
          half("15.3"), "G/cm", DIGIT, holding_gradient((4, 4))),
)  # fmt: skip
