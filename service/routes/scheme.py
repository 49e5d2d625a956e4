"""`scheme`: does this set of beams work, and what would make it?"""

from collections.abc import Mapping
from typing import Any, Literal

from pydantic import Field

from levels.darkstates import RESONANT_WIDTHS
from levels.pumping import pump
from levels.scheme import Verdict, check
from levels.setup import populations_of
from service import scheme_records as write
from service.answers import Answer, records_table
from service.beams import Number, SchemeAsked
from service.context import Context
from service.formats import Table
from service.polarised import field_record, joined, plain, polarisation_columns
from service.question import Question
from service.scheme_shapes import ComponentColumns, OtherLineColumns, PolarisationColumns, SchemeAnswered
from service.setups import Laboratory, laboratory, stretched, used_by, without_uncertainty

BY_RATES = "this is the model that is used"
NO_CYCLE = "a target is asked for, so that atoms are meant to leave the light"
OFF = "no beam is within reach of a component"


class VerdictAsked(SchemeAsked):
    """A scheme to check."""

    linewidths: Number = Field(
        RESONANT_WIDTHS, gt=0, le=1e6, description="how many natural widths count as near a resonance"
    )
    remedies: bool = Field(False, description="search for a better field where atoms go dark (dozens of solutions)")
    table: Literal["findings", "components", "polarisations", "populations", "dark_amplitudes", "other_lines"] = Field(
        "findings", description="which table CSV and NDJSON hold; JSON has them all"
    )


def scheme(context: Context, path: Mapping[str, str], asked: VerdictAsked) -> Answer:
    """Check beams in a field: what each really drives, where the atoms end up, what goes dark, and what to change.

    Findings come worst first, each with a stable code, the number behind it and what would change it; /v1/findings
    lists every kind. Polarisations count along the field (the laboratory z without one); right-handed light has
    positive helicity unless `convention` says `optics`. Coherences are kept wherever one rotating frame holds all
    lasers.

    Laser beams can blind: before you change a power or a beam's path, follow your local rules and your laser safety
    officer.
    """
    lab = laboratory(context, asked)
    verdict = check(
        lab.scheme,
        target=lab.target,
        initial=populations_of(lab.structure, lab.initial),
        linewidths=asked.linewidths,
        model=asked.model,
        remedies=asked.remedies,
    )
    content = {"atom": lab.setup.atom.isotope.name, **_content(lab, verdict, asked)}
    used = used_by(verdict.light.structure)
    return Answer(
        content,
        _table(content, asked.table),
        columnar=False,
        used=used,
        warnings=list(dict.fromkeys((*verdict.outcome.warnings, *stretched(verdict.light.structure)))),
        uncertainty_excludes=without_uncertainty(used),
    )


def _content(lab: Laboratory, verdict: Verdict, asked: VerdictAsked) -> dict[str, Any]:
    light, outcome = verdict.light, verdict.outcome
    drive = light.drive
    optics = [beam.optics for beam in lab.setup.beams]
    rows = list(zip(drive.couplings, verdict.driven, optics, strict=True))
    polarised = [
        polarisation_columns(part.beam.name, part.resolved, part.beam.direction, drive.axes, one)
        for part, _, one in rows
    ]
    pumping = verdict.pumping or pump(light, None, populations_of(light.structure, lab.initial))
    rates = outcome.rate_scattering_per_s
    return {
        "works": verdict.works,
        "findings": write.finding_records(verdict.findings),
        "model": light.model,
        "model_reason": light.reason,
        "unique": outcome.unique,
        "field": field_record(drive.axes),
        "scattering": plain(outcome.scattering_per_s, "s-1"),
        "scattering_by_rates": plain(rates, "s-1") if rates is not None else plain(None, "s-1", BY_RATES),
        "scattering_by_line": write.line_columns(outcome),
        "lost": plain(outcome.lost_per_s, "s-1"),
        "beams": [write.beam_record(lab.setup.atom, part, driven, one, asked.linewidths) for part, driven, one in rows],
        "polarisations": joined(polarised, PolarisationColumns.model_fields),
        "components": joined(
            [write.component_columns(driven, asked.linewidths) for driven in verdict.driven],
            ComponentColumns.model_fields,
        ),
        "other_lines": joined(
            [write.other_line_columns(light.structure, beam) for beam in lab.scheme.beams],
            OtherLineColumns.model_fields,
        ),
        "populations": write.population_columns(outcome),
        "manifolds": write.manifold_records(verdict),
        "dark_states": write.dark_records(verdict),
        "dark_amplitudes": write.dark_columns(verdict),
        "shared_dark": write.shared_columns(light),
        "pumping": write.pumping_record(pumping, verdict.pumping is not None),
        "cycling": write.cycling_record(verdict.cycling, OFF if lab.target is None else NO_CYCLE),
    }


def _table(content: Mapping[str, Any], name: str) -> Table:
    part = content[name]
    return records_table(part) if isinstance(part, list) else Table(part)


EXAMPLE: dict[str, Any] = {
    "atom": "40Ca+",
    "field": [1.0, 1.0, 2.0],
    "beams": [
        {
            "name": "cooling",
            "line": "397",
            "direction": [1, 0, 0],
            "polarisation": {"linear": 30},
            "detuning": -10,
            "saturation": 1,
        },
        {
            "name": "repump",
            "line": "866",
            "direction": [1, 0, 0],
            "polarisation": {"linear": 30},
            "detuning": 15,
            "saturation": 3,
        },
    ],
}
QUESTION = Question(
    name="scheme",
    path="/v1/scheme",
    asked=VerdictAsked,
    answered=SchemeAnswered,
    ask=scheme,
    summary="Does this polarisation scheme work?",
    example="/v1/scheme",
    tag="scheme",
    body_example=EXAMPLE,
    heavy=True,
)
