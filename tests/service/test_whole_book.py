"""Every line of the book answers, or says which published value is missing."""

import math
from urllib.parse import quote

import pytest
from starlette.testclient import TestClient

from levels.catalogue import Catalogue, load
from levels.notation import format_half
from levels.records import Atom, Line

FIELD = "3.2"
CATALOGUE = load()
SPECIES = list(CATALOGUE.elements)


def chosen(book: Catalogue, species: str) -> list[Atom]:
    """The reference isotope, and the first other one with a nuclear spin if that has none (or the reverse)."""
    atoms = book.species(species)
    first = atoms[book.elements[species].element.reference_isotope]
    others = [atom for atom in atoms.values() if bool(atom.isotope.twice_I) != bool(first.isotope.twice_I)]
    return [first, *others[:1]]


def stretched(line: Line) -> tuple[str, str]:
    """The sublevels of largest F and m of both levels."""
    pairs = (line.lower.twice_J + line.lower.twice_I, line.upper.twice_J + line.upper.twice_I)
    lower, upper = (f"{format_half(twice_F)},{format_half(twice_F)}" for twice_F in pairs)
    return lower, upper


def ask(client: TestClient, atom: Atom, question: str, **parameters: str) -> dict[str, object]:
    """The answer, or the problem that names what is not published; anything else fails."""
    query = "&".join(f"{name}={quote(value)}" for name, value in parameters.items())
    response = client.get(f"/v1/atoms/{quote(atom.isotope.name)}/{question}?{query}")
    answer: dict[str, object] = response.json()
    where = f"{question} of {atom.isotope.name} {parameters}: {response.text[:300]}"
    if response.status_code != 200:
        assert answer["type"] == "/problems/not-published", where
        assert answer["parameter"], where
    return answer


def finite(value: object) -> bool:
    return all(map(math.isfinite, _numbers(value)))


def _numbers(value: object) -> list[float]:
    if isinstance(value, dict):
        return [number for part in value.values() for number in _numbers(part)]
    if isinstance(value, list):
        return [number for part in value for number in _numbers(part)]
    return [value] if isinstance(value, float) else []


def test_there_are_forty_species() -> None:
    """The book holds at least forty species."""
    assert len(SPECIES) >= 40


@pytest.mark.parametrize("species", SPECIES)
def test_every_line_answers(species: str, client: TestClient, book: Catalogue) -> None:
    """Each line answers `components` and `shift` with finite numbers or the published value that is missing."""
    for atom in chosen(book, species):
        for line in atom.lines:
            table = ask(client, atom, "components", line=line.name, field=FIELD)
            lower, upper = stretched(line)
            one = ask(client, atom, "shift", line=line.name, lower=lower, upper=upper, field=FIELD)
            assert finite(table)
            assert finite(one)
            missing = (table.get("type", ""), one.get("type", ""))
            assert len(set(missing)) == 1, (atom.isotope.name, line.name, missing)


def test_a_borrowed_frequency_is_told_and_has_no_uncertainty(client: TestClient) -> None:
    """43Ca+ at 397 nm has only 40Ca+'s frequency, some 0.7 GHz away: no answer may pass it off as good to 0.2 MHz."""
    found = client.get("/v1/atoms/43Ca%2B/shift?line=397&lower=4,0&upper=4,1&field=1").json()
    assert any("mass number 40" in text for text in found["warnings"])
    assert found["frequency"]["uncertainty"] is None
    assert found["offset"]["uncertainty"] is not None
    table = client.get("/v1/atoms/43Ca%2B/components?line=397&field=1").json()
    assert any("mass number 40" in text for text in table["warnings"])
    assert set(table["columns"]["frequency_uncertainty_THz"]) == {None}
    own = client.get("/v1/atoms/40Ca%2B/shift?line=397&lower=1/2,1/2&upper=1/2,-1/2&field=0").json()
    assert own["warnings"] == []
    assert own["frequency"]["uncertainty"] is not None


@pytest.mark.parametrize("atom", [atom for atom in CATALOGUE.species("Ca").values() if atom.isotope.mass_number != 40])
def test_no_borrowed_centroid_keeps_an_uncertainty(atom: Atom) -> None:
    """The frequency of another isotope says nothing certain of this one, in any line of calcium."""
    for line in atom.lines:
        if line.centroid is not None and line.centroid_isotope == "40":
            assert line.centroid.uncertainty is None
