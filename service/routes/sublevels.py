"""`sublevels`: every sublevel of a level in a field."""

from collections.abc import Mapping

import numpy as np
from pydantic import Field

from levels.sensitivity import ENERGY, QUADRATIC, SHIFT, SLOPE
from levels.strongfield import term_sublevels
from levels.strongfield_spread import term_spread
from levels.sublevels import Sublevels, sublevels
from levels.uncertainty import sublevel_spread
from service.answers import Answer, with_uncertainties
from service.context import Context
from service.formats import Column, Table
from service.models import ANSWERED, MODEL, ModelName, model_of_level
from service.parameters import FieldGauss, Name
from service.question import Computed, Question
from service.schemas import Labels, MaybeNumbers, Numbers, Shape, Tabular

ORDER = [ENERGY, SHIFT, SLOPE, QUADRATIC]


class SublevelsAsked(Computed):
    """Every sublevel at one field."""

    level: Name = Field(description="level, as `5s_2S1/2` (`5S1/2` where that is unambiguous)", examples=["5s_2S1/2"])
    field: FieldGauss = Field(0.0, description="magnetic field along z, in gauss or with a unit", examples=["3.2"])
    model: ModelName = MODEL


class SublevelColumns(Shape):
    """One row for each sublevel, by F and then m."""

    F: Labels = Field(description="zero-field label; J for I = 0")
    m: Labels
    m_J: Labels = Field(description="high-field label")
    m_I: Labels = Field(description="high-field label")
    energy_MHz: Numbers = Field(description="from the level's hyperfine centroid")
    energy_uncertainty_MHz: MaybeNumbers
    shift_MHz: Numbers = Field(description="from the same sublevel at zero field")
    shift_uncertainty_MHz: MaybeNumbers
    slope_MHz_per_G: Numbers
    slope_uncertainty_MHz_per_G: MaybeNumbers
    quadratic_Hz_per_G2: Numbers = Field(description="half the second derivative at this field")
    quadratic_uncertainty_Hz_per_G2: MaybeNumbers
    moment_muB: Numbers = Field(description="magnetic moment along z: less the slope, in Bohr magnetons")


class SublevelsAnswered(Tabular):
    """Every sublevel at one field."""

    atom: str
    level: str
    model: str = ANSWERED
    columns: SublevelColumns


def label_columns(found: Sublevels) -> dict[str, Column]:
    """The labels of the sublevels, as decimals."""
    pairs = (("F", found.twice_F), ("m", found.twice_m), ("m_J", found.twice_mJ), ("m_I", found.twice_mI))
    return {name: twice / 2 for name, twice in pairs}


def answer_sublevels(context: Context, path: Mapping[str, str], asked: SublevelsAsked) -> Answer:
    """Energy, shift, slope, quadratic coefficient and moment of every sublevel of a level at one field.

    Energies count from the level's hyperfine centroid. Uncertainties come from those of A, B, C, g_J and g_I, and of
    the fine-structure intervals in a whole term; inputs without one are listed in `uncertainty_excludes`. m_J and m_I
    are the labels of the level by itself, in fields that undo its hyperfine structure and not yet its fine structure.
    """
    level = context.level(path["atom"], asked.level)
    model = model_of_level(context, path["atom"], asked.level, asked.field, asked.model)
    if model.term is None:
        found, spread = sublevels(level, asked.field), sublevel_spread(level, asked.field)
    else:
        found, spread = term_sublevels(model.term, asked.field), term_spread(model.term, asked.field)
    numbers = {
        "energy_MHz": found.energy_mhz[0],
        "shift_MHz": found.shift_mhz[0],
        "slope_MHz_per_G": found.slope_mhz_per_gauss[0],
        "quadratic_Hz_per_G2": found.quadratic_hz_per_gauss2[0],
    }
    moving, doubted = with_uncertainties(numbers, spread.uncertainty[ORDER, 0])
    columns: dict[str, Column] = {
        **label_columns(found),
        **moving,
        "moment_muB": np.asarray(found.moment_mu_b[0]),
    }
    return Answer(
        {"atom": level.atom, "level": level.name, "model": model.name},
        Table(columns, doubted),
        used=model.used,
        warnings=model.warnings,
        uncertainty_excludes=spread.excludes,
    )


QUESTION = Question(
    name="sublevels",
    path="/v1/atoms/{atom}/sublevels",
    asked=SublevelsAsked,
    answered=SublevelsAnswered,
    ask=answer_sublevels,
    summary="Every sublevel of a level in a field",
    example="/v1/atoms/87Rb/sublevels?level=5s_2S1/2&field=3.2",
    tag="field",
)
