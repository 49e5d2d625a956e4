"""Squares of 6j symbols by Racah's sum in whole numbers: fast where a table needs hundreds for the first time.

{j1 j2 j3; j4 j5 j6}^2 = D(j1 j2 j3) D(j1 j5 j6) D(j4 j2 j6) D(j4 j5 j3) S^2 with the triangle factors
D(a b c) = (a+b-c)! (a-b+c)! (-a+b+c)! / (a+b+c+1)! and Racah's alternating sum S. Edmonds (1957), (6.3.7). `angular`
has the symbols themselves, with their signs and roots.
"""

from fractions import Fraction
from functools import lru_cache
from math import factorial, prod

from levels.angular import six_j_reason


def _triangle(a: int, b: int, c: int) -> Fraction:
    """Return D(a b c) of doubled arguments."""
    top = factorial((a + b - c) // 2) * factorial((a - b + c) // 2) * factorial((-a + b + c) // 2)
    return Fraction(top, factorial((a + b + c) // 2 + 1))


@lru_cache(maxsize=65536)
def six_j_square(a: int, b: int, c: int, d: int, e: int, f: int) -> Fraction:
    """Compute {a b c; d e f}^2 exactly (doubled arguments); zero where a triangle rule forbids it.

    >>> six_j_square(1, 3, 2, 6, 4, 3)
    Fraction(1, 20)
    """
    if six_j_reason(a, b, c, d, e, f):
        return Fraction(0)
    threes = [part // 2 for part in (a + b + c, a + e + f, d + b + f, d + e + c)]
    fours = [part // 2 for part in (a + b + d + e, a + c + d + f, b + c + e + f)]
    total = Fraction(0)
    for t in range(max(threes), min(fours) + 1):
        below = [factorial(t - low) for low in threes] + [factorial(high - t) for high in fours]
        total += Fraction((-1) ** t * factorial(t + 1), prod(below))
    triangles = _triangle(a, b, c) * _triangle(a, e, f) * _triangle(d, b, f) * _triangle(d, e, c)
    return total**2 * triangles
