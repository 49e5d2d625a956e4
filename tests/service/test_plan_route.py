"""Frequency plans over HTTP."""

import copy
import json
from typing import Any

import pytest
from starlette.testclient import TestClient

from service.routes.plan import QUESTION

BODY: dict[str, Any] = dict(QUESTION.body_example or {})


def post(client: TestClient, body: dict[str, Any]) -> Any:
    response = client.post("/v1/plan", json=body)
    assert response.status_code == 200, response.text
    return response.json()


def changed(**members: Any) -> dict[str, Any]:
    return {**copy.deepcopy(BODY), **members}


def light(record: dict[str, Any]) -> float:
    """The light at the atoms, recomputed from the lock by what the answer says of each element."""
    frequency: float = record["lock_light_MHz"]
    for part in record["elements"]:
        sign = -1 if part["place"] == "lock" else 1
        if part["kind"] == "harmonic":
            frequency *= part["factor"] ** sign
        else:
            frequency += sign * part["order"] * part["passes"] * part["frequency_MHz"]
    return frequency


def test_settings_make_the_wanted_frequencies(client: TestClient) -> None:
    """What the answer says, recomputed, is the wanted frequency to 1 Hz beside the residual of a stated step."""
    answer = post(client, BODY)
    assert [record["wanted"] for record in answer["settings"]] == ["cooling", "repump", "imaging"]
    for record in answer["settings"]:
        assert record["reached"]
        wanted = record["frequency"]["value"] * 1e6
        assert light(record) == pytest.approx(wanted + 1e-3 * record["residual_kHz"], abs=1e-6)
        assert abs(record["residual_kHz"]) <= 1.0
    assert answer["search"]["exhaustive"]
    cooling, repump, imaging = answer["settings"]
    assert cooling["gap"]["value"] == pytest.approx(133.325 - 12, abs=0.02)
    assert cooling["gap"]["uncertainty"] < 0.01 < cooling["frequency"]["uncertainty"] * 1e9
    assert repump["gap"]["value"] == pytest.approx(6568.03 + 133.325, abs=0.05)
    assert imaging["slope"]["value"] == pytest.approx(1.3996, abs=1e-4)
    assert cooling["slope"]["value"] is None


def test_plan_posted_again_moves_nothing(client: TestClient) -> None:
    """The document of an answer is a body; posted again it keeps every setting and says that nothing moved."""
    answer = post(client, BODY)
    again = post(client, json.loads(json.dumps(answer["plan"])))
    assert [move["status"] for move in again["moves"]] == ["kept"] * 3
    for move in again["moves"]:
        assert move["frequency_moved_kHz"] == pytest.approx(0.0, abs=1e-3)
        assert move["moved_kHz"] == pytest.approx([0.0] * len(move["moved_kHz"]), abs=1e-3)
    assert again["settings"] == answer["settings"]


def test_changed_detuning_says_what_moves(client: TestClient) -> None:
    """4 MHz more detuning moves the double-pass setting by 2000 kHz and nothing else."""
    document = post(client, BODY)["plan"]
    document["wanted"][0]["detuning"] = -16
    moves = post(client, document)["moves"]
    assert moves[0]["frequency_moved_kHz"] == pytest.approx(-4000, abs=1)
    assert moves[0]["moved_kHz"] == pytest.approx([-2000], abs=1)
    assert moves[1]["moved_kHz"] == pytest.approx([0.0], abs=1e-3)


def test_out_of_reach_says_the_nearest_miss(client: TestClient) -> None:
    """Without the electro-optic modulator the repump light is out of reach, and the answer says what would do."""
    answer = post(client, changed(modulators=BODY["modulators"][:2]))
    (missed,) = answer["missed"]
    assert missed["wanted"] == "repump"
    assert missed["miss"]["value"] > 6000
    assert "electro-optic sideband" in missed["would_do"][0]
    record = answer["settings"][1]
    assert not record["reached"]
    assert record["reason"]
    assert record["light_MHz"] is None


def test_taken_modulator_is_told(client: TestClient) -> None:
    """A frequency whose only modulator serves another says so and is not among the missed."""
    wanted = [{"name": name, "atom": "87Rb", "line": "780", "component": "2-3"} for name in ("a", "b")]
    answer = post(client, changed(wanted=wanted, modulators=BODY["modulators"][:1], max_chain=1))
    without = next(record for record in answer["settings"] if not record["reached"])
    assert "the rest of the plan" in without["reason"]
    assert answer["missed"] == []


def test_doubled_light_and_a_comb(client: TestClient) -> None:
    """171Yb+ cooling light at 369.5 nm from a laser at 739 nm on a comb, doubled: the multiplier is 2."""
    body = {
        "wanted": [{"name": "cooling", "atom": "171Yb+", "line": "369", "component": "1-0", "detuning": "-10 MHz"}],
        "locks": [
            {
                "name": "comb",
                "kind": "comb",
                "frequency": "405.6 THz",
                "spacing": "250 MHz",
                "uncertainty": "10 kHz",
                "beat_low": "20 MHz",
                "beat_high": "110 MHz",
            }
        ],
        "modulators": [{"name": "doubler", "kind": "harmonic", "factor": 2}],
        "max_chain": 1,
    }
    (record,) = post(client, body)["settings"]
    assert record["reached"]
    assert record["multiplier"] == 2.0
    assert light(record) == pytest.approx(record["frequency"]["value"] * 1e6, abs=1e-6)
    teeth = (record["lock_light_MHz"] - record["beat_MHz"] - 405.6e6) / 250
    assert teeth == pytest.approx(record["tooth"], abs=1e-6)


def test_shared_laser(client: TestClient) -> None:
    """Cooling and imaging that share a laser and its first modulator run it at one setting."""
    modulators = [*BODY["modulators"], {"name": "ao3", "kind": "acousto-optic", "centre": 20, "bandwidth": 30}]
    share = [{"wanted": ["cooling", "imaging"], "modulator": "ao2"}]
    answer = post(client, changed(modulators=modulators, share=share))
    first = {record["wanted"]: record["elements"][0] for record in answer["settings"] if record["reached"]}
    assert first["cooling"]["modulator"] == first["imaging"]["modulator"] == "ao2"
    assert first["cooling"]["frequency_MHz"] == first["imaging"]["frequency_MHz"]
    for record in answer["settings"]:
        assert light(record) == pytest.approx(record["light_MHz"], abs=1e-6)


def test_csv_has_a_row_for_each_element(client: TestClient) -> None:
    """CSV lists every element to set."""
    text = client.post("/v1/plan?", json={**BODY, "format": "csv"}).text.splitlines()
    assert text[0].startswith("wanted,reached,frequency_THz,lock")
    assert len(text) == 4


BAD: list[tuple[dict[str, Any], int, str]] = [
    ({"wanted": []}, 422, "wanted"),
    ({"locks": []}, 422, "locks"),
    ({"max_chain": 9}, 422, "max_chain"),
    ({"colour": "red"}, 422, "colour"),
    ({"wanted": [{"name": "a"}]}, 422, "wanted a atom"),
    ({"wanted": [{"name": "a", "atom": "87Rc", "line": "780"}]}, 404, "atom"),
    ({"wanted": [{"name": "a", "atom": "87Rb", "line": "999"}]}, 404, "line"),
    ({"wanted": [{"name": "a", "atom": "87Rb", "line": "780", "component": "2-9"}]}, 404, "hyperfine level"),
    ({"wanted": [{"name": "a", "atom": "87Rb", "line": "780", "component": "2-(2,3)"}]}, 422, "wanted a component"),
    ({"wanted": [{"name": "a", "atom": "87Rb", "line": "780", "field": 3}]}, 422, "wanted a field"),
    ({"wanted": [{"name": "a", "atom": "87Rb", "line": "780", "lower": "2,2"}]}, 422, "wanted a"),
    ({"wanted": [{"name": "a", "atom": "87Rb", "line": "778.1"}]}, 422, "wanted a line"),
    ({"wanted": [{"name": "a", "frequency": "384 THz", "atom": "87Rb"}]}, 422, "wanted a frequency"),
    ({"wanted": [{"name": "a", "frequency": "3 MHz"}]}, 422, "wanted.0.frequency"),
    ({"wanted": [{"name": "a", "frequency": "384 THz", "locks": ["roof"]}]}, 404, "lock"),
    ({"wanted": [{"name": "a", "frequency": "384 THz"}, {"name": "a", "frequency": "384 THz"}]}, 422, "wanted"),
    ({"locks": [{"name": "l", "kind": "magic"}]}, 422, "locks.0.kind"),
    ({"locks": [{"name": "l", "kind": "feature"}]}, 422, "lock l atom"),
    ({"locks": [{"name": "l", "kind": "comb", "frequency": "384 THz"}]}, 422, "lock l spacing"),
    ({"locks": [{"name": "l", "kind": "frequency"}]}, 422, "lock l frequency"),
    ({"locks": [{"name": "l", "kind": "beat"}]}, 422, "lock l"),
    ({"locks": [{"name": "l", "kind": "beat", "beat_with": "x", "beat_low": 1, "beat_high": 2}]}, 404, "with"),
    (
        {"locks": [{"name": "l", "kind": "beat", "beat_with": "x", "beat_low": 3, "beat_high": 2}]},
        422,
        "lock l beat_low",
    ),
    ({"modulators": [{"name": "m", "kind": "acousto-optic"}]}, 422, "modulator m range"),
    ({"modulators": [{"name": "m", "kind": "acousto-optic", "centre": 10, "bandwidth": 40}]}, 422, "modulator m range"),
    ({"modulators": [{"name": "m", "kind": "acousto-optic", "low": 60, "high": "x"}]}, 422, "modulators.0.high"),
    (
        {"modulators": [{"name": "m", "kind": "acousto-optic", "low": 60, "high": 90, "orders": [0]}]},
        422,
        "modulator m orders",
    ),
    (
        {"modulators": [{"name": "m", "kind": "electro-optic", "low": 60, "high": 90, "passes": 2}]},
        422,
        "modulator m passes",
    ),
    ({"share": [{"wanted": ["cooling", "nobody"]}]}, 404, "wanted"),
    ({"share": [{"wanted": ["cooling", "repump"], "modulator": "x"}]}, 404, "modulator"),
    ({"previous": {"settings": [{"wanted": "a"}]}}, 422, "previous.settings.0.frequency_MHz"),
    ({"tolerance": "1 kg"}, 422, "tolerance"),
    ({"evidence": "checked"}, 422, "evidence"),
]


@pytest.mark.parametrize(("members", "status", "parameter"), BAD, ids=[str(number) for number in range(len(BAD))])
def test_what_cannot_be_is_a_problem(client: TestClient, members: dict[str, Any], status: int, parameter: str) -> None:
    """Bad bodies of every kind are problems that name the member and what would do."""
    response = client.post("/v1/plan", json=changed(**members))
    problem = response.json()
    assert (response.status_code, problem["parameter"]) == (status, parameter), response.text
    assert problem["detail"]
    assert "Traceback" not in response.text


def test_numbers_that_are_none(client: TestClient) -> None:
    """NaN and giant numbers in a plan are problems."""
    for text in ("NaN", "1e999", '"nan"'):
        body = json.dumps(changed(max_chain=1)).replace('"detuning": -12', f'"detuning": {text}')
        response = client.post("/v1/plan", content=body, headers={"content-type": "application/json"})
        assert response.status_code in (400, 422), response.text
