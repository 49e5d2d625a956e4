"""Every error as an RFC 9457 problem: the table of problem types and what each exception becomes.

A problem's `type` is a stable relative reference, `/problems/<name>`, and leads to its description on the same server.
Every problem has the same members in the same order; what does not apply is empty.
"""

import difflib
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from typing import Any, get_args

import orjson
from pydantic import BaseModel, Field, ValidationError

from levels.errors import NotPublished, OutsideValidity, UnknownName

MEDIA_TYPE = "application/problem+json"
LONGEST_GIVEN = 80
MOST_FAULTS = 20


@dataclass(frozen=True, slots=True)
class ProblemType:
    """One row of the table: what went wrong, and what the client can do about it."""

    name: str
    status: int
    title: str
    meaning: str
    remedy: str

    @property
    def uri(self) -> str:
        """The stable identifier, which is also where the description is served."""
        return f"/problems/{self.name}"


TYPES = {
    row.name: row
    for row in (
        ProblemType(
            "unknown-name",
            404,
            "Unknown name",
            "An atom, level, line, sublevel or source with this name is not in the catalogue.",
            "`nearest` lists the names that come closest; /v1/atoms and the lists below it have them all.",
        ),
        ProblemType(
            "unknown-path",
            404,
            "Unknown path",
            "There is nothing at this path.",
            "`nearest` lists the paths that come closest; /docs and /openapi.json have them all.",
        ),
        ProblemType(
            "method-not-allowed",
            405,
            "Method not allowed",
            "This path exists but does not answer this HTTP method.",
            "`allowed` and the Allow header list the methods that it answers.",
        ),
        ProblemType(
            "not-acceptable",
            406,
            "No such representation",
            "The answer does not exist in any of the media types that the Accept header asks for.",
            "`allowed` lists the media types; the parameter `format` (json, csv, ndjson) wins over the header.",
        ),
        ProblemType(
            "unsupported-media-type",
            415,
            "Body is not JSON",
            "The request's body has a media type other than JSON.",
            "Send JSON with `Content-Type: application/json`.",
        ),
        ProblemType(
            "malformed-body",
            400,
            "Malformed JSON",
            "The request's body cannot be read as JSON.",
            "`detail` says where reading stopped. NaN and Infinity are not JSON.",
        ),
        ProblemType(
            "body-too-large",
            413,
            "Body too large",
            "The request's body has more bytes than this server takes.",
            "`allowed` is the bound; ask in several requests.",
        ),
        ProblemType(
            "url-too-long",
            414,
            "URL too long",
            "The request's path and query have more bytes than this server takes.",
            "`allowed` is the bound; use the POST request where there is one.",
        ),
        ProblemType(
            "unknown-parameter",
            422,
            "Unknown parameter",
            "The request has a parameter or member that this question does not know. Nothing is ignored silently.",
            "`nearest` lists the known ones that come closest, `allowed` all of them.",
        ),
        ProblemType(
            "missing-parameter",
            422,
            "Missing parameter",
            "A parameter or member that the question needs is not there.",
            "Add `parameter`; `allowed` says what it may be.",
        ),
        ProblemType(
            "invalid-parameter",
            422,
            "Invalid parameter",
            "A parameter's value cannot be read, has the wrong unit, is out of range or breaks a physical rule.",
            "`allowed` says what would do: the range, the units, the notation or the rule that is broken.",
        ),
        ProblemType(
            "not-published",
            422,
            "Value not in the catalogue",
            "The answer needs a constant that the catalogue does not have. It is never guessed.",
            "`parameter` names the constant and whose it is; a laboratory's overlay can supply it.",
        ),
        ProblemType(
            "recalled-evidence",
            422,
            "Rests on values not compared with their publication",
            "The request asked for `evidence=checked`, but some inputs were entered from memory of their publication.",
            "`errors` lists those inputs and their sources; leave `evidence` out to get the answer all the same.",
        ),
        ProblemType(
            "answer-too-large",
            422,
            "Answer too large",
            "The answer would hold more numbers than this server gives in one.",
            "`given` is the size that was asked for and `allowed` the bound; ask for fewer fields, states or columns.",
        ),
        ProblemType(
            "took-too-long",
            504,
            "Computation took too long",
            "The computation did not end within the seconds that this server allows.",
            "`allowed` is the bound; ask for less at once.",
        ),
        ProblemType(
            "busy",
            503,
            "Server busy",
            "As many long computations are waiting as this server lets wait.",
            "Ask again after the seconds in the Retry-After header.",
        ),
        ProblemType(
            "scheduler-away",
            503,
            "Scheduler away",
            "This server sends scans to a Dask scheduler, and that one does not answer or has no workers.",
            "Ask again after the seconds in the Retry-After header; if it stays, tell whoever runs the server.",
        ),
        ProblemType(
            "not-ready",
            503,
            "Server not ready",
            "The server is starting or stopping.",
            "Ask again after the seconds in the Retry-After header.",
        ),
        ProblemType(
            "internal-error",
            500,
            "Internal error",
            "The server made a mistake. Nothing is wrong with the request, as far as is known.",
            "Report `request_id`; the server's log has the details under it.",
        ),
    )
}


class Fault(BaseModel):
    """One fault of a request that has several, or one input that was refused."""

    parameter: str
    given: str
    allowed: str
    detail: str


class ProblemBody(BaseModel):
    """A problem as RFC 9457 has it, with members that say what to change."""

    type: str = Field(description="stable identifier of the problem type, served with its description")
    title: str
    status: int
    detail: str = Field(description="what went wrong this time, as a sentence")
    instance: str = Field(description="the path that was asked")
    request_id: str = Field(description="the request, as in the X-Request-ID header and the server's log")
    parameter: str = Field(description="the offending parameter, member or constant; empty when there is none")
    given: str = Field(description="what was given, shortened")
    allowed: str = Field(description="what would do: range, units, notation, rule or list")
    nearest: list[str] = Field(description="the nearest names, best first")
    errors: list[Fault] = Field(description="every fault, when there are several, or every refused input")


class Problem(Exception):
    """A problem on its way to the client."""

    def __init__(
        self,
        name: str,
        detail: str,
        *,
        parameter: str = "",
        given: object = "",
        allowed: str = "",
        nearest: Iterable[str] = (),
        errors: Sequence[Fault] = (),
        headers: dict[str, str] | None = None,
    ) -> None:
        super().__init__(detail)
        self.type = TYPES[name]
        self.detail, self.parameter, self.given, self.allowed = detail, parameter, shown(given), allowed
        self.nearest, self.errors, self.headers = tuple(nearest), tuple(errors), headers or {}

    def encode(self, instance: str, request_id: str) -> bytes:
        """Write the problem as JSON."""
        body = ProblemBody(
            type=self.type.uri,
            title=self.type.title,
            status=self.type.status,
            detail=printable(self.detail),
            instance=shown(instance),
            request_id=request_id,
            parameter=shown(self.parameter),
            given=self.given,
            allowed=self.allowed,
            nearest=list(self.nearest),
            errors=list(self.errors),
        )
        return orjson.dumps(body.model_dump())


def printable(text: str) -> str:
    """The text without control characters and lone surrogates, which have no place in an answer."""
    return "".join(character if character.isprintable() else "\N{REPLACEMENT CHARACTER}" for character in text)


def shown(given: object) -> str:
    """What was given, as short printable text."""
    text = printable(str(given)[: LONGEST_GIVEN + 1])
    return text if len(text) <= LONGEST_GIVEN else text[: LONGEST_GIVEN - 3] + "..."


def _of_unknown_name(error: UnknownName) -> Problem:
    return Problem(
        "unknown-name", str(error), parameter=error.kind, given=error.given, allowed=error.hint, nearest=error.nearest
    )


def _of_not_published(error: NotPublished) -> Problem:
    return Problem("not-published", str(error), parameter=f"{error.constant} of {error.owner}", allowed=error.hint)


def _of_outside_validity(error: OutsideValidity) -> Problem:
    return Problem("invalid-parameter", str(error), parameter=error.parameter, given=error.given, allowed=error.allowed)


def of_validation(error: ValidationError, model: type[BaseModel] | None = None) -> Problem:
    """The problem of a request that does not fit its model; the model says what its members may be."""
    items = error.errors(include_url=False)[:MOST_FAULTS]
    faults = [_fault(item, model) for item in items]
    first, kind = faults[0], items[0]["type"]
    name = {"missing": "missing-parameter", "extra_forbidden": "unknown-parameter"}.get(kind, "invalid-parameter")
    return Problem(
        name,
        first.detail,
        parameter=first.parameter,
        given=first.given,
        allowed=first.allowed,
        errors=faults if len(faults) > 1 else (),
    )


def _fault(item: Any, model: type[BaseModel] | None) -> Fault:
    parameter = shown(".".join(str(part) for part in item["loc"]) or "body")
    cause = item.get("ctx", {}).get("error")
    members = members_at(model, item["loc"][:-1])
    if item["type"] == "missing":
        allowed = members.get(str(item["loc"][-1]), "")
        return Fault(parameter=parameter, given="", allowed=allowed, detail=f"{parameter} is needed")
    given = shown(item["input"])
    if item["type"] == "extra_forbidden":
        allowed = ", ".join(members)
        known = f"; its place takes {allowed}" if members else ""
        return Fault(parameter=parameter, given=given, allowed=allowed, detail=f"{parameter} is not known{known}")
    if isinstance(cause, OutsideValidity):
        return _told(parameter, given, cause.allowed)
    return _told(parameter, given, str(item["msg"]).removeprefix("Value error, "))


def members_at(model: type[BaseModel] | None, place: Sequence[int | str]) -> dict[str, str]:
    """The members that a request may have at a place below its model, with their descriptions."""
    for part in place:
        if model is None or isinstance(part, int):
            continue
        field = model.model_fields.get(part)
        model = None if field is None else _model_in(field.annotation)
    return {} if model is None else {name: field.description or "" for name, field in model.model_fields.items()}


def _model_in(annotation: Any) -> type[BaseModel] | None:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    return next(filter(None, map(_model_in, get_args(annotation))), None)


def _told(parameter: str, given: str, allowed: str) -> Fault:
    return Fault(parameter=parameter, given=given, allowed=allowed, detail=f"{parameter} = {given}: {allowed}")


EXCEPTIONS: tuple[tuple[type[Exception], Callable[[Any], Problem]], ...] = (
    (UnknownName, _of_unknown_name),
    (NotPublished, _of_not_published),
    (OutsideValidity, _of_outside_validity),
    (ValidationError, of_validation),
)
EXPECTED = (Problem, *(kind for kind, _ in EXCEPTIONS))


def problem_of(error: Exception) -> Problem:
    """The problem that an exception becomes; what no row of the table knows is an internal error."""
    if isinstance(error, Problem):
        return error
    for kind, convert in EXCEPTIONS:
        if isinstance(error, kind):
            return convert(error)
    return Problem("internal-error", "the server made a mistake; its log has the details")


def nearest_names(given: str, names: Iterable[str]) -> list[str]:
    """The names that come closest to a misspelt one, best first."""
    return difflib.get_close_matches(given[:LONGEST_GIVEN], list(names), n=5, cutoff=0.4)
