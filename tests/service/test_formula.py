"""Formulas and whole terms over HTTP: the code that is sent runs and agrees with the service's other answers."""

import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest
from starlette.testclient import TestClient

GROUND = "/v1/atoms/87Rb/formula?level=5s_2S1/2&sublevel=2,1"
LINE = "/v1/atoms/87Rb/formula?line=780&lower=2,1&upper=3,1&max_field=60"


def ask(client: TestClient, url: str) -> dict[str, Any]:
    response = client.get(url)
    assert response.status_code == 200, response.text
    answer: dict[str, Any] = response.json()
    return answer


def ran(answer: dict[str, Any], fields: list[float], folder: Path) -> list[float]:
    calls = f"\nfor b in {fields}:\n    print(repr({answer['name']}(b)))\n"
    (folder / "sent.py").write_text(answer["code"] + calls)
    done = subprocess.run(
        [sys.executable, "-W", "error", "sent.py"], cwd=folder, capture_output=True, text=True, timeout=60, check=True
    )
    return [float(line) for line in done.stdout.split()]


def test_closed_form_is_what_sublevels_answers(client: TestClient, tmp_path: Path) -> None:
    """The Breit-Rabi code of 87Rb |2,1> gives what `sublevels` answers at every field."""
    answer = ask(client, f"{GROUND}&max_field=1000")
    assert (answer["kind"], answer["of"], answer["name"]) == ("closed form", "energy", "energy_mhz")
    assert answer["largest_error_MHz"] < 1e-9
    fields = [0.0, 3.25, 1000.0]
    for field, value in zip(fields, ran(answer, fields, tmp_path), strict=True):
        columns = ask(client, f"/v1/atoms/87Rb/sublevels?level=5s_2S1/2&field={field}")["columns"]
        row = list(zip(columns["F"], columns["m"], strict=True)).index((2.0, 1.0))
        assert value == pytest.approx(columns["energy_MHz"][row], abs=1e-8)


@pytest.mark.parametrize("of", ["offset", "shift", "frequency"])
def test_fit_is_what_shift_answers(client: TestClient, tmp_path: Path, of: str) -> None:
    """The code of a D2 component gives what `shift` answers within the stated error, for each of its numbers."""
    answer = ask(client, f"{LINE}&of={of}&tolerance=2kHz")
    assert answer["largest_error_MHz"] <= 2e-3
    fields = [0.0, 7.0, 33.3, 60.0]
    scale = 1e6 if of == "frequency" else 1.0
    for field, value in zip(fields, ran(answer, fields, tmp_path), strict=True):
        expected = ask(client, f"/v1/atoms/87Rb/shift?line=780&lower=2,1&upper=3,1&field={field}")[of]["value"]
        assert value == pytest.approx(expected * scale, abs=answer["largest_error_MHz"] + 1e-6)


def test_strong_field_formula_is_that_of_the_term(client: TestClient, tmp_path: Path) -> None:
    """7Li 2p over 3000 G is answered by the whole term, and its code agrees with `sublevels` there."""
    answer = ask(client, "/v1/atoms/7Li/formula?level=2p_2P3/2&sublevel=3,2&min_field=500&max_field=3000&tolerance=0.1")
    assert answer["model"] == "multiplet"
    (value,) = ran(answer, [2222.0], tmp_path)
    columns = ask(client, "/v1/atoms/7Li/sublevels?level=2p_2P3/2&field=2222")["columns"]
    row = list(zip(columns["F"], columns["m"], strict=True)).index((3.0, 2.0))
    assert value == pytest.approx(columns["energy_MHz"][row], abs=answer["largest_error_MHz"] + 1e-6)


@pytest.mark.parametrize("language", ["python", "c", "javascript", "octave", "latex"])
def test_every_language_is_sent(client: TestClient, language: str) -> None:
    """Each language's code names the function, the atom, the range and the error in its comment."""
    answer = ask(client, f"{LINE}&as={language}")
    assert answer["query"]["as"] == language
    assert "87Rb 780 2,1 - 3,1" in answer["code"]
    assert "from 0 to 60 G" in answer["code"]
    assert "largest error found" in answer["code"]
    assert answer["columns"]["coefficient"]


def test_a_tolerance_out_of_reach_warns(client: TestClient) -> None:
    """A range that no short fit covers is answered with its error and a warning."""
    answer = ask(client, "/v1/atoms/87Rb/formula?level=5p_2P3/2&sublevel=3,0&max_field=3000&tolerance=1Hz")
    assert answer["largest_error_MHz"] > 1e-6
    assert "ask for a shorter range" in answer["warnings"][-1]


BAD = (
    ("/v1/atoms/87Rb/formula", "level", "either level"),
    (f"{GROUND}&line=780", "level", "either level"),
    (f"{GROUND}&upper=3,3", "upper", "leave it out"),
    ("/v1/atoms/87Rb/formula?level=5s_2S1/2", "sublevel", "needed"),
    ("/v1/atoms/87Rb/formula?line=780&lower=2,1", "upper", "needed"),
    ("/v1/atoms/87Rb/formula?line=780&lower=2,1&upper=3,3", "upper", "from m = 1"),
    (f"{GROUND}&of=offset", "of", "energy, shift"),
    (f"{GROUND}&as=cobol", "as", "python"),
    (f"{GROUND}&as=__import__('os').system('true')", "as", "python"),
    (f"{GROUND}&min_field=100", "max_field", "min_field below max_field"),
    (f"{GROUND}&tolerance=0", "tolerance", "MHz"),
    ("/v1/atoms/7Li/crossings?level=2p_2P1/2&max_dm=0", "max_dm", ""),
    ("/v1/atoms/7Li/crossings?level=2p_2P1/2&max_field=-5", "max_field", "G"),
    ("/v1/atoms/87Rb/multiplet?level=5s_2S1/2", "model", "no other level of its term"),
)


@pytest.mark.parametrize(("url", "parameter", "allowed"), BAD, ids=[case[0] for case in BAD])
def test_bad_questions_say_what_would_do(client: TestClient, url: str, parameter: str, allowed: str) -> None:
    """Each is refused as an invalid parameter with what would do."""
    response = client.get(url)
    body = response.json()
    assert (response.status_code, body["type"]) == (422, "/problems/invalid-parameter"), body
    assert body["parameter"] == parameter
    assert allowed in body["allowed"]


def test_unknown_sublevel_is_named(client: TestClient) -> None:
    """A sublevel that the level does not have is an unknown name with those it has."""
    body = client.get("/v1/atoms/87Rb/formula?level=5s_2S1/2&sublevel=3,1").json()
    assert (body["status"], body["type"]) == (404, "/problems/unknown-name")


# Whole terms


def test_term_has_every_sublevel_of_every_level(client: TestClient) -> None:
    """The term of 7Li 2p has 24 sublevels; the rows of 2P3/2 are those that `sublevels` answers."""
    answer = ask(client, "/v1/atoms/7Li/multiplet?level=2p_2P3/2&field=2000")
    columns = answer["columns"]
    assert (answer["term"], len(columns["F"])) == ("2P", 24)
    rows = [k for k, name in enumerate(columns["level"]) if name == "2p_2P3/2"]
    single = ask(client, "/v1/atoms/7Li/sublevels?level=2p_2P3/2&field=2000")["columns"]
    for name in ("energy_MHz", "shift_MHz", "slope_MHz_per_G", "quadratic_Hz_per_G2"):
        assert [columns[name][k] for k in rows] == pytest.approx(single[name], rel=1e-9, abs=1e-6)
    total = sum(columns["mean_L_z"]) + sum(columns["mean_S_z"])
    assert total == pytest.approx(0.0, abs=1e-9)


def test_paschen_back_shows_in_the_means(client: TestClient) -> None:
    """At 10 T the mean projections of 4He 2 3P are whole numbers of the Paschen-Back regime to a percent."""
    columns = ask(client, "/v1/atoms/4He/multiplet?level=2p_3P1&field=10T")["columns"]
    pairs = sorted((round(L), round(S)) for L, S in zip(columns["mean_L_z"], columns["mean_S_z"], strict=True))
    assert pairs == [(L, S) for L in (-1, 0, 1) for S in (-1, 0, 1)]
    for name in ("mean_L_z", "mean_S_z"):
        assert all(abs(value - round(value)) < 0.02 for value in columns[name])


def test_crossings_are_found_where_energies_agree(client: TestClient) -> None:
    """At a crossing that is answered, `multiplet` gives both sublevels one energy."""
    found = ask(client, "/v1/atoms/4He/crossings?level=2p_3P1&max_field=5000")["columns"]
    assert found["field_G"] == sorted(found["field_G"])
    assert found["field_G"]
    field = found["field_G"][0]
    table = ask(client, f"/v1/atoms/4He/multiplet?level=2p_3P1&field={field!r}")["columns"]
    labels = list(zip(table["level"], table["F"], table["m"], strict=True))
    energies = [
        table["energy_MHz"][labels.index(tuple(found[f"{end}_{part}"][0] for part in ("level", "F", "m")))]
        for end in ("first", "second")
    ]
    assert energies[0] == pytest.approx(energies[1], abs=1e-6)
    alone = ask(client, "/v1/atoms/87Rb/crossings?level=5s_2S1/2&max_field=100")
    assert alone["columns"]["field_G"] == []
