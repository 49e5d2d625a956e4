"""What a vapour cell or lamp shows of a line: every isotope's components and crossovers, their offsets and depths.

Offsets count from the centroid of one isotope; between isotopes the centroids' own uncertainties enter as independent.
`absorption` is a component's share in the whole line's absorption of weak unpolarised light by atoms that fill the
lower level evenly: abundance, multiplicity and line strength. It does not exist for crossovers.

`dip` is the depth in saturated absorption relative to the deepest feature, from two-level saturation by a weak
counter-propagating beam of the same polarisation: n S^2 (1 + g/g') for a component; for a crossover of a and b with
one lower level 2 n S_a S_b, with one upper level S_a S_b (n_a g_b + n_b g_a)/g', either times the share of atoms with
the velocity that it needs, exp(-ln2 (D/W)^2) with D the splitting and W the Doppler width (n atoms and g sublevels of
the lower level, S strength per atom, g' sublevels of the upper). Optical pumping, which in a cell often makes
crossovers the deepest and turns those of one upper level over, is neglected: read `dip` as what to expect first.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.components import pairs_of, strength_model, strengths
from levels.constants import KB, C, U
from levels.errors import NotPublished, OutsideValidity
from levels.hyperfine import hyperfine_components
from levels.manifold import Label, Manifold, format_label, manifold
from levels.positions import averaged
from levels.quantity import combine, in_unit
from levels.records import Isotope, Line
from levels.sensitivity import ENERGY, add_terms, spread, terms_of

Array = NDArray[np.float64]
Indices = NDArray[np.int64]
FAINTEST_CROSSOVER = 1e-6  # share of atoms with the velocity it needs; fainter ones are left out
FWHM_OF_DOPPLER = np.sqrt(8 * np.log(2))


@dataclass(frozen=True, slots=True)
class Sample:
    """One isotope in the cell: its line and its share among the atoms."""

    isotope: Isotope
    line: Line
    share: float


@dataclass(frozen=True, slots=True, eq=False)
class Features:
    """Every feature of one isotope; arrays have shape (r,), `lower` and `upper` hold one or two labels a row.

    `offset_mhz` counts from the isotope's own centroid, `uncertainty_mhz` (NaN where not known) goes with it.
    """

    sample: Sample
    lower: tuple[tuple[Label, ...], ...]
    upper: tuple[tuple[Label, ...], ...]
    offset_mhz: Array
    uncertainty_mhz: Array
    slope_mhz_per_gauss: Array
    absorption: Array  # NaN for crossovers
    dip: Array
    natural_mhz: float | None
    doppler_mhz: float
    excludes: tuple[str, ...]

    @property
    def is_crossover(self) -> NDArray[np.bool_]:
        """Which rows are crossovers."""
        return np.array([len(low) + len(up) > 2 for low, up in zip(self.lower, self.upper, strict=True)])

    @property
    def names(self) -> list[str]:
        """Each row as `2-3`, `2-(2,3)`, or at a field `2,2-3,3` and `2,2-(2,1;3,1)`."""
        return [f"{_side(low)}-{_side(up)}" for low, up in zip(self.lower, self.upper, strict=True)]


def _side(labels: tuple[Label, ...]) -> str:
    if len(labels) == 1:
        return format_label(labels[0])
    return f"({(',' if labels[0][1] is None else ';').join(map(format_label, labels))})"


def samples_of(lines: Sequence[tuple[Isotope, Line]]) -> list[Sample]:
    """Give each isotope its natural share among those listed; equal shares where an abundance is not known."""
    abundances = [isotope.abundance for isotope, _ in lines]
    known = [in_unit(item, "1").value for item in abundances if item is not None]
    shares = known if len(known) == len(lines) else [1.0] * len(lines)
    return [Sample(isotope, line, part / sum(shares)) for (isotope, line), part in zip(lines, shares, strict=True)]


def natural_width_mhz(line: Line) -> float | None:
    """Return the natural width of a line, that of both its levels; None when the upper level's is not known."""
    if line.upper.width is None:
        return None
    return line.upper.width.value + (0.0 if line.lower.width is None else line.lower.width.value)


def frequency_of_centroid_mhz(line: Line) -> float:
    """Return the centroid's frequency, from the nominal wavelength where nothing better is known."""
    return line.centroid.value if line.centroid is not None else C * 1e3 / line.nominal_nm


def doppler_width_mhz(line: Line, isotope: Isotope, temperature_k: float) -> float:
    """Compute the full Doppler width at half maximum, nu sqrt(8 ln2 kT/mc^2), of atoms at rest on average."""
    if not 0 < temperature_k <= 1e5:
        raise OutsideValidity("temperature", temperature_k, "from above 0 to 100000 K")
    if isotope.mass is None:
        raise NotPublished("mass", isotope.name)
    kg = in_unit(isotope.mass, "u").value * U
    return float(frequency_of_centroid_mhz(line) * FWHM_OF_DOPPLER * np.sqrt(KB * temperature_k / kg) / C)


def features(sample: Sample, temperature_k: float, field_gauss: float = 0.0, crossovers: bool = True) -> Features:
    """List every component and crossover of one isotope, components first.

    Without a field the rows are hyperfine components F - F', in a field Zeeman components of any polarisation.
    """
    line = sample.line
    below, above = manifold(line.lower, field_gauss), manifold(line.upper, field_gauss)
    low, up, strength = _components(line, below, above, field_gauss)
    doppler = doppler_width_mhz(line, sample.isotope, temperature_k)
    atoms = below.multiplicity[low] / below.multiplicity.sum() * sample.share
    rows = (
        [np.array([low, low]).T],
        [np.array([up, up]).T],
        [strength**2 * atoms * _share_of_dip(below, above, low, up)],
    )
    if crossovers:
        at = above.energy_mhz[up] - below.energy_mhz[low]
        for first, second, depth in _crossovers(below, above, low, up, strength, atoms):
            share = np.exp(-np.log(2) * ((at[first] - at[second]) / doppler) ** 2)
            seen = (share > FAINTEST_CROSSOVER) & (depth > 0)
            first, second = first[seen], second[seen]
            rows[0].append(np.array([low[first], low[second]]).T)
            rows[1].append(np.array([up[first], up[second]]).T)
            rows[2].append((depth * share)[seen])
    lows, ups, dip = (np.concatenate(part) for part in rows)
    return _table(sample, below, above, lows, ups, strength * atoms, dip, doppler)


def _share_of_dip(below: Manifold, above: Manifold, low: Indices, up: Indices) -> Array:
    """Return 1 + g/g': the probe misses the atoms that left and finds those that arrived."""
    result: Array = 1.0 + below.multiplicity[low] / above.multiplicity[up]
    return result


def _components(line: Line, below: Manifold, above: Manifold, field_gauss: float) -> tuple[Indices, Indices, Array]:
    """Return positions of both ends and the absorption strength per atom, which sums to 1 from each lower state."""
    if not strength_model(line):
        hint = "the line is opened by the field alone: its strength is not in this model"
        raise NotPublished("strength", f"{line.atom} {line.name}", hint)
    low_at = {label: k for k, label in enumerate(below.labels)}
    up_at = {label: k for k, label in enumerate(above.labels)}
    if field_gauss == 0:
        parts = hyperfine_components(line)
        found = [(low_at[part.twice_F, None], up_at[part.twice_F_up, None]) for part in parts]
        strength = np.array([float(part.strength or 0) for part in parts])
    else:
        pairs = pairs_of(line)
        found = [(low_at[low], up_at[high]) for low, high in pairs]
        strength = strengths(line, field_gauss, pairs)[0] * (line.lower.twice_J + 1) / (line.upper.twice_J + 1)
    kept = strength > 1e-9
    ends = np.array(found, dtype=np.int64)[kept]
    return ends[:, 0], ends[:, 1], strength[kept]


def _crossovers(
    below: Manifold, above: Manifold, low: Indices, up: Indices, strength: Array, atoms: Array
) -> list[tuple[Indices, Indices, Array]]:
    """Pair components with one lower, then with one upper state; the depth lacks the share of the velocity."""
    parts = []
    for mine, other in ((low, up), (up, low)):
        first, second = np.nonzero((mine[:, None] == mine[None, :]) & (other[:, None] < other[None, :]))
        depth = strength[first] * strength[second]
        if mine is low:
            depth = 2 * depth * atoms[first]
        else:
            g = below.multiplicity[low]
            gained = atoms[first] * g[second] + atoms[second] * g[first]
            depth = depth * gained / above.multiplicity[up[first]]
        parts.append((first, second, depth))
    return parts


def _table(
    sample: Sample, below: Manifold, above: Manifold, lows: Indices, ups: Indices, absorption: Array, dip: Array,
    doppler_mhz: float,
) -> Features:  # fmt: skip
    line, rows = sample.line, lows.shape[0]
    low, high = averaged(below, lows), averaged(above, ups)
    found = spread(add_terms(terms_of(line.upper, high[2]), terms_of(line.lower, low[2], sign=-1.0)))
    shares = np.full(rows, np.nan)
    shares[: absorption.size] = absorption
    return Features(
        sample,
        tuple(_labels(below, row) for row in lows),
        tuple(_labels(above, row) for row in ups),
        high[0] - low[0],
        found.uncertainty[ENERGY, 0],
        high[1] - low[1],
        shares,
        dip,
        natural_width_mhz(line),
        doppler_mhz,
        found.excludes,
    )


def _labels(states: Manifold, row: Indices) -> tuple[Label, ...]:
    return tuple(states.labels[k] for k in dict.fromkeys(row.tolist()))


def relative_dips(found: Sequence[Features]) -> list[Array]:
    """Scale the dips of all isotopes so that the deepest is 1."""
    deepest = max(float(item.dip.max()) for item in found)
    return [item.dip / deepest for item in found]


def centroid_offset(line: Line, reference: Line) -> tuple[float, float | None] | None:
    """Return an isotope's centroid less the reference's, with its uncertainty; None where either is not its own."""
    if (
        line.centroid is None
        or reference.centroid is None
        or not (has_own_centroid(line) and has_own_centroid(reference))
    ):
        return None
    if line.atom == reference.atom:
        return 0.0, 0.0
    difference = line.centroid.value - reference.centroid.value
    return difference, combine(line.centroid.uncertainty, reference.centroid.uncertainty)


def has_own_centroid(line: Line) -> bool:
    """Whether the frequency is that of this isotope, not of another one or of the natural mixture."""
    return line.centroid is not None and line.atom.startswith(line.centroid_isotope) and bool(line.centroid_isotope)
