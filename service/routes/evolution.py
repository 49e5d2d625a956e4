"""`evolution`: the populations of a scheme in time."""

from collections.abc import Mapping
from typing import Annotated

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from levels.errors import OutsideValidity
from levels.evolution import LARGEST_TIMES
from levels.pumping import evolve, prepare
from levels.setup import populations_of
from service.answers import Answer
from service.beams import SchemeAsked
from service.context import Context
from service.formats import Column, Table
from service.parameters import NUMBER_OR_TEXT, measure
from service.polarised import columns, sublevel_columns
from service.problems import Problem
from service.question import Question, Strict
from service.routes.scheme import EXAMPLE
from service.schemas import Labels, Numbers, Shape, Tabular, Texts
from service.setups import laboratory, stretched, used_by, without_uncertainty

Microseconds = Annotated[float, measure("time", "us", 0.0, 1e12), NUMBER_OR_TEXT]
COLUMNS = 5


class TimeGrid(Strict):
    """Times in equal steps (start, stop, points), equal ratios (`logarithmic`), or listed (values)."""

    start: Microseconds = Field(0.0, description="first time, in us or with a unit")
    stop: Microseconds | None = Field(None, description="last time, included")
    points: int = Field(101, ge=1, le=LARGEST_TIMES, strict=True, description="how many times")
    logarithmic: bool = Field(False, description="equal ratios instead of equal steps; start above 0 then")
    values: list[Microseconds] | None = Field(
        None, min_length=1, max_length=LARGEST_TIMES, description="the times themselves, rising"
    )

    def us(self) -> NDArray[np.float64]:
        """The times in us."""
        if (self.stop is None) == (self.values is None):
            given = "nothing" if self.stop is None else "both"
            raise OutsideValidity("times", given, "either stop (with start and points) or values")
        if self.stop is None:
            return np.array(self.values, dtype=np.float64)
        if not self.logarithmic:
            return np.linspace(self.start, self.stop, self.points)
        if self.start <= 0.0:
            raise OutsideValidity("times.start", self.start, "above 0 where times are logarithmic")
        return np.geomspace(self.start, self.stop, self.points)


class EvolutionAsked(SchemeAsked):
    """A scheme and the times to follow it to."""

    times: TimeGrid


class EvolutionColumns(Shape):
    """One row for each time and sublevel."""

    time_us: Numbers
    level: Texts
    F: Labels
    m: Labels
    population: Numbers = Field(description="share of the atoms")


class LossColumns(Shape):
    """Atoms that are gone."""

    time_us: Numbers
    lost: Numbers = Field(description="share of the atoms lost to levels without a way back")


class EvolutionAnswered(Tabular):
    """Populations in time."""

    atom: str
    model: str = Field(description="`bloch` (optical Bloch equations) or `rate` (rate equations)")
    model_reason: str
    losses: LossColumns
    columns: EvolutionColumns


def evolution(context: Context, path: Mapping[str, str], asked: EvolutionAsked) -> Answer:
    """Populations of all sublevels in time, decays and leaks included, from any start.

    The equations are linear and solved exactly between the times: no step-size error. All light is switched on at time
    zero.
    """
    lab = laboratory(context, asked)
    times = asked.times.us()
    light = prepare(lab.scheme, asked.model)
    structure = light.structure
    cells = times.size * structure.size * COLUMNS
    if cells > context.settings.max_numbers:
        bound = f"{context.settings.max_numbers} numbers"
        detail = f"the answer would hold {cells} numbers, more than {bound}"
        raise Problem("answer-too-large", detail, parameter="times", given=cells, allowed=bound)
    found = evolve(light, times, populations_of(structure, lab.initial))
    labels = {name: list(column) * times.size for name, column in sublevel_columns(structure).items()}
    table: dict[str, Column] = {
        "time_us": np.repeat(found.times_us, structure.size),
        **labels,
        "population": found.populations.ravel(),
    }
    used = used_by(structure)
    return Answer(
        {
            "atom": lab.setup.atom.isotope.name,
            "model": light.model,
            "model_reason": light.reason,
            "losses": columns({"time_us": found.times_us, "lost": found.lost}),
        },
        Table(table),
        used=used,
        warnings=list(dict.fromkeys((*structure.notes, *light.frame.notes, *stretched(structure)))),
        uncertainty_excludes=without_uncertainty(used),
    )


QUESTION = Question(
    name="evolution",
    path="/v1/evolution",
    asked=EvolutionAsked,
    answered=EvolutionAnswered,
    ask=evolution,
    summary="Populations of a scheme in time",
    example="/v1/evolution",
    tag="scheme",
    body_example={**EXAMPLE, "times": {"stop": 2, "points": 21}},
    heavy=True,
)
