"""`gradients`: can polarisation gradients cool on this line, how deep are they, how cold may it get?"""

from collections.abc import Mapping
from typing import Annotated, Any

from pydantic import Field

from levels.beams import intensity_of_saturation
from levels.errors import OutsideValidity
from levels.gradients import CONFIGURATIONS, GradientCheck, check_gradients
from levels.structure import structure_of
from service.answers import Answer, records_table
from service.beams import Component, Intensity
from service.context import Context
from service.measures import Megahertz
from service.parameters import Name
from service.polarised import plain
from service.question import Computed, Question
from service.schemas import Answered, Scalar, Shape, Texts
from service.setups import used_by, without_uncertainty

ESTIMATE = "an estimate for low saturation; its uncertainty is that of the model (cautions)"
RULED_OUT = "cooling below the Doppler limit is ruled out, or no formula covers this component"
NO_FIELD = "the lower level does not move with the field, or there is no light shift"


class GradientsAsked(Computed):
    """Two counter-propagating waves on one hyperfine component."""

    line: Name = Field(description="line, as `780` or `D2`", examples=["780"])
    component: Component = Field(description="lower F and upper F, as `2-3`; J for isotopes without nuclear spin")
    detuning: Megahertz = Field(description="laser minus component, in MHz or with a unit; not zero")
    intensity: Intensity | None = Field(None, description="of one wave, in mW/cm2 or with a unit")
    saturation: Annotated[float, Field(ge=0, le=1e12)] | None = Field(
        None, description="instead: I/I_sat of one wave for a component of strength 1"
    )


class GradientRecord(Shape):
    """One configuration of the two waves."""

    configuration: str = Field(description="`lin-perp-lin` or `sigma+sigma-`")
    works: bool = Field(description="whether cooling below the Doppler limit is possible")
    reasons: Texts = Field(description="why not; empty when it works")
    depth: Scalar = Field(description="how far a potential goes up and down along the waves")
    depth_temperature: Scalar
    spread: Scalar = Field(description="largest difference of light shifts at one place")
    saturation: Scalar = Field(description="of one wave, at this detuning")
    temperature: Scalar = Field(description="the usual estimate, with its validity in `cautions`")
    lowest_temperature: Scalar = Field(description="two recoil energies: what even the coldest clouds have")
    largest_field: Scalar = Field(description="field whose Larmor frequency equals the spread: stay well below it")
    cautions: Texts = Field(description="where the estimates stop")


class GradientsAnswered(Answered):
    """Polarisation-gradient cooling on one component."""

    atom: str
    line: str
    intensity: Scalar = Field(description="of one wave")
    configurations: list[GradientRecord]


def gradients(context: Context, path: Mapping[str, str], asked: GradientsAsked) -> Answer:
    """Whether polarisation gradients cool on a component, how deep the light shifts are, and the usual limits.

    Both configurations are answered: linear across linear, and sigma+ against sigma-. F -> F+1 needs red detuning,
    F' <= F blue; light shifts come from the exact shift operator over all upper hyperfine levels at low saturation.
    """
    atom, line = context.atom(path["atom"]), context.line(path["atom"], asked.line)
    if (asked.intensity is None) == (asked.saturation is None):
        given = "nothing" if asked.intensity is None else "both"
        raise OutsideValidity("intensity", given, "either intensity or saturation")
    intensity = asked.intensity
    if intensity is None:
        intensity = intensity_of_saturation(atom, line, asked.saturation or 0.0)
    found = [
        check_gradients(atom, line, asked.component, asked.detuning, intensity, configuration)
        for configuration in CONFIGURATIONS
    ]
    records = [_record(one) for one in found]
    structure = structure_of(atom, [line], 0.0)
    used = used_by(structure)
    return Answer(
        {
            "atom": atom.isotope.name,
            "line": line.name,
            "intensity": plain(intensity, "mW/cm2", "a setting of the laboratory, taken as exact"),
            "configurations": records,
        },
        records_table(records),
        columnar=False,
        used=used,
        warnings=structure.notes,
        uncertainty_excludes=without_uncertainty(used),
    )


def _record(found: GradientCheck) -> dict[str, Any]:
    field = found.largest_field_gauss
    return {
        "configuration": found.configuration,
        "works": found.works,
        "reasons": list(found.reasons),
        "depth": plain(found.depth_mhz, "MHz", ESTIMATE),
        "depth_temperature": plain(found.depth_uk, "uK", ESTIMATE),
        "spread": plain(found.spread_mhz, "MHz", ESTIMATE),
        "saturation": plain(found.saturation, "1", ESTIMATE),
        "temperature": _temperature(found.temperature_uk),
        "lowest_temperature": _temperature(found.lowest_uk),
        "largest_field": plain(field, "G", NO_FIELD if field is None else ESTIMATE),
        "cautions": list(found.cautions),
    }


def _temperature(value_uk: float | None) -> dict[str, Any]:
    return plain(value_uk, "uK", RULED_OUT if value_uk is None else ESTIMATE)


QUESTION = Question(
    name="gradients",
    path="/v1/atoms/{atom}/gradients",
    asked=GradientsAsked,
    answered=GradientsAnswered,
    ask=gradients,
    summary="Polarisation-gradient cooling: possible, how deep, how cold",
    example="/v1/atoms/87Rb/gradients?line=780&component=2-3&detuning=-30&saturation=0.5",
    tag="scheme",
    heavy=True,
)
