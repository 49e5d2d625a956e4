"""`features`: what a vapour cell or lamp shows of a line."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from pydantic import Field

from levels.errors import NotPublished, OutsideValidity, UnknownName
from levels.features import Features, Sample, centroid_offset, features, relative_dips, samples_of
from levels.notation import format_isotope, parse_isotope
from levels.profile import power_width_mhz, voigt_width_mhz
from levels.quantity import Quantity
from levels.records import Line
from service.answers import Answer, uncertainty_columns
from service.context import Context
from service.formats import with_reasons
from service.inputs import line_inputs, line_warnings
from service.measures import Kelvin
from service.parameters import FieldGauss, Name
from service.problems import Problem
from service.question import Computed, Question
from service.schemas import MaybeNumbers, Numbers, Shape, Tabular, Texts

NO_WIDTH = "the lifetime of the upper level is not in the catalogue"
OTHER_CENTROID = "the frequency is not known for this isotope itself"
NO_UNCERTAINTY = "an input states no uncertainty"
REASONS = {
    "offset_MHz": OTHER_CENTROID,
    "offset_uncertainty_MHz": NO_UNCERTAINTY,
    "own_offset_uncertainty_MHz": NO_UNCERTAINTY,
    "frequency_THz": "the frequency of this line's centroid is not in the catalogue",
    "frequency_uncertainty_THz": NO_UNCERTAINTY,
    "absorption": "weak light has no crossovers",
    "natural_width_MHz": NO_WIDTH,
    "power_width_MHz": NO_WIDTH,
    "voigt_width_MHz": NO_WIDTH,
}
COLUMNS_OF_FEATURES = 18


class CellAsked(Computed):
    """A vapour of one element on one line."""

    line: Name = Field(description="line, as `780`, `D2` or `5s_2S1/2->5p_2P3/2`", examples=["780"])
    temperature: Kelvin = Field(300.0, description="temperature of the vapour, in K or with a unit")
    saturation: float = Field(
        0.0, ge=0, le=1e9, description="intensity over the saturation intensity: power broadening"
    )
    field: FieldGauss = Field(0.0, description="magnetic field along z, in gauss or with a unit")
    isotopes: str = Field(
        "", max_length=200, description="mass numbers in the cell, as `85,87`; all stable isotopes when left out"
    )
    reference: int | None = Field(
        None, ge=1, le=400, description="mass number whose centroid offsets count from; the data's reference isotope"
    )


class FeaturesAsked(CellAsked):
    """Every feature of a vapour."""

    crossovers: bool = Field(True, description="whether crossovers are listed too")


class FeatureColumns(Shape):
    """One row for each feature, isotope by isotope, components before crossovers."""

    isotope: Texts
    kind: Texts = Field(description="component or crossover")
    feature: Texts = Field(description="as `2-3` or `2-(2,3)`; in a field with m, as `2,2-3,3`")
    offset_MHz: MaybeNumbers = Field(description="from the reference isotope's centroid; null where unknown")
    offset_uncertainty_MHz: MaybeNumbers
    own_offset_MHz: Numbers = Field(description="from this isotope's own centroid")
    own_offset_uncertainty_MHz: MaybeNumbers
    frequency_THz: MaybeNumbers
    frequency_uncertainty_THz: MaybeNumbers
    slope_MHz_per_G: Numbers = Field(description="how fast it moves at this field; zero for whole hyperfine components")
    absorption: MaybeNumbers = Field(description="share in the line's weak absorption; null for crossovers")
    dip: Numbers = Field(description="depth in saturated absorption, deepest 1, without optical pumping")
    natural_width_MHz: MaybeNumbers = Field(description="full width Gamma/2pi of both levels")
    power_width_MHz: MaybeNumbers = Field(description="natural width times sqrt(1 + saturation)")
    doppler_width_MHz: Numbers = Field(description="full Doppler width at half maximum")
    voigt_width_MHz: MaybeNumbers = Field(description="full width of the power-broadened line in the vapour")


class FeaturesAnswered(Tabular):
    """Every feature of a vapour."""

    element: str
    line: str
    reference_isotope: str
    left_out: Texts = Field(description="isotopes that are not listed, each with the reason")
    columns: FeatureColumns


@dataclass(frozen=True, slots=True)
class Cell:
    """What was asked for: the isotopes' features, the line that offsets count from, and who is left out."""

    element: str
    found: list[Features]
    reference: Line
    left_out: list[str]


def cell_of(context: Context, name: str, asked: CellAsked, crossovers: bool) -> Cell:
    """Solve every isotope of the cell."""
    wanted = parse_isotope(name)
    if wanted.mass_number is not None:
        raise OutsideValidity(
            "element", name, "an element and charge such as Rb or Ca+; choose isotopes with `isotopes`"
        )
    species = context.catalogue.species(str(wanted))
    numbers = _mass_numbers(asked.isotopes, list(species))
    if not numbers:
        numbers = [A for A, atom in species.items() if atom.isotope.abundance is not None] or list(species)
    first = context.catalogue.elements[str(wanted)].element.reference_isotope
    reference = asked.reference or (first if first in numbers else numbers[0])
    if reference not in species:
        raise UnknownName("reference", str(reference), [str(A) for A in species], f"a mass number of {name}")
    lines = {A: context.line(species[A].isotope.name, asked.line) for A in dict.fromkeys((*numbers, reference))}
    two = next((line.name for line in lines.values() if line.photons != 1), None)
    if two is not None:
        raise OutsideValidity("line", two, "a one-photon line")
    samples = samples_of([(species[A].isotope, lines[A]) for A in numbers])
    found, left_out = _solved(samples, asked, crossovers)
    return Cell(format_isotope(wanted.symbol, None, wanted.charge), found, lines[reference], left_out)


def _mass_numbers(text: str, known: list[int]) -> list[int]:
    numbers = []
    for part in filter(None, (item.strip() for item in text.split(","))):
        if not part.isascii() or not part.isdigit() or int(part[:4]) not in known:
            raise UnknownName("isotopes", part, [str(A) for A in known], "mass numbers such as 85,87")
        numbers.append(int(part))
    return list(dict.fromkeys(numbers))


def _solved(samples: Sequence[Sample], asked: CellAsked, crossovers: bool) -> tuple[list[Features], list[str]]:
    found, left_out, errors = [], [], []
    for sample in samples:
        try:
            found.append(features(sample, asked.temperature, asked.field, crossovers))
        except NotPublished as error:
            left_out.append(f"{sample.isotope.name}: {error}")
            errors.append(error)
    if not found:
        raise errors[0]
    return found, left_out


def answer_features(context: Context, path: Mapping[str, str], asked: FeaturesAsked) -> Answer:
    """The spectroscopy references on one line: hyperfine components and crossovers of all isotopes in a cell or lamp.

    These are the points that lasers are locked to. Depths are those of weak light without optical pumping, which in a
    real cell often makes crossovers the deepest features.
    """
    cell = cell_of(context, path["element"], asked, asked.crossovers)
    rows = sum(len(item.dip) for item in cell.found)
    if rows * COLUMNS_OF_FEATURES > context.settings.max_numbers:
        bound = f"{context.settings.max_numbers} numbers"
        detail = f"the answer would hold {rows} features, more than {bound}"
        raise Problem("answer-too-large", detail, parameter="isotopes", given=rows, allowed=bound)
    dips = relative_dips(cell.found)
    parts = [_rows(item, dip, cell.reference, asked) for item, dip in zip(cell.found, dips, strict=True)]
    columns: dict[str, list[Any]] = {name: [] for name in parts[0]}
    for part in parts:
        for name, column in part.items():
            columns[name].extend(column)
    excludes = list(
        dict.fromkeys(f"{item.sample.isotope.name}: {name}" for item in cell.found for name in item.excludes)
    )
    return Answer(
        content_of_cell(cell),
        with_reasons(columns, REASONS),
        used=used_of_cell(cell),
        warnings=warnings_of_cell(cell, asked),
        uncertainty_excludes=excludes,
    )


def _rows(found: Features, dip: Any, reference: Line, asked: FeaturesAsked) -> dict[str, list[Any]]:
    line, count = found.sample.line, len(found.dip)
    moved = centroid_offset(line, reference)
    own, _ = uncertainty_columns({"own": found.uncertainty_mhz})
    spreads: list[float | None] = list(own["own"])
    centroid = line.centroid
    of_centroid = None if centroid is None else centroid.uncertainty
    frequency = None if centroid is None else ((centroid.value + found.offset_mhz) * 1e-6).tolist()
    natural = found.natural_mhz
    power = None if natural is None else power_width_mhz(natural, asked.saturation)
    return {
        "isotope": [line.atom] * count,
        "kind": ["crossover" if one else "component" for one in found.is_crossover],
        "feature": found.names,
        "offset_MHz": [None] * count if moved is None else (moved[0] + found.offset_mhz).tolist(),
        "offset_uncertainty_MHz": [_joined(part, moved[1] if moved else None) for part in spreads],
        "own_offset_MHz": found.offset_mhz.tolist(),
        "own_offset_uncertainty_MHz": spreads,
        "frequency_THz": [None] * count if frequency is None else frequency,
        "frequency_uncertainty_THz": [_joined(part, of_centroid, 1e-6) for part in spreads],
        "slope_MHz_per_G": found.slope_mhz_per_gauss.tolist(),
        "absorption": [None if np.isnan(part) else part for part in found.absorption.tolist()],
        "dip": dip.tolist(),
        "natural_width_MHz": [natural] * count,
        "power_width_MHz": [power] * count,
        "doppler_width_MHz": [found.doppler_mhz] * count,
        "voigt_width_MHz": [None if power is None else voigt_width_mhz(power, found.doppler_mhz)] * count,
    }


def _joined(own: float | None, other: float | None, scale: float = 1.0) -> float | None:
    return None if own is None or other is None else float(np.hypot(own, other)) * scale


def content_of_cell(cell: Cell) -> dict[str, Any]:
    return {
        "element": cell.element,
        "line": cell.reference.name,
        "reference_isotope": cell.reference.atom,
        "left_out": cell.left_out,
    }


def used_of_cell(cell: Cell) -> list[tuple[str, Quantity]]:
    used: list[tuple[str, Quantity]] = []
    for item in cell.found:
        line, isotope = item.sample.line, item.sample.isotope
        own = (("mass", isotope.mass), ("abundance", isotope.abundance), ("width", line.upper.width))
        used += [(f"{line.atom}: {name}", quantity) for name, quantity in line_inputs(line)]
        used += [(f"{line.atom}: {name}", quantity) for name, quantity in own if quantity is not None]
    return used


def warnings_of_cell(cell: Cell, asked: CellAsked) -> list[str]:
    texts = [text for item in cell.found for text in line_warnings(item.sample.line, asked.field)]
    unknown = [
        item.sample.isotope.name for item in cell.found if centroid_offset(item.sample.line, cell.reference) is None
    ]
    if unknown:
        texts.append(f"offsets of {', '.join(unknown)} from {cell.reference.atom} are null: {OTHER_CENTROID}")
    return list(dict.fromkeys(texts))


QUESTION = Question(
    name="features",
    path="/v1/elements/{element}/features",
    asked=FeaturesAsked,
    answered=FeaturesAnswered,
    ask=answer_features,
    summary="What a vapour cell or lamp shows of a line: the lock points",
    example="/v1/elements/Rb/features?line=780",
    tag="plan",
    heavy=True,
)
