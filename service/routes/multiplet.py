"""`multiplet` and `crossings`: the whole fine-structure term of a level in a field, and where its sublevels meet."""

from collections.abc import Mapping

import numpy as np
from pydantic import Field

from levels.crossings import Crossing, crossings
from levels.errors import OutsideValidity
from levels.paschenback import whole_term
from levels.terms import Term, alone, term_of
from service.answers import Answer, with_uncertainties
from service.context import Context
from service.formats import Column, Table
from service.models import term_inputs, term_warnings
from service.parameters import FieldGauss, LargestField, Name
from service.question import Computed, Question
from service.routes.sublevels import ORDER
from service.schemas import Labels, MaybeNumbers, Numbers, Shape, Tabular, Texts

DOUBTED_FIELD = "a constant without a stated uncertainty (uncertainty_excludes) could outweigh the others"
LEVEL = Field(description="any level of the term, as `2p_2P3/2`; energies count from it", examples=["2p_2P3/2"])


class MultipletAsked(Computed):
    """A term at one field."""

    level: Name = LEVEL
    field: FieldGauss = Field(0.0, description="magnetic field along z, in gauss or with a unit", examples=["2000"])


class MultipletColumns(Shape):
    """One row for each sublevel of the term, by level, F and m."""

    level: Texts
    F: Labels = Field(description="zero-field label; J for I = 0")
    m: Labels
    energy_MHz: Numbers = Field(description="from the hyperfine centroid of the level asked for")
    energy_uncertainty_MHz: MaybeNumbers
    shift_MHz: Numbers = Field(description="from the same sublevel at zero field")
    shift_uncertainty_MHz: MaybeNumbers
    slope_MHz_per_G: Numbers
    slope_uncertainty_MHz_per_G: MaybeNumbers
    quadratic_Hz_per_G2: Numbers = Field(description="half the second derivative at this field")
    quadratic_uncertainty_Hz_per_G2: MaybeNumbers
    mean_L_z: Numbers = Field(description="mean orbital projection; m_L in a strong field")
    mean_S_z: Numbers = Field(description="mean spin projection; m_S in a strong field")


class MultipletAnswered(Tabular):
    """A term at one field."""

    atom: str
    term: str
    level: str
    columns: MultipletColumns


class CrossingsAsked(Computed):
    """Crossings up to a field."""

    level: Name = LEVEL
    max_field: LargestField = Field(1000.0, description="largest field, in gauss or with a unit", examples=["5000"])
    max_dm: int = Field(2, ge=1, le=20, description="largest difference of m between the two")


class CrossingColumns(Shape):
    """One row for each crossing, by field; the first sublevel belongs to the level asked for."""

    first_level: Texts
    first_F: Labels
    first_m: Labels
    second_level: Texts
    second_F: Labels
    second_m: Labels
    field_G: Numbers
    field_uncertainty_G: MaybeNumbers
    energy_MHz: Numbers = Field(description="of both, from the hyperfine centroid of the level asked for")
    slope_difference_MHz_per_G: Numbers = Field(description="of the second less the first")


class CrossingsAnswered(Tabular):
    """Crossings up to a field."""

    atom: str
    level: str
    columns: CrossingColumns


def answer_multiplet(context: Context, path: Mapping[str, str], asked: MultipletAsked) -> Answer:
    """Every sublevel of a fine-structure term, all levels in one Hamiltonian, at any field.

    Levels of one configuration and LS term, joined by the Zeeman operator to all orders in LS coupling; each level
    keeps its own published constants. Left out: the hyperfine interaction between different J and the diamagnetic
    shift. J and F are zero-field labels by rank within an m, so where two sublevels of one m almost meet the label goes
    with the energy.
    """
    level = context.level(path["atom"], asked.level)
    term = term_of(context.atom(path["atom"]), level)
    found = whole_term(term, asked.field)
    numbers = {
        "energy_MHz": found.energy_mhz,
        "shift_MHz": found.shift_mhz,
        "slope_MHz_per_G": found.slope_mhz_per_gauss,
        "quadratic_Hz_per_G2": found.quadratic_hz_per_gauss2,
    }
    moving, doubted = with_uncertainties(numbers, found.spread.uncertainty[ORDER, 0])
    columns: dict[str, Column] = {
        "level": [term.levels[state.position].name for state in found.states],
        "F": [state.twice_F / 2 for state in found.states],
        "m": [state.twice_m / 2 for state in found.states],
        **moving,
        "mean_L_z": found.mean_L_z,
        "mean_S_z": found.mean_S_z,
    }
    return Answer(
        {"atom": level.atom, "term": level.term, "level": level.name},
        Table(columns, doubted),
        used=term_inputs(term),
        warnings=term_warnings(term),
        uncertainty_excludes=found.spread.excludes,
    )


def answer_crossings(context: Context, path: Mapping[str, str], asked: CrossingsAsked) -> Answer:
    """Every field up to `max_field` at which a sublevel of the level meets one of its own term with another m.

    Both belong to one LS term, solved in one Hamiltonian; a level without partners in the catalogue is taken by itself.
    Sublevels of one m repel each other and do not cross.
    """
    level = context.level(path["atom"], asked.level)
    try:
        term = term_of(context.atom(path["atom"]), level)
    except OutsideValidity:
        term = alone(level)
    found = crossings(term, asked.max_field, 2 * asked.max_dm)
    return Answer(
        {"atom": level.atom, "level": level.name},
        _crossing_table(term, found),
        used=term_inputs(term),
        warnings=term_warnings(term),
        uncertainty_excludes=list(dict.fromkeys(name for one in found for name in one.excludes)),
    )


def _crossing_table(term: Term, found: list[Crossing]) -> Table:
    columns: dict[str, Column] = {}
    for end in ("first", "second"):
        states = [getattr(one, end) for one in found]
        columns[f"{end}_level"] = [term.levels[state.position].name for state in states]
        columns[f"{end}_F"] = [state.twice_F / 2 for state in states]
        columns[f"{end}_m"] = [state.twice_m / 2 for state in states]
    spread = [one.uncertainty_gauss for one in found]
    columns["field_G"] = [one.field_gauss for one in found]
    columns["field_uncertainty_G"] = spread
    columns["energy_MHz"] = [one.energy_mhz for one in found]
    columns["slope_difference_MHz_per_G"] = np.array([one.slope_difference_mhz_per_gauss for one in found])
    return Table(columns, {"field_uncertainty_G": DOUBTED_FIELD} if None in spread else {})


QUESTIONS = (
    Question(
        name="multiplet",
        path="/v1/atoms/{atom}/multiplet",
        asked=MultipletAsked,
        answered=MultipletAnswered,
        ask=answer_multiplet,
        summary="A whole fine-structure term in a field",
        example="/v1/atoms/7Li/multiplet?level=2p_2P3/2&field=2000",
        tag="field",
        heavy=True,
    ),
    Question(
        name="crossings",
        path="/v1/atoms/{atom}/crossings",
        asked=CrossingsAsked,
        answered=CrossingsAnswered,
        ask=answer_crossings,
        summary="Level crossings of a term",
        example="/v1/atoms/4He/crossings?level=2p_3P1&max_field=5000",
        tag="field",
        heavy=True,
    ),
)
