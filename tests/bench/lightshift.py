"""(l) A long polarisability curve and a search for magic wavelengths, in milliseconds."""

import statistics
from functools import partial

import numpy as np

from levels.catalogue import load
from levels.lightshift import Light, couple, drive_of, operator
from levels.magic import Side, magic_wavelengths
from levels.partners import Partners, partners_of
from levels.polarisability import polarisability
from levels.setting import make_setting
from tests.bench.measure import report, seconds

WAVELENGTHS = np.linspace(700.0, 900.0, 10_000)
RUNS = 15


def rubidium() -> Partners:
    """The ground level of 87Rb with its lines."""
    book = load()
    return partners_of(book.atom("87Rb"), book.find_level("87Rb", "5s_2S1/2"))


def curve(side: Partners) -> None:
    polarisability(side, WAVELENGTHS)


def search(side: Partners) -> None:
    """Every magic wavelength of the pair |1,-1>, |2,1> from 750 to 850 nm in elliptical light."""
    setting = make_setting(800.0, 30.0, 15.0, 20.0, 3.23)
    magic_wavelengths(Side(side, (2, -2)), Side(side, (4, 2)), setting, 750.0, 850.0)


def whole(side: Partners) -> None:
    """The full operator of the level in one light and field."""
    here, coupled = couple(side, 3.2)
    operator(here, coupled, Light(1064.0, 1e6, drive_of(30.0, 15.0, 20.0)))


def run() -> None:
    side = rubidium()
    for task, name, bar in (
        (curve, "10,000 wavelengths of the 87Rb ground level", "50 ms"),
        (search, "magic search over 100 nm, two sublevels of 87Rb", "300 ms"),
        (whole, "full operator of the 87Rb ground level", "none"),
    ):
        task(side)
        median = statistics.median(seconds(partial(task, side)) for _ in range(RUNS))
        report(f"(l) {name}", f"{1e3 * median:.1f} ms", bar)
