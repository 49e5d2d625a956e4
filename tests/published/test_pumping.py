"""Published and textbook results about light on atoms, on the catalogue's real data."""

import numpy as np
import pytest

from levels.beams import (
    intensity_of_saturation,
    make_beam,
    make_scheme,
    offset_of_hyperfine,
    saturation_intensity,
)
from levels.catalogue import Catalogue
from levels.darkstates import lower_manifolds, stationary_dark
from levels.decays import decay_of
from levels.driven import components_driven, drive_of
from levels.frames import frame_of
from levels.geometry import polarisation_vector
from levels.gradients import check_gradients
from levels.jones import circular, linear
from levels.pumping import prepare, pump, solve
from levels.remedies import scan_field
from tests.levels.pumping_records import beam as simple_beam
from tests.levels.pumping_records import simple_atom

ALONG, ACROSS = (0.0, 0.0, 1.0), (1.0, 0.0, 0.0)
IONS = {"40Ca+": ("397", "866"), "88Sr+": ("422", "1092"), "138Ba+": ("493", "650")}


def light(book: Catalogue, atom: str, line: str, jones, direction, offset_mhz, saturation=0.5, name="a", **more):
    isotope, chosen = book.atom(atom), book.find_line(atom, line)
    vector = polarisation_vector(direction, jones)
    intensity = intensity_of_saturation(isotope, chosen, saturation)
    return make_beam(name, chosen, direction, vector, offset_mhz, intensity, **more)


@pytest.mark.parametrize(
    ("atom", "line", "factor", "expected", "tolerance"),
    [
        ("87Rb", "780", 1, 1.66933, 0.00035),
        ("87Rb", "780", 15 / 7, 3.57713, 0.00074),
        ("133Cs", "852", 1, 1.1049, 0.0020),
        ("23Na", "D2", 1, 6.2600, 0.0051),
        ("23Na", "D2", 15 / 7, 13.4144, 0.0076),
        ("6Li", "670.96", 1, 2.54, 0.005),
        ("39K", "767", 1, 1.75, 0.005),
        ("88Sr", "461", 1, 40.7, 0.1),
        ("88Sr", "689", 1, 0.003, 0.0001),
        ("174Yb", "556", 1, 0.14, 0.002),
    ],
)
def test_saturation_intensities(book: Catalogue, atom, line, factor, expected, tolerance) -> None:
    """Cycling saturation intensities in mW/cm2: 87Rb, 133Cs, 23Na from Steck's D line data (recalled, with their
    uncertainties; isotropic light on F -> F + 1 takes 15/7 of it for I = 3/2), the rest common values."""
    chosen = book.find_line(atom, line)
    assert factor * saturation_intensity(chosen, decay_of(book.atom(atom), chosen.upper)) == pytest.approx(
        expected, abs=tolerance
    )


def test_isotropic_light_on_the_cycling_line(book: Catalogue) -> None:
    """The factor 15/7 between isotropic and cycling saturation intensity is the mean strength of F = 2 - 3 over all
    polarisations, (1/3) S (2J'+1)/(2J+1) = 7/15 with S(2,3) = 7/10 (Steck, Rubidium 87 D Line Data, recalled)."""
    chosen = book.find_line("87Rb", "780")
    offset = offset_of_hyperfine(chosen, 4, 6)
    total = np.zeros(5)
    reference = 0.0
    for jones, direction in ((circular("right"), ALONG), (circular("left"), ALONG), (linear(0.0), ACROSS)):
        table = components_driven(
            drive_of(
                make_scheme(book.atom("87Rb"), [light(book, "87Rb", "780", jones, direction, offset)], (0, 0, 0.0))
            ),
            "a",
        )
        rows = (table.lower_twice_F == 4) & (table.upper_twice_F == 6)
        for m, rabi in zip(table.lower_twice_m[rows], table.rabi_mhz[rows], strict=True):
            total[(m + 4) // 2] += rabi**2 / 3
        reference = max(reference, float(table.rabi_mhz[rows].max()) ** 2)
    assert total / reference == pytest.approx(np.full(5, 7 / 15))


def test_d1_pumps_dark_and_d2_bright(book: Catalogue) -> None:
    """87Rb: sigma+ with repump on D1 ends dark in |2,2> (figure caption in NeuroImage 199, 598 (2019), PMC6988110); on
    D2 F = 2 - 3 it ends there and keeps scattering (common practice)."""
    for line, F_up, dark in (("795", 4, True), ("780", 6, False)):
        chosen = book.find_line("87Rb", line)
        beams = [
            light(book, "87Rb", line, circular("right"), ALONG, offset_of_hyperfine(chosen, 4, F_up)),
            light(book, "87Rb", line, circular("right"), ALONG, offset_of_hyperfine(chosen, 2, 4), name="repump"),
        ]
        result = pump(prepare(make_scheme(book.atom("87Rb"), beams, (0, 0, 1.0))))
        structure = result.outcome.light.structure
        assert result.target == structure.position(chosen.lower, (4, 4))
        assert (result.outcome.scattering_per_s < 1.0) is dark
        assert dark or result.outcome.scattering_per_s > 1e6


def test_best_linear_angle_for_one_to_zero() -> None:
    """F = 1 -> F' = 0 scatters best with linear light at arccos(1/sqrt3) = 54.7 degrees to the field, where all three
    components are driven alike (Berkeland and Boshier, Phys. Rev. A 65, 033413 (2002), recalled; textbook geometry)."""
    atom = simple_atom(2, 0, g_low=1.0)
    angles = np.arange(40.0, 70.0, 0.5)
    rates = [
        solve(
            prepare(
                make_scheme(atom, [simple_beam(atom, intensity=0.01, direction=ACROSS, light=float(a))], (0, 0, 0.2))
            )
        ).scattering_per_s
        for a in angles
    ]
    assert angles[int(np.argmax(rates))] == pytest.approx(54.7356, abs=0.5)


def ion_scheme(book: Catalogue, atom: str, field, jones=None, red=10.0):
    blue, repump = IONS[atom]
    width = decay_of(book.atom(atom), book.find_line(atom, blue).upper).width_mhz
    jones = linear(0.0) if jones is None else jones
    beams = [
        light(book, atom, blue, jones, ACROSS, -width / 2, 1.0, "cooling"),
        light(book, atom, repump, jones, ACROSS, red, 3.0, "repump"),
    ]
    return make_scheme(book.atom(atom), beams, field)


@pytest.mark.parametrize("atom", list(IONS))
@pytest.mark.parametrize("angle", [0.0, 30.0, 90.0])
def test_two_dark_states_of_the_d_level(book: Catalogue, atom, angle) -> None:
    """D3/2 - P1/2 of 40Ca+ (866 nm), 88Sr+ (1092 nm) and 138Ba+ (650 nm) has two dark states for every polarisation,
    m = +-3/2 for light along the field (Berkeland and Boshier, Phys. Rev. A 65, 033413 (2002), recalled)."""
    scheme = ion_scheme(book, atom, (0, 0, 1.0), linear(angle))
    D = next(m for m in lower_manifolds(drive_of(scheme)) if m.twice_F == 3)
    assert len(D.dark) == 2
    if angle == 0.0:
        assert {m for s in D.dark for (_, m), a in zip(s.labels, s.vector, strict=True) if abs(a) > 1e-9} == {3, -3}
        assert all(state.is_stationary for state in D.dark)
    else:
        assert all(state.mixing_mhz > 0.1 for state in D.dark)
    drive = drive_of(scheme)
    assert (len(stationary_dark(drive, frame_of(drive))) > 0) is (angle == 0.0)


@pytest.mark.parametrize("atom", list(IONS))
def test_field_for_the_ion(book: Catalogue, atom) -> None:
    """The worked case: scattering of the eight-level ion over field magnitude and angle. Light along the field is
    worst; the best field turns the dark states at a rate between a fiftieth and the natural width (same source: rates
    comparable with the Rabi frequency), at an angle well off the polarisation."""
    scheme = ion_scheme(book, atom, (0, 0, 1.0))
    width = float(drive_of(scheme).structure.width_mhz.max())
    magnitudes = width / 1.4 * np.array([0.003, 0.03, 0.1, 0.2, 0.5, 2.0])
    scan = scan_field(scheme, magnitudes, [0.0, 15.0, 30.0, 45.0, 60.0, 75.0, 90.0])
    rates = scan.scattering_per_s
    magnitude, angle, best = scan.best
    assert rates[:, 0].max() < 1e-4 * best
    assert width / 50 < 1.4 * magnitude < width
    assert angle >= 30.0
    assert rates[0].max() < 0.2 * best
    assert rates[-1].max() < best
    assert best > 0.02 * np.pi * 1e6 * width


def test_repump_in_two_photon_resonance_is_dark(book: Catalogue) -> None:
    """With both lasers equally detuned the S - P - D system has a dark resonance without a field; away from it the
    light returns once a field turns the dark states of D3/2 (textbook Lambda system)."""
    blue = book.find_line("40Ca+", "397")
    half = decay_of(book.atom("40Ca+"), blue.upper).width_mhz / 2
    dark = solve(prepare(ion_scheme(book, "40Ca+", (0.0, 0.02, 0.02), red=-half))).scattering_per_s
    bright = solve(prepare(ion_scheme(book, "40Ca+", (0.0, 2.0, 2.0), red=half))).scattering_per_s
    assert dark < 0.02 * bright


def test_gray_molasses_needs_blue_light(book: Catalogue) -> None:
    """D1 of 39K and 6Li (F -> F, F -> F - 1) cools below the Doppler limit with blue detuning (Weidemueller et al.,
    Europhys. Lett. 27, 109 (1994); Fernandes et al., EPL 100, 63001 (2012))."""
    for atom, line, F in (("39K", "770", 4), ("6Li", "670.98", 3)):
        chosen = book.find_line(atom, line)
        for sign in (1, -1):
            found = check_gradients(book.atom(atom), chosen, (F, F), sign * 25.0, 1.0, "lin-perp-lin")
            assert found.works is (sign > 0)


def test_pumping_costs_about_two_j_photons(book: Catalogue) -> None:
    """sigma+ pumping from an unpolarised J to |J,J> takes of order 2J spontaneous decays (Rochester et al., Phys. Rev.
    A 94, 043416 (2016), an order of magnitude): 133Cs D1 F = 4 - 4 with repump, F = 4, within a factor of 2.5 of 8."""
    chosen = book.find_line("133Cs", "D1")
    beams = [
        light(book, "133Cs", "D1", circular("right"), ALONG, offset_of_hyperfine(chosen, 8, 8), 0.1, linewidth_mhz=1.0),
        light(
            book,
            "133Cs",
            "D1",
            circular("right"),
            ALONG,
            offset_of_hyperfine(chosen, 6, 8),
            0.1,
            "r",
            linewidth_mhz=1.0,
        ),
    ]
    result = pump(prepare(make_scheme(book.atom("133Cs"), beams, (0, 0, 1.0))))
    assert result.purity > 0.999
    assert 8 / 2.5 < result.photons < 8 * 2.5
