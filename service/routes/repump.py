"""`repump`: where an atom leaks to, and which laser brings it back."""

from collections.abc import Mapping, Sequence

from pydantic import Field

from levels.decaygraph import Graph, graph_of
from levels.errors import OutsideValidity
from levels.lasers import Laser, make_laser, saturation_of_intensity
from levels.leaks import neglected
from levels.notation import parse_component
from levels.quantity import Quantity, parse_quantity_input
from levels.records import Line
from levels.repump import Search, repump
from levels.repumpfacts import Facts, facts_of
from service.answers import Answer, records_table
from service.context import Context
from service.inputs import level_inputs, line_warnings
from service.measures import Seconds
from service.parameters import FieldGauss
from service.question import Computed, Question
from service.repump_records import content_of, repumper_record
from service.repump_shapes import RepumpAnswered

MOST_DRIVES = 6
LONGEST = 240


class RepumpAsked(Computed):
    """The lasers that drive an atom."""

    drive: str = Field(
        min_length=1,
        max_length=LONGEST,
        description="line of the cooling laser, as `397`, or with its hyperfine component, as `780:2-3`; more lasers "
        "that are there already after commas, as `397,866`",
        examples=["397"],
    )
    detuning: str = Field(
        "0",
        max_length=LONGEST,
        description="laser less its zero-field component, in MHz or with a unit; one for all or one for each drive",
    )
    saturation: str = Field(
        "1",
        max_length=LONGEST,
        description="I/I_sat; one for all or one for each drive",
    )
    intensity: str = Field(
        "", max_length=LONGEST, description="the same in mW/cm2 or with a unit; wins over saturation where given"
    )
    field: FieldGauss = Field(0.0, description="magnetic field along z, in gauss or with a unit")
    dark_after: Seconds = Field(
        0.01, description="a state that nothing empties within this time counts as dark, in s or with a unit"
    )


def split_drives(text: str) -> list[str]:
    """Cut at commas outside parentheses: names of levels may hold commas in them."""
    parts, depth = [""], 0
    for letter in text:
        depth += (letter == "(") - (letter == ")")
        if letter == "," and depth <= 0:
            parts.append("")
        else:
            parts[-1] += letter
    return [part.strip() for part in parts if part.strip()]


def answer_repump(context: Context, path: Mapping[str, str], asked: RepumpAsked) -> Answer:
    """Every state that decays and off-resonant light reach, photons and time before loss, what brings the atom back.

    Numbers of photons follow from published branching. What is not published is bounded, never guessed: each number
    comes with the worst and the best that unknown branching among the levels of the book allows.
    """
    atom = context.atom(path["atom"])
    texts = split_drives(asked.drive)
    lines = [_line_of(context, path["atom"], text) for text in texts]
    if not 1 <= len(lines) <= MOST_DRIVES:
        raise OutsideValidity("drive", asked.drive, f"from 1 to {MOST_DRIVES} drives such as 397,866 or 780:2-3")
    resolved = any(component is not None for _, component in lines)
    graph = graph_of(atom, resolved, asked.field)
    lasers = _lasers(graph, lines, asked)
    found = repump(graph, lasers, asked.dark_after, asked.field)
    shown = facts_of(graph, [one.repumpers[0] for one in found.singles], tuple(lasers), asked.field)
    repumpers = [repumper_record(graph, found, k, fact) for k, fact in enumerate(shown)]
    return Answer(
        content_of(graph, lasers, found, repumpers),
        records_table(repumpers),
        columnar=False,
        used=list(dict(_used(graph, found)).items()),
        warnings=[*_warnings(graph, lasers, shown, asked), *neglected(found.leaks)],
    )


def _line_of(context: Context, atom: str, text: str) -> tuple[Line, tuple[int, int] | None]:
    name, separator, component = text.rpartition(":")
    if not separator:
        return context.line(atom, text), None
    return context.line(atom, name), parse_component(component, "drive")


def _numbers(text: str, count: int, parameter: str, dimension: str, unit: str) -> list[float]:
    parts = [part.strip() for part in text.split(",")]
    if len(parts) not in (1, count):
        raise OutsideValidity(parameter, text, f"one value, or {count} with commas between them")
    if dimension:
        numbers = [parse_quantity_input(part.replace("e ", "e+"), dimension, unit, parameter) for part in parts]
    else:
        numbers = [_plain(part, parameter) for part in parts]
    return numbers * count if len(numbers) == 1 else numbers


def _plain(text: str, parameter: str) -> float:
    try:
        value = float(text)
    except ValueError:
        value = float("nan")
    if not 0 < value <= 1e9:
        raise OutsideValidity(parameter, text, "a number above 0 and at most 1e9")
    return value


def _lasers(graph: Graph, lines: Sequence[tuple[Line, tuple[int, int] | None]], asked: RepumpAsked) -> list[Laser]:
    count = len(lines)
    detunings = _numbers(asked.detuning, count, "detuning", "frequency", "MHz")
    saturations = _numbers(asked.saturation, count, "saturation", "", "")
    if asked.intensity:
        intensities = _numbers(asked.intensity, count, "intensity", "intensity", "mW/cm2")
        saturations = [
            saturation_of_intensity(graph, line, part) for (line, _), part in zip(lines, intensities, strict=True)
        ]
    return [
        make_laser(line, component, detuning, saturation)
        for (line, component), detuning, saturation in zip(lines, detunings, saturations, strict=True)
    ]


def _used(graph: Graph, found: Search) -> list[tuple[str, Quantity]]:
    """The branching and lifetimes of every level on the way, the hyperfine constants, the repumpers' frequencies."""
    leaks = found.leaks
    uppers = {laser.line.upper.name for laser in leaks.walk.lasers} | {one.state.level.name for one in leaks.reached}
    uppers |= {one.repumpers[0].line.upper.name for one in found.singles}
    used: list[tuple[str, Quantity]] = []
    for name in graph.spans:
        if name in uppers:
            used += _decay_inputs(graph, name)
    for line in [*(laser.line for laser in leaks.walk.lasers), *(one.repumpers[0].line for one in found.singles)]:
        if line.centroid is not None:
            used.append((f"centroid of {line.name}", line.centroid))
        if graph.resolved:
            used += [item for level in (line.lower, line.upper) for item in level_inputs(level)]
    return used


def _decay_inputs(graph: Graph, name: str) -> list[tuple[str, Quantity]]:
    branching = graph.branchings[name]
    own = branching.level.lifetime or branching.level.width
    used = [(f"lifetime of {name}", own)] if own is not None else []
    for channel in branching.channels:
        share = channel.line.branching or channel.line.einstein_A or channel.line.reduced_dipole
        if share is not None:
            used.append((f"branching of {channel.line.name}", share))
    return used


def _warnings(graph: Graph, lasers: Sequence[Laser], shown: Sequence[Facts], asked: RepumpAsked) -> list[str]:
    texts = [f"only the {len(graph.spans)} levels of the book are followed; decays through others are not considered"]
    if not graph.resolved and graph.atom.isotope.twice_I:
        texts.append("levels are taken whole: name a component, as 780:2-3, to see leaks between hyperfine levels")
    texts += [text for laser in lasers for text in line_warnings(laser.line, asked.field)]
    texts += [fact.missing for fact in shown if fact.missing]
    return list(dict.fromkeys(texts))


QUESTION = Question(
    name="repump",
    path="/v1/atoms/{atom}/repump",
    asked=RepumpAsked,
    answered=RepumpAnswered,
    ask=answer_repump,
    summary="Where an atom leaks to, and which laser brings it back",
    example="/v1/atoms/40Ca+/repump?drive=397",
    tag="plan",
    heavy=True,
)
