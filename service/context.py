"""What questions are answered from: the catalogue and the settings, built once and read-only."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import lru_cache

from levels.catalogue import Catalogue, load
from levels.records import Atom, Level, Line
from service.citations import Publication, publication
from service.settings import Settings

NAMES_KEPT = 4096


@dataclass(frozen=True, slots=True)
class Context:
    """The catalogue with its finders, which remember the names that were found."""

    catalogue: Catalogue
    settings: Settings
    publications: Mapping[str, Publication]
    atom: Callable[[str], Atom]
    level: Callable[[str, str], Level]
    line: Callable[[str, str], Line]

    @property
    def release(self) -> str:
        """The data release."""
        return self.catalogue.release


def build_context(settings: Settings) -> Context:
    """Read the catalogue, with the laboratory's overlay where there is one."""
    catalogue = load(overlay=settings.overlay)
    keep = lru_cache(NAMES_KEPT)
    return Context(
        catalogue,
        settings,
        {key: publication(item) for key, item in catalogue.references.items()},
        keep(catalogue.atom),
        keep(catalogue.find_level),
        keep(catalogue.find_line),
    )
