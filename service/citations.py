"""Publications as one-line citations, from the catalogue's CSL-JSON bibliography."""

import json
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

MOST_AUTHORS = 4


@dataclass(frozen=True, slots=True)
class Publication:
    """One entry of the bibliography."""

    id: str
    citation: str
    doi: str
    csl: Mapping[str, Any]

    @property
    def csl_json(self) -> str:
        """The CSL-JSON item as text."""
        return json.dumps(self.csl, ensure_ascii=False)


def publication(item: Mapping[str, Any]) -> Publication:
    """Read a CSL-JSON item."""
    return Publication(str(item["id"]), cite(item), str(item.get("DOI", "")), item)


def cite(item: Mapping[str, Any]) -> str:
    """Write authors, title, container, volume, page and year, as far as the item has them.

    >>> cite({"author": [{"family": "Ye"}], "container-title": "Opt. Lett.", "volume": "21", "page": "1280",
    ...       "issued": {"date-parts": [[1996]]}})
    'Ye, Opt. Lett. 21, 1280 (1996)'
    """
    place = " ".join(str(item[key]) for key in ("container-title", "volume") if item.get(key))
    if not place:
        place = str(item.get("publisher", ""))
    parts = [_authors(item), str(item.get("title", "")), place, str(item.get("page", "")), str(item.get("number", ""))]
    text = ", ".join(part for part in parts if part)
    year = _year(item)
    return f"{text} ({year})" if year else text


def _authors(item: Mapping[str, Any]) -> str:
    names = [str(author.get("family") or author.get("literal") or "") for author in item.get("author", ())]
    names = [name for name in names if name and name != "et al."]
    if len(names) < len(item.get("author", ())) or len(names) > MOST_AUTHORS:
        return f"{', '.join(names[:1])} et al."
    return ", ".join(names)


def _year(item: Mapping[str, Any]) -> str:
    parts = item.get("issued", {}).get("date-parts", [[]])
    return str(parts[0][0]) if parts and parts[0] else ""
