"""Reads and writes the trade's notation: isotopes, levels, lines, sublevels, half-integers, polarisations.

Text comes from people and programs: every reader either returns or raises UnknownName or OutsideValidity saying what
would do. Angular momenta are doubled integers (3 means 3/2).
"""

import re
from collections.abc import Callable, Iterable
from dataclasses import dataclass

from levels.errors import OutsideValidity, UnknownName

LONGEST_NAME = 80
LARGEST_TWICE = 200  # no angular momentum in an atom comes near 100

_SYMBOLS = frozenset(  # Zz is the tests' fictional element
    re.findall(
        "[A-Z][a-z]?",
        "HHeLiBeBCNOFNeNaMgAlSiPSClArKCaScTiVCrMnFeCoNiCuZnGaGeAsSeBrKrRbSrYZrNbMoTcRuRhPdAgCdInSnSbTeIXeCsBa"
        "LaCePrNdPmSmEuGdTbDyHoErTmYbLuHfTaWReOsIrPtAuHgTlPbBiPoAtRnFrRaAcThPaUNpPuAmCmBkCfEsFmMdNoLrZz",
    )
)
_ROMAN = {"I": 0, "II": 1, "III": 2, "IV": 3}
_L_LETTERS = "SPDFGHIKLMNOQ"
MULTIPOLE_RANK = {"E1": 1, "M1": 1, "E2": 2, "M2": 2, "E3": 3}


def _clean(text: str, parameter: str, would_do: str) -> str:
    stripped = text.strip()
    if not stripped or len(stripped) > LONGEST_NAME or not stripped.isprintable():
        raise OutsideValidity(parameter, shown(text), would_do)
    return stripped


def shown(text: str) -> str:
    """The text, cut to what an error message can bear."""
    return text if len(text) <= 60 else text[:57] + "..."


# Half-integers

_HALF = re.compile(r"([+-]?)([0-9]{1,4})(?:/([12])|\.([05])0{0,6}|\.)?", re.ASCII)


def parse_half(text: str, parameter: str = "half-integer") -> int:
    """Reads an integer or half-integer into its double.

    >>> parse_half("3/2"), parse_half("-1.5"), parse_half("2")
    (3, -3, 4)
    """
    would_do = "an integer or half-integer such as 2, 3/2 or 1.5"
    match = _HALF.fullmatch(_clean(text, parameter, would_do).replace("\N{MINUS SIGN}", "-"))
    if match is None:
        raise OutsideValidity(parameter, shown(text), would_do)
    sign, whole, denominator, tenths = match.groups()
    twice = int(whole) if denominator == "2" else 2 * int(whole) + (tenths == "5")
    if twice > LARGEST_TWICE:
        raise OutsideValidity(parameter, shown(text), f"{would_do}, at most {LARGEST_TWICE // 2}")
    return -twice if sign == "-" else twice


def format_half(twice: int) -> str:
    """Writes a doubled angular momentum: 3 as "3/2", 4 as "2"."""
    return f"{twice}/2" if twice % 2 else str(twice // 2)


# Isotopes

_ISOTOPE = re.compile(
    r"\^?\{?(?P<before>[0-9]{1,3})?\}?[ -]?(?P<symbol>[A-Za-z]{1,2})(?:[ -]?(?P<after>[0-9]{1,3}))??"
    r"(?P<star>\*)?(?: ?\^?\{?(?P<many>[0-9])?(?P<plus>\+{1,3})\}?| (?P<roman>I{1,3}|IV))?",
    re.ASCII,
)


@dataclass(frozen=True, slots=True)
class IsotopeName:
    """What an isotope's name says; `mass_number` is None for a bare element ("Rb", "Ca+")."""

    symbol: str
    mass_number: int | None
    charge: int

    def __str__(self) -> str:
        return format_isotope(self.symbol, self.mass_number, self.charge)


def parse_isotope(text: str) -> IsotopeName:
    """Reads `87Rb`, `Rb-87`, `40Ca+`, `Ca-40+`, `40Ca II`; a mass number may be missing.

    >>> str(parse_isotope("Rb-87")), str(parse_isotope("40Ca II"))
    ('87Rb', '40Ca+')
    """
    would_do = "an isotope such as 87Rb, Rb-87, 40Ca+ or 40Ca II"
    match = _ISOTOPE.fullmatch(_clean(text, "atom", would_do))
    symbol = match["symbol"].capitalize() if match else ""
    if match is None or symbol not in _SYMBOLS:
        raise UnknownName("atom", shown(text), hint=would_do)
    if match["before"] and match["after"]:
        raise UnknownName("atom", shown(text), hint=f"{would_do}; the mass number once")
    number = match["before"] or match["after"]
    charge = _ROMAN[match["roman"]] if match["roman"] else _charge(match["many"], match["plus"])
    return IsotopeName(symbol, int(number) if number else None, charge)


def _charge(many: str | None, plus: str | None) -> int:
    if not plus:
        return 0
    return int(many) if many else len(plus)


def format_isotope(symbol: str, mass_number: int | None, charge: int = 0) -> str:
    """Writes `87Rb`, `40Ca+`, `Sr` (no mass number), `Lu2+`."""
    sign = "" if charge == 0 else "+" if charge == 1 else f"{charge}+"
    return f"{mass_number or ''}{symbol}{sign}"


# Levels

_HALF_TEXT = r"[0-9]{1,2}(?:/2)?"
_TERM = re.compile(
    rf"(?:(?P<multiplicity>[0-9]{{1,2}})(?P<letter>[A-Z])|(?P<jk>[0-9]{{1,2}})\[(?P<K>{_HALF_TEXT})\]"
    rf"|\((?P<j1>{_HALF_TEXT}),(?P<j2>{_HALF_TEXT})\))[*o°]?(?P<J>{_HALF_TEXT})?",
    re.ASCII,
)


@dataclass(frozen=True, slots=True)
class LevelName:
    """The parts of a level's name: configuration tail, term without J, doubled J."""

    configuration: str
    term: str
    twice_J: int


def parse_level(text: str) -> LevelName:
    """Reads a level's full name, `5p_2P3/2`, `5s.5p_3P1`, `4f13.(2F7/2)5d.6s_3[3/2]1/2`.

    >>> parse_level("5s.5p_3P1")
    LevelName(configuration='5s.5p', term='3P', twice_J=2)
    """
    would_do = "a level such as 5p_2P3/2, 5s.5p_3P1 or 4f13.5d.6s_3[3/2]1/2"
    configuration, separator, tail = _clean(text, "level", would_do).rpartition("_")
    match = _TERM.fullmatch(tail)
    if not separator or not configuration or match is None:
        raise UnknownName("level", shown(text), hint=would_do)
    term, J = _split_term(match, tail)
    return LevelName(configuration, term, parse_half(J, "level"))


def _split_term(match: re.Match[str], tail: str) -> tuple[str, str]:
    J = match["J"]
    if J is None:
        raise UnknownName("level", shown(tail), hint="the term needs its J, as in 2P3/2")
    return tail[: len(tail) - len(J)].rstrip("*o°"), J


def term_quantum_numbers(term: str) -> dict[str, int]:
    """The doubled quantum numbers that a term states: S and L (LS), S_outer and K (JK), or j1 and j2 (jj).

    >>> term_quantum_numbers("2P"), term_quantum_numbers("2[3/2]")
    ({'S': 1, 'L': 2}, {'multiplicity': 2, 'K': 3})
    """
    match = _TERM.fullmatch(term.rstrip("*o°"))
    if match is None or match["J"]:
        raise OutsideValidity("term", shown(term), "a term such as 2P, 3[3/2] or (8,1)")
    if match["letter"]:
        if match["letter"] not in _L_LETTERS:
            raise OutsideValidity("term", shown(term), f"a letter of {_L_LETTERS}")
        return {"S": int(match["multiplicity"]) - 1, "L": 2 * _L_LETTERS.index(match["letter"])}
    if match["K"]:
        return {"multiplicity": int(match["jk"]), "K": parse_half(match["K"], "term")}
    return {"j1": parse_half(match["j1"], "term"), "j2": parse_half(match["j2"], "term")}


def level_keys(name: str) -> tuple[str, ...]:
    """Every short spelling under which a level may be asked for, the most specific first.

    >>> level_keys("5p_2P3/2")
    ('5p_2p3/2', '5p2p3/2', '2p3/2', '5p3/2')
    """
    full = name.casefold()
    configuration, _, tail = full.rpartition("_")
    keys = [full, squeeze(full), tail]
    outer = re.search(r"([0-9]{1,2})[a-z][0-9]*$", configuration)
    term = re.fullmatch(r"[0-9]{1,2}([a-z])([0-9/]+)", tail)
    if outer and term:
        keys.append(f"{outer[1]}{term[1]}{term[2]}")
    return tuple(dict.fromkeys(keys))


def squeeze(text: str) -> str:
    """A level's name without the separators that people leave out or put elsewhere: `5s5p 3P1` as `5s5p3p1`."""
    return re.sub(r"[\s._^*°]|(?<=[a-z\]])o(?=[0-9])", "", text.casefold())


# Lines

_WAVELENGTH = re.compile(r"([0-9]{1,6}(?:\.[0-9]{1,8})?) ?(?:nm)?", re.ASCII)
_BETWEEN = re.compile(r"\s*(?:->|→|<->|↔|--)\s*|(?<=[0-9])-(?=[0-9])")


@dataclass(frozen=True, slots=True)
class LineName:
    """How a line was asked for: by wavelength (`780`), or by a word that is an alias (`D2`) or joins two levels."""

    wavelength: str = ""
    alias: str = ""
    levels: tuple[str, str] | None = None


def parse_line(text: str) -> LineName:
    """Reads `780`, `780.24 nm`, `D2`, `5s_2S1/2->5p_2P3/2`.

    >>> parse_line("780 nm").wavelength
    '780'
    """
    cleaned = _clean(text, "line", "a line such as 780, D2 or 5s_2S1/2->5p_2P3/2")
    match = _WAVELENGTH.fullmatch(cleaned)
    if match:
        return LineName(wavelength=match[1])
    ends = [part for part in _BETWEEN.split(cleaned) if part]
    return LineName(alias=cleaned, levels=(ends[0], ends[1]) if len(ends) == 2 else None)


# Sublevels

_SUBLEVEL = re.compile(r"[|(<]?\s*(?:[FJ]'?\s*=\s*)?([^,=]+?)\s*,\s*(?:m_?[FJ]?'?\s*=\s*)?([^,=]+?)\s*[>)]?")


def parse_sublevel(text: str, parameter: str = "sublevel") -> tuple[int, int]:
    """Reads `F,m` into doubled F and m; F is J where the nucleus has no spin.

    >>> parse_sublevel("2,-1"), parse_sublevel("1/2,1/2"), parse_sublevel("1.5,0.5")
    ((4, -2), (1, 1), (3, 1))
    """
    would_do = "F,m such as 2,-1 or 3/2,1/2 with |m| at most F in whole steps"
    match = _SUBLEVEL.fullmatch(_clean(text, parameter, would_do))
    if match is None:
        raise OutsideValidity(parameter, shown(text), would_do)
    twice_F, twice_m = parse_half(match[1], parameter), parse_half(match[2], parameter)
    if twice_F < 0 or abs(twice_m) > twice_F or (twice_F - twice_m) % 2:
        raise OutsideValidity(parameter, shown(text), would_do)
    return twice_F, twice_m


def format_sublevel(twice_F: int, twice_m: int) -> str:
    """Writes `2,-1` or `1/2,1/2`."""
    return f"{format_half(twice_F)},{format_half(twice_m)}"


# Polarisations


@dataclass(frozen=True, slots=True)
class Polarisation:
    """One row of the table: canonical name, q = m_upper - m_lower, other spellings (compared without blanks)."""

    name: str
    q: int
    spellings: tuple[str, ...]


POLARISATIONS = (
    Polarisation("sigma+", 1, ("sigmaplus", "sigma_plus", "sigmap", "sp", "s+", "σ+", "σ⁺", "sig+", "+", "+1", "1")),
    Polarisation("pi", 0, ("π", "p", "0", "pi0")),
    Polarisation("sigma-", -1, ("sigmaminus", "sigma_minus", "sigmam", "sm", "s-", "σ-", "σ⁻", "sig-", "-", "-1")),
)
_POLARISATION_BY_SPELLING = {spelling: row for row in POLARISATIONS for spelling in (row.name, *row.spellings)}


def parse_polarisation(text: str, parameter: str = "polarisation") -> Polarisation:
    """Reads sigma+, pi, sigma- and their common spellings.

    "sigma" followed by a blank is sigma+: that is what a query string makes of an unescaped plus sign.

    >>> parse_polarisation("σ+").q, parse_polarisation("sigma minus").q
    (1, -1)
    """
    would_do = "sigma+, pi or sigma- (sigma%2B in a query string)"
    cleaned = _clean(text, parameter, would_do).casefold().replace("\N{MINUS SIGN}", "-")
    if cleaned == "sigma" and text.endswith(" "):
        cleaned = "sigma+"
    row = _POLARISATION_BY_SPELLING.get(re.sub(r"\s", "", cleaned))
    if row is None:
        raise OutsideValidity(parameter, shown(text), would_do)
    return row


def format_polarisation(q: int) -> str:
    """The name of q = m_upper - m_lower; multipoles beyond the dipole have no names and are written q=+2."""
    return next((row.name for row in POLARISATIONS if row.q == q), f"q={q:+d}")


# Hyperfine components and crossovers


@dataclass(frozen=True, slots=True)
class FeatureName:
    """What a hyperfine feature joins: one lower and one upper F for a component, two on one side for a crossover."""

    lower: tuple[int, ...]
    upper: tuple[int, ...]

    @property
    def is_crossover(self) -> bool:
        """Whether it lies halfway between two components."""
        return len(self.lower) + len(self.upper) > 2

    @property
    def components(self) -> tuple[tuple[int, int], ...]:
        """The (lower, upper) doubled F pairs it averages."""
        return tuple((low, up) for low in self.lower for up in self.upper)

    def __str__(self) -> str:
        return f"{_format_side(self.lower)}-{_format_side(self.upper)}"


_FEATURE = re.compile(r"(?:F\s*=\s*)?(\([^()]*\)|[^()-]+?)\s*(?:->|→|–|-)\s*(?:F'?\s*=\s*)?(\([^()]*\)|[^()>-]+)")


def parse_feature(text: str, parameter: str = "component") -> FeatureName:
    """Reads a hyperfine component `2-3` (lower F, upper F) or a crossover `2-(2,3)`.

    >>> str(parse_feature("2-(2,3)")), parse_feature("3/2-1/2").components
    ('2-(2,3)', ((3, 1),))
    """
    would_do = "lower F and upper F such as 2-3, or a crossover such as 2-(2,3)"
    match = _FEATURE.fullmatch(_clean(text, parameter, would_do))
    if match is None:
        raise OutsideValidity(parameter, shown(text), would_do)
    lower, upper = (_parse_side(side, parameter, would_do) for side in match.groups())
    if len(lower) + len(upper) > 3 or min(lower + upper) < 0:
        raise OutsideValidity(parameter, shown(text), would_do)
    return FeatureName(lower, upper)


def _parse_side(side: str, parameter: str, would_do: str) -> tuple[int, ...]:
    parts = side.strip("()").split(",")
    values = tuple(sorted(parse_half(part, parameter) for part in parts))
    if len(values) > 2 or len(set(values)) != len(values) or (len(values) == 2) != side.startswith("("):
        raise OutsideValidity(parameter, shown(side), would_do)
    return values


def _format_side(values: tuple[int, ...]) -> str:
    inner = ",".join(map(format_half, values))
    return f"({inner})" if len(values) > 1 else inner


def parse_component(text: str, parameter: str = "component") -> tuple[int, int]:
    """Reads a single hyperfine component `2-3` into doubled lower and upper F."""
    feature = parse_feature(text, parameter)
    if feature.is_crossover:
        raise OutsideValidity(parameter, shown(text), "one component such as 2-3, not a crossover")
    return feature.components[0]


# Finding


def nearest(given: str, names: Iterable[str], count: int = 5, key: Callable[[str], str] = str.casefold) -> list[str]:
    """The names closest to a misspelt one, best first."""
    import difflib

    by_key = {key(name): name for name in names}
    close = difflib.get_close_matches(key(given)[:LONGEST_NAME], list(by_key), n=count, cutoff=0.5)
    return [by_key[item] for item in close]
