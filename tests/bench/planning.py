"""(p) Repumpers of the largest species and a large frequency plan, as the service answers them."""

import statistics

from service.asking import validated
from service.context import Context, build_context
from service.question import Question
from service.routes.plan import QUESTION as PLAN
from service.routes.repump import QUESTION as REPUMP
from service.settings import Settings
from tests.bench.measure import report, seconds

LARGEST = (
    ("87Sr", "461:9/2-11/2"),  # the most states to walk: 59, with 21 repumpers of up to five components and 66 pairs
    ("163Dy", "421:21/2-23/2"),  # the most hyperfine levels in the book
    ("133Cs", "852:4-5"),
    ("87Sr", "461"),
)
PLAN_BODY = {
    "wanted": [
        {"name": f"w{k}", "atom": "87Rb", "line": "780", "component": part, "detuning": detuning}
        for k, (part, detuning) in enumerate(
            [
                ("2-3", -12),
                ("1-2", 0),
                ("2-2", 5),
                ("1-1", -40),
                ("2-3", 230),
                ("1-0", 17),
                ("2-1", -150),
                ("2-3", -1500),
            ]
        )
    ],
    "locks": [
        {"name": "cell", "kind": "feature", "atom": "87Rb", "line": "780", "feature": "2-(2,3)"},
        {"name": "other", "kind": "feature", "atom": "85Rb", "line": "780", "feature": "3-(3,4)"},
        {"name": "comb", "kind": "comb", "frequency": "384.23 THz", "spacing": 250, "beat_low": 15, "beat_high": 60},
        {"name": "beat", "kind": "beat", "beat_with": "w0", "beat_low": 100, "beat_high": 4000},
    ],
    "modulators": [
        *(
            {"name": f"ao{k}", "kind": "acousto-optic", "centre": centre, "bandwidth": width, "passes": passes}
            for k, (centre, width, passes) in enumerate(
                [
                    (80, 30, 1),
                    (80, 30, 2),
                    (110, 40, 1),
                    (110, 40, 2),
                    (200, 60, 2),
                    (200, 60, 1),
                    (350, 80, 2),
                    (60, 20, 1),
                ]
            )
        ),
        {"name": "eo1", "kind": "electro-optic", "low": 100, "high": 7500},
        {"name": "eo2", "kind": "electro-optic", "low": 3000, "high": 9500, "orders": [1, -1, 2, -2]},
        {"name": "eo3", "kind": "electro-optic", "low": 10, "high": 1000},
        {"name": "shg", "kind": "harmonic"},
    ],
    "max_chain": 3,
}


def answered(context: Context, question: Question, path: dict[str, str], given: dict[str, object]) -> None:
    """Answer one question, without HTTP."""
    question.ask(context, path, validated(question, given))


def median_ms(context: Context, question: Question, path: dict[str, str], given: dict[str, object]) -> float:
    """The median time of nine answers after a first one."""
    answered(context, question, path, given)
    return 1e3 * statistics.median(seconds(lambda: answered(context, question, path, given)) for _ in range(9))


def run() -> None:
    """Measure both bars."""
    context = build_context(Settings())
    for atom, drive in LARGEST:
        taken = median_ms(context, REPUMP, {"atom": atom}, {"drive": drive})
        report(f"(p) repump answer, {atom} at {drive}", f"{taken:.1f} ms", "50 ms")
    taken = median_ms(context, PLAN, {}, PLAN_BODY)
    report("(p) plan: 8 wanted, 4 locks, 12 modulators, chains of 3", f"{taken:.0f} ms", "1000 ms")
