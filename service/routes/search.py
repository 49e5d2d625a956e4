"""`lines near`, `levels like`: lines and levels over all species, by what they are and where they lie."""

from collections.abc import Mapping, Sequence
from typing import Any

from levels import air
from levels.errors import OutsideValidity, UnknownName
from levels.notation import nearest, shown
from levels.quantity import Quantity
from levels.records import Atom, Level
from levels.search import Found, LevelWanted, Target, Wanted, find_levels, find_lines, usable
from service.answers import NOT_IN_CATALOGUE, Answer
from service.context import Context
from service.formats import Column, with_reasons
from service.question import Question
from service.search_shapes import FindingAsked, LevelsAsked, LevelsFound, LinesAsked, LinesFound

MOST_SPECIES = 60
WITHIN_DEFAULT = 1e-3  # of the target
DISTANCES = ("distance_nm", "distance_GHz")
NOT_STATED = "not in the catalogue, or its publication states none"
LINE_REASONS = {
    "air_wavelength_nm": "the dispersion of air is known from 230 to 1700 nm",
    "frequency_THz": NOT_IN_CATALOGUE,
    "frequency_uncertainty_THz": NOT_STATED,
    "width_MHz": NOT_IN_CATALOGUE,
    "einstein_A_per_s": NOT_IN_CATALOGUE,
    "branching": NOT_IN_CATALOGUE,
}
LEVEL_REASONS = dict.fromkeys(("energy_per_cm", "lifetime_s", "width_MHz", "g_J"), NOT_IN_CATALOGUE)


def species_named(context: Context, text: str) -> list[str]:
    """The species of a list by commas; all without one. A blank at the end of a name is a plus that lost its escape."""
    known = context.catalogue.elements
    names = [part.lstrip() for part in text.split(",")] if text.strip() else list(known)
    chosen = []
    for name in names[:MOST_SPECIES]:
        found = name.strip() if name.strip() == name or f"{name.strip()}+" not in known else f"{name.strip()}+"
        if found not in known:
            raise UnknownName("species", shown(name), nearest(found, known))
        chosen.append(found)
    return chosen


def atoms_of(context: Context, asked: FindingAsked) -> list[Atom]:
    """The atoms to look at."""
    atoms: list[Atom] = []
    for name in species_named(context, asked.species):
        isotopes = context.catalogue.species(name)
        reference = context.catalogue.elements[name].element.reference_isotope
        atoms += [isotopes[reference]] if asked.isotopes == "reference" else isotopes.values()
    return atoms


def check(asked: LinesAsked) -> None:
    """Refuse parameters that contradict each other."""
    if asked.near is None and asked.within is not None:
        raise OutsideValidity("within", asked.within, "only together with near")
    if asked.medium == "air" and asked.unit != "nm":
        raise OutsideValidity("medium", asked.medium, "vacuum, unless unit is nm: frequencies have no medium")
    if asked.medium == "air" and asked.near is not None and not air.SHORTEST_NM < asked.near < air.LONGEST_NM:
        allowed = f"{air.SHORTEST_NM:g} to {air.LONGEST_NM:g} nm, where the dispersion of air is known"
        raise OutsideValidity("near", asked.near, allowed)
    if asked.min_width and asked.max_width and asked.min_width > asked.max_width:
        raise OutsideValidity("min_width", asked.min_width, f"at most max_width, {asked.max_width:g} MHz")


def answer_lines(context: Context, path: Mapping[str, str], asked: LinesAsked) -> Answer:
    """Which lines lie near a wavelength, frequency or wavenumber, over all species, and which are what one looks for.

    Distances count from `near`: in nm in the medium asked for, and in GHz. Without `near` every line that fits is
    listed by wavelength. The line of a two-photon transition is placed at the wavelength of each photon.
    """
    check(asked)
    wanted = Wanted(
        asked.multipole or "",
        asked.lower or "",
        asked.upper or "",
        asked.min_width,
        asked.max_width,
        asked.evidence == "checked",
    )
    target = None
    if asked.near is not None:
        within = asked.near * WITHIN_DEFAULT if asked.within is None else asked.within
        target = Target(asked.near, within, asked.unit, asked.medium == "air")
    found = find_lines(atoms_of(context, asked), wanted, target)
    shown_lines = found[: asked.limit]
    reasons = {**LINE_REASONS, **({} if target else dict.fromkeys(DISTANCES, "nothing was asked to be near"))}
    return Answer(
        {"found": len(found)},
        with_reasons(line_columns(shown_lines, wanted), reasons),
        used=[item for one in shown_lines for item in _used(one, wanted)],
        warnings=_cut(found, asked.limit),
    )


def line_columns(found: Sequence[Found], wanted: Wanted) -> dict[str, Column]:
    """The table of some lines."""
    lines = [one.line for one in found]
    centroids = [usable(line.centroid, wanted) for line in lines]
    return {
        "atom": [line.atom for line in lines],
        "line": [line.name for line in lines],
        "aliases": [", ".join(line.aliases) for line in lines],
        "lower_level": [line.lower.name for line in lines],
        "upper_level": [line.upper.name for line in lines],
        "multipole": [line.multipole for line in lines],
        "photons": [line.photons for line in lines],
        "wavelength_nm": [one.vacuum_nm for one in found],
        "air_wavelength_nm": [one.air_nm for one in found],
        "frequency_THz": [one.value * 1e-6 if one else None for one in centroids],
        "frequency_uncertainty_THz": [
            one.uncertainty * 1e-6 if one and one.uncertainty is not None else None for one in centroids
        ],
        "frequency_of": [line.centroid_isotope for line in lines],
        "distance_nm": [one.distance_nm for one in found],
        "distance_GHz": [one.distance_ghz for one in found],
        "width_MHz": [_value(usable(line.upper.width, wanted)) for line in lines],
        "einstein_A_per_s": [_value(usable(line.einstein_A, wanted)) for line in lines],
        "branching": [_value(usable(line.branching, wanted)) for line in lines],
        "evidence": [one.evidence if one else "" for one in centroids],
        "source": [one.source if one else "" for one in centroids],
    }


def _value(quantity: Quantity | None) -> float | None:
    return None if quantity is None else quantity.value


def _used(found: Found, wanted: Wanted) -> list[tuple[str, Quantity]]:
    line = found.line
    owner = f"{line.atom} {line.name}"
    parts = (
        ("centroid", line.centroid),
        ("width", line.upper.width),
        ("einstein_A", line.einstein_A),
        ("branching", line.branching),
    )
    kept = ((name, usable(quantity, wanted)) for name, quantity in parts)
    return [(f"{name} of {owner}", quantity) for name, quantity in kept if quantity is not None]


def _cut(found: Sequence[object], limit: int) -> list[str]:
    return [f"{len(found)} fit, the first {limit} are shown"] if len(found) > limit else []


def answer_levels(context: Context, path: Mapping[str, str], asked: LevelsAsked) -> Answer:
    """Which levels fit, over all species: metastable ones by their lifetime, 3P0 levels by name.

    A level without a value that is bounded (energy, lifetime) is left out.
    """
    wanted = LevelWanted(
        asked.level or "",
        asked.term or "",
        asked.J,
        None if asked.parity is None else 1 if asked.parity == "even" else -1,
        asked.min_energy,
        asked.max_energy,
        asked.min_lifetime,
        asked.max_lifetime,
    )
    found = find_levels(atoms_of(context, asked), wanted)
    levels = found[: asked.limit]
    columns: dict[str, Column] = {
        "atom": [level.atom for level in levels],
        "level": [level.name for level in levels],
        "configuration": [level.configuration for level in levels],
        "term": [level.term for level in levels],
        "J": [level.twice_J / 2 for level in levels],
        "parity": ["even" if level.parity > 0 else "odd" for level in levels],
        "energy_per_cm": [_value(level.energy) for level in levels],
        "energy_of": [level.energy_of for level in levels],
        "lifetime_s": [_value(level.lifetime) for level in levels],
        "width_MHz": [_value(level.width) for level in levels],
        "g_J": [_value(level.g_J) for level in levels],
    }
    used = [item for level in levels for item in _level_used(level)]
    return Answer(
        {"found": len(found)}, with_reasons(columns, LEVEL_REASONS), used=used, warnings=_cut(found, asked.limit)
    )


def _level_used(level: Level) -> list[tuple[str, Quantity]]:
    parts: tuple[tuple[str, Any], ...] = (
        ("energy", level.energy),
        ("lifetime", level.lifetime),
        ("width", level.width),
        ("g_J", level.g_J),
    )
    return [(f"{name} of {level.atom} {level.name}", quantity) for name, quantity in parts if quantity is not None]


QUESTIONS = (
    Question(
        name="find-lines",
        path="/v1/lines",
        asked=LinesAsked,
        answered=LinesFound,
        ask=answer_lines,
        summary="Lines near a wavelength over all species",
        example="/v1/lines?near=780.2&within=0.5",
        tag="catalogue",
        heavy=True,
    ),
    Question(
        name="find-levels",
        path="/v1/levels",
        asked=LevelsAsked,
        answered=LevelsFound,
        ask=answer_levels,
        summary="Levels over all species",
        example="/v1/levels?level=3P0&min_lifetime=1",
        tag="catalogue",
        heavy=True,
    ),
)
