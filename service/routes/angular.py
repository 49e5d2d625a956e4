"""`angular`: exact angular-momentum algebra."""

from collections.abc import Mapping
from fractions import Fraction
from typing import Any

from pydantic import Field

from levels.angular import (
    clebsch_gordan,
    clebsch_gordan_reason,
    hyperfine_shares,
    lande_shares,
    six_j,
    six_j_reason,
    three_j,
    three_j_reason,
)
from levels.constants import G_S
from levels.errors import OutsideValidity
from service.answers import Answer, scalar
from service.context import Context
from service.parameters import Half
from service.question import Asked, Question
from service.schemas import Answered, Scalar

EXACT = "exact"


class SymbolAnswered(Answered):
    """A coupling coefficient."""

    exact: str = Field(description="exact value, as `sqrt(6)/3`")
    square: str = Field(description="its exact square, a fraction")
    decimal: Scalar
    rule: str = Field(description="the selection rule that makes it zero; else empty")


class ThreeJAsked(Asked):
    """The arguments of a 3j symbol, in its two rows."""

    j1: Half = Field(examples=["1"])
    j2: Half = Field(examples=["1"])
    j3: Half = Field(examples=["0"])
    m1: Half = Field(examples=["1"])
    m2: Half = Field(examples=["-1"])
    m3: Half = Field(examples=["0"])


class SixJAsked(Asked):
    """The arguments of a 6j symbol, in its two rows."""

    j1: Half = Field(description="first row, first", examples=["1/2"])
    j2: Half = Field(description="first row, second", examples=["3/2"])
    j3: Half = Field(description="first row, third", examples=["1"])
    j4: Half = Field(description="second row, first", examples=["3"])
    j5: Half = Field(description="second row, second", examples=["2"])
    j6: Half = Field(description="second row, third", examples=["3/2"])


class ClebschGordanAsked(Asked):
    """The arguments of <j1 m1 j2 m2 | j m>."""

    j1: Half = Field(examples=["1/2"])
    m1: Half = Field(examples=["1/2"])
    j2: Half = Field(examples=["1"])
    m2: Half = Field(examples=["0"])
    j: Half = Field(examples=["3/2"])
    m: Half = Field(examples=["1/2"])


class LandeAsked(Asked):
    """An LS-coupled level, and perhaps one of its hyperfine levels."""

    J: Half = Field(description="total electronic angular momentum", examples=["3/2"])
    L: Half = Field(description="orbital angular momentum, an integer", examples=["1"])
    S: Half = Field(description="spin", examples=["1/2"])
    I: Half | None = Field(None, description="nuclear spin; with F for g_F", examples=["3/2"])
    F: Half | None = Field(None, description="total angular momentum; with I for g_F", examples=["3"])


class LandeAnswered(Answered):
    """Lande factors."""

    g_J: Scalar = Field(description="with the free electron's g factor and g_L = 1")
    g_J_exact: str = Field(description="with 2 for the electron's g factor, a fraction")
    weight_of_g_L: str = Field(description="exact share of g_L in g_J")
    weight_of_g_S: str = Field(description="exact share of the electron's g factor in g_J")
    g_F: Scalar = Field(description="of the hyperfine level, without the nucleus; null without I and F")
    g_F_exact: str = Field(description="with 2 for the electron's g factor, a fraction; empty without I and F")
    weight_of_g_J: str = Field(description="exact share of g_J in g_F; empty without I and F")
    weight_of_g_I: str = Field(description="exact share of g_I in g_F; empty without I and F")


def symbol(value: Any, rule: str) -> Answer:
    """A coefficient as an answer."""
    decimal = scalar(float(value), None, "1", EXACT)
    rule = rule or ("" if value != 0 else "no selection rule: the terms cancel")
    return Answer({"exact": str(value), "square": str(value**2), "decimal": decimal, "rule": rule})


def answer_three_j(context: Context, path: Mapping[str, str], asked: ThreeJAsked) -> Answer:
    """The 3j symbol (j1 j2 j3; m1 m2 m3), exactly, and the selection rule that makes it zero."""
    numbers = (asked.j1, asked.j2, asked.j3, asked.m1, asked.m2, asked.m3)
    return symbol(three_j(*numbers), three_j_reason(*numbers))


def answer_six_j(context: Context, path: Mapping[str, str], asked: SixJAsked) -> Answer:
    """The 6j symbol {j1 j2 j3; j4 j5 j6}, exactly, and the triangle rule that makes it zero."""
    numbers = (asked.j1, asked.j2, asked.j3, asked.j4, asked.j5, asked.j6)
    return symbol(six_j(*numbers), six_j_reason(*numbers))


def answer_clebsch_gordan(context: Context, path: Mapping[str, str], asked: ClebschGordanAsked) -> Answer:
    """The Clebsch-Gordan coefficient <j1 m1 j2 m2 | j m> with Condon-Shortley phases, exactly."""
    numbers = (asked.j1, asked.m1, asked.j2, asked.m2, asked.j, asked.m)
    return symbol(clebsch_gordan(*numbers), clebsch_gordan_reason(*numbers))


def lande(context: Context, path: Mapping[str, str], asked: LandeAsked) -> Answer:
    """The Lande factor of an LS-coupled level, and of one of its hyperfine levels when I and F are given.

    g_J = g_L w_L + g_S w_S, and E/h = g_F (muB/h) m B in a weak field with g_F = g_J w_J + g_I w_I. Relativistic and
    diamagnetic corrections are not in it: the catalogue's g_J are measured where that was done.
    """
    of_L, of_S = lande_shares(asked.J, asked.L, asked.S)
    if (asked.I is None) != (asked.F is None):
        raise OutsideValidity("F" if asked.F is None else "I", "", "I and F together, or neither")
    value, exact = float(of_L) + G_S * float(of_S), of_L + 2 * of_S
    content: dict[str, Any] = {
        "g_J": scalar(value, None, "1", EXACT),
        "g_J_exact": str(exact),
        "weight_of_g_L": str(of_L),
        "weight_of_g_S": str(of_S),
    }
    if asked.I is None or asked.F is None:
        nothing = {"g_F": scalar(None, None, "1", "I and F are not given"), "g_F_exact": ""}
        return Answer({**content, **nothing, "weight_of_g_J": "", "weight_of_g_I": ""})
    return Answer({**content, **_hyperfine(asked.F, asked.J, asked.I, value, exact)})


def _hyperfine(twice_F: int, twice_J: int, twice_I: int, g_J: float, g_J_exact: Fraction) -> dict[str, Any]:
    of_J, of_I = hyperfine_shares(twice_F, twice_J, twice_I)
    return {
        "g_F": scalar(g_J * float(of_J), None, "1", EXACT),
        "g_F_exact": str(g_J_exact * of_J),
        "weight_of_g_J": str(of_J),
        "weight_of_g_I": str(of_I),
    }


QUESTIONS = (
    Question(
        name="lande",
        path="/v1/angular/lande",
        asked=LandeAsked,
        answered=LandeAnswered,
        ask=lande,
        summary="Lande factors",
        example="/v1/angular/lande?J=3/2&L=1&S=1/2",
        tag="algebra",
    ),
    Question(
        name="clebsch-gordan",
        path="/v1/angular/clebsch-gordan",
        asked=ClebschGordanAsked,
        answered=SymbolAnswered,
        ask=answer_clebsch_gordan,
        summary="Clebsch-Gordan coefficient",
        example="/v1/angular/clebsch-gordan?j1=1/2&m1=1/2&j2=1&m2=0&j=3/2&m=1/2",
        tag="algebra",
        heavy=True,
    ),
    Question(
        name="3j",
        path="/v1/angular/3j",
        asked=ThreeJAsked,
        answered=SymbolAnswered,
        ask=answer_three_j,
        summary="3j symbol",
        example="/v1/angular/3j?j1=1&j2=1&j3=0&m1=1&m2=-1&m3=0",
        tag="algebra",
        heavy=True,
    ),
    Question(
        name="6j",
        path="/v1/angular/6j",
        asked=SixJAsked,
        answered=SymbolAnswered,
        ask=answer_six_j,
        summary="6j symbol",
        example="/v1/angular/6j?j1=1/2&j2=3/2&j3=1&j4=3&j5=2&j6=3/2",
        tag="algebra",
        heavy=True,
    ),
)
