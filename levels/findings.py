"""What a checked scheme may be told: one table of findings that code, documents and page share.

A finding has a stable code, a severity, what it is about, the number behind it and what would change it.
"""

from dataclasses import dataclass

SEVERITIES = ("problem", "warning", "note")


@dataclass(frozen=True, slots=True)
class Kind:
    """One row of the table: the code never changes, its severity is the usual one, `unit` that of the number."""

    code: str
    severity: str
    unit: str
    meaning: str


KINDS = (
    Kind("beam-off-resonance", "problem", "linewidths", "no component that the beam is meant for is within reach"),
    Kind("geometry-limits-polarisation", "warning", "1", "no polarisation of a beam at this angle is pure enough"),
    Kind("polarisation-impure", "warning", "1", "share of the light that drives another polarisation than wanted"),
    Kind("unwanted-components", "warning", "1", "share of the beam's scattering on components it is not meant for"),
    Kind("other-line-driven", "note", "s-1", "scattering on another line of the atom"),
    Kind("power-broadened", "note", "1", "saturation parameter of the strongest component"),
    Kind("unlit-level", "problem", "1", "share of the atoms in a level that no beam addresses"),
    Kind("dark-state", "problem", "MHz", "how fast the field turns a dark state that holds atoms"),
    Kind("dark-target", "note", "s-1", "the wanted state is dark: rate at which far light still excites it"),
    Kind(
        "two-photon-resonance", "warning", "MHz", "two-photon detuning of a pair of lower levels within its dark line"
    ),
    Kind("low-scattering", "problem", "s-1", "the light hardly scatters in the steady state"),
    Kind("purity", "note", "1", "share of the atoms that end in the wanted sublevel"),
    Kind("leaves-cycle", "note", "photons", "photons scattered before an atom leaves the cycle"),
    Kind("atoms-lost", "warning", "s-1", "rate of losing atoms to levels without a way back"),
    Kind("rate-equations", "warning", "", "coherences are left out because no rotating frame holds all lasers"),
    Kind("rate-equations-mislead", "note", "s-1", "rate equations would give another scattering rate"),
    Kind("depends-on-start", "note", "", "several steady states: where atoms start decides"),
    Kind("model-note", "note", "", "an assumption behind the numbers"),
)
BY_CODE = {kind.code: kind for kind in KINDS}


@dataclass(frozen=True, slots=True)
class Finding:
    """One finding about one beam, level or the whole scheme; `value` is None where no number belongs to it."""

    code: str
    severity: str
    about: str
    text: str
    value: float | None
    unit: str
    change: str


def finding(
    code: str, about: str, text: str, value: float | None = None, change: str = "", severity: str | None = None
) -> Finding:
    """Make a finding of the table, with its usual severity unless the number says otherwise."""
    kind = BY_CODE[code]
    return Finding(code, severity or kind.severity, about, text, value, kind.unit, change)
