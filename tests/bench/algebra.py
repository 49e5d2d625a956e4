"""(c) The exact strength table of the Cs D2 line against calling sympy naively."""

from fractions import Fraction

import sympy
from sympy.physics.wigner import wigner_6j

from levels.angular import line_strength
from tests.bench.measure import median_ratio, report

J, J_UP, I = 1, 3, 7
PAIRS = [(F, F_up) for F in (6, 8) for F_up in (4, 6, 8, 10)]
REPEATS = 200


def naive() -> list[Fraction]:
    """S(F,F') of every pair straight from sympy's 6j symbol."""
    table = []
    for F, F_up in PAIRS:
        if abs(F - F_up) > 2:
            table.append(Fraction(0))
            continue
        halves = [sympy.Rational(twice, 2) for twice in (J, J_UP, 2, F_up, F, I)]
        square = (F_up + 1) * (J + 1) * wigner_6j(*halves) ** 2
        table.append(Fraction(int(square.p), int(square.q)))
    return table


def ours() -> list[Fraction]:
    """The same from the library, whose answers are cached."""
    return [line_strength(J, J_UP, I, F, F_up) for F, F_up in PAIRS]


def run() -> None:
    naive(), ours()
    ratio = REPEATS * median_ratio(naive, lambda: [ours() for _ in range(REPEATS)], 15)
    report("(c) exact S(F,F') table of Cs D2, warm, against sympy", f"{ratio:.0f} x", "20 x")
