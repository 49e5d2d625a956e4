"""`plan`: lock points and modulators to settings for each wanted laser frequency."""

from collections.abc import Mapping, Sequence
from typing import Any

from levels.features import has_own_centroid
from levels.moves import moves_of
from levels.plan import plan
from levels.records import Line
from service.answers import Answer
from service.context import Context
from service.inputs import line_inputs, line_warnings
from service.plan_reading import earlier_of, order_of
from service.plan_records import document_of, missed_record, move_record, route_record, table_of
from service.plan_shapes import PlanAnswered, PlanAsked
from service.question import Question


def answer_plan(context: Context, path: Mapping[str, str], asked: PlanAsked) -> Answer:
    """The settings that make every wanted laser frequency from the locks and modulators at hand, no modulator twice.

    Every chain of up to `max_chain` modulators is compared; `search` says where it was not. The answer's `plan` is a
    body to post again after data or hardware changed: settings keep their structure while it reaches and the answer
    says what moves.
    """
    order, lines = order_of(context, asked)
    found = plan(order)
    routes = [route_record(found, one, one.route, 0) for one in found.served]
    others = [
        route_record(found, one, other, rank) for one in found.served for rank, other in enumerate(one.others, start=1)
    ]
    content: dict[str, Any] = {
        "settings": routes,
        "alternatives": others,
        "missed": [missed_record(found, one) for one in found.served if not one.reachable],
        "moves": [] if asked.previous is None else [move_record(one) for one in moves_of(found, earlier_of(asked))],
        "search": {"options": found.tried, "exhaustive": found.is_exhaustive, "bounds": list(found.bounds)},
        "plan": document_of(asked, routes, context.release),
    }
    used = [(f"{line.atom}: {name}", quantity) for line in lines for name, quantity in line_inputs(line)]
    return Answer(content, table_of(routes), columnar=False, used=used, warnings=_warnings(lines, asked))


def _warnings(lines: Sequence[Line], asked: PlanAsked) -> list[str]:
    largest = max((abs(one.field) for one in asked.wanted), default=0.0)
    texts = [text for line in lines for text in line_warnings(line, largest)]
    for line in lines:
        if not has_own_centroid(line):
            texts.append(f"the frequency of {line.name} is not known for {line.atom} itself: settings may be far off")
    return list(dict.fromkeys(texts))


QUESTION = Question(
    name="plan",
    path="/v1/plan",
    asked=PlanAsked,
    answered=PlanAnswered,
    ask=answer_plan,
    summary="Locks and modulators to settings for each wanted laser frequency",
    example="/v1/plan",
    tag="plan",
    body_example={
        "wanted": [
            {"name": "cooling", "atom": "87Rb", "line": "780", "component": "2-3", "detuning": -12},
            {"name": "repump", "atom": "87Rb", "line": "780", "component": "1-2"},
            {"name": "imaging", "atom": "87Rb", "line": "780", "lower": "2,2", "upper": "3,3", "field": 3.2},
        ],
        "locks": [{"name": "cell", "kind": "feature", "atom": "87Rb", "line": "780", "feature": "2-(2,3)"}],
        "modulators": [
            {"name": "ao1", "kind": "acousto-optic", "centre": 60, "bandwidth": 30, "passes": 2, "step": 0.001},
            {"name": "ao2", "kind": "acousto-optic", "centre": 80, "bandwidth": 40, "passes": 2},
            {"name": "eo1", "kind": "electro-optic", "low": 6000, "high": 7000},
        ],
        "max_chain": 2,
    },
    heavy=True,
)
