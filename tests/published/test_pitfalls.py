"""The traps that the literature of these numbers sets, one test for each that concerns data.

Each docstring says what the catalogue must do and on whose word. Numbers that stand here are the ones to avoid, or
bounds that a wrong choice would leave; the right ones are compared in `test_evidence`.
"""

import re

import pytest

from levels.catalogue import Catalogue
from levels.constants import M_E_OVER_M_P, MHZ_PER_WAVENUMBER, MU_B_MHZ_PER_GAUSS
from levels.published import Value
from levels.quantity import Quantity, in_unit
from levels.records import Level
from tests.published.ledger import every_value


@pytest.fixture(scope="module")
def values(book: Catalogue) -> dict[str, Value]:
    """Every published value by species and key: `K lines.767.frequency.39`."""
    return {f"{name} {key}": value for name, data in book.elements.items() for key, value in every_value(data)}


def known(quantity: Quantity | None) -> float:
    assert quantity is not None
    return quantity.value


def A(book: Catalogue, atom: str, level: str) -> float:
    return known(book.find_level(atom, level).A)


def others(value: Value) -> set[str]:
    """The sources of the alternatives."""
    return {other.source for other in value.alternatives}


# Conventions


def test_g_I_has_the_sign_that_its_hamiltonian_needs(book: Catalogue) -> None:
    """With H = muB (g_J J + g_I I) B a positive moment has a negative g_I; half the literature uses the other sign."""
    wrong = [one.name for one in book.atoms() if one.g_I and one.moment and one.g_I.value * one.moment.value >= 0]
    assert wrong == []
    assert known(book.atom("87Rb").isotope.g_I) == pytest.approx(-0.0009951414, abs=1e-10)  # Arimondo et al. 1977
    assert known(book.atom("40K").isotope.g_I) > 0  # the one alkali with a negative moment


def test_atomic_g_I_is_not_the_bare_moment(book: Catalogue) -> None:
    """Atomic g_I is smaller than the tabulated moment says by the shielding: Li 0.01 %, Rb 0.38 %, Cs 0.57 %."""
    shielding = {"7Li": 0.0001, "23Na": 0.0006, "39K": 0.0014, "87Rb": 0.0038, "133Cs": 0.0057}
    for name, expected in shielding.items():
        isotope = book.atom(name).isotope
        bare = -known(isotope.moment) / (isotope.twice_I / 2) * M_E_OVER_M_P
        assert bare / known(isotope.g_I) - 1 == pytest.approx(expected, abs=3e-4), name


def test_g_I_of_a_bare_moment_says_so(book: Catalogue) -> None:
    """Where only the moment is published, g_I is marked as computed from it without its shielding."""
    derived = [
        one.g_I
        for species in book.elements
        for number, table in book.elements[species].isotopes.items()
        for one in [book.species(species)[number].isotope]
        if table.g_I is None and one.g_I is not None
    ]
    assert len(derived) > 20
    assert [quantity.note for quantity in derived if "shielding" not in quantity.note] == []
    assert not any(quantity.evidence == "checked" for quantity in derived)


@pytest.mark.parametrize(
    ("atom", "level"),
    [
        ("9Be+", "2s_2S1/2"),
        ("25Mg+", "3s_2S1/2"),
        ("43Ca+", "4s_2S1/2"),
        ("87Sr+", "5s_2S1/2"),
        ("111Cd+", "5s_2S1/2"),
        ("113Cd+", "5s_2S1/2"),
        ("133Ba+", "6s_2S1/2"),
        ("173Yb+", "6s_2S1/2"),
        ("225Ra+", "7s_2S1/2"),
        ("40K", "4s_2S1/2"),
        ("3He", "2s_3S1"),
    ],
)
def test_inverted_structures_have_negative_A(atom: str, level: str, book: Catalogue) -> None:
    """A negative moment turns the structure round, though papers often print the splitting only."""
    assert A(book, atom, level) < 0


def test_inverted_p_levels(book: Catalogue) -> None:
    """A is negative in 2P3/2 of both Li isotopes and of 40K (F' = 11/2 lowest)."""
    assert all(A(book, name, "2p_2P3/2") < 0 for name in ("6Li", "7Li"))
    assert A(book, "40K", "4p_2P3/2") < 0


def test_signs_lost_in_abstracts(values: dict[str, Value], book: Catalogue) -> None:
    """43Ca+ 3d5/2 (A and B, mu and Q negative), 87Sr 3P1 and 3P2 (A), 87Sr g_I: magnitudes in print, signs here."""
    calcium = book.find_level("43Ca+", "3d_2D5/2")
    assert known(calcium.A) < 0
    assert known(calcium.B) < 0
    assert A(book, "87Sr", "5s.5p_3P1") < 0
    assert A(book, "87Sr", "5s.5p_3P2") < 0
    assert known(book.atom("87Sr").isotope.g_I) > 0
    assert "sign" in values["Cs levels.6p_2P3/2.hyperfine.133.B"].note  # the compared text drops minus signs


def test_wavelengths_are_vacuum_wavelengths(book: Catalogue) -> None:
    """Labels mix air and vacuum: lines known by an air wavelength carry the vacuum one, 0.1 to 0.3 nm longer."""
    pairs = [  # atom, name here, vacuum nm, the air wavelength also in use
        ("39K", "404.5", 404.53, 404.41),
        ("87Rb", "420", 420.30, 420.18),
        ("133Cs", "456", 455.66, 455.53),
        ("169Tm", "410.7", 410.700, 410.584),
        ("169Tm", "530.9", 530.859, 530.712),
        ("169Tm", "506.4", 506.367, 506.226),
        ("166Er", "583", 582.842, 582.680),
        ("164Dy", "626", 626.082, 625.909),
        ("20Ne", "640.4", 640.402, 640.225),
        ("40Ar", "811.75", 811.754, 811.531),
        ("84Kr", "811.51", 811.513, 811.290),
    ]
    for atom, name, vacuum, air in pairs:
        wavelength = known(book.find_line(atom, name).wavelength)
        assert wavelength == pytest.approx(vacuum, abs=0.006), (atom, name)
        assert abs(wavelength - air) > 0.1, (atom, name)


def test_frequencies_say_of_what_they_are(values: dict[str, Value]) -> None:
    """Crossovers, components and averages are named: Rb D2 d/f, 171Yb+ E3 and E2, 176Lu+ mean of F = 6, 7, 8."""
    for key in (
        "Rb lines.780.frequency.87.2-(2,3)",
        "Yb+ lines.467.frequency.171.0-3",
        "Yb+ lines.435.frequency.171.0-2",
        "Lu+ lines.848.frequency.176.average",
        "Rb lines.760.frequency.87.2-2",
        "Ra lines.483.frequency.225.1/2-3/2",
    ):
        assert key in values


def test_two_photon_frequencies_are_sums(book: Catalogue) -> None:
    """5S-5D is quoted per photon, 5S-7S as the sum: the catalogue keeps the sum and the wavelength of each photon."""
    for name in ("778.1", "760"):
        line = book.find_line("87Rb", name)
        assert line.photons == 2
        assert known(line.wavelength) * known(line.centroid) == pytest.approx(2 * 299792458e3, rel=1e-9)
        assert known(line.wavelength) == pytest.approx(float(name), abs=0.5)


# Alkalis


def test_potassium_d_lines_are_the_combs(values: dict[str, Value]) -> None:
    """K D2 of Banerjee and Natarajan (391015578.040 MHz) is 592 MHz low by comb work (Falke 2006, Lisdat 2006)."""
    value = values["K lines.767.frequency.39"]
    assert value.source == "falke2006"
    assert in_unit(value.quantity(), "MHz").value - 391015578.040 == pytest.approx(592, abs=1)


def test_p_half_splittings_of_one_laboratory_are_not_used(book: Catalogue, values: dict[str, Value]) -> None:
    """7Li 2P1/2: 91.87 MHz (Huang, theory), not 92.04; 87Rb 5P1/2: 408.34 MHz (2016), not 406.2 or 407.25."""
    assert 2 * A(book, "7Li", "2p_2P1/2") == pytest.approx(91.873, abs=0.01)
    assert A(book, "87Rb", "5p_2P1/2") == pytest.approx(408.34, abs=0.1)
    assert not any(value.value.startswith(("92.04", "407.25")) for value in values.values())


def test_lithium_d2_warns_of_interference(values: dict[str, Value]) -> None:
    """Li D2 components interfere (Brown 2013): the values say so; the old 6Li D2 number 446.799677 THz is left out."""
    for isotope in ("6", "7"):
        assert "interfere" in values[f"Li lines.670.96.frequency.{isotope}"].note
    assert not any(value.value.startswith("446.799677") for value in values.values())
    assert others(values["Li lines.670.98.shift.6"]) == {"huang2018"}


def test_caesium_values_replaced_by_later_ones(values: dict[str, Value]) -> None:
    """Cs D1 of 2006 before 1999 (59 kHz higher); 5D5/2 1353 ns before 1250 ns; 7D5/2 and 7P of the later papers."""
    assert values["Cs lines.895.frequency.133"].source == "gerginov2006"
    assert "udem1999" in others(values["Cs lines.895.frequency.133"])
    assert values["Cs levels.5d_2D5/2.lifetime"].value.startswith("1353")
    assert values["Cs levels.7d_2D5/2.hyperfine.133.A"].source == "rahaman2023"
    assert values["Cs levels.7p_2P3/2.lifetime"].value.startswith("137.54")


def test_sodium_and_rubidium_disagreements_are_kept(values: dict[str, Value]) -> None:
    """Na 3P3/2 A: 18.534(15) and 18.572(24) are both listed, as are the two D1 isotope shifts of Rb."""
    assert others(values["Na levels.3p_2P3/2.hyperfine.23.A"]) == {"gangrsky1998"}
    assert "2.2 sigma" in values["Rb lines.795.frequency.85"].note


def test_rubidium_clock_is_not_buffer_gas_shifted(values: dict[str, Value]) -> None:
    """87Rb: ...610.904 Hz, not the shifted ...608 or ...612.8; 85Rb: 3035.732440, not 3035.734 MHz."""
    rb87 = in_unit(values["Rb levels.5s_2S1/2.hyperfine.87.intervals.1-2"].quantity(), "Hz").value
    assert rb87 == pytest.approx(6834682610.904, abs=1e-3)
    rb85 = in_unit(values["Rb levels.5s_2S1/2.hyperfine.85.intervals.2-3"].quantity(), "Hz").value
    assert rb85 == pytest.approx(3035732440, abs=10)


def test_g_J_of_p_levels(book: Catalogue, values: dict[str, Value]) -> None:
    """Rb 5P3/2: the Lande value, with the only measurement (1.3362(13), 1.6 sigma) beside it; Cs 6P3/2 is measured."""
    assert known(book.find_level("87Rb", "5p_2P3/2").g_J) == pytest.approx(1.334106, abs=1e-6)
    assert "arimondo1977" in others(values["Rb levels.5p_2P3/2.g_J"])
    assert values["Cs levels.6p_2P3/2.g_J"].source == "staerkind2023"


def test_abundances_that_vary(values: dict[str, Value]) -> None:
    """Commercial lithium is depleted in 6Li and 39K has two uncertainties in print: notes and alternatives say so."""
    assert "depleted" in values["Li isotopes.6.abundance"].note
    assert values["Li isotopes.6.abundance"].alternatives
    assert "garner1975" in others(values["K isotopes.39.abundance"])


def test_potassium_40_moment_and_half_life(values: dict[str, Value]) -> None:
    """40K: -1.29797 muN and 1.248(3)e9 y of the newer tables, not -1.298100 and 1.28e9 y."""
    assert values["K isotopes.40.moment"].quantity().value == pytest.approx(-1.29797, abs=1e-5)
    assert values["K isotopes.40.half_life"].value.startswith("1.248(3)e9")


def test_potassium_39_splitting_does_not_claim_ten_digits(values: dict[str, Value]) -> None:
    """39K: 461.7197202 and 461.719700(5) MHz (2019) are 3.9 sigma apart; both stand."""
    assert others(values["K levels.4s_2S1/2.hyperfine.39.intervals.1-2"]) == {"peper2019"}


def test_francium_ground_state_is_not_the_9s_splitting(book: Catalogue) -> None:
    """A list prints 4.0451 GHz for 210Fr, which is the 9s splitting: the ground state's A is 7.195 GHz."""
    assert A(book, "210Fr", "7s_2S1/2") == pytest.approx(7195.1, abs=1)


# Alkaline-earth-like neutrals


def test_ytterbium_399_disagreement_is_shown(values: dict[str, Value]) -> None:
    """174Yb 399 nm: 751526533 and 751525988 MHz: both stand and the first says that it is unconfirmed."""
    value = values["Yb lines.399.frequency.174"]
    assert others(value) == {"das2005"}
    assert "unconfirmed" in value.note


def test_preliminary_ytterbium_clock_frequencies_are_left_out(values: dict[str, Value]) -> None:
    """The 2005 institutional abstract (518295836608.5, 518294576858.6 kHz) is 13 to 18 kHz high and not used."""
    assert not [key for key, item in values.items() if re.match("518295836608|518294576858", item.value)]


def test_strontium_1p1_width(book: Catalogue) -> None:
    """Three lifetimes agree on 5.21 ns: 30.2 to 30.6 MHz; the common 32 MHz and 5.263 ns come from older rates."""
    assert 30.2 < known(book.find_level("88Sr", "1P1").width) < 30.6


def test_strontium_leak_is_a_range(values: dict[str, Value]) -> None:
    """1P1-1D2: 3.85e3, 5.3e3 and 9.25e3 s-1 all stand; 1D2-3P2 is 0.177 measured, not 0.322."""
    assert others(values["Sr lines.6457.einstein_A"]) == {"hunter1986", "cooper2018"}
    assert values["Sr lines.1904.branching"].quantity().value == pytest.approx(0.177, abs=0.001)


def test_strontium_metastable_lifetimes(values: dict[str, Value], book: Catalogue) -> None:
    """87Sr 3P0: 118, 151 and 167 s all stand (rates in 1e-3 s-1 are no widths in mHz); 671 nm: a partial M2 rate."""
    value = values["Sr levels.5s.5p_3P0.hyperfine.87.lifetime"]
    assert {"muniz2020", "dolde2025"} <= others(value)
    width = known(book.find_level("87Sr", "5s.5p_3P0").width) * 1e9  # mHz
    assert 0.9 < width < 1.4
    assert "partial" in values["Sr lines.671.einstein_A"].note


def test_tables_do_not_replace_combs(values: dict[str, Value]) -> None:
    """Level tables are 0.1 to 5 GHz off the combs in Sr, Hg, Ca+, Al+, Lu+: there they are alternatives at most."""
    tables = {"morton2000", "morton2003", "sugar1985", "sansonetti2005", "kaufman1991", "martin1978"}
    for key in (
        "Sr levels.5s.5p_3P1.energy",
        "Sr levels.5s.5p_3P2.energy",
        "Hg levels.6s.6p_3P0.energy",
        "Hg levels.6s.6p_3P1.energy",
        "Ca+ levels.4p_2P1/2.energy",
        "Ca+ levels.4p_2P3/2.energy",
        "Al+ levels.3s.3p_3P0.energy",
        "Lu+ levels.5d.6s_3D1.energy",
        "In+ levels.5s.5p_3P0.energy",
    ):
        assert values[key].source not in tables, key


def test_mercury_table_energies(book: Catalogue) -> None:
    """198Hg 3P0 and 3P1 from frequencies: 4.8 GHz above the handbook's 37645.080 and 39412.300 cm-1."""
    for name, table in (("6s.6p_3P0", 37645.080), ("6s.6p_3P1", 39412.300)):
        energy = known(book.find_level("198Hg", name).energy)
        assert (energy - table) * MHZ_PER_WAVENUMBER == pytest.approx(4800, abs=80)


def test_magnesium_composite_line(values: dict[str, Value], book: Catalogue) -> None:
    """Mg 285 nm: 35051.2808 cm-1 is the natural mixture's composite line, 504 MHz above the table's 35051.264."""
    assert "composite" in values["Mg levels.3s.3p_1P1.energy"].note
    assert known(book.find_line("24Mg", "285").centroid) < 35051.2808 * MHZ_PER_WAVENUMBER


def test_mercury_g_I_is_the_free_atoms(book: Catalogue) -> None:
    """199Hg precesses at 759.0 Hz/G, not at the 771.2 of the bare moment."""
    hz_per_gauss = abs(known(book.atom("199Hg").isotope.g_I)) * MU_B_MHZ_PER_GAUSS * 1e6
    assert hz_per_gauss == pytest.approx(759.0, abs=0.3)


def test_mercury_201_clock_level_sign(book: Catalogue) -> None:
    """g(3P0) of 201Hg is printed negative like 199Hg's; the moments have opposite signs, so it is positive here."""
    assert known(book.find_level("201Hg", "6s.6p_3P0").g_I) > 0 > known(book.find_level("199Hg", "6s.6p_3P0").g_I)


def test_hyperfine_constants_are_not_scaled_by_moments(values: dict[str, Value]) -> None:
    """A ratios carry anomalies of up to 0.5 %: no A is another isotope's A times a ratio of moments."""
    scaled = [key for key, item in values.items() if re.search(r"hyperfine\.\d+\.A$", key) and "moment" in item.formula]
    assert scaled == []


def test_quadrupole_moments_in_doubt(values: dict[str, Value]) -> None:
    """87Sr: 0.33 b by three determinations, the table's 0.305 beside it; 43Ca: -0.0408 and -0.0479 b both stand."""
    assert values["Sr isotopes.87.quadrupole"].quantity().value == pytest.approx(0.33, abs=0.01)
    assert "stone2021" in others(values["Sr isotopes.87.quadrupole"])
    assert others(values["Ca isotopes.43.quadrupole"]) == {"tang2025a"}


def test_ytterbium_abundances_and_moment(values: dict[str, Value]) -> None:
    """Two compositions are in print (174Yb 31.83 and 32.03 %); mu(173Yb) = -0.648 is excluded by the A ratios."""
    assert values["Yb isotopes.174.abundance"].alternatives
    for species in ("Yb", "Yb+"):
        assert values[f"{species} isotopes.173.moment"].quantity().value == pytest.approx(-0.679, abs=0.002)


def test_mercury_7s_level_has_no_tabulated_energy(values: dict[str, Value]) -> None:
    """The recalled 7s 3S1 energy fails the visible lines by 0.08 cm-1 and is left out."""
    assert "Hg levels.6s.7s_3S1.energy" not in values


def test_measured_intervals_of_87sr_3p2(book: Catalogue) -> None:
    """87Sr 3P2: the corrected B misses an interval by 67 kHz in the first-order formula, so B = 67.340 stands."""
    assert known(book.find_level("87Sr", "5s.5p_3P2").B) == pytest.approx(67.34, abs=0.02)


# Ions


def test_ytterbium_octupole_lifetime(values: dict[str, Value]) -> None:
    """Yb+ 2F7/2: the letter printed half of the corrected 9.96(50)e7 s; the later stands first, both are shown."""
    value = values["Yb+ levels.4f13.6s2_2F7/2.lifetime"]
    assert value.value == "9.96(50)e7 s"
    assert [other.value for other in value.alternatives] == ["4.98(25)e7 s"]


def test_calcium_43_uses_the_unshielded_moment(book: Catalogue) -> None:
    """43Ca+: g_I from -1.315350 muN of the ion (2.04675e-4), not from the bare -1.31764 (2.0503e-4)."""
    assert known(book.atom("43Ca+").isotope.g_I) == pytest.approx(1.315350 / 3.5 * M_E_OVER_M_P, rel=1e-6)


def test_barium_values_replaced(values: dict[str, Value]) -> None:
    """Ba+: branching 0.731823 (2019) before 0.7293 (12 sigma), g_J(5D5/2) 1.20036739 before 1.2020."""
    assert values["Ba+ lines.493.branching"].value.startswith("0.731823")
    assert values["Ba+ levels.5d_2D5/2.g_J"].quantity().value == pytest.approx(1.200367, abs=1e-6)


def test_barium_6p_hyperfine_is_left_out_or_consistent(book: Catalogue) -> None:
    """Ba+ 6p3/2: the recalled A of 135 and 137 contradict each other (1.1257 for 1.1187): agree or be out."""
    first, second = (book.find_level(f"{number}Ba+", "6p_2P3/2").A for number in (137, 135))
    assert first is None or second is None or first.value / second.value == pytest.approx(1.1187, abs=0.003)


def test_calcium_ion_lifetimes_and_clock(values: dict[str, Value]) -> None:
    """Ca+: 6.904 and 6.639 ns (2015, 2020) before the 1993 beam; 729 nm: ...400.2 Hz, the 2009 value is 7 Hz low."""
    assert "jin1993" in others(values["Ca+ levels.4p_2P1/2.lifetime"])
    assert "jin1993" in others(values["Ca+ levels.4p_2P3/2.lifetime"])
    clock = values["Ca+ lines.729.frequency.40"]
    assert clock.quantity().value == pytest.approx(411042129776400.3, abs=1)
    assert "chwalla2009" in others(clock)


def test_calcium_44_shifts_carry_their_conflict(values: dict[str, Value]) -> None:
    """397 nm less 866 nm misses 732 nm by 0.74 MHz for 44Ca+: both values say 0.8 MHz."""
    for line in ("397", "866"):
        assert "0.8 MHz" in values[f"Ca+ lines.{line}.shift.44"].note


def test_strontium_ion_shift_sign(values: dict[str, Value]) -> None:
    """674 nm: papers give nu(88) - nu(86); here 86 lies below 88, and the 2011 value, 17 kHz away, stands beside."""
    value = values["Sr+ lines.674.shift.86"]
    assert value.quantity().value < 0
    assert others(value) == {"lybarger2011"}


def test_cadmium_clock_values(values: dict[str, Value]) -> None:
    """113Cd+: the splittings of 2015 and 2021 are 9 mHz apart; the later first."""
    value = values["Cd+ levels.5s_2S1/2.hyperfine.113.A"]
    assert value.source == "miao2021"
    assert value.alternatives


def test_beryllium_A_is_the_zero_field_value(values: dict[str, Value]) -> None:
    """9Be+: A at zero field (...837.044 Hz), not at 4.46 T (...837.371 Hz)."""
    assert values["Be+ levels.2s_2S1/2.hyperfine.9.A"].value.startswith("-625.008837044")


def test_ytterbium_ion_g_J_and_lines(book: Catalogue, values: dict[str, Value]) -> None:
    """Yb+: g_J(6s) is not the 1.998 of tables; 729476867027206.8 Hz of 172Yb+ belongs to 411 nm, not to 435 nm."""
    assert known(book.find_level("171Yb+", "6s_2S1/2").g_J) > 2.0
    assert values["Yb+ lines.411.frequency.172"].value.startswith("729476867027206.8")


# Lanthanides, gases, metals


def test_lanthanide_g_J_are_measured(book: Catalogue) -> None:
    """LS coupling gives 1.25, 1.167, 1.143, 2.0 for the grounds of Dy, Er, Tm, Eu; measured values are used."""
    measured = {"164Dy": 1.24159, "166Er": 1.163801, "169Tm": 1.14119, "153Eu": 1.9934}
    for atom, expected in measured.items():
        ground = book.find_level(atom, book.atom(atom).isotope.ground)
        assert known(ground.g_J) == pytest.approx(expected, abs=1e-4), atom


def metastable(book: Catalogue, atom: str) -> Level:
    (found,) = [level for level in book.atom(atom).levels if re.fullmatch(r".*s_2\[3/2\]2", level.name)]
    return found


@pytest.mark.parametrize("atom", ["20Ne", "40Ar", "84Kr", "132Xe"])
def test_noble_gas_metastable_g_J(atom: str, book: Catalogue) -> None:
    """3P2 is single in its configuration: g is within 0.1 % of 1.5012, not the 1.503 to 1.506 of optical tables."""
    assert known(metastable(book, atom).g_J) == pytest.approx(1.5012, abs=0.0012)


def test_holmium_constants_are_the_fitted_ones(values: dict[str, Value]) -> None:
    """Ho: only the fitted constants reproduce the intervals; those corrected for second order are alternatives."""
    for name in ("A", "B", "C"):
        value = values[f"Ho levels.4f11.6s2_4I15/2.hyperfine.165.{name}"]
        assert "as fitted" in value.note
        assert "corrected" in value.alternatives[0].note


def test_helium_triplets_are_inverted(book: Catalogue) -> None:
    """2 3P: J = 0 lies highest; 3He 2 3S1: F = 3/2 lowest and the interval 6739.70 MHz is 1.5 |A|."""
    energies = [known(book.find_level("4He", f"2p_3P{J}").energy) for J in (0, 1, 2)]
    assert energies == sorted(energies, reverse=True)
    assert A(book, "3He", "2s_3S1") == pytest.approx(-6739.701177 / 1.5, abs=1e-6)


def test_helium_2s_2p_is_the_corrected_one(values: dict[str, Value]) -> None:
    """The 2004 and 2017 centroids miss a -55 kHz shift that the 2025 value removes: the latter is used."""
    assert values["He lines.1083.21.frequency.4"].source == "wen2025"


def test_neon_shift_alternatives(values: dict[str, Value]) -> None:
    """20-22Ne: 1626.287(53) of 2017 first, 1625.9(0.15) of 2011 beside it."""
    assert others(values["Ne lines.640.4.shift.22"]) == {"feldker2011"}


def test_thallium_masses(values: dict[str, Value]) -> None:
    """203, 205Tl: AME's 202.972344 and 204.974427 u, not the handbook's ...320 and ...401."""
    assert values["Tl isotopes.203.mass"].quantity().value == pytest.approx(202.972344, abs=2e-6)
    assert values["Tl isotopes.205.mass"].quantity().value == pytest.approx(204.974427, abs=2e-6)


def test_copper_splitting(book: Catalogue) -> None:
    """63Cu: 2 A = 11733.83 MHz; a web list prints 11735.83."""
    assert 2 * A(book, "63Cu", "4s_2S1/2") == pytest.approx(11733.83, abs=0.05)


def test_gallium_uncertainties_are_one_sigma(book: Catalogue) -> None:
    """69Ga 4d: the 2001 paper prints three standard deviations (9 for 77.3) and corrects earlier signs."""
    level = book.find_level("69Ga", "4d_2D5/2").A
    assert known(level) > 0
    assert level is not None
    assert level.uncertainty == pytest.approx(0.3)
    assert A(book, "69Ga", "4d_2D3/2") < 0


def test_katori_lifetimes(values: dict[str, Value]) -> None:
    """Index copies print 385+8 and 394+5 s for 38(+8-5) and 39(+5-4) s."""
    assert values["Ar levels.(2P3/2)4s_2[3/2]2.lifetime"].value == "38(+8-5) s"
    assert values["Kr levels.(2P3/2)5s_2[3/2]2.lifetime"].value == "39(+5-4) s"


def test_thulium_clock_level_has_no_measured_lifetime(values: dict[str, Value]) -> None:
    """Tm 2F5/2: 112 ms is a lower limit, not a lifetime."""
    assert "Tm levels.4f13.6s2_2F5/2.lifetime" not in values


def test_chromium_533_is_no_line(book: Catalogue) -> None:
    """A note's 533 nm repump is a slip for 633 nm."""
    names = {line.name for line in book.atom("52Cr").lines}
    assert "633" in names
    assert not any(name.startswith("533") for name in names)
