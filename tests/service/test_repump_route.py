"""Leaks and repumpers over HTTP."""

import pytest
from starlette.testclient import TestClient


def test_calcium_ion(client: TestClient) -> None:
    """40Ca+ on 397 scatters 15.54(2) photons before D3/2; 866 closes the cycle and 854 empties what is not reached."""
    answer = client.get("/v1/atoms/40Ca+/repump?drive=397").json()
    assert answer["photons_before_loss"]["value"] == pytest.approx(1 / 0.06435)
    assert answer["photons_before_loss"]["uncertainty"] == pytest.approx(7e-5 / 0.06435**2, rel=1e-6)
    assert answer["closure"] == "data"
    assert [(leak["level"], leak["fate"]) for leak in answer["leaks"]] == [("3d_2D3/2", "lost")]
    first, second = answer["repumpers"]
    assert (first["line"], first["closes"], first["shares_upper_level"]) == ("866", True, True)
    assert first["photons_before_loss"]["value"] is None
    assert first["photons_before_loss"]["reason"] == "the cycle is closed"
    assert first["vacuum_wavelength"]["value"] == pytest.approx(866.4516, abs=1e-3)
    assert first["air_wavelength"]["value"] == pytest.approx(866.2137, abs=1e-3)
    assert (second["line"], second["opens"]) == ("850", ["3d_2D5/2"])
    assert answer["elsewhere"][0]["lines"] == ["854 to 4p_2P3/2"]


def test_several_drives(client: TestClient) -> None:
    """397 with 866 is closed: photons are null with the reason, and the loss per photon is zero."""
    answer = client.get("/v1/atoms/40Ca+/repump?drive=397,866&detuning=-10,5MHz&saturation=2,0.5").json()
    assert [drive["detuning_MHz"] for drive in answer["drives"]] == [-10.0, 5.0]
    assert [drive["saturation"] for drive in answer["drives"]] == [2.0, 0.5]
    assert answer["photons_before_loss"]["value"] is None
    assert answer["loss_per_photon"]["value"] == 0.0
    assert answer["time_before_loss"]["value"] is None
    assert answer["repumpers"] == []


def test_hyperfine_drive_of_rubidium(client: TestClient) -> None:
    """87Rb on 780:2-3: off-resonant leak into F=1, brought back 6.568 GHz up from the zero-detuning laser."""
    answer = client.get("/v1/atoms/87Rb/repump?drive=780:2-3&detuning=-12").json()
    (leak,) = answer["leaks"]
    assert (leak["level"], leak["F"], leak["cause"]) == ("5s_2S1/2", 1.0, "off-resonant excitation")
    best = answer["repumpers"][0]
    assert best["components"] == ["1-2"]
    assert best["offset"]["value"] == pytest.approx(6568.03 + 12, abs=0.05)
    assert best["offset"]["uncertainty"] == pytest.approx(0.008, abs=0.003)
    assert best["reach"] == "electro-optic"
    warmer = client.get("/v1/atoms/87Rb/repump?drive=780:2-3").json()
    assert warmer["photons_before_loss"]["value"] > answer["photons_before_loss"]["value"]


def test_intensity_sets_the_saturation(client: TestClient) -> None:
    """An intensity of 1.669 mW/cm2 is the saturation intensity of the 87Rb cycling transition (Steck's data)."""
    answer = client.get("/v1/atoms/87Rb/repump?drive=780:2-3&intensity=1.669").json()
    assert answer["drives"][0]["saturation"] == pytest.approx(1.0, abs=2e-3)


def test_unknown_branching_is_told(client: TestClient) -> None:
    """138Ba: the split of the leak is not published; bounds differ, three repumpers close whatever it is."""
    answer = client.get("/v1/atoms/138Ba/repump?drive=553").json()
    assert answer["closure"] == "unknown"
    assert answer["unpublished"]
    leak = answer["leaks"][0]
    assert leak["per_photon"]["value"] == 0.0
    assert leak["per_photon_at_most"]["value"] == pytest.approx(0.003, abs=1e-4)
    assert sorted(answer["schemes"][0]["lasers"]) == ["1108", "1130", "1500"]
    assert answer["schemes"][0]["closes"]
    assert any("levels of the book" in text for text in answer["warnings"])


def test_field_spreads_the_repumper(client: TestClient) -> None:
    """In a field every repumper says how far its Zeeman components spread."""
    answer = client.get("/v1/atoms/40Ca+/repump?drive=397&field=5").json()
    spread = answer["repumpers"][0]["field_spread"]["value"]
    assert 1.0 < spread < 20.0
    still = client.get("/v1/atoms/40Ca+/repump?drive=397").json()
    assert still["repumpers"][0]["field_spread"]["value"] is None


def test_csv_lists_the_repumpers(client: TestClient) -> None:
    """CSV has one row for each repumper, with units in the names of its columns."""
    text = client.get("/v1/atoms/40Ca+/repump?drive=397&format=csv").text.splitlines()
    assert len(text) == 3
    assert {"line", "frequency_THz", "offset_MHz", "closes"} <= set(text[0].split(","))


@pytest.mark.parametrize(
    ("query", "status", "parameter"),
    [
        ("", 422, "drive"),
        ("drive=", 422, "drive"),
        ("drive=,", 422, "drive"),
        ("drive=999", 404, "line"),
        ("drive=397:7-9", 404, "component"),
        ("drive=397:x", 422, "drive"),
        ("drive=397:1/2-(1/2,3/2)", 422, "drive"),
        ("drive=397,866,850,854,393,729,732", 422, "drive"),
        ("drive=397&detuning=1,2,3", 422, "detuning"),
        ("drive=397&detuning=nan", 422, "detuning"),
        ("drive=397&saturation=0", 422, "saturation"),
        ("drive=397&saturation=x", 422, "saturation"),
        ("drive=397&intensity=3kg", 422, "intensity"),
        ("drive=397&field=1e9", 422, "field"),
        ("drive=397&dark_after=0", 422, "dark_after"),
        ("drive=397&drive=866", 422, "drive"),
        ("drive=397&evidence=checked", 422, "evidence"),
        ("drive=397&power=3", 422, "power"),
    ],
)
def test_what_cannot_be_is_a_problem(client: TestClient, query: str, status: int, parameter: str) -> None:
    """Bad input of every kind is a problem that names the parameter and what would do."""
    response = client.get(f"/v1/atoms/40Ca+/repump?{query}")
    problem = response.json()
    assert (response.status_code, problem["parameter"]) == (status, parameter), response.text
    assert problem["allowed"] or problem["nearest"] or problem["errors"]
    assert "Traceback" not in response.text


def test_missing_constant_is_named(client: TestClient) -> None:
    """Hyperfine resolution needs the constants of the driven line: what is not published is named."""
    response = client.get("/v1/atoms/53Cr/repump?drive=425:9/2-11/2")
    problem = response.json()
    assert (response.status_code, problem["type"]) == (422, "/problems/not-published")
    assert problem["parameter"].startswith("A of 53Cr")


def test_every_atom_answers(client: TestClient) -> None:
    """Every line of every atom answers with a closed set of members or a problem, never a fault of the server."""
    for atom in [record["name"] for record in client.get("/v1/atoms").json()["atoms"]][::9]:
        for line in client.get(f"/v1/atoms/{atom}/lines").json()["lines"][:3]:
            response = client.get(f"/v1/atoms/{atom}/repump", params={"drive": line["name"]})
            assert response.status_code in (200, 422), response.text
