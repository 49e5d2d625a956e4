"""Audit rule on sublevel labels: a rank in an m-block names one F only while the block's energies stay apart."""

import math
from itertools import pairwise

import numpy as np

from levels.audit_structure import Broken, Species
from levels.blocks import block_ms, hyperfine_weights
from levels.constants import MU_B_MHZ_PER_GAUSS
from levels.notation import format_half
from levels.records import Level
from levels.sublevels import Constants, constants_of, solve_block

# closer than this the published constants do not tell which F lies lower, or an avoided crossing is too narrow to name
SMALLEST_GAP_MHZ = 1e-3
FIELD_STEPS = 60


def label_gaps(species: Species) -> Broken:
    """No two F coincide at zero field within the constants' uncertainty; no block comes near a crossing in a field."""
    for atom in species.atoms.values():
        for level in atom.levels:
            key = f"levels.{level.name}.hyperfine.{atom.isotope.mass_number}"
            if level.A is None or level.g_J is None or level.g_I is None or not level.twice_J:
                continue
            coincident = _coincident(level)
            if coincident:
                yield key, coincident
                continue
            gap = _smallest_gap(constants_of(level))
            if gap < SMALLEST_GAP_MHZ:
                yield key, f"two sublevels of one m come within {gap * 1e3:.3g} kHz in a field"


def _coincident(level: Level) -> str:
    """Which neighbouring F the constants do not put in order, or nothing."""
    constants = [(i, constant) for i, constant in enumerate((level.A, level.B, level.C)) if constant is not None]
    numbers = range(abs(level.twice_J - level.twice_I), level.twice_J + level.twice_I + 1, 2)
    weights = {F: hyperfine_weights(level.twice_J, level.twice_I, F) for F in numbers}
    energy = {F: sum(weights[F][i] * constant.value for i, constant in constants) for F in numbers}
    for low, high in pairwise(sorted(numbers, key=energy.__getitem__)):
        gap = energy[high] - energy[low]
        spread = math.hypot(*((weights[high][i] - weights[low][i]) * (c.uncertainty or 0.0) for i, c in constants))
        if gap <= max(spread, SMALLEST_GAP_MHZ):
            return f"F = {format_half(low)} and {format_half(high)} are {gap:.3g} MHz apart, uncertain by {spread:.2g}"
    return ""


def _smallest_gap(constants: Constants) -> float:
    """The least distance of neighbours in any m-block, over fields up to far beyond the hyperfine structure."""
    span = max(abs(weight) for weight in (constants.A_mhz, constants.B_mhz, constants.C_mhz)) * 10
    fields = np.geomspace(1e-3, 1e2, FIELD_STEPS) * span / MU_B_MHZ_PER_GAUSS
    gaps = [SMALLEST_GAP_MHZ * 2]
    for twice_m in block_ms(constants.twice_J, constants.twice_I):
        energies = solve_block(constants, twice_m, fields).energy_mhz
        if energies.shape[1] > 1:
            gaps.append(float(np.min(np.diff(energies, axis=1))))
    return min(gaps)
