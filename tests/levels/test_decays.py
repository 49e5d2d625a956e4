"""How levels decay: shares, closure, leaks and what is said about missing values."""

from dataclasses import replace

import numpy as np
import pytest

from levels.beams import saturation_intensity
from levels.decays import decay_of, driven_decay, own_rate
from levels.errors import NotPublished
from levels.records import Atom
from tests.levels.pumping_records import CA40, RB87_D2, simple_atom
from tests.records_for_tests import quantity


def with_lines(atom, **changes):
    """The atom with attributes of its lines changed by name."""
    return replace(atom, lines=tuple(replace(line, **changes.get(line.name, {})) for line in atom.lines))


def level_named(atom, name):
    return next(level for level in atom.levels if level.name == name)


def test_branching_shares_the_lifetime():
    """40Ca+ 4p 2P1/2 decays at 1/6.904 ns, 93.565 % of it at 397 nm."""
    decay = decay_of(CA40, level_named(CA40, "P1/2"))
    assert decay.total_per_s == pytest.approx(1 / 6.904e-9)
    assert decay.rate_of(CA40.lines[0]) == pytest.approx(0.93565 / 6.904e-9)
    assert decay.leak_per_s == 0.0
    assert decay.notes == ()


def test_one_missing_share_is_the_remainder():
    """The one line without a published share gets what the others leave, and a note says so."""
    atom = with_lines(CA40, red={"branching": None})
    decay = decay_of(atom, level_named(atom, "P1/2"))
    assert decay.rate_of(atom.lines[1]) == pytest.approx(0.06435 / 6.904e-9)
    assert "taken as what remains" in decay.notes[0]


def test_unclosed_branching_is_a_leak():
    """A level whose only line has 90 % loses a tenth of its decays."""
    atom = with_lines(simple_atom(0, 2), **{"780": {"branching": quantity(0.9)}})
    decay = decay_of(atom, atom.levels[1])
    assert decay.leak_per_s == pytest.approx(0.1 * decay.total_per_s)
    assert "counted as lost" in decay.notes[0]


def test_shares_within_uncertainty_are_scaled_to_one():
    """Shares that miss 1 by less than their uncertainty close exactly: no leak out of rounding."""
    atom = with_lines(CA40, blue={"branching": quantity(0.9330, 0.002)})
    decay = decay_of(atom, level_named(atom, "P1/2"))
    assert decay.leak_per_s == 0.0
    assert sum(channel.rate_per_s for channel in decay.channels) == pytest.approx(decay.total_per_s, rel=1e-12)


def test_rates_beyond_the_lifetime_are_said():
    """Einstein coefficients that add up to more than the lifetime allows are scaled with a note."""
    atom = with_lines(CA40, blue={"branching": quantity(0.99)})
    assert "scaled to 1" in decay_of(atom, level_named(atom, "P1/2")).notes[0]


def test_sum_of_lines_stands_in_for_a_lifetime():
    """Without a lifetime the total is the sum of the lines' own rates."""
    atom = with_lines(simple_atom(0, 2), **{"780": {"branching": None, "einstein_A": quantity(3.8e7, unit="s-1")}})
    upper = replace(atom.levels[1], lifetime=None)
    atom = Atom(atom.isotope, (atom.levels[0], upper), (replace(atom.lines[0], upper=upper),))
    assert decay_of(atom, upper).total_per_s == 3.8e7


def test_reduced_dipole_gives_the_rate():
    """4.227 e a0 <5s 2S1/2||d||5p 2P3/2> in the convention of Steck (Rubidium 87 D Line Data) is 5.978 e a0 in the
    symmetric one (times sqrt2), which gives A = 38.11e6 s-1 at 780 nm."""
    line = replace(RB87_D2.lines[0], reduced_dipole=quantity(5.978, 0.005, "e*a0"), branching=None)
    rate, spread = own_rate(line)
    assert rate == pytest.approx(38.11e6, rel=2e-3)
    assert spread / rate == pytest.approx(2 * 0.005 / 5.978)


def test_driven_line_without_a_rate_is_not_published():
    """A line whose upper level has no rate at all cannot be driven in the model: its Rabi frequency is unknown."""
    atom = simple_atom(0, 2)
    upper = replace(atom.levels[1], lifetime=None)
    line = replace(atom.lines[0], upper=upper, branching=None)
    bare = Atom(atom.isotope, (atom.levels[0], upper), (line,))
    with pytest.raises(NotPublished):
        driven_decay(bare, line)


def test_saturation_intensity_of_rubidium():
    """1.66933(35) mW/cm2 for the cycling component of the 87Rb D2 line (Steck, Rubidium 87 D Line Data)."""
    decay = decay_of(RB87_D2, RB87_D2.levels[1])
    assert decay.width_mhz == pytest.approx(6.0666, abs=2e-4)
    assert saturation_intensity(RB87_D2.lines[0], decay) == pytest.approx(1.66933, abs=35e-5)
    assert np.isfinite(decay.total_per_s)


def test_shares_without_a_lifetime_say_where_not_how_fast():
    """Dipole shares alone are followed at a rate that stands in, which no laser may count on; E2 alone is stable."""
    levels = tuple(replace(level, lifetime=None, width=None) for level in CA40.levels)
    ends = {level.name: level for level in levels}
    lines = tuple(replace(line, lower=ends[line.lower.name], upper=ends[line.upper.name]) for line in CA40.lines)
    atom = replace(CA40, levels=levels, lines=tuple(replace(line, einstein_A=None) for line in lines))
    decay = decay_of(atom, level_named(atom, "P1/2"))
    assert not decay.is_timed
    assert [channel.rate_per_s / decay.total_per_s for channel in decay.channels] == pytest.approx([0.93565, 0.06435])
    assert "the lifetime of 40Ca+ P1/2 is not published" in decay.notes[0]
    with pytest.raises(NotPublished):
        driven_decay(atom, atom.lines[0])
    slow = replace(atom, lines=tuple(replace(line, multipole="E2") for line in atom.lines))
    assert decay_of(slow, level_named(slow, "P1/2")).total_per_s == 0.0
