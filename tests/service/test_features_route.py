"""Spectroscopy references and line shapes over HTTP."""

import pytest
from starlette.testclient import TestClient


def test_rubidium_cell(client: TestClient) -> None:
    """A natural Rb cell on D2 shows twelve components and twelve crossovers of two isotopes with all their widths."""
    answer = client.get("/v1/elements/Rb/features?line=780").json()
    columns = answer["columns"]
    assert columns["kind"].count("component") == columns["kind"].count("crossover") == 12
    assert sum(part for part in columns["absorption"] if part is not None) == pytest.approx(1.0, abs=1e-9)
    assert max(columns["dip"]) == 1.0
    row = list(zip(columns["isotope"], columns["feature"], strict=True)).index(("87Rb", "2-(2,3)"))
    main = list(zip(columns["isotope"], columns["feature"], strict=True)).index(("87Rb", "2-3"))
    assert columns["offset_MHz"][row] - columns["offset_MHz"][main] == pytest.approx(-133.325, abs=0.02)
    assert columns["absorption"][row] is None
    assert columns["natural_width_MHz"][row] == pytest.approx(6.066, abs=0.01)
    assert columns["doppler_width_MHz"][row] == pytest.approx(511.3, abs=0.5)
    assert {source["id"] for source in answer["sources"]} > {"wang2021"}


def test_field_splits_features(client: TestClient) -> None:
    """In a field the features are Zeeman components with their slopes, and power broadens them."""
    url = "/v1/elements/Rb/features?line=780&isotopes=87&field=5&crossovers=false&saturation=3"
    columns = client.get(url).json()["columns"]
    row = columns["feature"].index("2,2-3,3")
    assert columns["slope_MHz_per_G"][row] == pytest.approx(1.3996, abs=2e-4)
    assert columns["power_width_MHz"][row] == pytest.approx(2 * columns["natural_width_MHz"][row])
    assert set(columns["isotope"]) == {"87Rb"}


def test_isotopes_with_borrowed_frequencies_have_no_offset(client: TestClient) -> None:
    """An isotope without a published frequency of its own has null offsets and a warning, not a guess."""
    answer = client.get("/v1/elements/Ca/features?line=423").json()
    columns = answer["columns"]
    for isotope, offset in zip(columns["isotope"], columns["offset_MHz"], strict=True):
        if offset is None:
            assert any(isotope in text for text in answer["warnings"])


def test_profile_sums_up(client: TestClient) -> None:
    """The profile's area over a wide grid is one, its columns the same as CSV."""
    url = "/v1/elements/Rb/profile?line=780&start=-30000&stop=30000&points=6001&temperature=350K"
    columns = client.get(url).json()["columns"]
    assert sum(columns["absorption_per_GHz"]) * 0.01 == pytest.approx(1.0, abs=1e-3)
    text = client.get(f"{url}&format=csv").text.splitlines()
    assert text[0] == "offset_MHz,absorption_per_GHz"
    assert len(text) == 6002


@pytest.mark.parametrize(
    ("url", "status", "parameter"),
    [
        ("/v1/elements/Rx/features?line=780", 404, "atom"),
        ("/v1/elements/Fm/features?line=780", 404, "species"),
        ("/v1/elements/87Rb/features?line=780", 422, "element"),
        ("/v1/elements/Rb/features?line=999", 404, "line"),
        ("/v1/elements/Rb/features", 422, "line"),
        ("/v1/elements/Rb/features?line=778.1", 422, "line"),
        ("/v1/elements/Rb/features?line=780&isotopes=86", 404, "isotopes"),
        ("/v1/elements/Rb/features?line=780&isotopes=%C2%B2", 404, "isotopes"),
        ("/v1/elements/Rb/features?line=780&isotopes=99999999999999999999", 404, "isotopes"),
        ("/v1/elements/Rb/features?line=780&reference=1", 404, "reference"),
        ("/v1/elements/Rb/features?line=780&temperature=-3", 422, "temperature"),
        ("/v1/elements/Rb/features?line=780&temperature=nan", 422, "temperature"),
        ("/v1/elements/Rb/features?line=780&temperature=300MHz", 422, "temperature"),
        ("/v1/elements/Rb/features?line=780&saturation=-1", 422, "saturation"),
        ("/v1/elements/Rb/features?line=780&field=1e9", 422, "field"),
        ("/v1/elements/Rb/features?line=780&colour=red", 422, "colour"),
        ("/v1/elements/Sr/features?line=698&isotopes=88", 422, "strength of 88Sr 698"),
        ("/v1/elements/Rb/profile?line=780&start=5&stop=5", 422, "stop"),
        ("/v1/elements/Rb/profile?line=780&points=1", 422, "points"),
    ],
)
def test_what_cannot_be_is_a_problem(client: TestClient, url: str, status: int, parameter: str) -> None:
    """Bad input of every kind is a problem that names the parameter and what would do."""
    response = client.get(url)
    problem = response.json()
    assert (response.status_code, problem["parameter"]) == (status, parameter), response.text
    assert problem["allowed"] or problem["nearest"]
    assert "Traceback" not in response.text
