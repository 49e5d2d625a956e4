"""Audit rules on frequencies: every loop of lines and energies closes, every shift reproduces what it should.

A sum of terms may miss zero by three combined standard uncertainties, plus one unit of the last printed digit of every
term that states none.
"""

import math
from collections.abc import Iterable, Mapping
from itertools import combinations

import numpy as np

from levels.audit_structure import Broken, Species
from levels.constants import MHZ_PER_WAVENUMBER
from levels.frequencies import (
    Edge,
    Levels,
    best_path,
    edges_of,
    own_centroids,
    published_centroid,
    published_shift,
)
from levels.quantity import Quantity
from levels.schema import LineTable
from levels.sums import spread_of

SIGMAS = 3.0
# hyperfine repulsion moves centroids of odd isotopes, second-order field shifts bend the plot of heavy ones
KING_ALLOWANCE_MHZ = 1.0
KING_RELATIVE = 0.005
# where the unresolved structure of a natural mixture has its centre depends on the light source: some 0.005 cm-1
NATURAL_ALLOWANCE_MHZ = 150.0
# natural-mixture tables and one isotope's frequency differ by isotope shifts: 5 GHz beyond lithium, hydrogen apart
TABLE_ALLOWANCE_MHZ = 15_000.0


def allowance(terms: Iterable[Quantity]) -> float:
    """How far a sum of terms (one unit) may miss zero."""
    known, digits = 0.0, 0.0
    for term in terms:
        if term.uncertainty is None:
            digits += 2 * spread_of(term)
        else:
            known += term.uncertainty**2
    return SIGMAS * math.sqrt(known) + digits


def loops_of(edges: Iterable[Edge]) -> list[tuple[Edge, list[tuple[Edge, int]]]]:
    """One loop per edge that the most precise spanning tree does not need: the edge, and its way through the tree."""
    tree: list[Edge] = []
    loops = []
    for edge in sorted(edges, key=lambda item: spread_of(item.quantity)):
        path = best_path(tree, edge.start, edge.end)
        if path is None:
            tree.append(edge)
        else:
            loops.append((edge, path))
    return loops


def _misfits(edges: Iterable[Edge], extra_mhz: float = 0.0) -> Iterable[tuple[Edge, str]]:
    for edge, path in loops_of(edges):
        miss = edge.quantity.value - sum(sign * step.quantity.value for step, sign in path)
        allowed = allowance([edge.quantity, *(step.quantity for step, _ in path)]) + extra_mhz
        if abs(miss) > allowed:
            way = " ".join(f"{'+' if sign > 0 else '-'} {step.label}" for step, sign in path).removeprefix("+ ")
            yield edge, f"{edge.label} misses {way} by {miss:.6g} MHz, {allowed:.3g} MHz allowed"


def _levels(species: Species) -> Levels:
    return {number: {level.name: level for level in atom.levels} for number, atom in species.atoms.items()}


def ritz(species: Species) -> Broken:
    """Lines and stated energies of one isotope close every loop of levels."""
    own = own_centroids(species.data, _levels(species))
    isotopes: tuple[int | str, ...] = (*species.data.isotopes, "natural")
    for isotope in isotopes:
        extra = NATURAL_ALLOWANCE_MHZ if isotope == "natural" else 0.0
        for edge, message in _misfits(edges_of(species.data, own, isotope), extra):
            yield f"loops.{isotope}.{edge.label}", message


def shift_loops(species: Species) -> Broken:
    """Isotope shifts of lines close the same loops as the lines, far more sharply than their frequencies."""
    levels = _levels(species)
    for isotope in species.data.isotopes:
        edges = []
        for name, line in species.data.lines.items():
            for entry in line.shift:
                shift = published_shift(entry, line, levels) if entry.isotope == isotope else None
                if shift is not None:
                    edges.append(Edge(line.lower, line.upper, shift, f"{name} nm shift"))
                    break
        for edge, message in _misfits(edges):
            yield f"shifts.{isotope}.{edge.label}", message


def shift_against_frequency(species: Species) -> Broken:
    """Where both isotopes have a published frequency, the published shift is their difference."""
    reference, levels = species.data.element.reference_isotope, _levels(species)
    for name, line in species.data.lines.items():
        absolute = _published(line, levels)
        for entry in line.shift:
            shift = published_shift(entry, line, levels)
            if shift is None or entry.isotope is None or not {entry.isotope, reference} <= set(absolute):
                continue
            own, other = absolute[entry.isotope][0], absolute[reference][0]
            miss = own.value - other.value - shift.value
            if abs(miss) > allowance((own, other, shift)):
                yield (
                    f"lines.{name}.shift.{entry.isotope}",
                    f"{shift.text} against {own.value - other.value:.6g} MHz from frequencies",
                )


def _published(line: LineTable, levels: Levels) -> Mapping[int | str, list[Quantity]]:
    found: dict[int | str, list[Quantity]] = {}
    for entry in line.frequency:
        centroid = published_centroid(entry, line, levels)
        if centroid is not None and entry.isotope is not None:
            found.setdefault(entry.isotope, []).append(centroid)
    return found


def repeated_frequency(species: Species) -> Broken:
    """Several published frequencies of one line and isotope give one centroid."""
    levels = _levels(species)
    for name, line in species.data.lines.items():
        for isotope, centroids in _published(line, levels).items():
            first = centroids[0]
            for other in centroids[1:]:
                if abs(other.value - first.value) > allowance((first, other)):
                    miss = other.value - first.value
                    yield f"lines.{name}.frequency.{isotope}", f"centroids of two entries differ by {miss:.6g} MHz"


def reducible(species: Species) -> Broken:
    """A frequency or shift of a hyperfine component has the constants that reduce it to the centroid."""
    levels = _levels(species)
    for name, line in species.data.lines.items():
        for entry in line.frequency:
            if published_centroid(entry, line, levels) is None:
                yield f"lines.{name}.frequency.{entry.isotope}", f"{entry.of} has no A to reduce it to the centroid"
        for shift in line.shift:
            if published_shift(shift, line, levels) is None:
                yield f"lines.{name}.shift.{shift.isotope}", f"{shift.of} has no A to reduce it to the centroid"


def tabulated_energy(species: Species) -> Broken:
    """A line's frequency is the difference of the tabulated energies within isotope shifts: a mistyped digit is not."""
    if species.data.element.Z == 1:
        return  # hydrogen and deuterium differ by 670 GHz; their energies are stated per isotope and close by `ritz`
    for line in species.reference.lines:
        lower, upper = line.lower.energy, line.upper.energy
        if lower is None or upper is None or line.centroid is None:
            continue
        difference = (upper.value - lower.value) * MHZ_PER_WAVENUMBER
        allowed = TABLE_ALLOWANCE_MHZ + MHZ_PER_WAVENUMBER * allowance((lower, upper)) + allowance((line.centroid,))
        if abs(line.centroid.value - difference) > allowed:
            miss = (line.centroid.value - difference) / MHZ_PER_WAVENUMBER
            yield f"lines.{line.name}", f"frequency is {miss:.4g} cm-1 above the difference of the energies"


def king(species: Species) -> Broken:
    """Isotope shifts of two lines, divided by the mass difference, lie on one straight line (a King plot)."""
    levels = _levels(species)
    modified = {name: _modified_shifts(species, line, levels) for name, line in species.data.lines.items()}
    for first, second in combinations(modified, 2):
        common = [isotope for isotope in modified[first] if isotope in modified[second]]
        if len(common) < 3:
            continue
        x, y = (np.array([modified[name][isotope][0] for isotope in common]) for name in (first, second))
        slope, offset = np.polyfit(x, y, 1)
        for isotope, miss in zip(common, y - slope * x - offset, strict=True):
            inverse_mass = modified[first][isotope][2]
            spread = math.hypot(slope * modified[first][isotope][1], modified[second][isotope][1])
            shift_mhz = abs(modified[second][isotope][0] * inverse_mass)
            if abs(miss * inverse_mass) > SIGMAS * spread + KING_ALLOWANCE_MHZ + KING_RELATIVE * shift_mhz:
                message = f"isotope {isotope} is {miss * inverse_mass:.3g} MHz off the straight line"
                yield f"king.{first} nm.{second} nm", message


def _modified_shifts(species: Species, line: LineTable, levels: Levels) -> dict[int, tuple[float, float, float]]:
    """Per isotope: shift over the difference of inverse masses, the shift's uncertainty, that difference (1/u)."""
    masses = {number: atom.isotope.mass.value for number, atom in species.atoms.items() if atom.isotope.mass}
    reference = masses.get(species.data.element.reference_isotope)
    found: dict[int, tuple[float, float, float]] = {}
    for entry in line.shift:
        shift = published_shift(entry, line, levels)
        if shift is not None and reference is not None and entry.isotope in masses:
            inverse_mass = 1 / reference - 1 / masses[entry.isotope]
            found.setdefault(entry.isotope, (shift.value / inverse_mass, spread_of(shift), inverse_mass))
    return found
