"""Centroid frequencies of every line of every isotope, from what was published about any of them.

In this order: the isotope's own published frequency, reduced to the centroid; another isotope's plus isotope shifts, or
the natural mixture's (see `mixture`); the isotope's other lines and energies (Ritz combination); then the reference
isotope's or the natural mixture's number, which the record says (`centroid_isotope`). Uncertainties add in
quadrature; inputs shared by two terms of one sum (a hyperfine constant of a common level) are treated as independent,
which overstates rather than hides.
"""

import heapq
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace

from levels import air
from levels.blocks import hyperfine_weights
from levels.mixture import NOTE, TOO_LITTLE, of_mixture
from levels.notation import parse_feature
from levels.published import LineFrequency, Shift
from levels.quantity import (
    Quantity,
    combine,
    derived,
    frequency_of,
    in_unit,
    wavenumber_of,
)
from levels.records import Level
from levels.schema import DataFile, LineTable
from levels.sums import signed_sum, spread_of

ALONE = 0.999
Whose = int | str  # a mass number or "natural"
Levels = Mapping[Whose, Mapping[str, Level]]


@dataclass(frozen=True, slots=True)
class Centroid:
    """The centroid frequency of a line (MHz), and whose it is."""

    quantity: Quantity
    isotope: str
    note: str = ""


@dataclass(frozen=True, slots=True)
class Edge:
    """An interval between two levels of one isotope, known from a line or from an energy."""

    start: str
    end: str
    quantity: Quantity
    label: str


def in_mhz(entry: LineFrequency) -> Quantity:
    """What was published, as a vacuum frequency in MHz."""
    quantity = replace(entry.quantity(), alternatives=())
    frequency = frequency_of(_vacuum(quantity) if entry.medium == "air" else quantity)
    return replace(frequency, alternatives=tuple(map(in_mhz, entry.alternatives)))


def _vacuum(wavelength: Quantity) -> Quantity:
    in_nm = in_unit(wavelength, "nm")
    value = air.vacuum_of_air(in_nm.value)
    spread = combine(in_nm.uncertainty, air.RELATIVE_UNCERTAINTY * value)
    formula = f"vacuum wavelength of {wavelength.text} in standard air (Ciddor 1996)"
    return derived(value, spread, "nm", formula, ["ciddor1996"], inputs=(wavelength,))


def hyperfine_part(lower: Level, upper: Level, of: str) -> Quantity | None:
    """The offset in MHz of a component or crossover from the line's centroid; None where a constant is missing.

    A crossover lies at the mean of its two components.
    """
    feature = parse_feature(of)
    sides = ((upper, [pair[1] for pair in feature.components], 1.0), (lower, [p[0] for p in feature.components], -1.0))
    value, spreads, used = 0.0, [], []
    for level, numbers, sign in sides:
        weights = [hyperfine_weights(level.twice_J, level.twice_I, twice_F) for twice_F in numbers]
        for position, constant in enumerate((level.A, level.B, level.C)):
            weight = sign * sum(row[position] for row in weights) / len(weights)
            if constant is None:
                if weight and position == 0:
                    return None
                continue
            if weight:
                value += weight * constant.value
                spreads.append(None if constant.uncertainty is None else abs(weight) * constant.uncertainty)
                used.append(constant)
    return derived(value, combine(*spreads), "MHz", f"hyperfine offset of {of} from the centroid", inputs=used)


def _reduced(quantity: Quantity, of: str, lower: Level | None, upper: Level | None) -> Quantity | None:
    """A published frequency or shift of `of`, brought to the centroid."""
    if of == "centroid":
        return quantity
    if of == "average":
        note = "; ".join(filter(None, (quantity.note, "an average of components, taken as the centroid")))
        return replace(quantity, uncertainty=None, note=note)
    part = hyperfine_part(lower, upper, of) if lower and upper else None
    if part is None:
        return None
    spread = combine(quantity.uncertainty, part.uncertainty)
    formula = f"{of} at {quantity.text} minus its hyperfine offset"
    return derived(quantity.value - part.value, spread, "MHz", formula, inputs=(quantity, part))


def published_centroid(entry: LineFrequency, line: LineTable, levels: Levels) -> Quantity | None:
    """One published frequency reduced to the centroid in MHz; None where a hyperfine constant it needs is missing."""
    return _reduced(in_mhz(entry), entry.of, *_ends(entry.isotope, line, levels))


def published_shift(entry: Shift, line: LineTable, levels: Levels) -> Quantity | None:
    """One published isotope shift reduced to centroids in MHz."""
    return _reduced(in_unit(entry.quantity(), "MHz"), entry.of, *_ends(entry.isotope, line, levels))


def _ends(isotope: Whose | None, line: LineTable, levels: Levels) -> tuple[Level | None, Level | None]:
    own = levels.get(isotope or "", {})
    return own.get(line.lower), own.get(line.upper)


def own_centroids(data: DataFile, levels: Levels) -> dict[str, dict[Whose, Quantity]]:
    """For every line the centroids known for an isotope itself, directly or by isotope shifts."""
    return {name: _centroids_of(line, data.element.reference_isotope, levels) for name, line in data.lines.items()}


def _centroids_of(line: LineTable, reference: int, levels: Levels) -> dict[Whose, Quantity]:
    known: dict[Whose, Quantity] = {}
    for entry in line.frequency:
        centroid = published_centroid(entry, line, levels)
        if centroid is not None and entry.isotope is not None:
            known.setdefault(entry.isotope, centroid)
    shifts = {entry.isotope: published_shift(entry, line, levels) for entry in reversed(line.shift)}
    for isotope, shift in shifts.items():
        if reference not in known and shift is not None and isotope in known:
            known[reference] = signed_sum([(known[isotope], 1), (shift, -1)], f"{isotope} minus its isotope shift")
    for isotope, shift in shifts.items():
        if isotope is not None and isotope not in known and shift is not None and reference in known:
            known[isotope] = signed_sum([(known[reference], 1), (shift, 1)], f"{reference} plus the isotope shift")
    return known


def edges_of(data: DataFile, centroids: Mapping[str, Mapping[Whose, Quantity]], isotope: Whose) -> list[Edge]:
    """The intervals known for one isotope: its lines and the energies stated for it."""
    edges = [
        Edge(line.lower, line.upper, centroids[name][isotope], f"{name} nm")
        for name, line in data.lines.items()
        if isotope in centroids[name]
    ]
    for name, level in data.levels.items():
        if level.energy and level.energy.isotope == isotope and name != data.element.ground:
            energy = frequency_of(level.energy.quantity())
            edges.append(Edge(data.element.ground, name, energy, f"E({name})"))
    return edges


def best_path(edges: Iterable[Edge], start: str, end: str, without: str = "") -> list[tuple[Edge, int]] | None:
    """The chain of intervals from one level to another with the least summed variance, each with its sign."""
    neighbours: dict[str, list[tuple[str, Edge, int]]] = {}
    for edge in edges:
        if edge.label != without:
            neighbours.setdefault(edge.start, []).append((edge.end, edge, 1))
            neighbours.setdefault(edge.end, []).append((edge.start, edge, -1))
    queue: list[tuple[float, int, str, list[tuple[Edge, int]]]] = [(0.0, 0, start, [])]
    done: set[str] = set()
    counter = 0
    while queue:
        variance, _, level, path = heapq.heappop(queue)
        if level == end:
            return path
        if level in done:
            continue
        done.add(level)
        for other, edge, sign in neighbours.get(level, []):
            counter += 1
            step = variance + spread_of(edge.quantity) ** 2
            heapq.heappush(queue, (step, counter, other, [*path, (edge, sign)]))
    return None


def path_sum(path: Iterable[tuple[Edge, int]]) -> Quantity:
    """The frequency in MHz that a chain of intervals adds up to."""
    steps = list(path)
    if len(steps) == 1 and steps[0][1] == 1:
        return steps[0][0].quantity
    formula = " ".join(f"{'+' if sign > 0 else '-'} {edge.label}" for edge, sign in steps).removeprefix("+ ")
    return signed_sum([(edge.quantity, sign) for edge, sign in steps], formula)


def line_centroids(data: DataFile, levels: Levels) -> dict[int, dict[str, Centroid]]:
    """The best centroid of every line for every isotope of the file; a line without any is absent."""
    own = own_centroids(data, levels)
    whose: list[Whose] = [*data.isotopes, "natural"]
    edges: dict[Whose, list[Edge]] = {isotope: edges_of(data, own, isotope) for isotope in whose}
    edges["any"] = [edge for isotope in whose for edge in edges[isotope] if edge.label.startswith("E(")]
    reference = data.element.reference_isotope
    shifted = {name: _by_shifts(data, line, levels, own[name], edges) for name, line in data.lines.items()}
    result: dict[int, dict[str, Centroid]] = {}
    for isotope in data.isotopes:
        result[isotope] = {}
        for name, line in data.lines.items():
            if isotope not in own[name] and isotope in shifted[name]:
                result[isotope][name] = shifted[name][isotope]
                continue
            order: tuple[Whose, ...] = (isotope, reference, "natural", "any")
            for source in order:
                found = _centroid(own[name], edges[source], line, source)
                if found:
                    has_shift = any(entry.isotope == isotope for entry in line.shift)
                    result[isotope][name] = _told(found, isotope, source, has_shift, _is_alone(data, isotope))
                    break
    return result


def _by_shifts(
    data: DataFile,
    line: LineTable,
    levels: Levels,
    own: Mapping[Whose, Quantity],
    edges: Mapping[Whose, list[Edge]],
) -> dict[int, Centroid]:
    """What isotope shifts say of isotopes where no isotope's own frequency of the line is published."""
    found = {entry.isotope: published_shift(entry, line, levels) for entry in reversed(line.shift)}
    shifts = {isotope: shift for isotope, shift in found.items() if isotope is not None and shift is not None}
    reference = data.element.reference_isotope
    base = _centroid(own, edges[reference], line, reference) if shifts else None
    if base:
        formula = f"{reference} plus the isotope shift"
        return {A: Centroid(signed_sum([(base, 1), (shift, 1)], formula), str(A)) for A, shift in shifts.items()}
    natural = _centroid(own, edges["natural"], line, "natural") if shifts else None
    abundances = {A: in_unit(table.abundance.quantity(), "1") for A, table in data.isotopes.items() if table.abundance}
    mixed = of_mixture(natural, shifts, abundances, reference) if natural else {}
    return {isotope: Centroid(quantity, str(isotope), NOTE) for isotope, quantity in mixed.items()}


def measured_components(line: LineTable, isotope: int) -> tuple[tuple[int, int, Quantity], ...]:
    """The components of one isotope that were measured themselves, as (2F, 2F', recommended frequency in MHz)."""
    found: dict[tuple[int, int], Quantity] = {}
    for entry in line.frequency:
        if entry.isotope != isotope or entry.of in ("centroid", "average"):
            continue
        feature = parse_feature(entry.of)
        if not feature.is_crossover:
            found.setdefault(feature.components[0], in_mhz(entry))
    return tuple((low, up, quantity) for (low, up), quantity in found.items())


def _centroid(own: Mapping[Whose, Quantity], edges: list[Edge], line: LineTable, source: Whose) -> Quantity | None:
    if source in own:
        return own[source]
    path = best_path(edges, line.lower, line.upper)
    return path_sum(path) if path else None


def _is_alone(data: DataFile, isotope: int) -> bool:
    """Whether the natural element is this isotope, to one part in a thousand."""
    abundance = data.isotopes[isotope].abundance
    return abundance is not None and in_unit(abundance.quantity(), "1").value >= ALONE


def _told(quantity: Quantity, isotope: int, source: Whose, has_shift: bool, alone: bool) -> Centroid:
    """Say whose number it is; a borrowed one keeps no uncertainty, since the shift from it is not known.

    Only where the natural mixture is this isotope alone, or nearly, its number is the isotope's.
    """
    if source == isotope:
        return Centroid(quantity, str(isotope))
    if source == "any":
        borrowed = replace(quantity, uncertainty=None)
        return Centroid(borrowed, "natural", "difference of energies that belong to different isotopes")
    owner = "the natural mixture" if source == "natural" else f"mass number {source}"
    why = TOO_LITTLE if has_shift and source == "natural" else ""
    if source != "natural" or not alone:
        quantity = replace(quantity, uncertainty=None)
    return Centroid(quantity, str(source), f"frequency of {owner}: this isotope's own is not published{why}")


def level_energy(data: DataFile, edges: list[Edge], name: str) -> Quantity | None:
    """The energy in cm-1 above the ground level that lines add up to, for a level whose energy is not tabulated."""
    path = best_path(edges, data.element.ground, name)
    return wavenumber_of(path_sum(path)) if path else None
