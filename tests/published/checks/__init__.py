"""Published results that follow from the catalogue's constants, each with its source, evidence and tolerance.

A row says what is claimed, who published it, how its number came to us, and why its tolerance is what it is. `FOUND`
means that the number stood in a text that was read for this project (mostly an abstract), `MEMORY` that it was entered
from memory of the cited publication, `PRACTICE` that laboratories say so without a paper. Tolerances are twice the
published uncertainty, half of the last printed digit, or what the row's reason says; none was widened to pass.
"""

from tests.published.checks import clocks, cooling, intervals, moments, patterns, slopes, strongfields, values
from tests.published.checks.table import Check

CHECKS: tuple[Check, ...] = tuple(
    check
    for module in (clocks, slopes, intervals, patterns, moments, values, cooling, strongfields)
    for check in module.CHECKS
)
