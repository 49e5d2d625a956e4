"""Cooling figures that tables and papers print: Doppler limits, recoils, saturation intensities, slower fields."""

from collections.abc import Callable

from levels.catalogue import Catalogue
from levels.cooling import cooling
from levels.cooling_figures import Setting
from tests.published.checks.table import FOUND, MEMORY, Check, half

STECK = "Steck, {} D Line Data"
COMMON = "value in common use for the linewidth quoted with it"
MORE = "value in common use"
PRINTED = "half of the last printed digit"


def figure(atom: str, line: str, name: str, width_mhz: float | None = None) -> Callable[[Catalogue], float]:
    """A figure of the catalogue; scaled to another linewidth where the printed number goes with that one."""

    def read(book: Catalogue) -> float:
        found = cooling(book.atom(atom), book.find_line(atom, line))
        value = found.figures[name].value
        assert value is not None, found.figures[name].reason
        width = found.line.upper.width
        assert width is not None
        return value if width_mhz is None else value * width_mhz / width.value

    return read


def printed(
    atom: str, line: str, name: str, text: str, unit: str, source: str, evidence: str = MEMORY,
    tolerance: float | None = None, why: str = PRINTED, width_mhz: float | None = None, mark: str = "",
) -> Check:  # fmt: skip
    """A row whose tolerance is half of the last printed digit unless it says otherwise."""
    spoken = name.replace("_", " ")
    key = f"{name}-{atom}-{line}".lower().replace("_", "-") + mark
    allowed = half(text) if tolerance is None else tolerance
    claim = f"{spoken} of {atom} {line} is {text} {unit}"
    if width_mhz is not None:
        why = f"{why}; printed for a linewidth of {width_mhz:g} MHz, to which ours is scaled"
    return Check(
        key, claim, source, evidence, float(text), allowed, unit, why, figure(atom, line, name, width_mhz)
    )


def slower_span(book: Catalogue) -> float:
    """Field span in tesla that stops sodium from 1000 m/s."""
    setting = Setting(initial_speed_m_per_s=1000.0, final_speed_m_per_s=0.0)
    span = cooling(book.atom("23Na"), book.find_line("23Na", "D2"), setting).figures["slower_field_span"].value
    assert span is not None
    return span * 1e-4


def slower_of_lithium(book: Catalogue) -> float:
    """Speed in m/s from which lithium comes to rest in 30 cm at the largest deceleration."""
    found = cooling(book.atom("6Li"), book.find_line("6Li", "D2"))
    a = found.figures["largest_acceleration"].value
    assert a is not None
    return float((2 * a * 0.3) ** 0.5)


DOPPLER, RECOIL, SATURATED = "doppler_temperature", "recoil_velocity", "saturation_intensity"
RB, CS, NA = STECK.format("Rubidium 87"), STECK.format("Cesium"), STECK.format("Sodium")

CHECKS = (
    printed("88Sr", "689", DOPPLER, "0.179", "uK", "quoted in arXiv:2403.18796 (2024)", FOUND),
    printed("23Na", "D2", DOPPLER, "240", "uK", "Lett et al., Phys. Rev. Lett. 61, 169 (1988)", FOUND, 5.0,
            "half of the last significant digit: 240 is 235 rounded", mark="-1988"),
    printed("133Cs", "D2", RECOIL, "3.53", "mm/s", "university textbook problem with rounded inputs", FOUND, 0.01,
            "the problem takes 850 nm and 133 u: 0.2 %", mark="-rounded"),
    printed("87Rb", "D2", SATURATED, "1.66933", "mW/cm2", RB, tolerance=0.00035, why="the uncertainty printed with it"),
    printed("87Rb", "D2", "saturation_intensity_isotropic", "3.57713", "mW/cm2", RB, tolerance=0.00074,
            why="the uncertainty printed with it"),
    printed("87Rb", "D2", "saturation_intensity_far_detuned", "2.50399", "mW/cm2", RB, tolerance=0.00052,
            why="the uncertainty printed with it"),
    printed("87Rb", "D1", "saturation_intensity_far_detuned", "4.4876", "mW/cm2", RB, tolerance=0.0031,
            why="the uncertainty printed with it"),
    printed("133Cs", "D2", SATURATED, "1.1049", "mW/cm2", CS, tolerance=0.0020, why="the uncertainty printed with it"),
    printed("133Cs", "D2", "saturation_intensity_isotropic", "2.7119", "mW/cm2", CS, tolerance=0.0049,
            why="the uncertainty printed with the cycling value, times 27/11"),
    printed("23Na", "D2", SATURATED, "6.2600", "mW/cm2", NA, tolerance=0.0051, why="the uncertainty printed with it"),
    printed("23Na", "D2", "saturation_intensity_isotropic", "13.4144", "mW/cm2", NA, tolerance=0.0076,
            why="the uncertainty printed with it"),
    printed("23Na", "D2", "saturation_intensity_far_detuned", "9.3900", "mW/cm2", NA, tolerance=0.0077,
            why="the uncertainty printed with it"),
    printed("6Li", "D2", SATURATED, "2.54", "mW/cm2", MORE),
    printed("39K", "D2", SATURATED, "1.75", "mW/cm2", MORE),
    printed("88Sr", "461", SATURATED, "40.7", "mW/cm2", COMMON),
    printed("88Sr", "689", SATURATED, "0.003", "mW/cm2", MORE),
    printed("174Yb", "556", SATURATED, "0.14", "mW/cm2", MORE),
    printed("40Ca", "423", SATURATED, "59.9", "mW/cm2", COMMON, width_mhz=34.6, tolerance=0.1,
            why="0.2 %: it is printed as 59.9 and as 60"),
    printed("52Cr", "425.55", SATURATED, "8.52", "mW/cm2", COMMON, width_mhz=5.02, tolerance=0.02,
            why="0.2 %: the linewidth is printed to three digits"),
    printed("202Hg", "254", SATURATED, "10.2", "mW/cm2", COMMON, width_mhz=1.27),
    printed("166Er", "401", SATURATED, "56", "mW/cm2", COMMON, width_mhz=27.5),
    printed("164Dy", "421", SATURATED, "56.4", "mW/cm2", COMMON, width_mhz=32.2, tolerance=0.15,
            why="0.3 %: 56.3 follows from the linewidth quoted with it"),
    printed("4He", "1083.33", DOPPLER, "39", "uK", COMMON),
    printed("6Li", "D2", DOPPLER, "140", "uK", COMMON, tolerance=1.0, why="printed as 140 and as 141"),
    printed("6Li", "D2", RECOIL, "98.9", "mm/s", MORE),
    printed("6Li", "D2", "recoil_energy_temperature", "3.5", "uK", "Gehm, Properties of 6Li", tolerance=0.05),
    printed("7Li", "D2", DOPPLER, "141", "uK", COMMON),
    printed("23Na", "D2", DOPPLER, "235.03", "uK", NA),
    printed("23Na", "D2", RECOIL, "29.461", "mm/s", NA),
    printed("23Na", "D2", "recoil_temperature", "2.3998", "uK", NA),
    printed("39K", "D2", DOPPLER, "145", "uK", COMMON),
    printed("39K", "D2", RECOIL, "13.36", "mm/s", MORE),
    printed("39K", "D2", "recoil_energy_temperature", "0.42", "uK", "Tiecke, Properties of Potassium"),
    printed("85Rb", "D2", DOPPLER, "145.57", "uK", STECK.format("Rubidium 85")),
    printed("85Rb", "D2", RECOIL, "6.0230", "mm/s", STECK.format("Rubidium 85")),
    printed("87Rb", "D2", DOPPLER, "145.57", "uK", RB),
    printed("87Rb", "D2", RECOIL, "5.8845", "mm/s", RB),
    printed("87Rb", "D2", "recoil_temperature", "0.36196", "uK", RB),
    printed("87Rb", "D2", "recoil_frequency", "3.7710", "kHz", RB),
    printed("133Cs", "D2", DOPPLER, "125.61", "uK", CS),
    printed("133Cs", "D2", RECOIL, "3.5225", "mm/s", CS),
    printed("133Cs", "D2", "recoil_temperature", "0.19834", "uK", CS),
    printed("133Cs", "D2", "recoil_frequency", "2.0663", "kHz", CS),
    printed("40Ca", "423", DOPPLER, "830", "uK", COMMON, tolerance=5.0, why="printed as 0.83 mK"),
    printed("40Ca", "423", RECOIL, "23.6", "mm/s", MORE),
    printed("88Sr", "461", DOPPLER, "730", "uK", COMMON, tolerance=5.0, why="printed as 0.73 mK"),
    printed("88Sr", "461", RECOIL, "9.85", "mm/s", MORE),
    printed("88Sr", "689", RECOIL, "6.58", "mm/s", MORE),
    printed("88Sr", "689", "recoil_temperature", "0.46", "uK", MORE),
    printed("174Yb", "399", DOPPLER, "690", "uK", COMMON, tolerance=5.0, why="printed as 0.69 mK", width_mhz=28.9),
    printed("174Yb", "556", DOPPLER, "4.4", "uK", COMMON),
    printed("174Yb", "556", RECOIL, "4.13", "mm/s", MORE),
    printed("202Hg", "254", DOPPLER, "31", "uK", COMMON, width_mhz=1.27, tolerance=0.6,
            why="2 %: 30.5 uK follows from the linewidth quoted with it"),
    printed("24Mg", "285", DOPPLER, "1900", "uK", COMMON, tolerance=50.0, why="printed as 1.9 mK"),
    printed("52Cr", "425.55", DOPPLER, "120", "uK", COMMON, tolerance=1.0, why="older papers print 124"),
    printed("52Cr", "425.55", RECOIL, "18.05", "mm/s", MORE),
    printed("166Er", "583", DOPPLER, "4.6", "uK", COMMON),
    printed("164Dy", "626", DOPPLER, "3.3", "uK", COMMON),
    printed("169Tm", "530.7", DOPPLER, "8.5", "uK", COMMON, tolerance=0.5, why="printed as 8 to 9 uK"),
    printed("24Mg+", "279.6", DOPPLER, "1000", "uK", COMMON, tolerance=50.0, why="printed as 1.0 mK"),
    printed("40Ca+", "397", DOPPLER, "520", "uK", COMMON, width_mhz=21.6, tolerance=5.0,
            why="printed as 0.52 mK for an older linewidth"),
    printed("171Yb+", "369", DOPPLER, "470", "uK", "Olmschenk et al., Phys. Rev. A 80, 022502 (2009), by its lifetime",
            FOUND, 1.2, "the uncertainty of the lifetime"),
    Check(
        "slower-span-23na", "a field of 0.12 T stops sodium from 1000 m/s: B0 = h v0/(lambda muB)",
        "Foot, Atomic Physics (Oxford, 2005), eq. 9.12", FOUND, 0.12, 0.005, "T", "half of the last printed digit",
        slower_span,
    ),
    Check(
        "slower-capture-6li", "a 30 cm slower cannot stop the mean of a lithium beam, 1500 m/s, but about 1000 m/s",
        "undergraduate thesis, Duke University (2003), on the beam and the length", FOUND, 1000.0, 60.0, "m/s",
        "the thesis says the length and the mean speed; the bound is the largest deceleration's", slower_of_lithium,
    ),
)  # fmt: skip
