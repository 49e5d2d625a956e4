"""Relative hyperfine strengths S(F,F') as reference documents print them, as exact fractions.

Rb, Cs, Na: Steck, Alkali D Line Data, tables of relative hyperfine transition strength factors (values from memory).
Li, K, Yb+: the same factors, (2F'+1)(2J+1){J J' 1; F' F I}^2, as fractions worked out before this code was written.
"""

from fractions import Fraction

import pytest

from levels.angular import line_strength
from levels.catalogue import Catalogue

# atom, line: {2F: {2F': S}}
TABLES = {
    ("87Rb", "D2"): {2: {0: "1/6", 2: "5/12", 4: "5/12"}, 4: {2: "1/20", 4: "1/4", 6: "7/10"}},
    ("87Rb", "D1"): {2: {2: "1/6", 4: "5/6"}, 4: {2: "1/2", 4: "1/2"}},
    ("23Na", "D2"): {2: {0: "1/6", 2: "5/12", 4: "5/12"}, 4: {2: "1/20", 4: "1/4", 6: "7/10"}},
    ("23Na", "D1"): {2: {2: "1/6", 4: "5/6"}, 4: {2: "1/2", 4: "1/2"}},
    ("7Li", "D2"): {2: {0: "1/6", 2: "5/12", 4: "5/12"}, 4: {2: "1/20", 4: "1/4", 6: "7/10"}},
    ("39K", "D2"): {2: {0: "1/6", 2: "5/12", 4: "5/12"}, 4: {2: "1/20", 4: "1/4", 6: "7/10"}},
    ("85Rb", "D2"): {4: {2: "3/10", 4: "7/18", 6: "14/45"}, 6: {4: "5/63", 6: "5/18", 8: "9/14"}},
    ("85Rb", "D1"): {4: {4: "2/9", 6: "7/9"}, 6: {4: "5/9", 6: "4/9"}},
    ("133Cs", "D2"): {6: {4: "5/14", 6: "3/8", 8: "15/56"}, 8: {6: "7/72", 8: "7/24", 10: "11/18"}},
    ("133Cs", "D1"): {6: {6: "1/4", 8: "3/4"}, 8: {6: "7/12", 8: "5/12"}},
    ("6Li", "D2"): {1: {1: "4/9", 3: "5/9"}, 3: {1: "1/36", 3: "2/9", 5: "3/4"}},
    ("40K", "D2"): {7: {5: "3/8", 7: "10/27", 9: "55/216"}, 9: {7: "14/135", 9: "8/27", 11: "3/5"}},
    ("171Yb+", "329"): {0: {2: "1"}, 2: {2: "1/6", 4: "5/6"}},
}


@pytest.mark.parametrize("line", TABLES, ids=lambda line: " ".join(line))
def test_printed_strengths(line: tuple[str, str], book: Catalogue) -> None:
    """Every printed S(F,F') of the line is ours, exactly, and nothing is missing between them."""
    found = book.find_line(*line)
    J, J_up, I = found.lower.twice_J, found.upper.twice_J, found.lower.twice_I
    for F, row in TABLES[line].items():
        ours = {F_up: line_strength(J, J_up, I, F, F_up) for F_up in range(abs(J_up - I), J_up + I + 1, 2)}
        assert {F_up: strength for F_up, strength in ours.items() if strength} == {
            F_up: Fraction(text) for F_up, text in row.items()
        }
    assert sorted(TABLES[line]) == list(range(abs(J - I), J + I + 1, 2))


@pytest.mark.parametrize("line", TABLES, ids=lambda line: " ".join(line))
def test_printed_strengths_sum_to_one(line: tuple[str, str]) -> None:
    """The printed numbers themselves add up to 1 for each F, so that a slip of the pen here is seen."""
    assert {F: sum(map(Fraction, row.values())) for F, row in TABLES[line].items()} == dict.fromkeys(TABLES[line], 1)
