"""The catalogue: atoms, levels, lines, the publications behind them and the release."""

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import asdict, fields, replace
from typing import Any

from levels.errors import UnknownName
from levels.notation import nearest
from levels.quantity import Quantity
from levels.records import Isotope, Level, Line
from levels.summary import CoolingLine, cooling_lines
from levels.tally import tally
from service import VERSION
from service.answers import NOT_IN_CATALOGUE, Answer, curated, records_table, sources_of
from service.catalogue_shapes import (
    AtomAnswered,
    AtomsAnswered,
    LevelsAnswered,
    LinesAnswered,
    ReleaseAnswered,
    SourceAnswered,
)
from service.context import Context
from service.question import Asked, Question
from service.schemas import Answered

Records = list[dict[str, Any]]
COUNTED = ("values", "checked", "recalled", "computed", "alternatives")


class NothingAsked(Asked):
    """A question without parameters of its own."""


def isotope_record(isotope: Isotope) -> dict[str, Any]:
    """An isotope as the list has it."""
    return {
        "name": isotope.name,
        "element": isotope.symbol,
        "charge": isotope.charge,
        "Z": isotope.Z,
        "mass_number": isotope.mass_number,
        "nuclear_spin": isotope.twice_I / 2,
        "ground_level": isotope.ground,
    }


def level_record(level: Level) -> dict[str, Any]:
    """A level as the list has it."""
    no_spin = "I = 0" if not level.twice_I else "J = 0"
    dipole = NOT_IN_CATALOGUE if level.twice_J and level.twice_I else no_spin
    quadrupole = NOT_IN_CATALOGUE if level.twice_J > 1 and level.twice_I > 1 else "needs I and J of 1 or more"
    octupole = NOT_IN_CATALOGUE if level.twice_J > 2 and level.twice_I > 2 else "needs I and J of 3/2 or more"
    return {
        "name": level.name,
        "aliases": list(level.aliases),
        "configuration": level.configuration,
        "term": level.term,
        "coupling": level.coupling,
        "J": level.twice_J / 2,
        "parity": "even" if level.parity > 0 else "odd",
        "energy": curated(level.energy, "cm-1"),
        "energy_of": level.energy_of,
        "lifetime": curated(level.lifetime, "s"),
        "width": curated(level.width, "MHz"),
        "g_J": curated(level.g_J, "1", NOT_IN_CATALOGUE if level.twice_J else "J = 0"),
        "g_I": curated(level.g_I, "1", NOT_IN_CATALOGUE if level.twice_I else "I = 0"),
        "A": curated(level.A, "MHz", dipole),
        "B": curated(level.B, "MHz", quadrupole),
        "C": curated(level.C, "MHz", octupole),
        "notes": list(level.notes),
    }


def line_record(line: Line) -> dict[str, Any]:
    """A line as the list has it."""
    return {
        "name": line.name,
        "aliases": list(line.aliases),
        "lower": line.lower.name,
        "upper": line.upper.name,
        "multipole": line.multipole,
        "photons": line.photons,
        "nominal_nm": line.nominal_nm,
        "frequency": curated(line.centroid, "MHz"),
        "frequency_of": line.centroid_isotope,
        "wavelength": curated(line.wavelength, "nm"),
        "einstein_A": curated(line.einstein_A, "s-1"),
        "branching": curated(line.branching, "1"),
        "reduced_dipole": curated(line.reduced_dipole, "e*a0"),
        "induced": line.induced,
        "notes": list(line.notes),
    }


def quantities(records: Iterable[Isotope | Level | Line]) -> Iterator[tuple[str, Quantity]]:
    """Every curated value of some records, with its name."""
    for record in records:
        owner = record.name if isinstance(record, Isotope) else f"{record.atom} {record.name}"
        for item in fields(record):
            value = getattr(record, item.name)
            if isinstance(value, Quantity):
                yield f"{item.name} of {owner}", value


def everything(context: Context) -> Iterator[tuple[str, Quantity]]:
    """Every curated value of the catalogue; g_I only with its isotope."""
    for isotope in context.catalogue.atoms():
        atom = context.atom(isotope.name)
        yield from quantities([isotope, *atom.levels, *atom.lines])


def atoms(context: Context, path: Mapping[str, str], asked: Asked) -> Answer:
    """Every isotope of the catalogue, by nuclear charge, ionic charge and mass."""
    return _listed({}, "atoms", [isotope_record(isotope) for isotope in context.catalogue.atoms()], ())


def cooling_record(found: CoolingLine) -> dict[str, Any]:
    """A line that might cool."""
    line = found.line
    closed = {True: "yes", False: "no", None: "unknown"}[found.is_closed]
    return {
        "line": line.name,
        "aliases": list(line.aliases),
        "lower": line.lower.name,
        "upper": line.upper.name,
        "wavelength": curated(line.wavelength, "nm"),
        "width": curated(line.upper.width, "MHz"),
        "branching": curated(line.branching, "1"),
        "is_cycling": found.is_cycling,
        "closed": closed,
        "leak_lines": [leak.name for leak in found.leaks],
        "leak_levels": [leak.lower.name for leak in found.leaks],
    }


def cooling_inputs(found: Iterable[CoolingLine]) -> Iterator[tuple[str, Quantity]]:
    """What the hints on cooling rest on."""
    for line in (one.line for one in found):
        parts = (("wavelength", line.wavelength), ("width", line.upper.width), ("branching", line.branching))
        for name, quantity in parts:
            if quantity is not None:
                yield f"{name} of {line.atom} {line.name}", quantity


def atom(context: Context, path: Mapping[str, str], asked: Asked) -> Answer:
    """One isotope on one screen: mass, spin, abundance, moments, its levels and lines, and what might cool it."""
    found = context.atom(path["atom"])
    isotope = found.isotope
    spinless = NOT_IN_CATALOGUE if isotope.twice_I else "I = 0"
    content = {
        **isotope_record(isotope),
        "mass": curated(isotope.mass, "u"),
        "abundance": curated(isotope.abundance, "1"),
        "half_life": curated(isotope.half_life, "s", "none in the catalogue: stable, or not curated"),
        "g_I": curated(isotope.g_I, "1", spinless),
        "moment": curated(isotope.moment, "muN", spinless),
        "quadrupole": curated(isotope.quadrupole, "b", NOT_IN_CATALOGUE if isotope.twice_I > 1 else "I below 1"),
        "levels": [level.name for level in found.levels],
        "lines": [line.name for line in found.lines],
    }
    table = records_table([content])
    cooling = cooling_lines(found)
    content["cooling_lines"] = [cooling_record(one) for one in cooling]
    return Answer(content, table, columnar=False, used=[*quantities([isotope]), *cooling_inputs(cooling)])


def levels(context: Context, path: Mapping[str, str], asked: Asked) -> Answer:
    """Every level of an isotope with its constants."""
    found = context.atom(path["atom"])
    return _listed({"atom": found.isotope.name}, "levels", list(map(level_record, found.levels)), found.levels)


def lines(context: Context, path: Mapping[str, str], asked: Asked) -> Answer:
    """Every line of an isotope with its frequency and rates."""
    found = context.atom(path["atom"])
    return _listed({"atom": found.isotope.name}, "lines", list(map(line_record, found.lines)), found.lines)


def _listed(content: dict[str, Any], key: str, records: Records, used: Sequence[Level | Line]) -> Answer:
    return Answer({**content, key: records}, records_table(records), columnar=False, used=list(quantities(used)))


def sources(context: Context, path: Mapping[str, str], asked: Asked) -> Answer:
    """Every publication that a value rests on, with the values."""
    used = list(everything(context))
    return Answer({}, records_table(sources_of(used, context.publications)), columnar=False, used=used)


def source(context: Context, path: Mapping[str, str], asked: Asked) -> Answer:
    """One publication, and the values that rest on it."""
    known = context.publications.get(path["id"])
    if known is None:
        raise UnknownName("source", path["id"], nearest(path["id"], context.publications))
    mine = ((name, value) for name, value in everything(context) if known.id in value.sources)
    used = [(name, replace(value, source=known.id)) for name, value in mine]
    content = {"id": known.id, "citation": known.citation, "doi": known.doi, "csl_json": known.csl_json}
    return Answer(content, records_table(sources_of(used, context.publications)), columnar=False, used=used)


def release(context: Context, path: Mapping[str, str], asked: Asked) -> Answer:
    """The data release, how much it holds, and how much of it was compared with its publication."""
    catalogue = context.catalogue
    elements = catalogue.elements.values()
    rows = [asdict(row) for row in tally(catalogue.elements)]
    content = {
        "version": VERSION,
        "species": len(catalogue.elements),
        "isotopes": len(catalogue.names),
        "levels": sum(len(data.isotopes) * len(data.levels) for data in elements),
        "lines": sum(len(data.isotopes) * len(data.lines) for data in elements),
        "publications": len(context.publications),
        **{name: sum(row[name] for row in rows) for name in COUNTED},
        "overlaid": list(catalogue.overlaid),
        "tally": rows,
    }
    return Answer(content, records_table(rows), columnar=False)


def _question(
    name: str, path: str, answered: Any, ask: Any, summary: str, example: str, heavy: bool = False
) -> Question:
    return Question(name, path, NothingAsked, answered, ask, summary, example, "catalogue", heavy=heavy)


QUESTIONS = (
    _question("atoms", "/v1/atoms", AtomsAnswered, atoms, "Every isotope", "/v1/atoms"),
    _question("atom", "/v1/atoms/{atom}", AtomAnswered, atom, "One isotope", "/v1/atoms/87Rb"),
    _question(
        "levels", "/v1/atoms/{atom}/levels", LevelsAnswered, levels, "Levels of an isotope", "/v1/atoms/87Rb/levels"
    ),
    _question("lines", "/v1/atoms/{atom}/lines", LinesAnswered, lines, "Lines of an isotope", "/v1/atoms/87Rb/lines"),
    _question("sources", "/v1/sources", Answered, sources, "Every publication", "/v1/sources", heavy=True),
    _question(
        "source", "/v1/sources/{id}", SourceAnswered, source, "One publication", "/v1/sources/ye1996", heavy=True
    ),
    _question("release", "/v1/release", ReleaseAnswered, release, "The data release", "/v1/release", heavy=True),
)
