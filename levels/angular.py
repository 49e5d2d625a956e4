"""Exact angular-momentum algebra: 3j, 6j, Clebsch-Gordan, Lande factors and line strengths.

Every angular momentum and projection comes in doubled (`3` is 3/2), so half-integers are integers at the door; inside
everything is exact (sympy), and results are cached because they never change. Selection rules are tested first, each
with the sentence that says which one makes a coefficient zero.

Formulas: Edmonds, Angular Momentum in Quantum Mechanics (1957), chapters 3, 6 and 7.
"""

from fractions import Fraction
from functools import lru_cache
from typing import Any

import sympy
from sympy.physics.wigner import wigner_3j, wigner_6j

from levels.errors import OutsideValidity
from levels.notation import format_half

LARGEST_TWICE_J = 200


def half(twice: int) -> Any:
    """Return the exact half of a doubled number, as sympy sees it."""
    return sympy.Rational(twice, 2)


def check_momentum(name: str, twice_j: int) -> None:
    """Refuse a negative or very large angular momentum."""
    if not 0 <= twice_j <= LARGEST_TWICE_J:
        raise OutsideValidity(name, format_half(twice_j), f"an angular momentum from 0 to {LARGEST_TWICE_J // 2}")


def check_projection(name: str, twice_j: int, twice_m: int) -> None:
    """Refuse a projection that its angular momentum does not have."""
    if (twice_j - twice_m) % 2:
        raise OutsideValidity(name, format_half(twice_m), f"differs from j = {format_half(twice_j)} by an integer")


def triangle_reason(twice_a: int, twice_b: int, twice_c: int) -> str:
    """Say why three angular momenta do not couple, or return an empty string when they do."""
    if (twice_a + twice_b + twice_c) % 2:
        return f"{format_half(twice_a)}, {format_half(twice_b)} and {format_half(twice_c)} do not add up to an integer"
    if not abs(twice_a - twice_b) <= twice_c <= twice_a + twice_b:
        return (
            f"triangle rule: {format_half(twice_c)} is not between |{format_half(twice_a)} - {format_half(twice_b)}| "
            f"and {format_half(twice_a)} + {format_half(twice_b)}"
        )
    return ""


def three_j_reason(j1: int, j2: int, j3: int, m1: int, m2: int, m3: int) -> str:
    """Say which selection rule makes a 3j symbol zero, or return an empty string (all arguments doubled)."""
    if m1 + m2 + m3:
        return f"projections {format_half(m1)}, {format_half(m2)} and {format_half(m3)} do not sum to zero"
    for j, m in ((j1, m1), (j2, m2), (j3, m3)):
        if abs(m) > j:
            return f"projection {format_half(m)} is larger than {format_half(j)}"
    reason = triangle_reason(j1, j2, j3)
    if not reason and m1 == m2 == m3 == 0 and (j1 + j2 + j3) // 2 % 2:
        reason = "all projections are zero and the angular momenta sum to an odd number"
    return reason


def _check_pairs(*pairs: tuple[int, int]) -> None:
    for index, (j, m) in enumerate(pairs, start=1):
        check_momentum(f"j{index}", j)
        check_projection(f"m{index}", j, m)


@lru_cache(maxsize=65536)
def three_j(j1: int, j2: int, j3: int, m1: int, m2: int, m3: int) -> Any:
    """Compute the exact Wigner 3j symbol of doubled arguments, as a sympy number.

    >>> three_j(2, 2, 0, 2, -2, 0)
    sqrt(3)/3
    """
    _check_pairs((j1, m1), (j2, m2), (j3, m3))
    if three_j_reason(j1, j2, j3, m1, m2, m3):
        return sympy.Integer(0)
    return wigner_3j(half(j1), half(j2), half(j3), half(m1), half(m2), half(m3))


def six_j_reason(a: int, b: int, c: int, d: int, e: int, f: int) -> str:
    """Say which triangle of the 6j symbol {a b c; d e f} is broken, or return an empty string."""
    for triad in ((a, b, c), (a, e, f), (d, b, f), (d, e, c)):
        if reason := triangle_reason(*triad):
            return reason
    return ""


@lru_cache(maxsize=65536)
def six_j(a: int, b: int, c: int, d: int, e: int, f: int) -> Any:
    """Compute the exact Wigner 6j symbol {a b c; d e f} of doubled arguments, as a sympy number.

    >>> six_j(1, 3, 2, 6, 4, 3)
    sqrt(5)/10
    """
    for name, j in zip("abcdef", (a, b, c, d, e, f), strict=True):
        check_momentum(name, j)
    if six_j_reason(a, b, c, d, e, f):
        return sympy.Integer(0)
    return wigner_6j(half(a), half(b), half(c), half(d), half(e), half(f))


def clebsch_gordan_reason(j1: int, m1: int, j2: int, m2: int, j: int, m: int) -> str:
    """Say which selection rule makes <j1 m1 j2 m2 | j m> zero, or return an empty string."""
    if m1 + m2 != m:
        return f"m = {format_half(m)} is not m1 + m2 = {format_half(m1 + m2)}"
    return three_j_reason(j1, j2, j, m1, m2, -m)


@lru_cache(maxsize=65536)
def clebsch_gordan(j1: int, m1: int, j2: int, m2: int, j: int, m: int) -> Any:
    """Compute the exact Clebsch-Gordan coefficient <j1 m1 j2 m2 | j m> (doubled arguments, Condon-Shortley phases).

    >>> clebsch_gordan(1, 1, 2, 0, 3, 1)
    sqrt(6)/3
    """
    _check_pairs((j1, m1), (j2, m2), (j, m))
    if clebsch_gordan_reason(j1, m1, j2, m2, j, m):
        return sympy.Integer(0)
    sign = -1 if (j1 - j2 + m) // 2 % 2 else 1
    return sign * sympy.sqrt(j + 1) * three_j(j1, j2, j, m1, m2, -m)


def _projection_factor(twice_of: int, twice_other: int, twice_total: int) -> Fraction:
    """Return [T(T+1) + a(a+1) - b(b+1)] / 2T(T+1): the share of a along T = a + b (zero for T = 0)."""
    if twice_total == 0:
        return Fraction(0)
    a, b, t = (Fraction(x * (x + 2), 4) for x in (twice_of, twice_other, twice_total))
    return (t + a - b) / (2 * t)


def lande_shares(twice_J: int, twice_L: int, twice_S: int) -> tuple[Fraction, Fraction]:
    """Return the exact weights (of g_L, of g_S) in the Lande factor of an LS-coupled level.

    g_J = g_L [J(J+1) + L(L+1) - S(S+1)]/2J(J+1) + g_S [J(J+1) + S(S+1) - L(L+1)]/2J(J+1); both are zero for J = 0.
    """
    for name, j in (("J", twice_J), ("L", twice_L), ("S", twice_S)):
        check_momentum(name, j)
    if twice_L % 2:
        raise OutsideValidity("L", format_half(twice_L), "an integer")
    if reason := triangle_reason(twice_L, twice_S, twice_J):
        raise OutsideValidity("J", format_half(twice_J), f"couples from L and S ({reason})")
    return _projection_factor(twice_L, twice_S, twice_J), _projection_factor(twice_S, twice_L, twice_J)


def hyperfine_shares(twice_F: int, twice_J: int, twice_I: int) -> tuple[Fraction, Fraction]:
    """Return the exact weights (of g_J, of g_I) in g_F, the weak-field factor of a hyperfine level.

    E/h = g_F (muB/h) m B with g_F = g_J w_J + g_I w_I and g_I in Bohr magnetons; both are zero for F = 0.
    """
    if reason := triangle_reason(twice_J, twice_I, twice_F):
        raise OutsideValidity("F", format_half(twice_F), f"couples from J and I ({reason})")
    return _projection_factor(twice_J, twice_I, twice_F), _projection_factor(twice_I, twice_J, twice_F)


def _exact_square(symbol: Any) -> Fraction:
    square = sympy.Rational(symbol**2)
    return Fraction(int(square.p), int(square.q))


@lru_cache(maxsize=16384)
def line_strength(
    twice_J: int, twice_J_up: int, twice_I: int, twice_F: int, twice_F_up: int, rank: int = 1
) -> Fraction:
    """Compute S(F,F'), the exact relative strength of one hyperfine component of a line.

    S = (2F'+1)(2J+1){J J' k; F' F I}^2 with k the multipole rank: the share of F' in all the absorption from F, so
    that the sum over F' is 1 for each F. Edmonds (7.1.7).

    >>> line_strength(1, 3, 3, 4, 6)
    Fraction(7, 10)
    """
    symbol = six_j(twice_J, twice_J_up, 2 * rank, twice_F_up, twice_F, twice_I)
    return (twice_F_up + 1) * (twice_J + 1) * _exact_square(symbol)


@lru_cache(maxsize=65536)
def component_strength(
    twice_J: int,
    twice_J_up: int,
    twice_I: int,
    lower: tuple[int, int],
    upper: tuple[int, int],
    rank: int = 1,
) -> Fraction:
    """Compute the exact zero-field strength of the component (F, m) - (F', m'), all doubled.

    (2J'+1)(2F+1)(2F'+1){J J' k; F' F I}^2 (F' k F; -m' q m)^2: the share of this component in the decays of the upper
    sublevel to the lower level, so that all of them sum to 1.

    >>> component_strength(1, 3, 3, (4, 4), (6, 6))
    Fraction(1, 1)
    """
    (twice_F, twice_m), (twice_F_up, twice_m_up) = lower, upper
    three = three_j(twice_F_up, 2 * rank, twice_F, -twice_m_up, twice_m_up - twice_m, twice_m)
    six = six_j(twice_J, twice_J_up, 2 * rank, twice_F_up, twice_F, twice_I)
    return (twice_J_up + 1) * (twice_F + 1) * (twice_F_up + 1) * _exact_square(six) * _exact_square(three)


@lru_cache(maxsize=4096)
def multipole_elements(twice_J: int, twice_J_up: int, rank: int) -> dict[tuple[int, int], float]:
    """Compute sqrt(2J'+1) <J' m'|T^k_q|J m> / <J'||T^k||J> for every pair (2m, 2m') of a line.

    The sign is that of (-1)^(J'-m') (J' k J; -m' q m), Edmonds (5.4.1); q = m' - m. The squares that leave one upper
    sublevel sum to 1, which is the normalisation of all strengths.
    """
    elements = {}
    for m in range(-twice_J, twice_J + 1, 2):
        for m_up in range(-twice_J_up, twice_J_up + 1, 2):
            if abs(m_up - m) <= 2 * rank:
                symbol = three_j(twice_J_up, 2 * rank, twice_J, -m_up, m_up - m, m)
                sign = -1 if (twice_J_up - m_up) // 2 % 2 else 1
                elements[m, m_up] = sign * float(sympy.sqrt(twice_J_up + 1) * symbol)
    return elements
