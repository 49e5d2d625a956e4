"""Photons before loss and repumpers of real atoms: published numbers, and what laboratories do, found by the search."""

from collections.abc import Sequence

import pytest

from levels.catalogue import Catalogue, load
from levels.decaygraph import Graph, graph_of
from levels.lasers import Laser, make_laser
from levels.leaks import Leaks, leaks_of, metastable_elsewhere, neglected
from levels.notation import format_half, parse_component
from levels.repump import Scheme, Search, repump
from levels.repumpfacts import Facts, facts_of

DARK_S = 0.01


@pytest.fixture(scope="module")
def book() -> Catalogue:
    return load()


def set_up(book: Catalogue, atom: str, *drives: str) -> tuple[Graph, list[Laser]]:
    record = book.atom(atom)
    lasers = []
    for drive in drives:
        name, _, component = drive.partition(":")
        lasers.append(make_laser(book.find_line(record, name), parse_component(component) if component else None))
    return graph_of(record, any(laser.component for laser in lasers)), lasers


def leaks(book: Catalogue, atom: str, *drives: str) -> Leaks:
    return leaks_of(*set_up(book, atom, *drives), DARK_S)


def search(book: Catalogue, atom: str, *drives: str) -> Search:
    return repump(*set_up(book, atom, *drives), DARK_S)


def facts(book: Catalogue, atom: str, *drives: str) -> list[tuple[Scheme, Facts]]:
    graph, lasers = set_up(book, atom, *drives)
    singles = repump(graph, lasers, DARK_S).singles
    return list(zip(singles, facts_of(graph, [one.repumpers[0] for one in singles], tuple(lasers)), strict=True))


def names(scheme: Scheme) -> list[str]:
    return sorted(one.line.name for one in scheme.repumpers)


def components(scheme: Scheme) -> list[str]:
    return [f"{format_half(low)}-{format_half(up)}" for low, up in scheme.repumpers[0].components]


def closing(sets: Sequence[Scheme]) -> list[list[str]]:
    return [names(one) for one in sets if one.is_closed]


@pytest.mark.parametrize(
    ("atom", "drive", "expected", "tolerance", "source"),
    [
        ("138Ba+", "493", 3.729, 0.003, "Arnold et al., Phys. Rev. A 100, 032503 (2019): 2.729 photons, 3.729 events"),
        ("88Sr+", "422", 18.3, 0.1, "Likforman et al., Phys. Rev. A 93, 052507 (2016): branch 0.9453(+7-5)"),
        ("40Ca+", "397", 15.54, 0.02, "Ramm et al., PRL 111, 023004 (2013): 0.06435(7) to D3/2"),
        ("174Yb+", "369", 199.6, 6.0, "Olmschenk et al., PRA 76, 052314 (2007): 0.00501(15), about 1 in 200"),
        ("138Ba", "553", 333, 35, "De et al., PRA 79, 041402 (2009): about 1:330 to the D states"),
    ],
)
def test_photons_before_loss(
    book: Catalogue, atom: str, drive: str, expected: float, tolerance: float, source: str
) -> None:
    """Scattering events before an atom without repumpers is lost follow from published branching."""
    assert leaks(book, atom, drive).photons == pytest.approx(expected, abs=tolerance), source


def test_emitted_photons_of_barium(book: Catalogue) -> None:
    """138Ba+ emits 2.729 photons at 493 nm before it is shelved (Arnold et al., PRA 100, 032503 (2019))."""
    found = leaks(book, "138Ba+", "493")
    assert found.photons is not None
    assert found.photons * found.emitted == pytest.approx(2.729, abs=0.002)
    assert found.uncertainty == pytest.approx(0.00042 / 0.268**2 / 10, rel=0.05)  # 0.000042 in the share


def test_repump_of_rubidium(book: Catalogue) -> None:
    """87Rb F=2-3 leaks into F=1 by off-resonant light; F=1 -> F'=2 brings it back, 6.568 GHz up (common practice)."""
    scheme, found = facts(book, "87Rb", "780:2-3")[0]
    assert (names(scheme), components(scheme)) == (["780"], ["1-2"])
    assert scheme.is_closed
    assert found.settings[0].offset_mhz == pytest.approx(6568.03, abs=0.05)
    assert found.reach == "electro-optic"
    assert found.air_nm == pytest.approx(780.02, abs=0.01)


@pytest.mark.parametrize(
    ("atom", "drive", "repumper", "offset_mhz"),
    [
        ("23Na", "589.2:2-3", "1-2", 1713.3),  # Beckmann et al. (1974), Yei et al. (1993)
        ("39K", "767:2-3", "1-2", 440.6),  # Beckmann et al. (1974), Falke et al. (2006)
        ("40K", "767:9/2-11/2", "7/2-9/2", -1241.7),  # Eisinger et al. (1952): inverted ground state
        ("85Rb", "780:3-4", "2-3", 2915.1),  # Tetu et al. (1976), Barwood et al. (1991)
        ("133Cs", "852:4-5", "3-4", 8941.5),  # SI second, Gerginov et al. (2003)
    ],
)
def test_hyperfine_repumps_of_alkalis(book: Catalogue, atom: str, drive: str, repumper: str, offset_mhz: float) -> None:
    """The best repumper of an alkali trap is the other ground state's component on the same line (common practice)."""
    scheme, found = facts(book, atom, drive)[0]
    assert names(scheme) == [drive.partition(":")[0]]
    assert components(scheme) == [repumper]
    assert found.settings[0].offset_mhz == pytest.approx(offset_mhz, abs=0.3)


def test_lithium_repumps(book: Catalogue) -> None:
    """7Li: the repumper is F=1 -> F'=2, 813 MHz above cooling (Beckmann et al. 1974 and Orth et al. 1975)."""
    found = facts(book, "7Li", "670.96:2-3")
    offsets = {(names(s)[0], components(s)[0]): f.settings[0].offset_mhz for s, f in found if s.is_closed}
    assert offsets["670.96", "1-2"] == pytest.approx(812.9, abs=0.3)


def test_repump_of_calcium_ion(book: Catalogue) -> None:
    """40Ca+: 866 closes and shares P1/2 (dark resonances); 850 opens D5/2, which 854 empties (common practice)."""
    found = facts(book, "40Ca+", "397")
    assert [names(scheme) for scheme, _ in found] == [["866"], ["850"]]
    first, second = found[0][0], found[1][0]
    assert first.is_closed
    assert any("coherent dark resonance" in note for note in found[0][1].notes)
    assert any("two dark states" in note for note in found[0][1].notes)
    assert second.opens == ("3d_2D5/2",)
    assert second.photons == pytest.approx(263, abs=2)  # 0.06435 x 0.0587/(0.0587 + 0.9347), Gerritsma et al. (2008)
    elsewhere = metastable_elsewhere(leaks(book, "40Ca+", "397", "866"))
    assert [level.name for level in elsewhere] == ["3d_2D5/2"]
    assert leaks(book, "40Ca+", "397", "866").photons is None
    assert ["854"] in closing(search(book, "40Ca+", "397", "850").singles)


@pytest.mark.parametrize(
    ("atom", "drive", "back", "second", "metastable"),
    [
        ("138Ba+", "493", "650", "614", "5d_2D5/2"),
        ("88Sr+", "422", "1092", "1033", "4d_2D5/2"),
        ("226Ra+", "468", "1079", "802", "6d_2D5/2"),
    ],
)
def test_repumps_of_other_ions(book: Catalogue, atom: str, drive: str, back: str, second: str, metastable: str) -> None:
    """Heavy alkaline-earth ions: one infrared or red laser closes, a second empties D5/2 (common practice)."""
    found = search(book, atom, drive)
    assert names(found.singles[0]) == [back]
    assert found.singles[0].is_closed
    (level,) = metastable_elsewhere(found.leaks)
    assert level.name == metastable
    assert second in {line.name for line in book.atom(atom).lines if line.lower.name == metastable}


def test_repump_of_ytterbium_ion(book: Catalogue) -> None:
    """174Yb+: 935 closes the 369 cycle; 760 and 638 empty F7/2, which other excitation fills (common practice)."""
    found = search(book, "174Yb+", "369")
    assert names(found.singles[0]) == ["935"]
    assert found.singles[0].is_closed
    assert "4f13.6s2_2F7/2" in {level.name for level in metastable_elsewhere(found.leaks)}
    by_329 = search(book, "174Yb+", "329")
    assert {"760", "638"} <= {one.repumpers[0].line.name for one in by_329.singles}
    assert ["760", "935"] in closing(by_329.sets)


def test_sidebands_of_171_ytterbium_ion(book: Catalogue) -> None:
    """171Yb+ on 1-0 needs the 14.7 GHz sideband for F=0 and 935 with its 3.07 GHz sideband (common practice)."""
    graph, lasers = set_up(book, "171Yb+", "369:1-0")
    found = repump(graph, lasers, DARK_S)
    best = found.sets[0]
    assert best.is_closed
    assert names(best) == ["369", "935"]
    parts = dict(
        zip(
            [one.line.name for one in best.repumpers], facts_of(graph, list(best.repumpers), tuple(lasers)), strict=True
        )
    )
    assert parts["369"].settings[0].offset_mhz == pytest.approx(14_747.7, abs=2)
    assert [part.component for part in parts["935"].settings] == [(2, 0), (4, 2)]
    assert abs(parts["935"].settings[1].sideband_mhz or 0.0) == pytest.approx(3070, abs=5)


def test_repumps_of_strontium(book: Catalogue) -> None:
    """88Sr at 461 nm: 679 + 707 close, and 481, 497, 2.6 and 3.0 um routes are found (common practice)."""
    found = search(book, "88Sr", "461")
    lines = {one.repumpers[0].line.name for one in found.singles}
    assert {"707", "679", "497", "481", "2603", "3012", "3067", "717"} <= lines
    assert not any(one.is_closed for one in found.singles)
    assert names(found.sets[0]) == ["679", "707"]
    assert found.sets[0].is_closed


def test_single_repumping_of_strontium_is_limited_by_the_triplet(book: Catalogue) -> None:
    """With 3P2 repumped by 3012, 1P1 - 3D1 - 3P0 limits to 1:4.9e6 with A = 66(6) s-1, to 1:3.9e6 with 83(32) s-1.

    Okamoto et al., arXiv:2406.18942 (2024): A(1P1-3D1) = 83(32) s-1 and 1:3.9e6; the catalogue prefers the later rate.
    """
    found = search(book, "88Sr", "461")
    single = next(one for one in found.singles if names(one) == ["3012"])
    assert single.photons is not None
    assert single.photons * 66 / 83 == pytest.approx(3.9e6, rel=0.02)


def test_repumps_of_barium(book: Catalogue) -> None:
    """138Ba needs three repumpers, 1108, 1130 and 1500 nm (De et al., PRA 79, 041402 (2009)), however it splits."""
    found = search(book, "138Ba", "553")
    assert names(found.sets[0]) == ["1108", "1130", "1500"]
    assert found.sets[0].is_closed
    assert found.leaks.closure == "unknown"
    assert not any(one.is_closed for one in found.singles)
    assert {item.state.level.name for item in found.leaks.reached} == {"6s.5d_3D1", "6s.5d_3D2", "6s.5d_1D2"}


def test_repumps_of_chromium(book: Catalogue) -> None:
    """52Cr at 425 nm leaks into 5D4 and 5D3; 663 and 654 nm bring it back (common practice), as is bounded."""
    found = search(book, "52Cr", "425")
    assert [item.state.level.name for item in found.leaks.reached] == ["3d4.4s2_5D4", "3d4.4s2_5D3"]
    pair = next(one for one in found.sets if names(one) == ["654", "663"])
    assert pair.photons is not None
    assert found.leaks.photons is not None
    assert pair.photons > 1000 * found.leaks.photons
    assert pair.most is None


def test_ytterbium_needs_no_repump(book: Catalogue) -> None:
    """Yb traps at 399 nm without repumper; its leak of 1.2e-7 (Loftus et al., PRA 61, 051401) is left out, and told."""
    found = leaks(book, "174Yb", "399")
    assert found.photons is None
    assert found.closure == "data"
    (told,) = neglected(found)
    assert "5d.6s_3D1, 5d.6s_3D2 neglected" in told
    assert neglected(leaks(book, "87Rb", "780")) == []


def test_ritz_sum_of_calcium_ion(book: Catalogue) -> None:
    """866 lies below 397 by the 732 nm interval: published values close to 0.27 MHz, two standard deviations.

    397: Wan et al. (2014); 866: Gebert et al. (2015); 732: 729 (Sokolik et al.) less the D splitting of Solaro et al.
    (2020).
    """
    found = {names(scheme)[0]: one for scheme, one in facts(book, "40Ca+", "397")}
    interval = book.find_line("40Ca+", "732").centroid
    setting = found["866"].settings[0]
    assert interval is not None
    assert setting.offset_mhz == pytest.approx(-interval.value, abs=0.3)
    assert setting.offset_uncertainty_mhz == pytest.approx(0.130, abs=0.001)


def test_hyperfine_interval_by_two_lines(book: Catalogue) -> None:
    """The ground interval of 87Rb is the same by D1 and D2: 6834.682610904 MHz (SI realisations, CIPM)."""
    for line in ("780", "795"):
        offsets = {}
        for scheme, found in facts(book, "87Rb", f"{line}:2-2"):
            for setting in found.settings:
                offsets[names(scheme)[0], components(scheme)[0]] = setting.offset_mhz
        assert offsets[line, "1-2"] == pytest.approx(6834.682610904, abs=1e-6)
