"""Centroid frequencies of every line of every isotope, from what was published about any of them.

In this order: the isotope's own published frequency, reduced to the centroid; another isotope's plus isotope shifts;
the isotope's other lines and energies (Ritz combination); then the reference isotope's or the natural mixture's number,
which the record says (`centroid_isotope`). Uncertainties add in quadrature; inputs shared by two terms of one sum
(a hyperfine constant of a common level) are treated as independent, which overstates rather than hides.
"""

import heapq
import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace

from levels import air
from levels.blocks import hyperfine_weights
from levels.notation import parse_feature
from levels.published import LineFrequency, Shift
from levels.quantity import (
    Quantity,
    combine,
    derived,
    frequency_of,
    in_unit,
    parse_number,
    resolution,
    wavenumber_of,
)
from levels.records import Level
from levels.schema import DataFile, LineTable

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
            known[reference] = _sum([(known[isotope], 1), (shift, -1)], f"{isotope} minus its isotope shift")
    for isotope, shift in shifts.items():
        if isotope is not None and isotope not in known and shift is not None and reference in known:
            known[isotope] = _sum([(known[reference], 1), (shift, 1)], f"{reference} plus the isotope shift")
    return known


def _sum(terms: Iterable[tuple[Quantity, int]], formula: str) -> Quantity:
    parts = list(terms)
    value = sum(sign * item.value for item, sign in parts)
    spread = combine(*(item.uncertainty for item, _ in parts))
    result = derived(value, spread, "MHz", formula, inputs=[item for item, _ in parts])
    if spread is None:  # print no finer than the coarsest term, so that the digits still tell the resolution
        place = math.floor(math.log10(2 * math.hypot(*(spread_of(item) for item, _ in parts))))
        result = replace(result, text=f"{round(value, -place):.{max(0, -place)}f} MHz")
    return result


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


def spread_of(quantity: Quantity) -> float:
    """The standard uncertainty, or half the last printed digit where none is stated, in the quantity's unit."""
    if quantity.uncertainty is not None:
        return quantity.uncertainty
    last_digit = abs(resolution(quantity.text))
    number, _, text_unit = quantity.text.partition(" ")
    text_value, _ = parse_number(number)
    if text_unit == quantity.unit or text_value == 0:
        return last_digit / 2
    return abs(quantity.value * last_digit / text_value) / 2  # right for proportional and for reciprocal units


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
    return _sum([(edge.quantity, sign) for edge, sign in steps], formula)


def line_centroids(data: DataFile, levels: Levels) -> dict[int, dict[str, Centroid]]:
    """The best centroid of every line for every isotope of the file; a line without any is absent."""
    own = own_centroids(data, levels)
    whose: list[Whose] = [*data.isotopes, "natural"]
    edges: dict[Whose, list[Edge]] = {isotope: edges_of(data, own, isotope) for isotope in whose}
    edges["any"] = [edge for isotope in whose for edge in edges[isotope] if edge.label.startswith("E(")]
    reference = data.element.reference_isotope
    result: dict[int, dict[str, Centroid]] = {}
    for isotope in data.isotopes:
        result[isotope] = {}
        for name, line in data.lines.items():
            order: tuple[Whose, ...] = (isotope, reference, "natural", "any")
            for source in order:
                found = _centroid(own[name], edges[source], line, source)
                if found:
                    result[isotope][name] = _told(found, isotope, source)
                    break
    return result


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


def _told(quantity: Quantity, isotope: int, source: Whose) -> Centroid:
    if source == isotope:
        return Centroid(quantity, str(isotope))
    if source == "any":
        return Centroid(quantity, "natural", "difference of energies that belong to different isotopes")
    owner = "the natural mixture" if source == "natural" else f"mass number {source}"
    return Centroid(quantity, str(source), f"frequency of {owner}: this isotope's own is not published")


def level_energy(data: DataFile, edges: list[Edge], name: str) -> Quantity | None:
    """The energy in cm-1 above the ground level that lines add up to, for a level whose energy is not tabulated."""
    path = best_path(edges, data.element.ground, name)
    return wavenumber_of(path_sum(path)) if path else None
