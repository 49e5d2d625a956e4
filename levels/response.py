"""How one sublevel answers to light: its polarisability for each polarisation, as sums of poles in the light frequency.

To first order in the light, and while the field keeps sublevels further apart than the light shift couples them, the
shift of a sublevel is -(E0^2/4h) sum_q |c_q|^2 alpha_q(nu), with

    alpha_q = remainder + sum_o [ |<o|d_q|a>|^2/(D_o - nu) + |<o|d_-q|a>|^2/(D_o + nu) ]

in a0^3: light of amplitude c_q drives m -> m + q in the rotating term and m -> m - q in the counter-rotating one. Any
polarisation enters by two numbers, the share p = |c_0|^2 along the field and the circularity C = |c_+|^2 - |c_-|^2:
alpha = mean + p (alpha_0 - mean) + C (alpha_+ - alpha_-)/2, where mean = (alpha_+ + alpha_-)/2.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.components import amplitudes
from levels.constants import HARTREE_MHZ
from levels.lightshift import QS, Label, solvable
from levels.partners import (
    Doubt,
    Partners,
    Terms,
    Weighing,
    add_strengths,
    dipole_of,
    doubt_of,
    line_terms,
    other_end,
    remainder_terms,
    signed_frequency_mhz,
)
from levels.polarisability import (
    clearance_mhz,
    hyperfine_levels,
    poles_of,
    vector_and_tensor_bounds,
    vector_and_tensor_caps,
)
from levels.rational import Rational
from levels.records import Line
from levels.sublevels import Constants, Eigen, as_fields, constants_of, find_sublevel, solve_block

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Response:
    """Poles and weights of one sublevel (2F, 2m) at n fields; without a label, of a level's or an F's scalar part.

    `pole_mhz` and `weight` (a0^3 MHz) have shape (n, k): alpha_q = remainder + sum over the poles with that `q` of
    weight/(pole - nu). Counter-rotating terms are poles of negative frequency (of positive, for lines downwards).
    `line` is the row of each pole's line among the partners' lines, `clearance_mhz` how far light must stay from it.
    `energy_mhz` (n,) counts from the level's centroid; `orientation` is <J_z>/2J and `alignment`
    <3 J_z^2 - J(J+1)>/J(2J-1), what a vector and a tensor polarisability of J are multiplied with.
    """

    partners: Partners
    label: Label | None
    field_gauss: Array
    q: NDArray[np.int64]
    pole_mhz: Array
    weight: Array
    line: NDArray[np.int64]
    clearance_mhz: Array
    energy_mhz: Array
    orientation: Array
    alignment: Array

    def shares(self, light_mhz: ArrayLike, at: int = 0) -> Array:
        """Evaluate what each line adds to alpha_q at one field: (lines, 3, m) for m light frequencies, in a0^3."""
        nu = np.atleast_1d(np.asarray(light_mhz, dtype=np.float64))
        shares = np.zeros((len(self.partners.lines), 3, nu.size))
        part = self.weight[at][:, None] / (self.pole_mhz[at][:, None] - nu)
        np.add.at(shares, (self.line, self.q + 1), part)
        return shares

    def by_drive(self, light_mhz: ArrayLike, at: int = 0) -> Array:
        """Evaluate alpha_q at one field for q = -1, 0, 1: (3, m) for m light frequencies, in a0^3."""
        total: Array = self.partners.remainder.value + self.shares(light_mhz, at).sum(axis=0)
        return total

    def along_field(self, light_mhz: float) -> Array:
        """Evaluate alpha_q at every field for one light frequency: (3, n) in a0^3."""
        part = self.weight / (self.pole_mhz - light_mhz)
        rows = [part[:, self.q == q].sum(axis=1) for q in QS]
        total: Array = self.partners.remainder.value + np.stack(rows)
        return total

    def rational(self, fractions: Sequence[float], at: int = 0) -> Rational:
        """Return the polarisability for given |c_q|^2 at one field as a function of the light's frequency in MHz."""
        share = np.asarray(fractions, dtype=np.float64)[self.q + 1]
        kept = share != 0
        return Rational(
            self.pole_mhz[at][kept],
            (share * self.weight[at])[kept],
            self.clearance_mhz[kept],
            self.partners.remainder.value,
        )

    def terms(self, light_mhz: Array, fractions: Array, at: int = 0, sign: float = 1.0) -> Terms:
        """Say how the polarisability at m light frequencies moves with the lines, for |c_q|^2 of (3,) or (3, m)."""
        share = np.reshape(fractions, (3, -1))
        gap = self.pole_mhz[at][:, None] - light_mhz
        slopes = np.zeros((len(self.partners.lines), 3, light_mhz.size))
        np.add.at(slopes, (self.line, self.q + 1), -np.abs(self.weight[at])[:, None] / gap**2)
        parts = (self.shares(light_mhz, at), slopes)
        lines, level = self.partners.lines, self.partners.level
        shares, moved = (
            {line.name: row for line, row in zip(lines, (part * share).sum(axis=1), strict=True)} for part in parts
        )
        for line in lines:
            if line.lower.name != level.name:
                moved[line.name] = -moved[line.name]
        return line_terms(self.partners, shares, moved, anchor=1.0, sign=sign)


def response(partners: Partners, label: Label, field_gauss: ArrayLike) -> Response:
    """Solve one sublevel (2F, 2m) and what its lines join it to, at n fields."""
    level, fields = partners.level, as_fields(field_gauss)
    constants = constants_of(level)
    rank = find_sublevel(constants, *label)
    own = solve_block(constants, label[1], fields)
    mixture = _mixture(own, rank, level.twice_J)
    q_all, poles, weights, rows, clear = [], [], [], [], []
    for row, line in enumerate(partners.lines):
        other = constants_of(solvable(other_end(level, line))[0])
        for q, gap, square in _driven(line, level.name == line.lower.name, own, rank, other, label[1], fields):
            gap = gap + signed_frequency_mhz(level, line)
            for sign, owner in ((1, q), (-1, -q)):  # w/(D + nu) = -w/(-D - nu)
                q_all.append(np.full(gap.shape[1], owner))
                poles.append(sign * gap)
                weights.append(sign * square)
                rows.append(np.full(gap.shape[1], row))
                clear.append(np.full(gap.shape[1], clearance_mhz(line)))
    if not poles:
        nothing, none = np.zeros((fields.size, 0)), np.zeros(0, dtype=np.int64)
        return Response(partners, label, fields, none, nothing, nothing, none, np.zeros(0), *mixture)
    return Response(
        partners,
        label,
        fields,
        np.concatenate(q_all).astype(np.int64),
        np.concatenate(poles, axis=1),
        np.concatenate(weights, axis=1),
        np.concatenate(rows).astype(np.int64),
        np.concatenate(clear),
        *mixture,
    )


def scalar_response(partners: Partners, twice_F: int | None = None) -> Response:
    """Return the scalar polarisability of a level, or of one F, in the shape of a sublevel's answer to light."""
    q, poles, weights, rows, clear = [], [], [], [], []
    for row, line in enumerate(partners.lines):
        for pole in poles_of(partners.level, line, twice_F):
            for sign, owner in ((sign, owner) for sign in (1, -1) for owner in QS):
                q.append(owner)
                poles.append(sign * pole.frequency_mhz)
                weights.append(sign * pole.weights[0] * HARTREE_MHZ)
                rows.append(row)
                clear.append(pole.clearance_mhz)
    nothing = np.zeros(1)
    energy = nothing if twice_F is None else np.array([hyperfine_levels(partners.level)[twice_F]])
    return Response(
        partners,
        None,
        nothing,
        np.array(q, dtype=np.int64),
        np.array([poles]),
        np.array([weights]),
        np.array(rows, dtype=np.int64),
        np.array(clear),
        energy,
        nothing,
        nothing,
    )


def _mixture(own: Eigen, rank: int, twice_J: int) -> tuple[Array, Array, Array]:
    """Return energy, orientation and alignment of one rank of a block at n fields."""
    J, J_z, share = twice_J / 2, own.block.J_z, own.states[:, :, rank] ** 2
    energy = own.energy_mhz[:, rank]
    orientation = share @ J_z / (2 * J) if twice_J else np.zeros_like(energy)
    alignment = share @ (3 * J_z**2 - J * (J + 1)) / (J * (2 * J - 1)) if twice_J > 1 else np.zeros_like(energy)
    return energy, orientation, alignment


def _driven(
    line: Line, is_lower: bool, own: Eigen, rank: int, other: Constants, twice_m: int, fields: Array
) -> list[tuple[int, Array, Array]]:
    """List, for each q = m_o - m, the energies of the other level's sublevels above ours and |<o|d_q|a>|^2 HARTREE."""
    scale = HARTREE_MHZ * dipole_of(line) ** 2 / (line.upper.twice_J + 1)
    highest = other.twice_J + other.twice_I
    found = []
    for q in QS:
        m = twice_m + 2 * q
        if abs(m) > highest:
            continue
        far = solve_block(other, m, fields)
        element = amplitudes(line, own, far)[:, :, rank] if is_lower else amplitudes(line, far, own)[:, rank, :]
        square = scale * element**2
        kept = np.any(square > 1e-14 * scale, axis=0)
        if np.any(kept):
            found.append((q, far.energy_mhz[:, kept] - own.energy_mhz[:, rank, None], square[:, kept]))
    return found


def _weighing(one: Response, light_mhz: Array, fractions: Array, at: int, minus: Response | None = None) -> Weighing:
    """Say how a remainder enters the polarisability of a sublevel, or the difference of two of one level."""
    share = np.reshape(fractions, (3, -1))
    circular = float(np.max(np.abs(share[2] - share[0])))
    tilt = float(np.max(np.abs(3 * share[1] - 1))) / 2
    orientation, alignment, energy = one.orientation[at], one.alignment[at], 0.0
    if minus is not None:
        orientation, alignment = orientation - minus.orientation[at], alignment - minus.alignment[at]
        energy = abs(one.energy_mhz[at] - minus.energy_mhz[at])
    turned, tilted = vector_and_tensor_bounds(one.partners.level.twice_J)
    turn, slant = float(circular * abs(orientation)), float(tilt * abs(alignment))
    caps = vector_and_tensor_caps(one.partners, light_mhz)
    return Weighing(
        1.0 if minus is None else 0.0,
        turned * turn,
        tilted * slant,
        float(energy),
        None if caps is None else (caps[0] * turn, caps[1] * slant),
    )


def doubt_of_sublevel(one: Response, light_mhz: Array, fractions: Array, at: int = 0) -> Doubt:
    """Compute the uncertainty of a sublevel's polarisability at m light frequencies, in a0^3."""
    rest = remainder_terms(one.partners, light_mhz, _weighing(one, light_mhz, fractions, at))
    return doubt_of(one.terms(light_mhz, fractions, at) | rest, light_mhz.size)


def doubt_of_difference(upper: Response, lower: Response, light_mhz: Array, fractions: Array, at: int = 0) -> Doubt:
    """Compute the uncertainty of alpha(upper) - alpha(lower); within one level the scalar remainder cancels."""
    terms = add_strengths(upper.terms(light_mhz, fractions, at), lower.terms(light_mhz, fractions, at, sign=-1.0))
    if upper.partners.level.name == lower.partners.level.name:
        rest = remainder_terms(upper.partners, light_mhz, _weighing(upper, light_mhz, fractions, at, lower))
    else:
        rest = remainder_terms(upper.partners, light_mhz, _weighing(upper, light_mhz, fractions, at))
        rest |= remainder_terms(lower.partners, light_mhz, _weighing(lower, light_mhz, fractions, at))
    return doubt_of(terms | rest, light_mhz.size)
