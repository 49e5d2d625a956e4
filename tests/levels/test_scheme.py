"""Verdicts on whole schemes: the right findings with the right numbers, and none where all is well."""

import numpy as np
import pytest

from levels.beams import make_scheme, offset_of_component, offset_of_hyperfine
from levels.errors import OutsideValidity
from levels.findings import BY_CODE, KINDS, SEVERITIES, finding
from levels.scheme import check
from tests.levels.pumping_records import CA40, RB87_D1, RB87_D2, beam, simple_atom
from tests.levels.test_decays import with_lines
from tests.levels.test_pumping import ion_scheme, pumping_scheme
from tests.records_for_tests import quantity

D1, D2 = RB87_D1.lines[0], RB87_D2.lines[0]
TARGET = (D1.lower, (4, 4))


def codes(verdict, severity=None):
    return [item.code for item in verdict.findings if severity in (None, item.severity)]


def one(verdict, code):
    return next(item for item in verdict.findings if item.code == code)


def test_table_of_findings_is_sound():
    """Every kind has its own code, a severity of the list and a meaning; a finding takes unit and severity from it."""
    assert len(BY_CODE) == len(KINDS)
    assert {kind.severity for kind in KINDS} <= set(SEVERITIES)
    assert all(kind.meaning for kind in KINDS)
    item = finding("purity", "x", "y", 0.5)
    assert (item.severity, item.unit) == ("note", "1")


def test_good_pumping_has_no_problem():
    """87Rb D1 pumping along the field: |2,2> is a dark target, the purity is 1, nothing is a problem."""
    verdict = check(pumping_scheme(linewidth_mhz=1.0), target=TARGET)
    assert verdict.works
    assert one(verdict, "purity").value == pytest.approx(1.0, abs=1e-6)
    assert "dark-target" in codes(verdict)
    assert "dark-state" not in codes(verdict)
    assert codes(verdict, "problem") == []


def test_misaligned_pumping_names_angle_and_limit():
    """8.5 degrees between beam and field: at most 98.9 % sigma+, said with the angle; the purity falls with it."""
    scheme = pumping_scheme(field=(np.sin(np.radians(8.5)), 0, np.cos(np.radians(8.5))), wanted_q=1, linewidth_mhz=1.0)
    verdict = check(scheme, target=TARGET)
    limit = one(verdict, "geometry-limits-polarisation")
    assert limit.value == pytest.approx((1 + np.cos(np.radians(8.5)) ** 2) / 2)
    assert "8.5 deg" in limit.text
    assert "8.5 deg" in limit.change
    assert 0.9 < one(verdict, "purity").value < 0.99


def test_impure_beam_gets_its_plates():
    """Linear light where sigma+ is wanted: half the light is wrong, and the plate setting makes it circular."""
    from levels.geometry import axes_of, polarisation_vector, resolve
    from levels.jones import plate, through_plates

    offset = offset_of_hyperfine(D2, 4, 6)
    verdict = check(make_scheme(RB87_D2, [beam(RB87_D2, offset_mhz=offset, light=0.0, wanted_q=1)], (0, 0, 1.0)))
    impure = one(verdict, "polarisation-impure")
    assert impure.value == pytest.approx(0.5)
    half, quarter = (float(part.split(" deg")[0]) for part in impure.change.split("plate at ")[1:])
    jones = through_plates(0.0, [plate("half", half), plate("quarter", quarter)])
    resolved = resolve((0, 0, 1), polarisation_vector((0, 0, 1), jones), axes_of((0, 0, 1.0)))
    assert resolved.fraction(1) == pytest.approx(1.0, abs=1e-4)


def test_beam_off_resonance_gets_its_offset():
    """A beam a gigahertz off says by how many linewidths and which offset is resonant."""
    offset = offset_of_component(D2, (4, 4), (6, 6), 0.5)
    light = beam(RB87_D2, offset_mhz=offset + 1000.0, wanted_q=1, wanted_F=(4, 6))
    verdict = check(make_scheme(RB87_D2, [light], (0, 0, 0.5)))
    off = one(verdict, "beam-off-resonance")
    assert off.severity == "problem"
    assert off.value == pytest.approx(1000.0 / 6.0666, rel=2e-3)
    assert float(off.change.split("to ")[1].split(" MHz")[0]) == pytest.approx(offset, abs=1.5)


def test_missing_repump_is_a_problem():
    """Cooling light alone leaves the atoms in F = 1, which no beam addresses, after thousands of photons."""
    light = beam(RB87_D2, offset_mhz=offset_of_hyperfine(D2, 4, 6, -6.0), intensity=3.0, light=0.0, direction=(1, 0, 1))
    verdict = check(make_scheme(RB87_D2, [light], (0, 0, 0.5)))
    assert not verdict.works
    unlit = one(verdict, "unlit-level")
    assert unlit.about == "s_2S1/2 F=1"
    assert unlit.value > 0.9
    assert one(verdict, "leaves-cycle").value == pytest.approx(verdict.cycling.photons)


def test_dark_ion_gets_a_field():
    """Linear light along the field leaves 40Ca+ in D3/2 m = +-3/2: a problem, and the remedy found is brighter."""
    verdict = check(ion_scheme((0, 0, 1.0)), remedies=True)
    assert not verdict.works
    dark = [item for item in verdict.findings if item.code == "dark-state"]
    assert [item.severity for item in dark] == ["problem", "problem"]
    assert "|3/2,3/2>" in dark[0].text + dark[1].text
    assert "low-scattering" in codes(verdict)
    assert float(dark[0].change.split("scatters ")[1].split(" per")[0]) > 1e6


def test_bright_ion_has_no_problem():
    """With the field at an angle the same beams scatter, and no dark state holds more than its share."""
    verdict = check(ion_scheme((0, 1.5, 1.5)))
    assert verdict.works
    assert "dark-state" not in codes(verdict)
    assert verdict.outcome.scattering_per_s > 1e6


def test_two_photon_resonance_is_pointed_out():
    """Equal detunings of 397 and 866 nm are in two-photon resonance; well apart they are not."""
    for red, expected in ((-15.0, True), (60.0, False)):
        beams = [
            beam(CA40, "blue", offset_mhz=-15.0, intensity=30.0, direction=(1, 0, 0), light=40.0, name="blue"),
            beam(CA40, "red", offset_mhz=red, intensity=30.0, direction=(1, 0, 0), light=40.0, name="red"),
        ]
        verdict = check(make_scheme(CA40, beams, (0, 0, 2.0)))
        assert ("two-photon-resonance" in codes(verdict)) is expected


def test_losses_and_models_are_findings():
    """A leak, rate equations for want of a frame and several steady states are all said."""
    leaky = with_lines(simple_atom(0, 2), **{"780": {"branching": quantity(0.99)}})
    assert "atoms-lost" in codes(check(make_scheme(leaky, [beam(leaky)], (0, 0, 1.0))))
    cool = offset_of_hyperfine(D2, 4, 6)
    beams = [beam(RB87_D2, offset_mhz=cool), beam(RB87_D2, offset_mhz=cool - 10.0, name="b")]
    assert "rate-equations" in codes(check(make_scheme(RB87_D2, beams, (0, 0, 1.0))))
    atom = simple_atom(4, 2)
    assert "depends-on-start" in codes(check(make_scheme(atom, [beam(atom)], (0, 0, 1.0))))


def test_wrong_target_names_the_better_one():
    """Asked to pump into |2,-2> with sigma+ light, the finding is a problem and names |2,2>."""
    verdict = check(pumping_scheme(linewidth_mhz=1.0), target=(D1.lower, (4, -4)))
    purity = one(verdict, "purity")
    assert purity.severity == "problem"
    assert "2,2 best" in purity.change


def test_findings_come_worst_first():
    """Problems stand before warnings, warnings before notes."""
    verdict = check(ion_scheme((0, 0, 1.0)))
    ranks = [SEVERITIES.index(item.severity) for item in verdict.findings]
    assert ranks == sorted(ranks)


def test_linewidths_must_be_positive():
    """The reach of a resonance is a positive number of widths."""
    with pytest.raises(OutsideValidity):
        check(pumping_scheme(), linewidths=0.0)
