"""Tune-out and magic wavelengths, static polarisabilities: what papers state about light and the catalogue should give.

Tolerances are twice the two uncertainties in quadrature, ours as the answer gives it (strengths, frequencies, static
value, and a bound on what the lines leave out). Rows whose number the catalogue's lines cannot give are explained one
by one in `tests/published/test_lightshift.py`.
"""

from collections.abc import Callable

import numpy as np

from levels.catalogue import Catalogue
from levels.components import component
from levels.constants import MHZ_NM
from levels.magic import Side, Solution, magic_wavelengths, tune_outs
from levels.partners import Partners, partners_of
from levels.polarisability import polarisability
from levels.setting import Setting, make_setting
from tests.published.checks.table import FOUND, MEMORY, PRACTICE, Check, Label

LINEAR = make_setting(1000.0)
OURS = "twice ours and the published uncertainty in quadrature; ours is "
LEONARD = "Leonard, Fallon, Sackett, Safronova, Phys. Rev. A 92, 052501 (2015)"
CHENG = "Cheng, Jiang, Mitroy, Phys. Rev. A 88, 022511 (2013), calculated"


def side_of(book: Catalogue, atom: str, level: str) -> Partners:
    return partners_of(book.atom(atom), book.find_level(atom, level))


def tune_out(
    book: Catalogue,
    atom: str,
    level: str,
    between: tuple[float, float],
    label: Label | None = None,
    twice_F: int | None = None,
    setting: Setting = LINEAR,
) -> Solution:
    """The tune-out in a range that has exactly one."""
    (found,) = tune_outs(Side(side_of(book, atom, level), label, twice_F), setting, *between).solutions
    return found


def magic(
    book: Catalogue, atom: str, lower: str, upper: str, between: tuple[float, float], setting: Setting = LINEAR
) -> Solution:
    """The scalar magic wavelength of two levels in a range that has exactly one."""
    pair = Side(side_of(book, atom, lower)), Side(side_of(book, atom, upper))
    (found,) = magic_wavelengths(*pair, setting, *between).solutions
    return found


def tuned(atom: str, level: str, low: float, high: float, **more: object) -> Callable[[Catalogue], float]:
    return lambda book: tune_out(book, atom, level, (low, high), **more).value  # type: ignore[arg-type]


def purity(circularity: float) -> Setting:
    """Light along the field with this degree of circularity."""
    return make_setting(1000.0, 0.0, float(np.degrees(np.arcsin(circularity))) / 2)


def lithium_scalar_mhz(book: Catalogue) -> float:
    """The scalar tune-out of 7Li above the D1 component F = 2 to F' = 2."""
    resonance = component(book.find_line("7Li", "670.98"), (4, 0), (4, 2), 0.0).frequency_mhz
    assert resonance is not None
    return MHZ_NM / tune_out(book, "7Li", "2s_2S1/2", (670.9618, 670.9765), twice_F=4).value - resonance


def tensor_angle(_: Catalogue) -> float:
    return float(np.degrees(np.arccos(1 / np.sqrt(3))))


def rest(atom: str, level: str) -> Callable[[Catalogue], float]:
    """What the static value holds beyond core and lines, in a0^3."""
    return lambda book: side_of(book, atom, level).remainder.dispersing


def scalar(atom: str, level: str, wavelength_nm: float) -> Callable[[Catalogue], float]:
    return lambda book: float(polarisability(side_of(book, atom, level), wavelength_nm).numbers[0, 0])


def _static(atom: str, level: str, total: float, spread: float, tail: float, source: str, evidence: str) -> Check:
    """D lines and core fall short of the measured value by the levels above, which are few percent of it at most."""
    claim = f"the static value of {atom} is that of its lines and core, and of the levels above them"
    why = f"twice the measured {spread:g} a0^3, and the {tail:g} a0^3 that levels above may hold at most (1.5 %)"
    name = f"{atom} static polarisability less lines and core"
    return Check(name, claim, source, evidence, tail / 2, tail / 2 + 2 * spread, "a0^3", why, rest(atom, level))


GREGOIRE = "Gregoire et al., arXiv:1509.07091 (2015)"
TABLE = "2023 table of static dipole polarizabilities, through mendeleev"
S = "5s_2S1/2"
CHECKS: tuple[Check, ...] = (
    _static("7Li", "2s_2S1/2", 164.1125, 0.0005, 2.5, TABLE, FOUND),
    _static("23Na", "3s_2S1/2", 162.7, 0.5, 2.4, TABLE, FOUND),
    _static("39K", "4s_2S1/2", 290.0, 0.5, 4.4, GREGOIRE, FOUND),
    _static("87Rb", S, 320.1, 0.6, 4.8, GREGOIRE, FOUND),
    _static("133Cs", "6s_2S1/2", 401.0, 0.6, 6.0, "Amini and Gould, arXiv:physics/0305074 (2003)", FOUND),
    Check(
        "138Ba+ static polarisability", "lines and core make the static value of Ba+",
        "Iskrenova-Tchoukova and Safronova, Phys. Rev. A 78, 012508 (2008), calculated", FOUND, 124.15, 1.0, "a0^3",
        "what the catalogue leaves out (levels above 6p and their cancellation with the core) is below 1 % there",
        scalar("138Ba+", "6s_2S1/2", np.inf),
    ),
    Check(
        "87Rb scalar tune-out, F = 2", "F = 2 has no scalar shift at 790.032388 nm", LEONARD, FOUND, 790.032388, 0.0068,
        "nm", OURS + "3.4 pm, from the D lines' lifetimes", tuned("87Rb", S, 781.0, 794.0, twice_F=4),
    ),
    Check(
        "87Rb tune-out of |1,0>", "|1,0> does not shift in linear light at 790.01858 nm",
        "Schmidt et al., arXiv:1512.03578 (2016)", FOUND, 790.01858, 0.0068, "nm", OURS + "3.4 pm",
        tuned("87Rb", S, 781.0, 794.0, label=(2, 0)),
    ),
    Check(
        "87Rb tune-out in circular light", "a stretched sublevel does not shift at 785.1522 nm for circularity 0.9931",
        "Fallon, Moan, Larson, Sackett, arXiv:2201.10435 (2022)", FOUND, 785.1522, 0.0069, "nm", OURS + "3.4 pm",
        tuned("87Rb", S, 781.0, 794.0, label=(4, -4), setting=purity(0.9931)),
    ),
    Check(
        "87Rb tune-out between the 6P lines", "near 421 nm the 6P lines cancel the rest",
        "Herold et al., Phys. Rev. Lett. 109, 243003 (2012)", MEMORY, 421.075, 0.019, "nm", OURS + "9 pm",
        tuned("87Rb", S, 420.5, 421.6, twice_F=4),
    ),
    Check(
        "87Rb tune-out red of the 6P lines", "near 423 nm the 6P lines cancel the rest",
        "Herold et al., Phys. Rev. Lett. 109, 243003 (2012)", MEMORY, 423.018, 0.14, "nm", OURS + "70 pm",
        tuned("87Rb", S, 421.8, 430.0, twice_F=4),
    ),
    Check(
        "39K tune-out between the D lines", "4s does not shift at 768.9701 nm",
        "Trubko, Gregoire, Holmgren, Cronin, Phys. Rev. A 95, 052507 (2017)", MEMORY, 768.9701, 0.0041, "nm",
        OURS + "2.0 pm; the published number is for the natural mixture, 93 % 39K",
        tuned("39K", "4s_2S1/2", 767.5, 769.5),
    ),
    Check(
        "7Li scalar tune-out", "2s has no scalar shift 3310.1 MHz above F = 2 to F' = 2 of D1",
        "Copenhaver, Cassella, Berghaus, Mueller, Phys. Rev. A 100, 063603 (2019)", FOUND, 3310.1, 9.9, "MHz",
        OURS + "0.8 MHz", lithium_scalar_mhz,
    ),
    Check(
        "88Sr tune-out near 689 nm", "the ground level does not shift at 689.2222 nm",
        "Heinz et al., Phys. Rev. Lett. 124, 203201 (2020)", MEMORY, 689.2222, 0.0102, "nm", OURS + "5 pm; the "
        "calculated 689.200 nm of 2013 is 22 pm off both", tuned("88Sr", "5s2_1S0", 689.0, 689.4),
    ),
    Check(
        "40Ca tune-out near 657 nm", "the ground level does not shift at 657.446 nm", CHENG, FOUND, 657.446, 0.003,
        "nm", "the calculation has the line's strength to some 20 %, 2.4 pm of the 12 pm to the line",
        tuned("40Ca", "4s2_1S0", 657.0, 657.45),
    ),
    Check(
        "24Mg tune-out near 457 nm", "the ground level does not shift at 457.2372 nm", CHENG, FOUND, 457.2372, 0.0004,
        "nm", "0.4 pm from the line, whose wavelength there is good to the last printed digit or two",
        tuned("24Mg", "3s2_1S0", 457.2, 457.2375),
    ),
    Check(
        "138Ba tune-out near 789 nm", "the ground level does not shift at 788.875 nm", CHENG, FOUND, 788.875, 0.26,
        "nm", OURS + "0.13 nm", tuned("138Ba", "6s2_1S0", 788.0, 790.0),
    ),
    Check(
        "174Yb tune-out near 553 nm", "the ground level does not shift at 541.8325 THz",
        "Hoehn et al., Phys. Rev. A 108, 053325 (2023)", FOUND, 553.294, 0.85, "nm",
        OURS + "0.43 nm; the calculated 553.00 nm of 2013 is superseded", tuned("174Yb", "4f14.6s2_1S0", 552.0, 555.0),
    ),
    Check(
        "88Sr clock magic wavelength near 813 nm", "1S0 and 3P0 shift alike at 813.428 nm",
        "Ludlow et al., Science 319, 1805 (2008), for 87Sr", MEMORY, 813.428, 98.0, "nm",
        OURS + "49 nm: 3P0 has lines to the 5p2, 7s and 6d levels that the catalogue does not have",
        lambda book: magic(book, "88Sr", "5s2_1S0", "5s.5p_3P0", (700.0, 1000.0)).value,
    ),
    Check(
        "88Sr clock magic wavelength near 477 nm", "1S0 and 3P0 shift alike at 476.82362 nm",
        "Ma, Das, Wilkowski, Kwong, arXiv:2507.04532 (2025)", FOUND, 476.82362, 36.0, "nm",
        OURS + "18 nm: the 474 nm line from 3P0 is not in the catalogue",
        lambda book: magic(book, "88Sr", "5s2_1S0", "5s.5p_3P0", (484.0, 600.0)).value,
    ),
    Check(
        "40Ca+ magic wavelength between 393 and 397 nm", "4s and 3d 2D5/2 shift alike at 395.79 nm",
        "Jiang et al., arXiv:1802.00942 (2018), calculated", FOUND, 395.79, 0.02, "nm",
        "there the two S-P lines outweigh what is left out of 3d; 0.02 nm is 100 a0^3",
        lambda book: magic(book, "40Ca+", "4s_2S1/2", "3d_2D5/2", (393.5, 396.8)).value,
    ),
    Check(
        "162Dy polarisability at 1064 nm", "the ground level has 184.4 a0^3",
        "Ravensbergen et al., Phys. Rev. Lett. 120, 223001 (2018)", FOUND, 184.4, 31.0, "a0^3",
        "twice the 15 a0^3 of the static value in the compilation", scalar("162Dy", "4f10.6s2_5I8", 1064.0),
    ),
    Check(
        "tensor angle", "3 cos^2 - 1 = 0: no tensor shift at 54.7356 degrees", "standard", PRACTICE, 54.7356, 5e-5,
        "deg", "half of the last digit; tests/levels/test_lightshift.py shows that the operator obeys it", tensor_angle,
    ),
)  # fmt: skip
