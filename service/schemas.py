"""The shapes that answers share. They document the answers; the tests hold every answer against them."""

from typing import Annotated, Any

from pydantic import BaseModel, ConfigDict, Field

Numbers = list[float]
Labels = list[float]
Texts = list[str]
MaybeNumbers = list[float | None]


class Shape(BaseModel):
    """A record whose members are all there, always."""

    model_config = ConfigDict(extra="forbid", allow_inf_nan=False)


class Scalar(Shape):
    """A computed number."""

    value: float | None = Field(description="null when it does not exist; `reason` says why")
    uncertainty: float | None = Field(description="standard uncertainty (one sigma); null when it is not known")
    unit: str
    reason: str = Field(description="why the value or its uncertainty is null; else empty")


class Published(Shape):
    """A number from the catalogue with where it comes from."""

    value: float
    uncertainty: float | None = Field(description="standard uncertainty; null when none is stated")
    unit: str
    text: str = Field(description="the digits as published")
    source: str = Field(description="keys of the publications; /v1/sources/{id} has each")
    evidence: str = Field(description="checked, recalled or computed")
    note: str


class Curated(Shape):
    """A number from the catalogue, or null and the reason."""

    value: float | None
    uncertainty: float | None = Field(description="standard uncertainty; null when none is stated")
    unit: str
    text: str = Field(description="the digits as published")
    source: str = Field(description="keys of the publications; /v1/sources/{id} has each")
    evidence: str = Field(description="checked, recalled or computed")
    note: str
    alternatives: list[Published] = Field(description="what others published")
    reason: str = Field(description="why the value or its uncertainty is null; else empty")


class Source(Shape):
    """A publication that an answer rests on."""

    id: str
    citation: str
    doi: str
    evidence: str = Field(description="checked, recalled or computed")
    used_for: Texts = Field(description="the inputs that come from it")


class Missing(Shape):
    """A column that holds null and why."""

    column: str
    reason: str


class Answered(Shape):
    """What every answer has besides its own members."""

    query: dict[str, Any] = Field(description="the question with its defaults")
    warnings: Texts = Field(description="where the model is stretched")
    uncertainty_excludes: Texts = Field(
        description="inputs without a stated uncertainty, which uncertainties leave out"
    )
    sources: list[Source]
    release: str = Field(description="the data release that answered")


class Tabular(Answered):
    """An answer with a table."""

    missing: list[Missing] = Field(description="columns that hold null, with the reason")


Half = Annotated[float, Field(description="integer or half-integer")]
