"""Nothing that a body can hold breaks the questions about schemes: they answer or refuse, with the member's name."""

import copy
from collections.abc import Iterator
from typing import Any

import pytest
from starlette.testclient import TestClient

from service.question import Question
from service.routes import QUESTIONS

ABOUT_SCHEMES = [one for one in QUESTIONS if one.tag == "scheme" and one.method == "POST"]
NASTY: tuple[Any, ...] = (
    None, True, 0, -1, 1e300, -1e300, 5e-324, 10**30, "", "nan", "1e999", "-0", "3 parsec", "\ud7ff\u0000", "a" * 5000,
    [], [[]], [0], [0, 0, 0], [1e308, 1e308, 1e308], [None] * 3, {}, {"x": 1}, [{}],
)  # fmt: skip
EACH = 6  # a member is given every sixth nasty value, the next one those after them


def places(value: Any, path: tuple[Any, ...] = ()) -> Iterator[tuple[Any, ...]]:
    """Every place in a body, inner and outer."""
    if path:
        yield path
    pairs = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    for key, part in pairs:
        yield from places(part, (*path, key))


def replaced(body: Any, path: tuple[Any, ...], value: Any) -> Any:
    changed = copy.deepcopy(body)
    part = changed
    for key in path[:-1]:
        part = part[key]
    part[path[-1]] = value
    return changed


def full(question: Question) -> dict[str, Any]:
    """The example with members that it leaves out, so that they are tried too."""
    body = copy.deepcopy(dict(question.body_example or {}))
    fields = question.asked.model_fields
    extra = {
        "initial": [{"level": "4s_2S1/2", "sublevel": "1/2,1/2", "share": 1}],
        "linewidths": 10,
        "coil_axis": [0, 0, 1],
        "magnitudes": [1],
        "angles": [30],
        "modulations": [1],
        "shifts": [1],
    }
    body |= {name: value for name, value in extra.items() if name in fields and body.get("atom", "40Ca+") == "40Ca+"}
    body["beams"] = body["beams"][:2]
    body["beams"][0]["around_field"] = 10
    body["beams"][0]["polarisation"] |= {"impurity": 0.01, "phase": 20, "reference": [0, 1, 0]}
    return body


@pytest.mark.parametrize("question", ABOUT_SCHEMES, ids=lambda one: one.name)
def test_nasty_bodies_are_answered_or_refused(client: TestClient, question: Question) -> None:
    """Every member of the body, replaced by nasty values in turn, gives 200 or a problem; never a failure."""
    body = full(question)
    assert client.post(question.path, json=body).status_code == 200
    for number, path in enumerate(places(body)):
        for value in NASTY[number % EACH :: EACH]:
            response = client.post(question.path, json=replaced(body, path, value))
            assert response.status_code < 500, (path, value, response.text[:300])
            if response.status_code != 200:
                assert response.headers["content-type"] == "application/problem+json"
                assert response.json()["detail"]
