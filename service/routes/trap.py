"""`trap`: which sublevels of a level a magnetic field minimum holds."""

from collections.abc import Mapping

import numpy as np
from pydantic import Field

from levels.constants import MU_B_MHZ_PER_GAUSS
from levels.trapping import MHZ_PER_MICROKELVIN, Trapped, losses, trapping
from service.answers import Answer, scalar, uncertainty_columns
from service.context import Context
from service.formats import Column, Table
from service.parameters import DepthMicrokelvin, FieldGauss, LargestField, Name
from service.question import Computed, Question
from service.schemas import Labels, MaybeNumbers, Numbers, Scalar, Shape, Tabular, Texts

NOWHERE = "where null, the sublevel does not seek weak field up to the largest field"
NO_TURN = "where null, it does not turn up to the largest field"
NO_KNIFE = "where null, no depth was asked for, or the sublevel is not held that deep"
NO_SLOPE = "where null, the sublevel has no moment at the bottom of the trap, or the mass is not in the catalogue"
NO_RATE = "not in the catalogue"


class TrapAsked(Computed):
    """A trap between two fields."""

    level: Name = Field(description="level, as `5s_2S1/2` (`5S1/2` where that is unambiguous)", examples=["5s_2S1/2"])
    bottom: FieldGauss = Field(0.0, description="field at the bottom of the trap, in gauss or with a unit")
    max_field: LargestField = Field(2000.0, description="largest field of the trap", examples=["2000"])
    depth: DepthMicrokelvin | None = Field(
        None, description="depth at which a radio-frequency knife is to cut, in uK or with a unit", examples=["300"]
    )


class TrapColumns(Shape):
    """One row for each sublevel, by F and then m."""

    F: Labels
    m: Labels
    seeks: Texts = Field(description="weak field, strong field or neither, at the bottom of the trap")
    moment_muB: Numbers = Field(description="along the field, at the bottom")
    moment_uncertainty_muB: MaybeNumbers
    weak_from_G: MaybeNumbers = Field(description="field above which the energy rises")
    turning_field_G: MaybeNumbers = Field(description="field where it turns over")
    turning_field_uncertainty_G: MaybeNumbers
    depth_MHz: MaybeNumbers = Field(description="energy between the two, or up to the largest field")
    depth_uncertainty_MHz: MaybeNumbers
    depth_uK: MaybeNumbers
    levitation_gradient_G_per_cm: MaybeNumbers = Field(description="whose force balances gravity, at the bottom")
    knife_m: MaybeNumbers = Field(description="m that the knife takes atoms to")
    knife_field_G: MaybeNumbers = Field(description="where it cuts")
    knife_frequency_MHz: MaybeNumbers
    knife_frequency_uncertainty_MHz: MaybeNumbers
    knife_bottom_MHz: MaybeNumbers = Field(description="frequency that reaches the bottom of the trap")


class LossShape(Shape):
    """A way in which single atoms leave."""

    channel: str
    acts: str
    rate: Scalar


class TrapAnswered(Tabular):
    """A trap between two fields."""

    atom: str
    level: str
    losses: list[LossShape] = Field(description="one-body losses that the level allows")
    columns: TrapColumns


def answer_trap(context: Context, path: Mapping[str, str], asked: TrapAsked) -> Answer:
    """Weak-field seekers, depth, moment, gradient against gravity and radio-frequency knife of every sublevel.

    Spins follow the field's direction and see its magnitude, from `bottom` to `max_field`. The depth does not count
    gravity. The knife drives m to the neighbouring m of the same F at the field where the energy above the bottom is
    `depth`. An ion's motion is ruled by electric forces: its figures are those of its moment alone.

    Trap magnets store energy and get hot: follow local rules.
    """
    atom, level = context.atom(path["atom"]), context.level(path["atom"], asked.level)
    grounds = context.level_grounds(path["atom"], asked.level)
    found = trapping(atom.isotope, level, asked.bottom, asked.max_field, asked.depth)
    columns, missing = _columns(found)
    mass = atom.isotope.mass
    return Answer(
        {
            "atom": level.atom,
            "level": level.name,
            "losses": [
                {
                    "channel": one.channel,
                    "acts": one.acts,
                    "rate": scalar(one.rate_per_s, None, "s-1", NO_RATE if one.rate_per_s is None else "not computed"),
                }
                for one in losses(level, asked.bottom)
            ],
        },
        Table(columns, missing),
        used=[*grounds.basis, *([("mass", mass)] if mass is not None else [])],
        warnings=grounds.warnings(asked.max_field),
        uncertainty_excludes=list(dict.fromkeys(name for one in found for name in one.excludes)),
    )


def _columns(found: list[Trapped]) -> tuple[dict[str, Column], dict[str, str]]:
    knives = [one.knife for one in found]
    sigma, doubted = uncertainty_columns(
        {
            "moment_uncertainty_muB": [one.slope_uncertainty_mhz_per_gauss / MU_B_MHZ_PER_GAUSS for one in found],
            "turning_field_uncertainty_G": [one.turning_uncertainty_gauss for one in found],
            "depth_uncertainty_MHz": [one.depth_uncertainty_mhz for one in found],
            "knife_frequency_uncertainty_MHz": [
                np.nan if knife is None else knife.frequency_uncertainty_mhz for knife in knives
            ],
        }
    )
    columns: dict[str, Column] = {
        "F": [one.label[0] / 2 for one in found],
        "m": [one.label[1] / 2 for one in found],
        "seeks": [one.seeks for one in found],
        "moment_muB": [one.moment_mu_b + 0.0 for one in found],
        "moment_uncertainty_muB": sigma["moment_uncertainty_muB"],
        "weak_from_G": [one.from_gauss for one in found],
        "turning_field_G": [one.turning_gauss for one in found],
        "turning_field_uncertainty_G": sigma["turning_field_uncertainty_G"],
        "depth_MHz": [one.depth_mhz for one in found],
        "depth_uncertainty_MHz": sigma["depth_uncertainty_MHz"],
        "depth_uK": [None if one.depth_mhz is None else one.depth_mhz / MHZ_PER_MICROKELVIN for one in found],
        "levitation_gradient_G_per_cm": [one.levitation_gauss_per_cm for one in found],
        "knife_m": [None if knife is None else knife.to[1] / 2 for knife in knives],
        "knife_field_G": [None if knife is None else knife.field_gauss for knife in knives],
        "knife_frequency_MHz": [None if knife is None else knife.frequency_mhz for knife in knives],
        "knife_frequency_uncertainty_MHz": sigma["knife_frequency_uncertainty_MHz"],
        "knife_bottom_MHz": [None if knife is None else knife.bottom_mhz for knife in knives],
    }
    return columns, {**_reasons(columns), **_doubts(doubted, columns)}


def _reasons(columns: Mapping[str, Column]) -> dict[str, str]:
    """Why each column holds null."""
    rows = {
        "weak_from_G": NOWHERE,
        "depth_MHz": NOWHERE,
        "depth_uK": NOWHERE,
        "turning_field_G": NO_TURN,
        "levitation_gradient_G_per_cm": NO_SLOPE,
        **dict.fromkeys(("knife_m", "knife_field_G", "knife_frequency_MHz", "knife_bottom_MHz"), NO_KNIFE),
    }
    return {name: reason for name, reason in rows.items() if None in list(columns[name])}


def _doubts(doubted: Mapping[str, str], columns: Mapping[str, Column]) -> dict[str, str]:
    """An uncertainty is null with its value, else for the doubt."""
    values = {
        "turning_field_uncertainty_G": ("turning_field_G", NO_TURN),
        "depth_uncertainty_MHz": ("depth_MHz", NOWHERE),
        "knife_frequency_uncertainty_MHz": ("knife_frequency_MHz", NO_KNIFE),
    }
    reasons = {}
    for name, reason in doubted.items():
        value, absent = values.get(name, ("moment_muB", reason))
        both = [known is not None and sigma is None for known, sigma in zip(columns[value], columns[name], strict=True)]
        parts = [absent] if None in list(columns[value]) else []
        parts += [reason] if any(both) else []
        reasons[name] = "; ".join(parts) or reason
    return reasons


QUESTION = Question(
    name="trap",
    path="/v1/atoms/{atom}/trap",
    asked=TrapAsked,
    answered=TrapAnswered,
    ask=answer_trap,
    summary="Magnetic trapping of every sublevel",
    example="/v1/atoms/87Rb/trap?level=5s_2S1/2&bottom=1&max_field=2000&depth=300",
    tag="motion",
    heavy=True,
)
