"""Constants that follow from published ones: Lande factors, nuclear g, hyperfine constants from intervals, rates.

Each function takes and returns Quantities, so that a derived number carries sources, evidence and formula.
"""

import math
import re
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from levels.angular import hyperfine_shares, lande_shares
from levels.blocks import hyperfine_weights
from levels.constants import EA0, EPS0, G_S, HBAR, M_E, M_E_OVER_M_P, C, E
from levels.errors import OutsideValidity
from levels.notation import parse_level, term_quantum_numbers
from levels.quantity import Quantity, combine, derived, format_number, in_unit, significant_digits

_CORE = re.compile(r"\(([0-9]{1,2})([A-Z])([0-9/]+)\)")
_ORBITALS = "spdfghik"


def lande(name: str, term: str, coupling: str, twice_J: int) -> Quantity | None:
    """The Lande factor of a level in its stated coupling; None where the name does not determine it or J = 0.

    LS: from S and L. JK, as in `4f13.(2F7/2)5d.6s_3[3/2]1/2`: the core in parentheses couples with the outer L to K,
    K with the outer spin to J. JJ, as in `4f10.(5I8).6s.6p.(3P1)_(8,1)9`: both parts in parentheses couple to J.
    Neglects configuration mixing, relativistic and QED corrections, so it has no uncertainty.
    """
    if twice_J == 0 or coupling == "none":
        return None
    try:
        factor, formula = _lande(name, term, coupling, twice_J)
    except (OutsideValidity, LookupError):
        return None
    return derived(factor, None, "1", f"{formula} with g_S = {G_S:.11g}, g_L = 1")


def _lande(name: str, term: str, coupling: str, twice_J: int) -> tuple[float, str]:
    numbers = term_quantum_numbers(term)
    if coupling == "LS":
        return _lande_ls(twice_J, numbers["L"], numbers["S"]), "Lande factor in LS coupling"
    configuration = parse_level(name).configuration
    cores = [_core(match) for match in _CORE.finditer(configuration)]
    if coupling == "JK":
        outer_L = 2 * sum(_ORBITALS.index(letter) for letter in _outer_letters(configuration))
        twice_K, twice_S = numbers["K"], numbers["multiplicity"] - 1
        core_share, L_share = hyperfine_shares(twice_K, cores[0][0], outer_L)
        K_share, S_share = hyperfine_shares(twice_J, twice_K, twice_S)
        g_K = cores[0][1] * float(core_share) + float(L_share)
        return g_K * float(K_share) + float(G_S) * float(S_share), "Lande factor in J1-L2 coupling"
    if (cores[0][0], cores[1][0]) != (numbers["j1"], numbers["j2"]):
        raise OutsideValidity("term", term, "the two J of the terms in parentheses")
    first, second = hyperfine_shares(twice_J, numbers["j1"], numbers["j2"])
    return cores[0][1] * float(first) + cores[1][1] * float(second), "Lande factor in J1-J2 coupling"


def _lande_ls(twice_J: int, twice_L: int, twice_S: int) -> float:
    orbital, spin = lande_shares(twice_J, twice_L, twice_S)
    return float(orbital) + G_S * float(spin)


def _core(match: re.Match[str]) -> tuple[int, float]:
    """Doubled J and Lande factor of a term in parentheses."""
    level = parse_level(f"core_{match[1]}{match[2]}{match[3]}")
    numbers = term_quantum_numbers(level.term)
    return level.twice_J, _lande_ls(level.twice_J, numbers["L"], numbers["S"])


def _outer_letters(configuration: str) -> list[str]:
    outer = configuration.rpartition(")")[2]
    return [letter for letter, count in re.findall(r"[0-9]{1,2}([a-z])([0-9]*)", outer) for _ in range(int(count or 1))]


def g_I_of_moment(moment: Quantity, twice_I: int) -> Quantity:
    """g_I in Bohr magnetons, sign for H = muB (g_J J + g_I I) B, from a tabulated nuclear moment.

    Tabulated moments are of the bare nucleus; the electrons' shielding (0.1 % to 1.6 %) is not removed, so the
    result has no known uncertainty.
    """
    value = -in_unit(moment, "muN").value / (twice_I / 2) * M_E_OVER_M_P
    result = derived(value, None, "1", "-mu/I m_e/m_p, shielding of the bare moment not removed", inputs=(moment,))
    return replace(result, text=f"{value:.6g}")


def constants_of_intervals(
    twice_J: int, twice_I: int, intervals: Sequence[tuple[int, int, Quantity]], given: dict[str, Quantity]
) -> dict[str, Quantity]:
    """A, B, C (MHz) that reproduce measured intervals E(F2) - E(F1), each interval as (2 F1, 2 F2, Quantity).

    Constants in `given` are kept and their part subtracted. As many of A, B, C as the intervals determine are found by
    least squares with the published weights, higher ones taken as zero. One interval of an I = 1/2 or J = 1/2 level is
    a mere division: evidence and source stay. Correlations between intervals are not published and neglected.
    """
    names = [name for name in _allowed(twice_J, twice_I) if name not in given][: len(intervals)]
    if not names:
        return {}
    if len(names) < len([name for name in _allowed(twice_J, twice_I)[:2] if name not in given]):
        return {}  # A alone from one interval of a level that has B too would be a guess
    matrix, target, spread = _interval_equations(twice_J, twice_I, intervals, given, names)
    trivial = len(intervals) == 1 and len(_allowed(twice_J, twice_I)) == 1
    if trivial:
        measured = in_unit(intervals[0][2], "MHz")
        return {"A": _divided(measured, float(matrix[0, 0]))}
    weights = 1.0 / spread if np.all(np.isfinite(spread)) else np.ones(len(target))
    solution, _, rank, _ = np.linalg.lstsq(matrix * weights[:, None], target * weights, rcond=None)
    if rank < len(names):
        return {}
    inverse = np.linalg.pinv(matrix * weights[:, None]) * weights
    errors = np.sqrt((inverse**2) @ spread**2) if np.all(np.isfinite(spread)) else [None] * len(names)
    used = [item[2] for item in intervals] + list(given.values())
    formula = f"Casimir formula solved for {', '.join(names)} from {len(intervals)} intervals"
    return {
        name: derived(float(value), None if error is None else float(error), "MHz", formula, inputs=used)
        for name, value, error in zip(names, solution, errors, strict=True)
    }


def _allowed(twice_J: int, twice_I: int) -> list[str]:
    return ["A", "B", "C"][: min(twice_J, twice_I, 3)]


def _interval_equations(
    twice_J: int,
    twice_I: int,
    intervals: Sequence[tuple[int, int, Quantity]],
    given: dict[str, Quantity],
    names: Sequence[str],
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    columns = {"A": 0, "B": 1, "C": 2}
    weights = np.array(
        [
            np.subtract(hyperfine_weights(twice_J, twice_I, second), hyperfine_weights(twice_J, twice_I, first))
            for first, second, _ in intervals
        ]
    )
    measured = [in_unit(quantity, "MHz") for _, _, quantity in intervals]
    known = {name: in_unit(quantity, "MHz") for name, quantity in given.items()}
    target = np.array([item.value for item in measured])
    for name, quantity in known.items():
        target = target - weights[:, columns[name]] * quantity.value
    spread = np.array([math.nan if item.uncertainty is None else item.uncertainty for item in measured])
    return weights[:, [columns[name] for name in names]], target, spread


def _divided(measured: Quantity, divisor: float) -> Quantity:
    value = measured.value / divisor
    spread = None if measured.uncertainty is None else measured.uncertainty / abs(divisor)
    note = "; ".join(filter(None, (f"published interval {measured.text} / {divisor:g}", measured.note)))
    others = tuple(_divided(in_unit(other, "MHz"), divisor) for other in measured.alternatives)
    text = f"{format_number(value, spread)} MHz"
    return replace(measured, value=value, uncertainty=spread, text=text, note=note, alternatives=others)


# Rates. Relative uncertainties add in quadrature; the frequency's own is negligible beside them.


def _product(formula: str, unit: str, value: float, *factors: Quantity, powers: Sequence[float] = ()) -> Quantity:
    exponents = powers or [1.0] * len(factors)
    relative = combine(
        *(
            None if item.uncertainty is None or item.value == 0 else power * item.uncertainty / item.value
            for item, power in zip(factors, exponents, strict=True)
        )
    )
    if relative is not None:
        return derived(value, abs(value * relative), unit, formula, inputs=factors)
    digits = min(significant_digits(item.text) for item in factors if item.uncertainty is None)
    return replace(derived(value, None, unit, formula, inputs=factors), text=f"{value:.{max(digits, 2)}g} {unit}")


def rate_of_branching(branching: Quantity, lifetime: Quantity) -> Quantity:
    """The partial rate of a line: its branching fraction over the upper level's lifetime."""
    fraction, tau = in_unit(branching, "1"), in_unit(lifetime, "s")
    if fraction.value == 1 and fraction.uncertainty is None:
        fraction = replace(fraction, uncertainty=0.0)  # the only channel: exact
    return _product("branching / lifetime", "s-1", fraction.value / tau.value, fraction, tau)


def branching_of_rate(rate: Quantity, lifetime: Quantity) -> Quantity:
    """The branching fraction of a line: its partial rate times the upper level's lifetime."""
    A, tau = in_unit(rate, "s-1"), in_unit(lifetime, "s")
    return _product("partial rate x lifetime", "1", A.value * tau.value, A, tau)


def lifetime_of_rate(branching: Quantity, rate: Quantity) -> Quantity:
    """The lifetime of a level from one line's rate and branching fraction."""
    fraction, A = in_unit(branching, "1"), in_unit(rate, "s-1")
    if fraction.value == 1 and fraction.uncertainty is None:
        fraction = replace(fraction, uncertainty=0.0)
    return _product("branching / partial rate", "s", fraction.value / A.value, fraction, A)


def rate_of_oscillator_strength(strength: Quantity, frequency: Quantity, twice_J: int, twice_J_up: int) -> Quantity:
    """The electric-dipole rate of an absorption oscillator strength: A = 2 pi e^2 nu^2 / (eps0 m_e c^3) g_l/g_u f."""
    nu = in_unit(frequency, "MHz").value * 1e6
    scale = 2 * math.pi * E**2 * nu**2 / (EPS0 * M_E * C**3) * (twice_J + 1) / (twice_J_up + 1)
    return _product("2 pi e^2 nu^2/(eps0 m_e c^3) g_l/g_u f", "s-1", scale * strength.value, strength)


def _dipole_scale(frequency: Quantity, twice_J_up: int) -> float:
    omega = 2 * math.pi * in_unit(frequency, "MHz").value * 1e6
    return float(omega**3 * EA0**2) / (3 * math.pi * EPS0 * HBAR * C**3 * (twice_J_up + 1))


def rate_of_dipole(dipole: Quantity, frequency: Quantity, twice_J_up: int) -> Quantity:
    """The rate of a reduced dipole element (3j convention): A = omega^3 d^2 / (3 pi eps0 hbar c^3 (2J'+1))."""
    element = in_unit(dipole, "e*a0")
    value = _dipole_scale(frequency, twice_J_up) * element.value**2
    return _product("omega^3 d^2/(3 pi eps0 hbar c^3 (2J'+1))", "s-1", value, element, powers=[2.0])


def dipole_of_rate(rate: Quantity, frequency: Quantity, twice_J_up: int) -> Quantity:
    """The magnitude of the reduced dipole element <J||d||J'> in e a0 of an electric-dipole rate.

    Convention: Wigner-Eckart with the 3j symbol, symmetric in J and J'; 5.978 e a0 for the D2 line of 87Rb.
    """
    A = in_unit(rate, "s-1")
    value = math.sqrt(A.value / _dipole_scale(frequency, twice_J_up))
    return _product("sqrt(3 pi eps0 hbar c^3 (2J'+1) A/omega^3)", "e*a0", value, A, powers=[0.5])
