"""Every rule of the audit, on the fictional element with one thing broken."""

import json
import shutil
from pathlib import Path

import pytest

from levels.audit import RULES, audit, audit_overlay, main
from levels.audit_nuclei import one_nucleus
from levels.audit_structure import Species
from levels.audit_trends import TRENDS, smooth_trends
from levels.audit_values import values_of
from levels.catalogue import Catalogue, load
from levels.schema import validate
from levels.tally import format_tally, tally
from tests.conftest import FICTIONAL
from tests.levels.test_schema import document


def broken(tmp_path: Path, old: str, new: str, file: str = "Zz.toml") -> Catalogue:
    """The fictional catalogue with one piece of text replaced in one of its files."""
    copy = shutil.copytree(FICTIONAL, tmp_path / "data")
    text = (copy / file).read_text()
    assert text.count(old) >= 1
    (copy / file).write_text(text.replace(old, new, 1))
    return load([copy])


def test_the_fictional_element_is_clean(fictional: Catalogue) -> None:
    """No rule fires where nothing is wrong."""
    assert audit(fictional) == []


IDLE_EXCEPTION = '[[exceptions]]\nrule = "ritz"\nwhere = "loops.*"\nreason = "answers nothing any more"\n'
FOURTH_INTERVAL = '{ between = "1-3", value = "245.0(1) MHz", source = "zyx1999", evidence = "recalled" },\n'
D2 = 'branching = { value = "0.980(2)"'


def given(key: str, value: str) -> str:
    """A line of the data file that states one more recalled value."""
    return f'{key} = {{ value = "{value}", source = "zyx1999", evidence = "recalled" }}\n'


def test_the_packaged_book_is_clean(book: Catalogue) -> None:
    """Every rule holds over the whole catalogue, answered exceptions apart."""
    assert audit(book) == []


BREAKS = {
    "parity": [
        ('configuration = "5p6.6p"\nterm = "2P"\nJ = "3/2"\nparity = "odd"', 'term = "2P"\nJ = "3/2"\nparity = "even"'),
        ("photons = 2\n", ""),
    ],
    "multipole": [
        ('multipole = "E3"', 'multipole = "E1"'),
        ("induced = ", "note = "),
        ('multipole = "M1"', 'multipole = "M1"\ninduced = "needlessly"'),
    ],
    "configuration": [
        ('configuration = "5p6.6p"', 'configuration = "5p5.6p"'),
        ('configuration = "5p6.7s"', 'configuration = "5p6.8s"'),
    ],
    "term": [
        (
            '[levels."5d.6p_3[5/2]5/2"]\nconfiguration = "unknown"\nterm = "3[5/2]"\ncoupling = "none"',
            '[levels."5d.6p_3F5/2"]\nterm = "3F"',
        ),
        ('term = "(8,1)"\ncoupling = "JJ"', 'term = "(8,1)"'),
    ],
    "line name": [("nominal_nm = 800.0", "nominal_nm = 802.0")],
    "nominal wavelength": [("nominal_nm = 476.19", "nominal_nm = 476.91")],
    "order": [('lower = "6p_2P1/2"\nupper = "6p_2P3/2"', 'lower = "6p_2P3/2"\nupper = "6p_2P1/2"')],
    "unique names": [('aliases = ["D1"]', 'aliases = ["D2"]'), ('aliases = ["P3/2"]', 'aliases = ["7s_2S1/2"]')],
    "spin": [
        ('[isotopes.303]\nspin = "3/2"', '[isotopes.303]\nspin = "1"'),
        ('[isotopes.300]\nspin = "0"', '[isotopes.300]\nspin = "1"'),
    ],
    "mass": [("301.011000(5) u", "301.211000(5) u")],
    "abundance": [("60.0(1) %", "69.0(1) %")],
    "hyperfine numbers": [
        ('A = { value = "80.0(2) MHz"', given("B", "1.0(1) MHz") + 'A = { value = "80.0(2) MHz"'),
        ('A = { value = "-360.0(5) MHz"', given("B", "1.0(1) MHz") + 'A = { value = "-360.0(5) MHz"'),
        ('between = "2-3", value = "10800', 'between = "2-4", value = "10800'),
        ('of = "2-3"', 'of = "3-3"'),
    ],
    "ritz": [
        ('"12500.00000(2) cm-1"', '"12500.00010(2) cm-1"'),
        ('"833.1044(5) nm", medium = "air"', '"833.1044(5) nm"'),
        ('"12000.000 cm-1"', '"12000.100 cm-1"'),
    ],
    "shift against frequency": [('value = "500.0(5) MHz"', 'value = "505.0(5) MHz"')],
    "repeated frequency": [('"374743734.0(5) MHz"', '"374743743.0(5) MHz"')],
    "reducible": [('A = { value = "-48.0(1) MHz", source = "zedd2001", evidence = "checked" }\n', "")],
    "tabulated energy": [('"12500.00000(2) cm-1"', '"12050.00000(2) cm-1"')],
    "A ratio": [('"-3600.000(2) MHz"', '"-3700.000(2) MHz"'), ('"80.0(2) MHz"', '"83.0(2) MHz"')],
    "B ratio": [('quadrupole = { value = "0.60(2) b"', 'quadrupole = { value = "0.90(2) b"')],
    "A sign": [('"-3600.000(2) MHz"', '"3600.000(2) MHz"')],
    "nuclear g": [('"-0.00054190(20)"', '"-0.00051490(20)"'), ('"-0.00054190(20)"', '"0.00054190(20)"')],
    "lande": [('"2.00240(2)"', '"2.24000(2)"')],
    "intervals": [('  { between = "2-3", value = "135', FOURTH_INTERVAL + '  { between = "2-3", value = "135')],
    "label gaps": [('"-360.0(5) MHz"', '"-360(500) MHz"')],
    "branching sum": [('"0.020(2)"', '"0.200(2)"')],
    "lifetime": [(D2, given("einstein_A", "3.95(1)e7 s-1") + D2), (D2, given("einstein_A", "3.00(1)e7 s-1") + D2)],
    "line strength": [
        (D2, given("einstein_A", "3.69(5)e7 s-1") + given("reduced_dipole", "6.51(2) e*a0") + D2),
        (D2, given("einstein_A", "3.69(5)e7 s-1") + given("oscillator_strength", "0.90(1)") + D2),
    ],
    "decay sum": [('aliases = ["D1"]\n', 'aliases = ["D1"]\n' + given("einstein_A", "2.0(1)e7 s-1"))],
    "multiplet strength": [('"30.0(5) ns"', '"1.00(2) ns"')],
    "uncertainty": [('"6.00(5) MHz"', '"6.00 MHz"')],
    "disagreement": [(', note = "radiation trapping not corrected"', "")],
    "known sources": [('source = "zedd2001"', 'source = "zed2001"')],
    "exception": [("[element]", IDLE_EXCEPTION + "[element]")],
}


@pytest.mark.parametrize(
    ("rule", "old", "new"), [(rule, old, new) for rule, pairs in BREAKS.items() for old, new in pairs]
)
def test_a_broken_number_is_found_by_its_rule(tmp_path: Path, rule: str, old: str, new: str) -> None:
    """One thing wrong in the file makes the rule fire, naming the species and the key."""
    findings = [finding for finding in audit(broken(tmp_path, old, new)) if finding.rule == rule]
    assert findings
    assert all(finding.where.startswith("Zz: ") and finding.message for finding in findings)


REFERENCE_BREAKS = {
    "used references": [('"zyx1999"', '"zyx1998"')],
    "known sources": [('"zyx1999"', '"zyx1998"')],
    "reference form": [
        ("10.5555/zz.2001.1", "https://doi.org/10.5555/zz.2001.1"),
        ("10.5555/zz.2001.1", "10.5555/zz.2001.1."),
        ("[[2001]]", "[[2010]]"),
        ('"type": "article-journal",', ""),
        ('"DOI": "10.5555/zz.2001.1"', '"DOI": "10.5555/zz.2001.1", "number": "arXiv:20.1"'),
        ('"author": [{"family": "Zyx"}],', ""),
    ],
    "duplicate references": [
        ('"volume": "0",\n  "page": "99"', '"volume": "1",\n  "page": "1"'),
    ],
}


@pytest.mark.parametrize(
    ("rule", "old", "new"), [(rule, old, new) for rule, pairs in REFERENCE_BREAKS.items() for old, new in pairs]
)
def test_a_broken_bibliography_is_found_by_its_rule(tmp_path: Path, rule: str, old: str, new: str) -> None:
    """Unknown, unused, malformed and doubled references are found."""
    findings = audit(broken(tmp_path, old, new, "references.json"))
    assert rule in {finding.rule for finding in findings}


def test_shifts_of_three_lines_close_their_loop(tmp_path: Path) -> None:
    """nu(800) = nu(1333) + nu(2000) holds for isotope shifts too, far below the lines' own uncertainty."""
    head = 'upper = "6p_2P3/2"\nnominal_nm = 2000.0\n'
    shift = 'shift = [ {{ isotope = 301, value = "{}", source = "zedd2001", evidence = "checked" }} ]\n'
    catalogue = broken(tmp_path, head, head + shift.format("90.0(5) MHz"))
    copy = tmp_path / "data" / "Zz.toml"
    e2 = "[lines.1333]\n"
    for value, rules in (("110.0(5) MHz", set()), ("120.0(5) MHz", {"shift loops"})):
        text = copy.read_text()
        copy.write_text(text.replace(e2, e2 + shift.format(value)))
        found = {finding.rule for finding in audit(load([copy.parent]))}
        copy.write_text(text)
        assert found == rules
    assert {finding.rule for finding in audit(catalogue)} == set()


def test_isotope_shifts_of_two_lines_lie_on_a_line(tmp_path: Path) -> None:
    """Shifts of the 833 nm line that are 1.1 times those of 800 nm make a straight King plot; one that is not shows."""
    entry = '{{ isotope = {}, value = "{}(5) MHz", source = "zyx1999", evidence = "recalled" }}'
    mass = '[isotopes.305]\nmass = { value = "305.015000(5) u", source = "zedd2001", evidence = "checked" }\n'
    text = (FICTIONAL / "Zz.toml").read_text().replace("[isotopes.305]\n", mass)
    text = text.replace("{ isotope = 301, value", entry.format(305, "800.0") + ",\n  { isotope = 301, value")
    copy = shutil.copytree(FICTIONAL, tmp_path / "data")
    for last, rules in (("880.0", set()), ("980.0", {"king"})):
        shifts = ", ".join(entry.format(*pair) for pair in ((301, "220.0"), (303, "550.0"), (305, last)))
        (copy / "Zz.toml").write_text(
            text.replace("nominal_nm = 833.333\n", f"nominal_nm = 833.333\nshift = [{shifts}]\n")
        )
        assert {finding.rule for finding in audit(load([copy]))} == rules


def test_smooth_trends_along_a_column() -> None:
    """Fine structure that does not grow from sodium to potassium is found; one that grows is not."""
    small = Species(validate(document('"833.1044(5) nm", medium = "air"', '"806.4516(5) nm"'), "Zz.toml"))
    large = Species(validate(document(), "Zz.toml"))
    name = "K: trends.fine structure of the D lines"
    assert name not in {where for where, _ in smooth_trends({"Na": small, "K": large})}
    assert name in {where for where, _ in smooth_trends({"Na": large, "K": small})}
    assert len({trend.name for trend in TRENDS}) == len(TRENDS)


def test_the_ion_shares_its_nucleus_with_the_atom(tmp_path: Path) -> None:
    """A mass that the file of the ion gives otherwise is found."""
    atom = (FICTIONAL / "Zz.toml").read_text()
    ion = atom.replace("charge = 0", "charge = 1")
    (tmp_path / "Zz.toml").write_text(atom)
    (tmp_path / "Zz+.toml").write_text(ion)
    assert list(one_nucleus(load([tmp_path]))) == []
    fact = next(line for line in ion.splitlines() if line.startswith("mass = "))
    (tmp_path / "Zz+.toml").write_text(ion.replace(fact, fact.replace('value = "', 'value = "1'), 1))
    assert [where.rpartition(".")[2] for where, _ in one_nucleus(load([tmp_path]))] == ["mass"]


def test_every_rule_has_a_broken_fixture() -> None:
    """No rule joins the table without a test that makes it fire."""
    assert {*BREAKS, *REFERENCE_BREAKS, "shift loops", "king", "smooth trends", "one nucleus"} == set(RULES)


def test_an_exception_answers_its_finding_and_is_counted(tmp_path: Path) -> None:
    """A reasoned exception silences one rule at one key, and stands in the tally."""
    text = (FICTIONAL / "Zz.toml").read_text().replace('"-3600.000(2) MHz"', '"-3700.000(2) MHz"')
    answer = '[[exceptions]]\nrule = "A ratio"\nwhere = "levels.6s_2S1/2.A.*"\nreason = "a made-up anomaly of 2.8 %"\n'
    copy = shutil.copytree(FICTIONAL, tmp_path / "data")
    (copy / "Zz.toml").write_text(text + answer)
    catalogue = load([copy])
    assert "A ratio" not in {finding.rule for finding in audit(catalogue)}
    assert tally(catalogue.elements)[0].exceptions == 1


def test_the_tally_counts_every_value_once(fictional: Catalogue) -> None:
    """Values fall into checked, recalled and computed; alternatives are counted beside them."""
    row = tally(fictional.elements)[0]
    assert row.values == row.checked + row.recalled + row.computed == len(list(values_of(fictional.elements["Zz"])))
    assert (row.isotopes, row.levels, row.lines, row.alternatives) == (4, 11, 8, 1)
    assert format_tally([row, row]).splitlines()[-1].split()[:2] == ["all", "8"]


def test_keys_of_values_are_unique(book: Catalogue) -> None:
    """A key names one value, except where a line lists several frequencies of one isotope."""
    for data in book.elements.values():
        keys = [key for key, _ in values_of(data) if ".frequency." not in key]
        assert len(keys) == len(set(keys))


def test_an_overlay_answers_only_for_itself(tmp_path: Path) -> None:
    """Auditing an overlay reports what the overlay breaks, not what the packaged data may have."""
    (tmp_path / "ourlab.toml").write_text(
        '[element]\nsymbol = "Rb"\n[levels."5s_2S1/2".hyperfine.87]\nA = { value = "3147.341(1) MHz" }\n'
    )
    _, findings = audit_overlay(tmp_path)
    assert {finding.rule for finding in findings} >= {"A ratio"}
    assert all(finding.where.startswith("Rb: ") for finding in findings)


def test_the_command_says_what_an_overlay_lacks(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """An overlay that does not validate is told by file and key; the status says which kind of failure it was."""
    (tmp_path / "ourlab.toml").write_text('[element]\nsymbol = "Rb"\ncolour = "red"\n')
    assert main([str(tmp_path)]) == 2
    assert "ourlab.toml: element.colour: unknown key" in capsys.readouterr().err


def test_references_are_sorted_and_unique() -> None:
    """The bibliography is one sorted list, so that additions merge line by line."""
    from levels.catalogue import DATA

    names = [item["id"] for item in json.loads((DATA / "references.json").read_text(encoding="utf-8"))]
    assert names == sorted(set(names))
