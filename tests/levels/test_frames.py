"""Rotating frames: where one exists, what is left out of it, and the reason where there is none."""

import numpy as np
import pytest

from levels.beams import make_scheme, offset_of_hyperfine
from levels.driven import drive_of
from levels.frames import frame_of
from tests.levels.pumping_records import CA40, RB87_D2, beam

LINE = RB87_D2.lines[0]
COOL, REPUMP = offset_of_hyperfine(LINE, 4, 6), offset_of_hyperfine(LINE, 2, 4)


def framed(atom, *beams, field=(0, 0, 1.0)):
    drive = drive_of(make_scheme(atom, beams, field))
    return drive, frame_of(drive)


def test_lambda_ion_has_a_frame_per_level():
    """Two lasers on S - P - D: P turns with the first, D with their difference, each laser's phase enters once."""
    drive, frame = framed(CA40, beam(CA40, "blue", offset_mhz=-7.0), beam(CA40, "red", offset_mhz=4.0, name="r"))
    assert frame.reason == ""
    S, D, P = (drive.structure.slices[k].start for k in range(3))
    assert frame.shift_mhz[P] - frame.shift_mhz[S] == pytest.approx(-7.0)
    assert frame.shift_mhz[P] - frame.shift_mhz[D] == pytest.approx(4.0)
    assert (frame.photons[D] - frame.photons[S]).tolist() == [1, -1]
    assert all(mask.all() for mask in frame.coherent)


def test_cooling_and_repump_share_the_excited_level():
    """On one line, each ground F turns with its own laser; the other's far-detuned light is left to rates, and said."""
    drive, frame = framed(RB87_D2, beam(RB87_D2, offset_mhz=COOL), beam(RB87_D2, offset_mhz=REPUMP, name="r"))
    assert frame.reason == ""
    one, two = drive.structure.position(LINE.lower, (2, 0)), drive.structure.position(LINE.lower, (4, 0))
    upper = frame.shift_mhz[drive.structure.slices[1]]
    assert np.ptp(upper) == pytest.approx(0.0, abs=1e-9)
    assert upper[0] - frame.shift_mhz[two] == pytest.approx(COOL)
    assert upper[0] - frame.shift_mhz[one] == pytest.approx(REPUMP)
    low_F = drive.structure.twice_F[drive.structure.slices[0]]
    assert frame.coherent[0][:, low_F == 4].any()
    assert not frame.coherent[0][:, low_F == 2].any()
    assert any("far-detuned" in note for note in frame.notes)


def test_two_frequencies_on_one_component_have_no_frame():
    """Two resonant beams 10 MHz apart on one transition beat: no frame, and the reason names beam and levels."""
    beams = [beam(RB87_D2, offset_mhz=COOL, intensity=1.6), beam(RB87_D2, offset_mhz=COOL - 10, name="second")]
    _, frame = framed(RB87_D2, *beams)
    assert "second" in frame.reason
    assert "F=2" in frame.reason


def test_equal_frequencies_add_their_fields():
    """Two beams of one frequency stand still together, with a note that their fields add."""
    beams = [beam(RB87_D2, offset_mhz=COOL), beam(RB87_D2, offset_mhz=COOL, name="b", direction=(0, 0, -1))]
    _, frame = framed(RB87_D2, *beams)
    assert frame.reason == ""
    assert any("fields add" in note and "a, b" in note for note in frame.notes)


def test_weak_but_comparable_light_is_not_swept_aside():
    """Two far-detuned beams of like strength on one transition have no frame: neither is negligible."""
    beams = [beam(RB87_D2, offset_mhz=COOL - 3000, intensity=1e-3),
             beam(RB87_D2, offset_mhz=COOL - 3010, intensity=1e-3, name="b")]  # fmt: skip
    _, frame = framed(RB87_D2, *beams)
    assert frame.reason != ""
