"""Formulas of `fits` as text and as code: LaTeX, Python, C, JavaScript, Octave.

The expression is built from numbers of ours alone, term by term; nothing that a client writes is ever parsed. sympy and
its printers are imported when a formula is first asked for. Code is a function of the field in gauss (the independent
variable is called B inside) that returns MHz, in double precision, and runs as printed.
"""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from levels.errors import OutsideValidity
from levels.fits import Closed, Fit, Formula

DIGITS = 17  # read back to the same double


@dataclass(frozen=True, slots=True)
class Language:
    """One language: how it prints an expression, the lines around it and the line of one intermediate variable."""

    name: str
    prints: Callable[[Any], str]
    head: str
    variable: str
    tail: str


def _printed(printer: str, **settings: Any) -> Callable[[Any], str]:
    def prints(expression: Any) -> str:
        import sympy

        return str(getattr(sympy, printer)(expression, **settings))

    return prints


def _latex(expression: Any) -> str:
    import sympy

    return str(sympy.latex(expression))


LANGUAGES = {
    row.name: row
    for row in (
        Language(
            "python",
            _printed("pycode"),
            'import math\n\n\ndef {name}(field_gauss):\n    """{about}"""\n    B = float(field_gauss)\n',
            "    {name} = {value}\n",
            "    return {value}\n",
        ),
        Language(
            "c",
            _printed("ccode"),
            "#include <math.h>\n\n/* {about} */\n"
            "double {name}(double field_gauss)\n{{\n    const double B = field_gauss;\n",
            "    const double {name} = {value};\n",
            "    return {value};\n}}\n",
        ),
        Language(
            "javascript",
            _printed("jscode"),
            "// {about}\nfunction {name}(field_gauss) {{\n  const B = Number(field_gauss);\n",
            "  const {name} = {value};\n",
            "  return {value};\n}}\n",
        ),
        Language(
            "octave",
            _printed("octave_code"),
            "function value = {name}(field_gauss)\n  % {about}\n  B = double(field_gauss);\n",
            "  {name} = {value};\n",
            "  value = {value};\nend\n",
        ),
        Language("latex", _latex, "% {about}\n", "{name} = {value},\\quad\n", "{name}(B) = {value}\n"),
    )
}


def printed(found: Formula, language: str, name: str, about: str, added_mhz: float = 0.0) -> str:
    """Write a formula as a function `name` in one of LANGUAGES; `about` is its comment, `added_mhz` is added to it.

    `name` and `about` are this project's text, on one line and without the comment's own closing marks.
    """
    row = LANGUAGES.get(language)
    if row is None:
        raise OutsideValidity("as", language, f"one of {', '.join(LANGUAGES)}")
    variables, expression = expression_of(found, added_mhz)
    lines = [row.variable.format(name=symbol, value=row.prints(value)) for symbol, value in variables]
    shown = name.replace("_", "\\_") if language == "latex" else name
    shown = f"\\mathrm{{{shown}}}" if language == "latex" else shown
    return (
        row.head.format(name=name, about=about)
        + "".join(lines)
        + row.tail.format(name=shown, value=row.prints(expression))
    )


def expression_of(found: Formula, added_mhz: float = 0.0) -> tuple[list[tuple[str, Any]], Any]:
    """Build the sympy expression of a formula in B, with the intermediate variables that its fits use."""
    import sympy

    B, total = sympy.Symbol("B", real=True), _number(added_mhz)
    variables: list[tuple[str, Any]] = []
    for part in found.parts:
        if isinstance(part.form, Closed):
            total += part.sign * _closed(part.form, B)
            continue
        x = sympy.Symbol("x", real=True)
        if not variables:
            low, high = part.form.low_gauss, part.form.high_gauss
            scaled = (_number(2.0) * B - _number(low + high)) / _number(high - low)
            variables.append(("x", scaled))
        total += part.sign * _fit(part.form, x)
    return variables, total


def _number(value: float) -> Any:
    import sympy

    return sympy.Float(value, DIGITS) if value else sympy.Integer(0)


def _powers(coefficients: tuple[float, ...], symbol: Any) -> Any:
    """Nest a polynomial as c0 + x (c1 + x (...)); what is zero is left out."""
    total = _number(coefficients[-1])
    for coefficient in reversed(coefficients[:-1]):
        total = _number(coefficient) + symbol * total
    return total


def _closed(form: Closed, B: Any) -> Any:
    import sympy

    mean = _powers(form.mean, B)
    if not form.sign:
        return mean
    root = sympy.sqrt(_powers(form.half, B) ** 2 + _powers(form.coupling, B) ** 2)
    return mean + form.sign * root


def _fit(form: Fit, x: Any) -> Any:
    top = _powers(form.top, x)
    return top if len(form.bottom) == 1 else top / _powers(form.bottom, x)


def coefficients_of(found: Formula) -> list[tuple[str, float]]:
    """List the numbers of a formula by name, part by part: those of the closed form, or of top and bottom of a fit."""
    listed = []
    for number, part in enumerate(found.parts, start=1):
        mark = f"{number}_" if len(found.parts) > 1 else ""
        listed.append((f"{mark}part", float(part.sign)))
        for group, values in _groups(part.form).items():
            listed += [(f"{mark}{group}{power}", value) for power, value in enumerate(values)]
    return listed


def _groups(form: Closed | Fit) -> dict[str, tuple[float, ...]]:
    if isinstance(form, Closed):
        return {"sign": (float(form.sign),), "mean": form.mean, "half": form.half, "coupling": form.coupling}
    return {"top": form.top, "bottom": form.bottom, "range": (form.low_gauss, form.high_gauss)}
