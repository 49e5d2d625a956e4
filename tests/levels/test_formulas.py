"""Formulas of the field against the diagonalisation, and their code as each language runs it."""

import json
import math
import shutil
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.errors import OutsideValidity
from levels.fits import Closed, Fit, Formula, Source, closed_form, fit, formula
from levels.formulas import LANGUAGES, coefficients_of, expression_of, printed
from levels.strongfield import term_constants, term_sublevels
from levels.sublevels import constants_of, labels_of, sublevels
from tests.levels.test_strongfield import term
from tests.records_for_tests import CS133_P3, RB87_GROUND, RB87_P3, levels

ABOUT = "a test; field in gauss, result in MHz"
FIELDS = [0.0, 0.5, 3.2289, 17.0, 61.25, 100.0]


def of_ground(label: tuple[int, int] = (4, 2)) -> Source:
    return Source(1, constants_of(RB87_GROUND), label)


def offset(high: float = 100.0) -> Formula:
    """An offset on the D2 line: a fit of the upper sublevel less the closed form of the lower."""
    return formula(
        (Source(1, constants_of(RB87_P3), (6, 2)), Source(-1, constants_of(RB87_GROUND), (4, 2))), 0, high, 1e-3
    )


def exact_offset(fields: list[float]) -> np.ndarray:
    up, low = sublevels(RB87_P3, fields), sublevels(RB87_GROUND, fields)
    at_up = int(np.nonzero((up.twice_F == 6) & (up.twice_m == 2))[0][0])
    at_low = int(np.nonzero((low.twice_F == 4) & (low.twice_m == 2))[0][0])
    return up.energy_mhz[:, at_up] - low.energy_mhz[:, at_low]


@given(levels(twice_J=st.integers(0, 4), twice_I=st.integers(0, 4), mixed=True), st.floats(-5e3, 5e3))
def test_closed_forms_are_the_diagonalisation(of, field: float) -> None:
    """Every sublevel whose m has one or two states has a closed form, exact to rounding; the others have none."""
    constants = constants_of(of)
    found = sublevels(of, field)
    for k, label in enumerate(labels_of(constants)):
        states = sum(m == label[1] for _, m in labels_of(constants))
        form = closed_form(Source(1, constants, label))
        assert (form is None) == (states > 2)
        if form is not None:
            scale = np.abs(found.energy_mhz).max() + abs(field) * 4
            assert form.at(np.array([field]))[0] == pytest.approx(found.energy_mhz[0, k], abs=1e-12 * scale + 1e-12)


def test_every_sublevel_of_a_spin_half_has_a_closed_form() -> None:
    """J = 1/2 with any I: the Breit-Rabi formula (Breit and Rabi, Phys. Rev. 38, 2082 (1931)) for all eight of 87Rb."""
    A, g_J, g_I = 3417.34130545, 2.00233113, -0.0009951414
    mu = 1.399624492
    for F, m in labels_of(constants_of(RB87_GROUND)):
        field = 321.0
        x = (g_J - g_I) * mu * field / (2 * A)
        sign = 1 if F == 4 else -1
        root = math.sqrt(1 + 4 * (m / 2) * x / 4 + x**2) if abs(m) < 4 else 1 + math.copysign(1, m) * x
        expected = -2 * A / 8 + g_I * mu * (m / 2) * field + sign * A * root
        found = closed_form(of_ground((F, m)))
        assert found is not None
        assert found.at(np.array([field]))[0] == pytest.approx(expected, abs=1e-5)


def test_a_whole_term_without_nuclear_spin_has_closed_forms() -> None:
    """Of a 2P with I = 0 every m has at most two states, and the square root holds into the Paschen-Back regime."""
    of = term(2, 1)
    fields = np.array([0.0, 900.0, 7000.0, 9e4])
    found = closed_form(Source(1, term_constants(of), (1, 1)))
    exact = term_sublevels(of, fields)
    assert found is not None
    assert found.at(fields) == pytest.approx(exact.energy_mhz[:, int(np.argmax(exact.twice_m))], abs=1e-7)


@pytest.mark.parametrize("label", [(0, 0), (2, 0), (4, 0), (6, 0), (6, 2), (4, -2)])
@pytest.mark.parametrize("high", [5.0, 60.0, 250.0])
def test_fits_keep_the_error_they_state(label: tuple[int, int], high: float) -> None:
    """Between the points that made it, a fit departs from the diagonalisation by no more than it says."""
    found = formula((Source(1, constants_of(RB87_P3), label),), 0.0, high, 1e-3)
    fields = np.sort(np.random.default_rng(7).uniform(0.0, high, 3000))
    exact = sublevels(RB87_P3, fields)
    at = int(np.nonzero((exact.twice_F == label[0]) & (exact.twice_m == label[1]))[0][0])
    worst = float(np.abs(found.at(fields) - exact.energy_mhz[:, at]).max())
    assert worst <= 1.02 * found.largest_error_mhz + 1e-9
    assert found.largest_error_mhz < (2e-3 if high < 100 else 0.5)


def test_a_rational_function_is_used_where_it_is_shorter() -> None:
    """The caesium 6p 2P3/2 over its avoided crossings takes a ratio; a few gauss take a polynomial."""
    constants = constants_of(CS133_P3)
    wide = formula((Source(1, constants, (6, 0)),), 0.0, 120.0, 1e-2)
    narrow = formula((Source(1, constants, (6, 0)),), 0.0, 3.0, 1e-2)
    assert (wide.kind, narrow.kind) == ("rational function", "polynomial")
    form = wide.parts[0].form
    assert isinstance(form, Fit)
    x = np.linspace(-1, 1, 5001)
    assert np.polyval(form.bottom[::-1], x).min() > 0
    assert form.bottom[0] != 0


def test_a_tolerance_out_of_reach_is_not_hidden() -> None:
    """Where no fit of the allowed length reaches the tolerance, the error that is stated is larger than it."""
    found = formula((Source(1, constants_of(RB87_P3), (6, 0)),), 0.0, 3000.0, 1e-6)
    assert found.largest_error_mhz > 1e-6


@pytest.mark.parametrize(("low", "high"), [(1.0, 1.0), (5.0, 1.0), (0.0, 2e6), (math.nan, 1.0)])
def test_bad_ranges_are_refused(low: float, high: float) -> None:
    """A range that is empty, reversed, too large or not a number is refused, and so is a tolerance of zero."""
    with pytest.raises(OutsideValidity, match="min_field below max_field"):
        formula((of_ground(),), low, high, 1e-3)
    with pytest.raises(OutsideValidity, match="tolerance"):
        formula((of_ground(),), 0.0, 1.0, 0.0)


def ran(command: list[str], folder: Path) -> list[float]:
    done = subprocess.run(command, cwd=folder, capture_output=True, text=True, timeout=60, check=True)
    assert done.stderr == ""
    return [float(line) for line in done.stdout.split()]


def run_python(code: str, name: str, folder: Path) -> list[float]:
    calls = f"\nfor b in {FIELDS}:\n    print(repr({name}(b)))\n"
    (folder / "formula.py").write_text(code + calls)
    return ran([sys.executable, "-W", "error", "formula.py"], folder)


def run_c(code: str, name: str, folder: Path) -> list[float]:
    fields = ", ".join(map(repr, FIELDS))
    loop = f'double b[] = {{{fields}}}; for (int k = 0; k < {len(FIELDS)}; k++) printf("%.17g\\n", {name}(b[k]));'
    (folder / "formula.c").write_text(f"#include <stdio.h>\n{code}\nint main(void) {{ {loop} return 0; }}\n")
    subprocess.run(
        ["gcc", "-std=c99", "-Wall", "-Wextra", "-Werror", "formula.c", "-o", "formula", "-lm"],
        cwd=folder, capture_output=True, text=True, timeout=60, check=True,
    )  # fmt: skip
    return ran(["./formula"], folder)


def run_javascript(code: str, name: str, folder: Path) -> list[float]:
    calls = f"\nfor (const b of {json.dumps(FIELDS)}) console.log({name}(b));\n"
    (folder / "formula.mjs").write_text('"use strict";\n' + code + calls)
    return ran(["node", "formula.mjs"], folder)


def run_octave(code: str, name: str, folder: Path) -> list[float]:
    fields = ", ".join(map(repr, FIELDS))
    (folder / f"{name}.m").write_text(code)
    return ran(["octave-cli", "--quiet", "--eval", f"printf('%.17g\\n', {name}([{fields}]))"], folder)


RUNNERS = {
    "python": (sys.executable, run_python),
    "c": ("gcc", run_c),
    "javascript": ("node", run_javascript),
    "octave": ("octave-cli", run_octave),
}


@pytest.mark.parametrize("language", RUNNERS)
def test_code_runs_as_printed(language: str, tmp_path: Path) -> None:
    """The printed code runs in its language and gives the offset within the stated error; closed forms to rounding."""
    program, run = RUNNERS[language]
    if shutil.which(program) is None:
        pytest.skip(f"{program} is not installed: the code is only checked for its syntax below")
    found = offset()
    values = run(printed(found, language, "offset_mhz", ABOUT, 1000.0), "offset_mhz", tmp_path)
    assert values == pytest.approx(exact_offset(FIELDS) + 1000.0, abs=found.largest_error_mhz + 1e-9)
    assert values == pytest.approx(found.at(np.array(FIELDS)) + 1000.0, abs=1e-9)
    exact = formula((of_ground(),), 0.0, 100.0, 1e-3)
    assert exact.largest_error_mhz < 1e-10
    values = run(printed(exact, language, "energy_mhz", ABOUT), "energy_mhz", tmp_path)
    assert values == pytest.approx(exact.at(np.array(FIELDS)), abs=1e-9)


def test_octave_code_is_balanced_and_elementwise() -> None:
    """Octave's code has matched brackets, elementwise powers and products of variables, and every block closed."""
    code = printed(offset(), "octave", "offset_mhz", ABOUT)
    lines = code.splitlines()
    assert lines[0] == "function value = offset_mhz(field_gauss)"
    assert lines[-1] == "end"
    assert [line.strip().endswith(";") for line in lines[2:-1]] == [True] * len(lines[2:-1])
    assert code.count("(") == code.count(")")
    assert "^" not in code.replace(".^", "")
    assert "x*(" not in code
    assert "**" not in code


def test_latex_states_variable_and_function() -> None:
    """LaTeX has the scaled variable, the function by name, a root, and balanced braces."""
    text = printed(offset(), "latex", "offset_mhz", ABOUT)
    assert text.splitlines()[0] == f"% {ABOUT}"
    assert "x = 0.02 B - 1.0" in text
    assert r"\mathrm{offset\_mhz}(B) =" in text
    assert r"\sqrt{" in text
    assert text.count("{") == text.count("}")


def test_unknown_language_is_refused() -> None:
    """A language without a printer is refused with those that exist."""
    with pytest.raises(OutsideValidity, match="python, c, javascript, octave, latex"):
        printed(offset(), "cobol", "x", ABOUT)


def test_coefficients_rebuild_the_formula() -> None:
    """The listed coefficients are all that a caller needs: they give the formula's value again."""
    found = offset()
    numbers = dict(coefficients_of(found))

    def group(name: str) -> list[float]:
        return [value for key, value in numbers.items() if key.startswith(name)]

    field = 33.0
    low, high = group("1_range")
    x = (2 * field - low - high) / (high - low)
    upper = np.polyval(group("1_top")[::-1], x) / np.polyval(group("1_bottom")[::-1], x)
    mean, half = (np.polyval(group(f"2_{name}")[::-1], field) for name in ("mean", "half"))
    coupling = np.polyval(group("2_coupling")[::-1], field)
    lower = mean + numbers["2_sign0"] * math.hypot(half, coupling)
    value = numbers["1_part"] * upper + numbers["2_part"] * lower
    assert value == pytest.approx(found.at(np.array([field]))[0], abs=1e-9)


def test_expression_holds_only_our_symbols() -> None:
    """An expression is built from B and x alone."""
    variables, expression = expression_of(offset())
    assert [name for name, _ in variables] == ["x"]
    assert {str(symbol) for symbol in expression.free_symbols} == {"B", "x"}
    assert set(LANGUAGES) == {"python", "c", "javascript", "octave", "latex"}
    form = closed_form(of_ground((4, 4)))
    assert isinstance(form, Closed)
    assert form.sign == 0


def test_a_fit_of_a_straight_line_is_one() -> None:
    """A function that is linear comes out with two coefficients."""
    found = fit(lambda field: 3.0 + 0.5 * field, 0.0, 10.0, 1e-9)
    assert (len(found.top), len(found.bottom)) == (2, 1)
    assert found.top == pytest.approx((5.5, 2.5))
