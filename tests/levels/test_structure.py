"""Sublevels and amplitudes of all levels that light and decays reach."""

import numpy as np
import pytest

from levels.components import components
from levels.errors import OutsideValidity
from levels.structure import structure_of
from tests.levels.pumping_records import CA40, CS133_D2, RB87_D1, RB87_D2
from tests.levels.test_decays import with_lines


@pytest.mark.parametrize("atom", [RB87_D2, RB87_D1, CS133_D2])
@pytest.mark.parametrize("field", [0.0, 3.0, 400.0])
def test_squares_of_amplitudes_are_the_strengths(atom, field):
    """The amplitudes' squares are the strengths of `components` at the same field."""
    structure = structure_of(atom, atom.lines, field)
    table = components(atom.lines[0], field)
    for k in range(table.q.size):
        low = structure.position(atom.levels[0], (int(table.lower_twice_F[k]), int(table.lower_twice_m[k])))
        up = structure.position(atom.levels[1], (int(table.upper_twice_F[k]), int(table.upper_twice_m[k])))
        part = structure.amplitudes["780"][up - structure.slices[1].start, low - structure.slices[0].start]
        assert part**2 == pytest.approx(table.strength[0, k], abs=1e-12)
        offset = structure.energy_mhz[up] - structure.energy_mhz[low]
        assert offset == pytest.approx(table.offset_mhz[0, k], abs=1e-8)


@pytest.mark.parametrize("field", [0.0, 30.0, 3000.0])
def test_decays_are_complete(field):
    """All decays of each upper sublevel sum to 1, and decays of different sublevels are orthogonal (no interference
    that would break the trace)."""
    structure = structure_of(CS133_D2, CS133_D2.lines, field)
    amplitude = structure.amplitudes["780"]
    F, m = structure.twice_F, structure.twice_m
    q = (m[structure.slices[1]][:, None] - m[structure.slices[0]][None, :]) // 2
    total = sum(np.where(q == k, amplitude, 0) @ np.where(q == k, amplitude, 0).T for k in (-1, 0, 1))
    assert total == pytest.approx(np.eye(total.shape[0]), abs=1e-12)
    assert F.size == 48


def test_zero_field_phases_are_those_of_coupled_states():
    """Amplitudes of F - F' at zero field have the signs of one reduced element times a 3j symbol: the ratio to
    (-1)^(F'-m') (F' 1 F; -m' q m) is the same for every m."""
    from levels.angular import three_j

    structure = structure_of(RB87_D2, RB87_D2.lines, 0.0)
    low, up = structure.slices
    for F in (2, 4):
        for F_up in (0, 2, 4, 6):
            ratios = []
            for a in range(low.start, low.stop):
                for b in range(up.start, up.stop):
                    if structure.twice_F[a] != F or structure.twice_F[b] != F_up:
                        continue
                    m, m_up = int(structure.twice_m[a]), int(structure.twice_m[b])
                    symbol = float(three_j(F_up, 2, F, -m_up, m_up - m, m)) if abs(m_up - m) <= 2 else 0.0
                    if abs(symbol) > 1e-9:
                        sign = -1 if (F_up - m_up) // 2 % 2 else 1
                        ratios.append(structure.amplitudes["780"][b - up.start, a - low.start] / (sign * symbol))
            assert np.ptp(ratios) == pytest.approx(0.0, abs=1e-12) if ratios else abs(F - F_up) > 2


def test_decays_are_followed_to_the_ground():
    """Driving 397 nm alone reaches D3/2, which decays by its quadrupole line: eight sublevels, no loss."""
    structure = structure_of(CA40, CA40.lines[:1], 1.0)
    assert [level.name for level in structure.levels] == ["S1/2", "D3/2", "P1/2"]
    assert structure.size == 8
    assert not structure.lost_per_s.any()
    assert set(structure.amplitudes) == {"blue", "red", "E2"}


def test_a_level_without_constants_is_lost():
    """When D3/2 has no published g_J, its share of the decays is counted as lost and a note says why."""
    from dataclasses import replace

    D = replace(CA40.levels[1], g_J=None)
    atom = with_lines(CA40, red={"lower": D}, E2={"upper": D})
    structure = structure_of(atom, atom.lines[:1], 1.0)
    assert [level.name for level in structure.levels] == ["S1/2", "P1/2"]
    assert structure.lost_per_s[-1] == pytest.approx(0.06435 / 6.904e-9)
    assert any("g_J" in note and "lost" in note for note in structure.notes)


def test_unknown_sublevel_is_refused():
    """A label that the level does not have is named."""
    structure = structure_of(RB87_D2, RB87_D2.lines, 0.0)
    with pytest.raises(OutsideValidity, match="3,3"):
        structure.position(RB87_D2.levels[0], (6, 6))
