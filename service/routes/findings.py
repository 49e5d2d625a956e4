"""`findings`: everything that a checked scheme may be told."""

from collections.abc import Mapping

from pydantic import Field

from levels.findings import KINDS
from service.answers import Answer, records_table
from service.context import Context
from service.question import Asked, Question
from service.schemas import Answered, Shape


class FindingsAsked(Asked):
    """Takes nothing."""


class KindRecord(Shape):
    """One kind of finding."""

    code: str = Field(description="stable: it never changes")
    severity: str = Field(description="the usual one: problem, warning or note; the number may make it another")
    unit: str = Field(description="unit of the number behind it; empty where none belongs to it")
    meaning: str


class FindingsAnswered(Answered):
    """The table of findings."""

    findings: list[KindRecord]


def findings(context: Context, path: Mapping[str, str], asked: FindingsAsked) -> Answer:
    """Every kind of finding with its stable code, usual severity, and what its number is."""
    records = [
        {"code": kind.code, "severity": kind.severity, "unit": kind.unit, "meaning": kind.meaning} for kind in KINDS
    ]
    return Answer({"findings": records}, records_table(records), columnar=False)


QUESTION = Question(
    name="findings",
    path="/v1/findings",
    asked=FindingsAsked,
    answered=FindingsAnswered,
    ask=findings,
    summary="Every kind of finding",
    example="/v1/findings",
    tag="scheme",
)
