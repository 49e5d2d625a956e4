"""Records written by hand, so that the physics is tested without the catalogue.

The alkali constants are those of the literature in round form; INVENTED says which are nobody's.
"""

from typing import Any

from hypothesis import strategies as st

from levels.quantity import Quantity
from levels.records import Level, Line

SOURCE = "tests"


def quantity(value: float, uncertainty: float | None = None, unit: str = "1") -> Quantity:
    """A value as the catalogue would hand it over."""
    return Quantity(value, uncertainty, unit, repr(value), SOURCE, "recalled")


def level(
    twice_J: int,
    twice_I: int,
    A: float | None = None,
    B: float | None = None,
    C: float | None = None,
    g_J: float | None = None,
    g_I: float | None = None,
    *,
    atom: str = "Zz",
    name: str = "a",
    spread: dict[str, float] | None = None,
    **more: Any,
) -> Level:
    """A level from bare numbers (MHz, Bohr magnetons); `spread` gives standard uncertainties by constant."""
    spread = spread or {}
    numbers = (("A", A, "MHz"), ("B", B, "MHz"), ("C", C, "MHz"), ("g_J", g_J, "1"), ("g_I", g_I, "1"))
    constants = {key: quantity(v, spread.get(key), unit) for key, v, unit in numbers if v is not None}
    return Level(atom, name, twice_J, twice_I, parity=more.pop("parity", 1), **constants, **more)


def line(lower: Level, upper: Level, rank: int = 1, **more: Any) -> Line:
    """A line between two hand-written levels."""
    multipole = more.pop("multipole", f"E{rank}")
    return Line(lower.atom, more.pop("name", "100"), lower, upper, multipole=multipole, rank=rank, **more)


# 87Rb (Steck, Rubidium 87 D Line Data; Arimondo, Inguscio, Violino 1977) and 133Cs 6p 2P3/2 (Gerginov et al. 2003).
RB87_G_I = quantity(-0.0009951414, 1.0e-9)
RB87_GROUND = level(
    1, 3, 3417.34130545, g_J=2.00233113, g_I=-0.0009951414, atom="87Rb", name="5s_2S1/2", spread={"g_J": 2e-8}
)
RB87_P3 = level(
    3, 3, 84.7185, 12.4965, None, 1.3362, -0.0009951414, atom="87Rb", name="5p_2P3/2",
    spread={"A": 0.0020, "B": 0.0037, "g_J": 0.0013}, parity=-1,
)  # fmt: skip
RB87_P1 = level(1, 3, 408.328, g_J=0.666, g_I=-0.0009951414, atom="87Rb", name="5p_2P1/2", parity=-1)
RB87_D2 = line(RB87_GROUND, RB87_P3, name="780")
RB87_D1 = line(RB87_GROUND, RB87_P1, name="795")
CS133_GROUND = level(1, 7, 2298.1579425, g_J=2.00254032, g_I=-0.00039885395, atom="133Cs", name="6s_2S1/2")
CS133_P3 = level(
    3, 7, 50.28827, -0.4934, 0.00056, 1.334087, -0.00039885395, atom="133Cs", name="6p_2P3/2", parity=-1
)  # fmt: skip
CS133_D2 = line(CS133_GROUND, CS133_P3, name="852")
# INVENTED: 128 sublevels, about as large as any atom's level.
LARGE = level(15, 7, -110.0, 900.0, 0.3, 1.2, -0.0004, name="invented")


def signed(low: float, high: float) -> st.SearchStrategy[float]:
    """Numbers of either sign whose size lies between two bounds."""
    return st.floats(low, high).flatmap(lambda size: st.sampled_from([size, -size]))


@st.composite
def levels(
    draw: st.DrawFn,
    twice_J: st.SearchStrategy[int] | None = None,
    twice_I: st.SearchStrategy[int] | None = None,
    mixed: bool = False,
) -> Level:
    """Any level with J to 8, I to 9/2: hyperfine of MHz to GHz, either sign, with B and C where they exist.

    `mixed` gives some of them fine-structure neighbours of one LS term, above or below.
    """
    J = draw(twice_J if twice_J is not None else st.integers(0, 16))
    I = draw(twice_I if twice_I is not None else st.integers(0, 9))
    A = draw(signed(1.0, 5000.0)) if J and I else None
    B = draw(signed(0.01, 0.3)) * abs(A) if A and J >= 2 and I >= 2 else None
    C = draw(signed(1e-5, 1e-3)) * abs(A) if A and J >= 3 and I >= 3 else None
    g_J = draw(signed(0.1, 2.5)) if J else None
    g_I = draw(signed(1e-5, 3e-3)) if I else None
    more = draw(terms(J)) if mixed else {}
    return level(J, I, A, B, C, g_J, g_I, **more)


@st.composite
def terms(draw: st.DrawFn, twice_J: int) -> dict[str, Any]:
    """An LS term that holds J, and none, one or both of its neighbours 1e4 to 1e7 MHz away."""
    S = draw(st.integers(0, 4).map(lambda s: 2 * s + twice_J % 2))
    Ls = [L for L in range(13) if abs(2 * L - S) <= twice_J <= 2 * L + S]
    if not Ls:
        return {}
    L = draw(st.sampled_from(Ls))
    exist = [J for J in (twice_J - 2, twice_J + 2) if abs(2 * L - S) <= J <= 2 * L + S]
    some = draw(st.lists(st.sampled_from(exist), unique=True)) if exist else []
    neighbours = tuple((J, draw(signed(1e4, 1e7))) for J in sorted(some))
    return {"term": f"{S + 1}{'SPDFGHIKLMNOQ'[L]}", "neighbours": neighbours}
