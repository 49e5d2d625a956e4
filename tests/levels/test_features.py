"""What a vapour shows: components, crossovers, their depths, widths and shape."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.constants import KB, MU_B_MHZ_PER_GAUSS, C, U
from levels.errors import NotPublished, OutsideValidity
from levels.features import Sample, centroid_offset, doppler_width_mhz, features, relative_dips, samples_of
from levels.notation import parse_feature
from levels.positions import difference_spread, own_spread, place, place_of_feature
from levels.profile import power_width_mhz, profile, voigt_width_mhz
from levels.records import Isotope, Level, Line
from tests.records_for_tests import RB87_D1, RB87_D2, level, line, quantity

WIDTH = quantity(6.0666, unit="MHz")


def isotope(name: str, twice_I: int, share: float | None = None, mass: float = 86.909) -> Isotope:
    abundance = None if share is None else quantity(share)
    return Isotope(name, "Rb", 0, 37, int(name[:2]), twice_I, "", mass=quantity(mass, unit="u"), abundance=abundance)


RB87 = isotope("87Rb", 3, 0.2783)


def with_width(some: Line) -> Line:
    centroid = quantity(384230484.4685, 0.006, "MHz")
    return replace(some, upper=replace(some.upper, width=WIDTH), centroid=centroid, centroid_isotope="87")


D2, D1 = with_width(RB87_D2), with_width(RB87_D1)


@pytest.mark.parametrize("some", [D2, D1], ids=["D2", "D1"])
def test_absorption_sums_to_the_isotopes_share(some: Line) -> None:
    """All components of an isotope together absorb its share of the atoms, with and without a field."""
    for field in (0.0, 1e-3, 300.0):
        found = features(Sample(RB87, some, 0.25), 300.0, field)
        assert np.nansum(found.absorption) == pytest.approx(0.25, abs=1e-9)
        assert np.isnan(found.absorption).tolist() == found.is_crossover.tolist()


def test_weak_field_components_add_up_to_hyperfine_ones() -> None:
    """In a weak field the Zeeman components of one F - F' absorb together what F - F' does without a field."""
    whole = features(Sample(RB87, D2, 1.0), 300.0, crossovers=False)
    split = features(Sample(RB87, D2, 1.0), 300.0, 1e-6, crossovers=False)
    together: dict[tuple[int, int], float] = {}
    for low, up, part in zip(split.lower, split.upper, split.absorption, strict=True):
        key = (low[0][0], up[0][0])
        together[key] = together.get(key, 0.0) + part
    expected = {(low[0][0], up[0][0]): a for low, up, a in zip(whole.lower, whole.upper, whole.absorption, strict=True)}
    assert together == pytest.approx(expected, abs=1e-9)


def test_crossovers_lie_halfway_and_are_named() -> None:
    """87Rb D2 has six crossovers of one lower level, each at the mean of its two components."""
    found = features(Sample(RB87, D2, 1.0), 300.0)
    at = dict(zip(found.names, found.offset_mhz, strict=True))
    crossovers = [name for name, is_one in zip(found.names, found.is_crossover, strict=True) if is_one]
    assert crossovers == ["1-(0,1)", "1-(0,2)", "1-(1,2)", "2-(1,2)", "2-(1,3)", "2-(2,3)"]
    for name in crossovers:
        parts = [f"{low // 2}-{up // 2}" for low, up in parse_feature(name).components]
        assert at[name] == pytest.approx(sum(at[part] for part in parts) / 2, abs=1e-9)


def test_crossover_needs_atoms_of_its_velocity() -> None:
    """A crossover of two components D apart is weaker by exp(-ln2 (D/W)^2) than in an infinitely hot vapour."""
    names = ["2-(2,3)", "1-(0,2)"]
    cold, hot = (features(Sample(RB87, D2, 1.0), kelvin) for kelvin in (300.0, 1e5))
    for name in names:
        splitting = {"2-(2,3)": 266.650, "1-(0,2)": 229.165}[name]
        depths = [item.dip[item.names.index(name)] for item in (cold, hot)]
        shares = [np.exp(-np.log(2) * (splitting / item.doppler_mhz) ** 2) for item in (cold, hot)]
        assert depths[0] / depths[1] == pytest.approx(shares[0] / shares[1], rel=1e-4)


def test_dips_of_a_two_level_pair() -> None:
    """A line J = 0 to 1 has one dip of depth 1, whatever its share; two isotopes scale as n S^2 (1 + g/g')."""
    lower, upper = level(0, 0, atom="88Rb"), level(2, 0, g_J=1.5, atom="88Rb", name="b", width=WIDTH)
    found = [features(Sample(isotope("88Rb", 0), line(lower, upper, nominal_nm=689.0), n), 300.0) for n in (0.8, 0.2)]
    assert [dip.tolist() for dip in relative_dips(found)] == [[1.0], [0.25]]


def test_uncertainty_of_a_crossover_is_that_of_the_mean() -> None:
    """2-(2,3) less 2-3 of 87Rb D2 is half of E(2) - E(3): -3A/2 + B/2 (Casimir), with that uncertainty."""
    one, two = (place_of_feature(D2, parse_feature(text)) for text in ("2-(2,3)", "2-3"))
    assert one.offset_mhz - two.offset_mhz == pytest.approx(-1.5 * 84.7185 - 0.5 * 12.4965, abs=1e-9)
    assert difference_spread(one, two) == pytest.approx(np.hypot(1.5 * 0.0020, 0.5 * 0.0037), rel=1e-9)


def test_uncertainty_of_a_frequency_has_the_centroid_once() -> None:
    """A frequency carries the centroid's uncertainty; a difference on one line does not, to another line twice."""
    ground_known = replace(RB87_D2.lower, A=quantity(3417.3, 0.0, "MHz"), g_J=quantity(2.0, 0.0))
    some = replace(D2, lower=ground_known)
    one, two = (place_of_feature(some, parse_feature(text)) for text in ("2-3", "1-2"))
    own = difference_spread(one, place_of_feature(replace(some, name="other"), parse_feature("2-3")))
    assert own == pytest.approx(np.hypot(0.006, 0.006), rel=1e-9)
    assert own_spread(two) == pytest.approx(np.hypot(0.006, np.hypot(0.5 * 0.002, 0.0)), rel=0.3)


def test_place_at_a_field_is_the_component() -> None:
    """The stretched component of 87Rb D2 moves by (muB/h)(3/2 g_J' - 1/2 g_J), from where it is without a field."""
    still = place_of_feature(D2, parse_feature("2-3"))
    moved = place(D2, [(4, 4)], [(6, 6)], 10.0)
    assert moved.slope_mhz_per_gauss == pytest.approx(MU_B_MHZ_PER_GAUSS * (1.5 * 1.3362 - 0.5 * 2.00233113))
    assert moved.offset_mhz - still.offset_mhz == pytest.approx(10 * moved.slope_mhz_per_gauss, abs=1e-6)


def test_doppler_width_is_the_textbook_one() -> None:
    """The Doppler width is nu/c sqrt(8 kT ln2/m): 511 MHz for 87Rb on D2 at 300 K."""
    width = doppler_width_mhz(D2, RB87, 300.0)
    assert width == pytest.approx(384230484.4685 / C * np.sqrt(8 * np.log(2) * KB * 300 / (86.909 * U)), rel=1e-12)
    assert width == pytest.approx(511.3, abs=0.1)
    with pytest.raises(OutsideValidity):
        doppler_width_mhz(D2, RB87, 0.0)


@given(st.floats(0.01, 1e3), st.floats(0.01, 1e3))
def test_voigt_width_bounds(lorentzian: float, gaussian: float) -> None:
    """A Voigt profile is wider than either of its parts and narrower than their sum."""
    width = voigt_width_mhz(lorentzian, gaussian)
    assert max(lorentzian, gaussian) * (1 - 3e-4) <= width <= (lorentzian + gaussian) * (1 + 1e-9)


def test_profile_has_area_one_and_the_width_of_a_voigt() -> None:
    """A lone component's profile has the area of its share and the half width of the Voigt formula."""
    lower, upper = level(0, 0, atom="88Rb"), level(2, 0, g_J=1.5, atom="88Rb", name="b", width=WIDTH)
    found = features(Sample(isotope("88Rb", 0, mass=88.0), line(lower, upper, nominal_nm=689.0), 1.0), 300.0)
    grid = np.linspace(-200_000, 200_000, 400_001)
    shape = profile([(found, 100.0)], grid, saturation=8.0)
    assert shape.sum() == pytest.approx(1.0, abs=1e-4)
    assert grid[shape.argmax()] == 100.0
    half = grid[shape > shape.max() / 2]
    width = voigt_width_mhz(power_width_mhz(6.0666, 8.0), found.doppler_mhz)
    assert half[-1] - half[0] == pytest.approx(width, abs=2.0)


def test_profile_without_lifetime_is_refused() -> None:
    """Without the upper level's lifetime there is no Voigt profile; the constant is named."""
    found = features(Sample(RB87, replace(RB87_D2, nominal_nm=780.0), 1.0), 300.0)
    with pytest.raises(NotPublished, match="lifetime"):
        profile([(found, 0.0)], np.zeros(3))


def test_missing_hyperfine_constant_is_named() -> None:
    """A level with I and J above zero whose A nobody published has no features; A is named, not guessed."""
    unknown = replace(D2, upper=replace(D2.upper, A=None))
    with pytest.raises(NotPublished, match=r"A of 87Rb 5p_2P3/2"):
        features(Sample(RB87, unknown, 1.0), 300.0)


def test_shares_of_a_sample() -> None:
    """Natural abundances are scaled to the isotopes listed; where one is unknown all count alike."""
    one, two, three = isotope("87Rb", 3, 0.3), isotope("85Rb", 5, 0.6), isotope("83Rb", 5)
    assert [item.share for item in samples_of([(one, D2), (two, D2)])] == pytest.approx([1 / 3, 2 / 3])
    assert [item.share for item in samples_of([(one, D2), (three, D2)])] == [0.5, 0.5]


def test_isotope_shift_needs_both_centroids() -> None:
    """Offsets between isotopes exist only where both frequencies are the isotopes' own; then uncertainties add."""
    other = replace(D2, atom="85Rb", centroid=quantity(384230406.0, 0.008, "MHz"), centroid_isotope="85")
    assert centroid_offset(D2, D2) == (0.0, 0.0)
    assert centroid_offset(D2, other) == pytest.approx((78.4685, 0.01))
    assert centroid_offset(replace(D2, centroid_isotope="natural"), other) is None
    assert centroid_offset(replace(D2, centroid=None), other) is None


def test_unknown_level_of_a_component_is_named() -> None:
    """A component of an F that the level does not have says which ones there are."""
    with pytest.raises(LookupError, match=r"hyperfine level '4'.*0, 1, 2, 3"):
        place_of_feature(D2, parse_feature("2-4"))


def test_level_without_g_factors_has_hyperfine_levels() -> None:
    """Without a field only A, B and C matter: a level without g factors still has its offsets."""
    bare: Level = replace(D2.upper, g_J=None, g_I=None)
    assert place_of_feature(replace(D2, upper=bare), parse_feature("2-3")).offset_mhz == pytest.approx(
        place_of_feature(D2, parse_feature("2-3")).offset_mhz
    )
