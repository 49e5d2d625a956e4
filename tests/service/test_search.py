"""Finding over HTTP: lines near a wavelength and levels over all species."""

import csv
import io

import pytest
from starlette.testclient import TestClient

from service.client import Client
from tests.service.conftest import Server


def test_lines_near_a_wavelength(client: TestClient) -> None:
    """Both rubidium isotopes lie near 780.2 nm, the nearest first, with distance and width."""
    answer = client.get("/v1/lines?near=780.2&within=0.5&isotopes=all").json()
    columns = answer["columns"]
    assert columns["atom"] == ["87Rb", "85Rb"]
    assert columns["distance_nm"] == pytest.approx([0.0412, 0.0414], abs=1e-4)
    assert columns["width_MHz"] == pytest.approx([6.07, 6.07], abs=0.01)
    assert answer["found"] == 2
    assert answer["sources"]


def test_default_range_is_a_thousandth(client: TestClient) -> None:
    """Without `within` the range is 0.1 % of the target."""
    assert (
        client.get("/v1/lines?near=780").json()["columns"]
        == client.get("/v1/lines?near=780&within=0.78").json()["columns"]
    )


def test_csv_has_the_same_columns(client: TestClient) -> None:
    """The CSV is the JSON's table."""
    url = "/v1/lines?near=423&within=5"
    columns = client.get(url).json()["columns"]
    rows = list(csv.DictReader(io.StringIO(client.get(f"{url}&format=csv").text)))
    assert list(rows[0]) == list(columns)
    assert [row["line"] for row in rows] == columns["line"]


def test_without_a_target_distances_are_null_with_a_reason(client: TestClient) -> None:
    """All lines of a species, by wavelength; the distance columns are null and say why."""
    answer = client.get("/v1/lines?species=Ca%2B").json()
    wavelengths = answer["columns"]["wavelength_nm"]
    assert wavelengths == sorted(wavelengths)
    assert set(answer["columns"]["distance_nm"]) == {None}
    assert {item["column"] for item in answer["missing"]} == {"distance_nm", "distance_GHz"}


def test_limit_is_told(client: TestClient) -> None:
    """More lines than the limit: as many as asked, the total, and a warning."""
    answer = client.get("/v1/lines?limit=3").json()
    assert len(answer["columns"]["atom"]) == 3
    assert answer["found"] > 500
    assert answer["warnings"] == [f"{answer['found']} fit, the first 3 are shown"]


def test_checked_evidence_leaves_recalled_lines_out(client: TestClient) -> None:
    """With evidence=checked no frequency is recalled, and no source of the answer either."""
    answer = client.get("/v1/lines?evidence=checked&limit=5000").json()
    assert "recalled" not in answer["columns"]["evidence"]
    assert {source["evidence"] for source in answer["sources"]} <= {"checked", "computed"}


@pytest.mark.parametrize(
    ("query", "parameter"),
    [
        ("near=abc", "near"),
        ("near=inf", "near"),
        ("near=0", "near"),
        ("within=1", "within"),
        ("near=780&unit=pm", "unit"),
        ("near=780&unit=THz&medium=air", "medium"),
        ("near=120&medium=air", "near"),
        ("min_width=5&max_width=1", "min_width"),
        ("multipole=E9", "multipole"),
        ("limit=0", "limit"),
        ("wavelength=780", "wavelength"),
    ],
)
def test_bad_input_is_a_problem(query: str, parameter: str, client: TestClient) -> None:
    """What cannot be read or contradicts itself is a 422 that names the parameter and what would do."""
    response = client.get(f"/v1/lines?{query}")
    problem = response.json()
    assert response.status_code == 422, problem
    assert problem["parameter"] == parameter
    assert problem["allowed"]


def test_unknown_names_are_told_with_their_nearest(client: TestClient) -> None:
    """A species or level that does not exist is a 404 with near names."""
    species = client.get("/v1/lines?species=Rv").json()
    assert (species["status"], species["parameter"]) == (404, "species")
    assert "Rb" in species["nearest"]
    level = client.get("/v1/lines?lower=5s_2S1/3").json()
    assert (level["status"], level["parameter"]) == (404, "level")


@pytest.mark.parametrize(
    ("query", "parameter", "near"), [("level=5s.5p_3P9", "level", "5s.5p_3P0"), ("term=3Q", "term", "3P")]
)
def test_level_or_term_that_no_species_has(query: str, parameter: str, near: str, client: TestClient) -> None:
    """A misspelt level or term among the filters is told with the nearest, not answered with nothing."""
    response = client.get(f"/v1/levels?{query}")
    problem = response.json()
    assert (response.status_code, problem["parameter"]) == (404, parameter)
    assert near in problem["nearest"]


@pytest.mark.parametrize("path", ["/v1/lines?near=780&within=200", "/v1/levels?species=Rb,Sr,Dy", "/v1/book"])
def test_catalogue_tables_say_why_a_column_has_gaps(path: str, client: TestClient) -> None:
    """Every column with gaps gives its reason, where many rows of the book stand side by side."""
    answer = client.get(path).json()
    gaps = [name for name, column in answer["columns"].items() if None in column]
    assert gaps
    assert [item["column"] for item in answer["missing"]] == gaps


def test_a_plus_that_lost_its_escape(client: TestClient) -> None:
    """`species=Ca+` reaches the server as `Ca ` and is read as the ion."""
    assert set(client.get("/v1/lines?species=Ca+").json()["columns"]["atom"]) == {"40Ca+"}


def test_levels_over_all_species(client: TestClient) -> None:
    """3P0 levels that live a second or more, with energy and lifetime; bad bounds are problems."""
    columns = client.get("/v1/levels?level=3P0&min_lifetime=1").json()["columns"]
    assert "87Sr" in columns["atom"]
    assert all(lifetime >= 1 for lifetime in columns["lifetime_s"])
    assert client.get("/v1/levels?J=1.3").status_code == 422
    assert client.get("/v1/levels?min_energy=-1").status_code == 422


def test_client_finds_too(server: Server) -> None:
    """The Python client asks the same questions."""
    with Client(server.url) as client:
        assert client.find_lines(near=589.16, within=0.01).columns.atom == ["23Na"]
        assert "88Sr" in client.find_levels(species="Sr", term="3P").columns.atom


def test_alternatives_are_served(client: TestClient) -> None:
    """Disagreements reach the client: two lifetimes of Yb+ 2F7/2, also as widths, and two frequencies at 399 nm."""
    levels = client.get("/v1/atoms/171Yb+/levels").json()["levels"]
    (octupole,) = [level for level in levels if level["name"] == "4f13.6s2_2F7/2"]
    assert [other["text"] for other in octupole["lifetime"]["alternatives"]] == ["4.98(25)e7 s"]
    assert octupole["width"]["alternatives"][0]["value"] == pytest.approx(2 * octupole["width"]["value"], rel=1e-9)
    lines = client.get("/v1/atoms/174Yb/lines").json()["lines"]
    (blue,) = [line for line in lines if line["name"] == "399"]
    assert [other["source"] for other in blue["frequency"]["alternatives"]] == ["das2005"]


def test_atom_says_what_might_cool_it(client: TestClient) -> None:
    """An atom's answer fits one screen: its levels, lines, and lines for cooling with their leaks."""
    answer = client.get("/v1/atoms/40Ca%2B").json()
    (blue,) = [one for one in answer["cooling_lines"] if one["line"] == "397"]
    assert (blue["closed"], blue["leak_lines"], blue["leak_levels"]) == ("no", ["866"], ["3d_2D3/2"])
    assert blue["branching"]["value"] == pytest.approx(0.936, abs=0.002)


def test_release_tells_each_species(client: TestClient) -> None:
    """The tally of the release sums to its totals, and at least half of all values are checked."""
    answer = client.get("/v1/release").json()
    for name in ("values", "checked", "recalled", "computed", "alternatives"):
        assert sum(row[name] for row in answer["tally"]) == answer[name]
    assert answer["values"] == answer["checked"] + answer["recalled"] + answer["computed"]
    assert answer["checked"] >= 0.5 * answer["values"]
    assert len(answer["tally"]) == answer["species"]


@pytest.mark.parametrize(
    "path",
    [
        "/v1/atoms",
        "/v1/atoms/87Rb",
        "/v1/atoms/87Rb/levels",
        "/v1/atoms/87Rb/lines",
        "/v1/lines",
        "/v1/levels",
        "/v1/sources",
        "/v1/sources/ye1996",
        "/v1/release",
        "/v1/book",
    ],
)
def test_everything_is_browsable_as_csv(path: str, client: TestClient) -> None:
    """Each list of the catalogue is a CSV table with a header and rows of equal length."""
    header, *rows = csv.reader(io.StringIO(client.get(f"{path}?format=csv").text))
    assert len(header) > 4
    assert rows
    assert {len(row) for row in rows} == {len(header)}
