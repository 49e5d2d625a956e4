"""`book`: the whole catalogue as one download, as JSON or CSV of every value, and as a zip with everything."""

from collections.abc import Mapping

from pydantic import Field
from starlette.requests import Request
from starlette.responses import Response
from starlette.routing import Route

from service import VERSION
from service.answers import Answer
from service.asking import Running
from service.book import (
    isotope_rows,
    level_rows,
    line_rows,
    publication_rows,
    species_rows,
    table_of,
    value_rows,
    zip_of,
)
from service.context import Context
from service.formats import etag, etag_matches, with_reasons
from service.problems import Problem
from service.question import Asked, Question
from service.schemas import Half, MaybeNumbers, Numbers, Shape, Tabular, Texts

ZIP = "/v1/book.zip"


class BookAsked(Asked):
    """The whole book."""


class SpeciesRow(Shape):
    """An element of one charge."""

    species: str
    element: str
    symbol: str
    charge: int
    Z: int
    ground_level: str
    reference_isotope: int = Field(description="isotope shifts count from it")


class IsotopeRow(Shape):
    """An isotope."""

    species: str
    mass_number: int
    nuclear_spin: Half


class LevelRow(Shape):
    """A level."""

    species: str
    level: str
    aliases: str
    configuration: str
    term: str
    coupling: str
    J: Half
    parity: str
    note: str


class LineRow(Shape):
    """A line."""

    species: str
    line: str
    aliases: str
    lower_level: str
    upper_level: str
    multipole: str
    photons: int
    induced: str
    nominal_nm: float
    note: str


class PublicationRow(Shape):
    """A publication."""

    id: str
    citation: str
    doi: str
    csl_json: str = Field(description="the entry as a CSL-JSON item, as text: its own keys are not identifiers")


class ValueColumns(Shape):
    """One row for each published value, the recommended one before its alternatives."""

    species: Texts
    key: Texts = Field(description="what it is of: the path in the data file of the species")
    rank: list[int] = Field(description="0 for the recommended value, 1 and on for alternatives")
    value: Numbers
    uncertainty: MaybeNumbers = Field(description="standard uncertainty; null when none is stated")
    unit: Texts
    text: Texts = Field(description="the digits as published")
    isotope: Texts = Field(description="of energies, frequencies and shifts: mass number or natural")
    of: Texts = Field(description="of frequencies and shifts: centroid, F-F' component, crossover, average")
    medium: Texts = Field(description="of wavelengths: vacuum or air")
    source: Texts
    evidence: Texts = Field(description="checked, recalled or computed")
    formula: Texts = Field(description="of computed values")
    note: Texts


class BookAnswered(Tabular):
    """The whole book as published: nothing in it is derived."""

    species: list[SpeciesRow]
    isotopes: list[IsotopeRow]
    levels: list[LevelRow]
    lines: list[LineRow]
    publications: list[PublicationRow]
    columns: ValueColumns


def answer_book(context: Context, path: Mapping[str, str], asked: BookAsked) -> Answer:
    """The whole book in one download, as published: every value with its alternatives, and the bibliography.

    As CSV or NDJSON it is the table of values. `/v1/book.zip` has all tables as CSV, with release and citation file.
    """
    catalogue, publications = context.catalogue, context.publications
    content = {
        "species": species_rows(catalogue),
        "isotopes": isotope_rows(catalogue),
        "levels": level_rows(catalogue),
        "lines": line_rows(catalogue),
        "publications": [
            {**row, "csl_json": publications[row["id"]].csl_json} for row in publication_rows(publications)
        ],
    }
    values = table_of(value_rows(catalogue)).columns
    return Answer(content, with_reasons(values, {"uncertainty": "none is stated"}))


async def book_zip(request: Request) -> Response:
    """The whole book as a zip of CSV files; the same release has the same bytes."""
    state = request.app.state
    running: Running | None = state.running
    if running is None:
        raise Problem("not-ready", "the catalogue is not loaded", headers={"Retry-After": "1"})
    context = running.context
    if request.query_params:
        unknown = next(iter(request.query_params))
        detail = f"{ZIP} has no parameter {unknown!r}"
        raise Problem(
            "unknown-parameter", detail, parameter=unknown, given=request.query_params[unknown], allowed="none"
        )
    tag = etag(context.release.encode(), VERSION.encode(), ZIP.encode())
    headers = {"ETag": tag.decode(), "Cache-Control": "public, max-age=60, stale-while-revalidate=300"}
    if etag_matches(request.headers.get("if-none-match", "").encode(), tag):
        return Response(status_code=304, headers=headers)
    packed = getattr(state, "book", None)
    if packed is None or packed[0] != tag:
        packed = tag, await running.heavy.run(lambda: zip_of(context.catalogue, context.publications))
        state.book = packed
    disposition = f'attachment; filename="sublevel-book-{context.release.partition("+")[0]}.zip"'
    headers["Content-Disposition"] = disposition
    return Response(packed[1], headers=headers, media_type="application/zip")


QUESTION = Question(
    name="book",
    path="/v1/book",
    asked=BookAsked,
    answered=BookAnswered,
    ask=answer_book,
    summary="The whole book as one download",
    example="/v1/book",
    tag="catalogue",
    heavy=True,
)
ROUTES = (Route(ZIP, book_zip, name="book zip"),)
