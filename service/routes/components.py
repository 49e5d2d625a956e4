"""`components`: every component of a line in a field."""

from collections.abc import Mapping
from typing import Any

from pydantic import Field

from levels.components import Components, components, frequency_uncertainties_mhz
from levels.notation import format_polarisation
from levels.records import Line
from levels.sensitivity import ENERGY, SHIFT, Spread
from levels.strongfield_lines import term_component_spread, term_components
from levels.uncertainty import component_spread
from service.answers import Answer, uncertainty_columns, with_uncertainties
from service.context import Context
from service.formats import Column, Table
from service.models import ANSWERED, MODEL, LineModel, ModelName, model_of_line
from service.parameters import FieldGauss, Name, PolarisationName
from service.question import Computed, Question
from service.routes.shift import NO_CENTROID, no_frequency_spread, no_strength
from service.routes.sublevels import ORDER
from service.schemas import Labels, MaybeNumbers, Numbers, Shape, Tabular, Texts


class ComponentsAsked(Computed):
    """Every component at one field."""

    line: Name = Field(description="line, as `780`, `D2` or `5s_2S1/2->5p_2P3/2`", examples=["780"])
    field: FieldGauss = Field(0.0, description="magnetic field along z, in gauss or with a unit", examples=["3.2"])
    polarisation: PolarisationName | None = Field(
        None, description="only components of this polarisation: sigma+, pi or sigma-", examples=["sigma+"]
    )
    model: ModelName = MODEL


class ComponentColumns(Shape):
    """One row for each component, by F, m, F', m'."""

    lower_F: Labels
    lower_m: Labels
    upper_F: Labels
    upper_m: Labels
    polarisation: Texts = Field(description="sigma+, pi, sigma-; q=+2 and the like for multipoles beyond the dipole")
    offset_MHz: Numbers = Field(description="frequency less that of the line's centroid")
    offset_uncertainty_MHz: MaybeNumbers
    frequency_THz: MaybeNumbers
    frequency_uncertainty_THz: MaybeNumbers
    shift_MHz: Numbers = Field(description="offset less that of the same component at zero field")
    shift_uncertainty_MHz: MaybeNumbers
    slope_MHz_per_G: Numbers
    slope_uncertainty_MHz_per_G: MaybeNumbers
    quadratic_Hz_per_G2: Numbers = Field(description="half the second derivative at this field")
    quadratic_uncertainty_Hz_per_G2: MaybeNumbers
    strength: MaybeNumbers = Field(description="share in the decays of the upper sublevel to the lower level")
    strength_at_zero_field: Texts = Field(description="the same at zero field, as an exact fraction")


class ComponentsAnswered(Tabular):
    """Every component at one field."""

    atom: str
    line: str
    lower_level: str
    upper_level: str
    model: str = ANSWERED
    columns: ComponentColumns


def frequency_columns(found: Components, sigma_mhz: Any) -> tuple[dict[str, Column], dict[str, str]]:
    """The absolute frequencies with their uncertainties, and why one is missing."""
    names = ("frequency_THz", "frequency_uncertainty_THz")
    frequency = found.frequency_mhz
    if frequency is None:
        return {name: [None] * len(found.q) for name in names}, dict.fromkeys(names, NO_CENTROID)
    spread = frequency_uncertainties_mhz(found, sigma_mhz[ENERGY], sigma_mhz[SHIFT])
    sigma, doubted = uncertainty_columns({names[1]: spread * 1e-6})
    return {names[0]: frequency[0] * 1e-6, **sigma}, dict.fromkeys(doubted, no_frequency_spread(found.line))


def label_columns(found: Components) -> dict[str, Column]:
    """The labels of the components' two ends, as decimals, and their polarisations."""
    return {
        "lower_F": found.lower_twice_F / 2,
        "lower_m": found.lower_twice_m / 2,
        "upper_F": found.upper_twice_F / 2,
        "upper_m": found.upper_twice_m / 2,
        "polarisation": [format_polarisation(q) for q in found.q.tolist()],
    }


def solved(line: Line, model: LineModel, field: float, q: int | None) -> tuple[Components, Spread]:
    """Every component with its uncertainty, in the model that answers."""
    if model.ends is None:
        return components(line, field, q), component_spread(line, field, q)
    return term_components(model.ends, field, q), term_component_spread(model.ends, field, q)


def answer_components(context: Context, path: Mapping[str, str], asked: ComponentsAsked) -> Answer:
    """Every component that the line's multipole allows: where it lies, how it moves, how strong it is.

    Strengths are normalised so that all decays of one upper sublevel to the lower level sum to 1. Components that are
    closed at zero field and that the field opens are listed too. Where the field mixes the fine structure by more than
    1 % the whole LS terms answer; their strengths take the ratios of LS coupling.
    """
    line = context.line(path["atom"], asked.line)
    model = model_of_line(context, path["atom"], asked.line, asked.field, asked.model)
    found, spread = solved(line, model, asked.field, asked.polarisation)
    numbers = {
        "offset_MHz": found.offset_mhz[0],
        "shift_MHz": found.shift_mhz[0],
        "slope_MHz_per_G": found.slope_mhz_per_gauss[0],
        "quadratic_Hz_per_G2": found.quadratic_hz_per_gauss2[0],
    }
    moving, doubted = with_uncertainties(numbers, spread.uncertainty[ORDER, 0])
    frequencies, missing = frequency_columns(found, spread.uncertainty[:, 0])
    missing = {**doubted, **missing}
    if not found.strength_known:
        missing["strength"] = no_strength(line)
    columns: dict[str, Column] = {
        **label_columns(found),
        **{name: moving.pop(name) for name in ("offset_MHz", "offset_uncertainty_MHz")},
        **frequencies,
        **moving,
        "strength": found.strength[0] if found.strength_known else [None] * len(found.q),
        "strength_at_zero_field": [str(part) if found.strength_known else "" for part in found.zero_field_strength],
    }
    return Answer(
        {
            "atom": line.atom,
            "line": line.name,
            "lower_level": line.lower.name,
            "upper_level": line.upper.name,
            "model": model.name,
        },
        Table(columns, missing),
        used=model.used,
        warnings=model.warnings,
        uncertainty_excludes=spread.excludes,
    )


QUESTION = Question(
    name="components",
    path="/v1/atoms/{atom}/components",
    asked=ComponentsAsked,
    answered=ComponentsAnswered,
    ask=answer_components,
    summary="Every component of a line in a field",
    example="/v1/atoms/87Rb/components?line=780&field=3.2&polarisation=sigma%2B",
    tag="field",
)
