"""Physics lint over the catalogue: every rule runs, every finding is reported.

A rule is a small named function in a table below. A finding can be answered in the data file by a reasoned
[[exceptions]] entry, whose `where` may hold `*`; one that answers nothing any more is a finding itself.
"""

import argparse
import re
import sys
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from levels import audit_constants as constants
from levels import audit_rates as rates
from levels import audit_sources as sources
from levels import audit_spectrum as spectrum
from levels import audit_structure as structure
from levels.audit_labels import label_gaps
from levels.audit_nuclei import one_nucleus
from levels.audit_structure import Broken, Species
from levels.audit_trends import smooth_trends
from levels.catalogue import DATA, Catalogue, load
from levels.errors import DataError
from levels.schema import DataFile, RuleException
from levels.tally import format_tally, tally


@dataclass(frozen=True, slots=True, order=True)
class Finding:
    """What broke which rule where: `where` is the species and the key in its file."""

    where: str
    rule: str
    message: str

    def __str__(self) -> str:
        return f"{self.where}: {self.rule}: {self.message}"


SPECIES_RULES: dict[str, Callable[[Species], Broken]] = {
    "parity": structure.parity,
    "multipole": structure.multipole,
    "configuration": structure.configuration,
    "term": structure.term,
    "line name": structure.line_name,
    "nominal wavelength": structure.nominal_wavelength,
    "order": structure.order,
    "unique names": structure.unique_names,
    "spin": structure.spin,
    "mass": structure.mass,
    "abundance": structure.abundance,
    "hyperfine numbers": structure.hyperfine_numbers,
    "ritz": spectrum.ritz,
    "shift loops": spectrum.shift_loops,
    "shift against frequency": spectrum.shift_against_frequency,
    "repeated frequency": spectrum.repeated_frequency,
    "reducible": spectrum.reducible,
    "king": spectrum.king,
    "tabulated energy": spectrum.tabulated_energy,
    "A ratio": constants.a_ratio,
    "B ratio": constants.b_ratio,
    "A sign": constants.a_sign,
    "nuclear g": constants.nuclear_g,
    "lande": constants.lande_factor,
    "intervals": constants.intervals,
    "label gaps": label_gaps,
    "branching sum": rates.branching_sum,
    "lifetime": rates.lifetime,
    "line strength": rates.line_strength,
    "decay sum": rates.decay_sum,
    "multiplet strength": rates.multiplet_strength,
}
VALUE_RULES = {"uncertainty": sources.uncertainty, "disagreement": sources.disagreement}
BOOK_RULES: dict[str, Callable[[Catalogue], Broken]] = {
    "one nucleus": one_nucleus,
    "known sources": sources.known_sources,
    "used references": sources.used_references,
    "reference form": sources.reference_form,
    "duplicate references": sources.duplicate_references,
}
RULES = (*SPECIES_RULES, *VALUE_RULES, *BOOK_RULES, "smooth trends", "exception")


def audit(catalogue: Catalogue) -> list[Finding]:
    """Every finding over the whole catalogue that no exception answers, in the order of species and key."""
    books = {name: Species(data) for name, data in catalogue.elements.items()}
    findings: list[Finding] = []
    for name, species in books.items():
        for rule, check in SPECIES_RULES.items():
            findings += [Finding(f"{name}: {where}", rule, message) for where, message in check(species)]
        for rule, judge in VALUE_RULES.items():
            found = judge(species, catalogue.references)
            findings += [Finding(f"{name}: {where}", rule, message) for where, message in found]
    for rule, survey in BOOK_RULES.items():
        findings += [Finding(where, rule, message) for where, message in survey(catalogue)]
    findings += [Finding(where, "smooth trends", message) for where, message in smooth_trends(books)]
    return sorted(_unanswered(findings, catalogue.elements))


def _unanswered(findings: Iterable[Finding], elements: Mapping[str, DataFile]) -> list[Finding]:
    exceptions = [(name, item) for name, data in elements.items() for item in data.exceptions]
    used: set[tuple[str, RuleException]] = set()
    left = []
    for finding in findings:
        answers = [pair for pair in exceptions if _answers(pair, finding)]
        used.update(answers)
        if not answers:
            left.append(finding)
    idle = [(name, item) for name, item in exceptions if (name, item) not in used]
    return left + [
        Finding(f"{name}: {item.where}", "exception", f"answers no {item.rule} finding") for name, item in idle
    ]


def _answers(pair: tuple[str, RuleException], finding: Finding) -> bool:
    name, exception = pair
    pattern = re.escape(f"{name}: {exception.where}").replace(r"\*", ".*")
    return exception.rule == finding.rule and re.fullmatch(pattern, finding.where) is not None


def audit_overlay(directory: Path) -> tuple[Catalogue, list[Finding]]:
    """The packaged data with an overlay on it, and the findings that the overlay adds."""
    catalogue = load(overlay=directory)
    before = set(audit(load()))
    return catalogue, [finding for finding in audit(catalogue) if finding not in before]


def main(arguments: Sequence[str] | None = None) -> int:
    """Prints the findings; returns 0 when there are none, 1 when there are, 2 when a file does not hold."""
    parser = argparse.ArgumentParser(prog="audit", description="Check the catalogue, or an overlay before it is used.")
    parser.add_argument("path", nargs="?", help="an overlay directory, or one packaged file to look at alone")
    parser.add_argument("--tally", action="store_true", help="print how much of each species is checked")
    options = parser.parse_args(arguments)
    try:
        catalogue, findings = _examined(options.path)
    except DataError as error:
        print(error, file=sys.stderr)
        return 2
    for finding in findings:
        print(finding)
    if options.tally:
        print(format_tally(tally(catalogue.elements)))
    print(f"{len(findings)} findings in {len(catalogue.elements)} species, {len(RULES)} rules", file=sys.stderr)
    return 1 if findings else 0


def _examined(path: str | None) -> tuple[Catalogue, list[Finding]]:
    if path is None:
        catalogue = load()
        return catalogue, audit(catalogue)
    chosen = Path(path).resolve()
    if chosen.parent == Path(str(DATA)).resolve():
        catalogue = load()
        return catalogue, [item for item in audit(catalogue) if item.where.startswith(f"{chosen.stem}: ")]
    return audit_overlay(chosen)


if __name__ == "__main__":
    sys.exit(main())
