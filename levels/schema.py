"""What one data file may contain: element, isotopes, levels, lines. Unknown keys are refused.

A file is `levels/data/<Symbol><charge>.toml`; DEVELOPERS.md shows a commented example. What concerns one table alone is
checked here while reading; what needs the whole file (names that refer to each other) by `DataFile` once all tables
are read.
"""

import re
from typing import Annotated, Any, Literal, Self

from pydantic import Field, ValidationError, model_validator

from levels.errors import DataError, OutsideValidity
from levels.notation import format_half, format_isotope, parse_half, parse_level, term_quantum_numbers
from levels.published import (
    Area,
    Dipole,
    Energy,
    Fraction,
    Frequency,
    HalfText,
    Interval,
    LevelText,
    LineFrequency,
    Mass,
    MassNumber,
    Moment,
    Polarisability,
    Rate,
    Shift,
    Strength,
    Table,
    Time,
    Value,
    Width,
)


class Element(Table):
    """The element and charge that a file is about."""

    symbol: Annotated[str, Field(pattern="^[A-Z][a-z]?$")]
    charge: Annotated[int, Field(ge=0, le=9)]
    Z: Annotated[int, Field(ge=1, le=120)]
    name: str
    ground: LevelText
    reference_isotope: MassNumber
    note: str = ""


class IsotopeTable(Table):
    """A nucleus and the neutral atom's mass."""

    spin: HalfText
    mass: Mass | None = None
    abundance: Fraction | None = None
    half_life: Time | None = None
    g_I: Value | None = None
    moment: Moment | None = None
    quadrupole: Area | None = None
    note: str = ""


class Hyperfine(Table):
    """The hyperfine constants of one level of one isotope, or the intervals that give them."""

    A: Frequency | None = None
    B: Frequency | None = None
    C: Frequency | None = None
    g_I: Value | None = None
    g_J: Value | None = None
    intervals: tuple[Interval, ...] = ()
    lifetime: Time | None = None  # of this isotope alone: hyperfine-induced decay, as of 87Sr 3P0
    note: str = ""


class LevelTable(Table):
    """A fine-structure level."""

    term: str
    J: HalfText
    parity: Literal["even", "odd"]
    configuration: str = ""
    coupling: Literal["LS", "JK", "JJ", "none"] = "LS"
    aliases: tuple[str, ...] = ()
    energy: Energy | None = None
    lifetime: Time | None = None
    width: Width | None = None
    g_J: Value | None = None
    hyperfine: dict[MassNumber, Hyperfine] = Field(default_factory=dict)
    note: str = ""

    @model_validator(mode="after")
    def _one_decay_constant(self) -> Self:
        if self.lifetime and self.width:
            raise ValueError("lifetime and width are the same fact: keep one, the other can be derived")
        if self.energy and self.energy.isotope is None:
            raise ValueError('energy needs isotope = <mass number> or "natural"')
        if self.coupling in ("LS", "JK", "JJ"):
            try:
                term_quantum_numbers(self.term)
            except OutsideValidity as error:
                raise ValueError(f'{error}, or coupling = "none"') from None
        return self


class LineTable(Table):
    """A line between two levels of the file."""

    lower: str
    upper: str
    multipole: Literal["E1", "M1", "E2", "M2", "E3"] = "E1"
    aliases: tuple[str, ...] = ()
    nominal_nm: Annotated[float, Field(gt=0, lt=1e9)]
    photons: Literal[1, 2] = 1
    induced: str = ""
    einstein_A: Rate | None = None
    branching: Fraction | None = None
    oscillator_strength: Strength | None = None
    reduced_dipole: Dipole | None = None
    frequency: tuple[LineFrequency, ...] = ()
    shift: tuple[Shift, ...] = ()
    note: str = ""

    @model_validator(mode="after")
    def _isotopes_named(self) -> Self:
        for kind, entries in (("frequency", self.frequency), ("shift", self.shift)):
            if any(entry.isotope is None for entry in entries):
                raise ValueError(f"every {kind} needs isotope = <mass number>")
        return self


class PolarisabilityTable(Table):
    """What a level's scalar polarisability has beside the lines of the file, or the whole of it at zero frequency."""

    core: Polarisability | None = None
    tail: Polarisability | None = None
    static: Polarisability | None = None


class RuleException(Table):
    """An audit finding that is answered: which rule, where, and why the data stands."""

    rule: str
    where: str
    reason: Annotated[str, Field(min_length=20)]


class DataFile(Table):
    """One data file, whole: the tables and that their names refer to something."""

    element: Element
    isotopes: dict[MassNumber, IsotopeTable]
    levels: dict[LevelText, LevelTable]
    lines: dict[str, LineTable] = Field(default_factory=dict)
    polarisability: dict[str, PolarisabilityTable] = Field(default_factory=dict)
    exceptions: tuple[RuleException, ...] = ()

    @property
    def species(self) -> str:
        """The file's name without its ending: `Rb`, `Ca+`."""
        return format_isotope(self.element.symbol, None, self.element.charge)

    @model_validator(mode="after")
    def _names_refer(self) -> Self:
        problems = [*_element_problems(self), *_level_problems(self), *_line_problems(self)]
        if problems:
            raise ValueError("; ".join(problems))
        return self


def _element_problems(data: DataFile) -> list[str]:
    problems = []
    if data.element.ground not in data.levels:
        problems.append(f"element.ground: no level {data.element.ground!r} in this file")
    if data.element.reference_isotope not in data.isotopes:
        problems.append(f"element.reference_isotope: no isotope {data.element.reference_isotope} in this file")
    problems += [f"polarisability: no level {name!r}" for name in data.polarisability if name not in data.levels]
    return problems


def _level_problems(data: DataFile) -> list[str]:
    problems = []
    for name, level in data.levels.items():
        parts = parse_level(name)
        if parts.twice_J != parse_half(level.J):
            problems.append(f"levels.{name}: the name says J = {format_half(parts.twice_J)}, the table {level.J}")
        if level.coupling != "none" and parts.term != level.term:
            problems.append(f"levels.{name}: the name says term {parts.term}, the table {level.term}")
        used = [*level.hyperfine, *([level.energy.isotope] if level.energy else [])]
        problems += [f"levels.{name}: no isotope {A}" for A in used if not _has_isotope(data, A)]
        problems += [
            f"levels.{name}.hyperfine.{A}: isotope {A} has no nuclear spin"
            for A in level.hyperfine
            if A in data.isotopes and parse_half(data.isotopes[A].spin) == 0
        ]
    return problems


def _line_problems(data: DataFile) -> list[str]:
    problems = []
    for name, line in data.lines.items():
        if not re.fullmatch(r"[1-9][0-9]*(\.[0-9]+)?", name):
            problems.append(f"lines.{name}: the name is the vacuum wavelength in nm, digits only")
        problems += [f"lines.{name}: no level {end!r}" for end in (line.lower, line.upper) if end not in data.levels]
        used = [*(entry.isotope for entry in line.frequency), *(entry.isotope for entry in line.shift)]
        problems += [f"lines.{name}: no isotope {A}" for A in used if not _has_isotope(data, A)]
    return problems


def _has_isotope(data: DataFile, isotope: int | str | None) -> bool:
    return isotope == "natural" or isotope in data.isotopes


def validate(document: dict[str, Any], file: str) -> DataFile:
    """Checks a parsed file against the schema; what is wrong raises DataError naming file, key and reason."""
    try:
        return DataFile.model_validate(document)
    except ValidationError as error:
        problems = [_explain(item) for item in error.errors(include_url=False, include_context=False)]
        key, reason = problems[0]
        rest = "".join(f"\n  {k + ': ' if k else ''}{r}" for k, r in problems[1:])
        raise DataError(file, key, reason + rest) from None


def _explain(item: Any) -> tuple[str, str]:
    parts = [str(part) for part in item["loc"] if part != "[key]" and part not in ("int", "literal['natural']")]
    message = str(item["msg"]).removeprefix("Value error, ")
    given = item.get("input")
    if item["type"] == "extra_forbidden":
        message = "unknown key"
    elif isinstance(given, str | int | float) and repr(given) not in message:
        message += f" (given {given!r})"
    return ".".join(parts), message
