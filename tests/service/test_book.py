"""The whole book as one download."""

import csv
import io
import json
import zipfile

import pytest
from starlette.testclient import TestClient

from levels.catalogue import Catalogue
from service.book import zip_of
from service.citations import publication
from tests.published.ledger import every_value

MEMBERS = [
    "README.txt",
    "CITATION.cff",
    "species.csv",
    "isotopes.csv",
    "levels.csv",
    "lines.csv",
    "values.csv",
    "publications.csv",
    "references.json",
]


@pytest.fixture(scope="module")
def archive(client: TestClient) -> zipfile.ZipFile:
    response = client.get("/v1/book.zip")
    assert response.headers["content-type"] == "application/zip"
    return zipfile.ZipFile(io.BytesIO(response.content))


def rows(archive: zipfile.ZipFile, name: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(archive.read(f"sublevel-book/{name}").decode())))


def test_every_value_is_in_it(book: Catalogue, client: TestClient, archive: zipfile.ZipFile) -> None:
    """JSON and zip hold every value with its digits, alternatives too, and no other."""
    expected = sorted(
        (name, value.value, value.source, value.evidence)
        for name, data in book.elements.items()
        for _, value in every_value(data)
    )
    columns = client.get("/v1/book").json()["columns"]
    assert (
        sorted(zip(columns["species"], columns["text"], columns["source"], columns["evidence"], strict=True))
        == expected
    )
    in_zip = rows(archive, "values.csv")
    assert sorted((row["species"], row["text"], row["source"], row["evidence"]) for row in in_zip) == expected


def test_every_source_is_in_it(archive: zipfile.ZipFile) -> None:
    """Each source that a value names is among the publications, in CSV and as CSL-JSON."""
    named = {key for row in rows(archive, "values.csv") for key in row["source"].split("; ") if key}
    assert named <= {row["id"] for row in rows(archive, "publications.csv")}
    assert named <= {item["id"] for item in json.loads(archive.read("sublevel-book/references.json"))}


def test_zip_holds_release_and_citation(archive: zipfile.ZipFile, client: TestClient) -> None:
    """The zip has its tables, the release and a citation file that names no person."""
    assert archive.namelist() == [f"sublevel-book/{name}" for name in MEMBERS]
    release = client.get("/v1/release").json()["release"]
    citation = archive.read("sublevel-book/CITATION.cff").decode()
    assert f'version: "{release}"' in citation
    assert "the Sublevel developers" in citation
    assert "family-names" not in citation
    assert release in archive.read("sublevel-book/README.txt").decode()


def test_same_book_same_bytes(fictional: Catalogue) -> None:
    """The zip of a release is the same bytes however often it is made."""
    publications = {key: publication(item) for key, item in fictional.references.items()}
    assert zip_of(fictional, publications) == zip_of(fictional, publications)


@pytest.mark.parametrize("path", ["/v1/book", "/v1/book?format=csv", "/v1/book.zip"])
def test_downloads_have_etags(path: str, client: TestClient) -> None:
    """A client that has the release gets 304, HEAD has the length, and each representation its own tag."""
    first = client.get(path)
    assert first.status_code == 200
    assert client.get(path, headers={"If-None-Match": first.headers["etag"]}).status_code == 304
    head = client.head(path)
    assert (head.headers["etag"], head.content) == (first.headers["etag"], b"")
    others = {client.head(other).headers["etag"] for other in ("/v1/book", "/v1/book?format=csv", "/v1/book.zip")}
    assert len(others) == 3


def test_unknown_parameter_of_the_zip(client: TestClient) -> None:
    """Nothing is ignored silently."""
    problem = client.get("/v1/book.zip?species=Rb").json()
    assert (problem["status"], problem["parameter"]) == (422, "species")
