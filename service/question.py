"""A question: one route of the API as a row of data.

A route file lists its questions; the application, OpenAPI, the documentation page and the command line all read the
same rows. `asking` has the way from a request to an answer.
"""

import inspect
from collections.abc import AsyncIterator, Callable, Mapping
from dataclasses import dataclass
from typing import Annotated, Any, Literal

from fastapi import Body, Path, Query
from pydantic import BaseModel, ConfigDict, Field

from service.answers import Answer
from service.context import Context
from service.formats import Table
from service.scans import Scans


class Strict(BaseModel):
    """Unknown members are refused and numbers are finite."""

    model_config = ConfigDict(frozen=True, extra="forbid", allow_inf_nan=False)


class Asked(Strict):
    """What every question takes."""

    format: Literal["json", "csv", "ndjson"] | None = Field(
        None, description="representation of the answer; wins over the Accept header", examples=["csv"], exclude=True
    )


class Computed(Asked):
    """What every computation takes besides its own."""

    evidence: Literal["any", "checked"] = Field(
        "any", description="`checked` refuses the answer when an input was not compared with its publication"
    )


@dataclass(frozen=True, slots=True)
class Question:
    """One route: its path, its models and the function that answers it."""

    name: str
    path: str
    asked: type[Asked]
    answered: type[BaseModel]
    ask: Callable[[Context, Mapping[str, str], Any], Answer]
    summary: str
    example: str
    tag: str
    body_example: Mapping[str, Any] | None = None
    heavy: bool = False
    pieces: Callable[[Scans, Context, Any], AsyncIterator[Table]] | None = None  # of a table that is long in the making

    @property
    def method(self) -> str:
        """GET where a query string can carry everything, else POST."""
        return "GET" if self.body_example is None else "POST"

    @property
    def path_names(self) -> list[str]:
        """The parameters in the path."""
        return [part[1:-1] for part in self.path.split("/") if part.startswith("{")]

    @property
    def description(self) -> str:
        """The longer description, from the docstring of `ask`."""
        return inspect.cleandoc(self.ask.__doc__ or "")


PATH_PARAMETERS: Mapping[str, Any] = {
    "atom": Path(description="isotope and charge, as `87Rb`, `Rb-87`, `40Ca+` or `40Ca II`", examples=["87Rb"]),
    "element": Path(description="element and charge, as `Rb`, `Ca+` or `Yb II`", examples=["Rb"]),
    "id": Path(description="a publication's key, as `sources` in any answer has it"),
}


def documented(question: Question) -> Callable[..., None]:
    """A function whose signature tells FastAPI the question's parameters; it is never called."""

    def endpoint() -> None: ...

    carrier = Query() if question.method == "GET" else Body()
    parameters = {name: Annotated[str, PATH_PARAMETERS[name]] for name in question.path_names}
    parameters["asked"] = Annotated[question.asked, carrier]
    kind = inspect.Parameter.KEYWORD_ONLY
    endpoint.__signature__ = inspect.Signature(  # type: ignore[attr-defined]
        [inspect.Parameter(name, kind, annotation=annotation) for name, annotation in parameters.items()]
    )
    endpoint.__doc__ = question.description
    endpoint.__name__ = question.name
    return endpoint
