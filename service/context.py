"""What questions are answered from: the catalogue and the settings, built once and read-only.

Names that were found, the grounds of their answers and components that were asked for are remembered, each up to a
bound: lab software asks about the same few things all day.
"""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import lru_cache

from levels.catalogue import Catalogue, load
from levels.lookup import ComponentLookup
from levels.records import Atom, Level, Line
from service import VERSION
from service.citations import Publication, publication
from service.inputs import Grounds, level_grounds, line_grounds
from service.settings import Settings

NAMES_KEPT = 4096
COMPONENTS_KEPT = 128  # of up to some 200 kB each
Label = tuple[int, int]


@dataclass(frozen=True, slots=True)
class Context:
    """The catalogue with its finders, by the names of atoms, levels and lines as they were asked for."""

    catalogue: Catalogue
    settings: Settings
    publications: Mapping[str, Publication]
    atom: Callable[[str], Atom]
    level: Callable[[str, str], Level]
    line: Callable[[str, str], Line]
    level_grounds: Callable[..., Grounds]
    line_grounds: Callable[[str, str], Grounds]
    component: Callable[[str, str, Label, Label], ComponentLookup]

    stamp: bytes  # of the data and the program: what answers to one question may differ by

    @property
    def release(self) -> str:
        """The data release."""
        return self.catalogue.release


def build_context(settings: Settings) -> Context:
    """Read the catalogue, with the laboratory's overlay where there is one."""
    catalogue = load(overlay=settings.overlay)
    publications = {key: publication(item) for key, item in catalogue.references.items()}
    keep = lru_cache(NAMES_KEPT)
    level, line = keep(catalogue.find_level), keep(catalogue.find_line)

    def grounds_of_levels(atom: str, *names: str) -> Grounds:
        return level_grounds(*(level(atom, name) for name in names), publications=publications)

    def grounds_of_line(atom: str, name: str) -> Grounds:
        return line_grounds(line(atom, name), publications)

    def component(atom: str, name: str, lower: Label, upper: Label) -> ComponentLookup:
        return ComponentLookup(line(atom, name), lower, upper)

    return Context(
        catalogue,
        settings,
        publications,
        keep(catalogue.atom),
        level,
        line,
        keep(grounds_of_levels),
        keep(grounds_of_line),
        lru_cache(COMPONENTS_KEPT)(component),
        f"{catalogue.release} {VERSION}".encode(),
    )
