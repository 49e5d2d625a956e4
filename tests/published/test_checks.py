"""Every published check of `checks` on the catalogue's real data."""

import math

import pytest

from levels.catalogue import Catalogue
from tests.published.checks import CHECKS
from tests.published.checks.table import FOUND, MEMORY, PRACTICE, Check


@pytest.mark.parametrize("check", CHECKS, ids=[check.name for check in CHECKS])
def test_published_number(check: Check, book: Catalogue) -> None:
    """What a publication states follows from the catalogue within the tolerance that the row gives and explains."""
    assert check.computed(book) == pytest.approx(check.expected, rel=0, abs=check.tolerance or 1e-12), (
        f"{check.claim} ({check.source}; {check.evidence}; tolerance: {check.why})"
    )


def test_every_check_says_where_it_comes_from() -> None:
    """Each row has a name of its own, a source, one of the three kinds of evidence and a reason for its tolerance."""
    assert len({check.name for check in CHECKS}) == len(CHECKS)
    for check in CHECKS:
        assert check.source
        assert check.why
        assert check.evidence in (FOUND, MEMORY, PRACTICE)
        assert math.isfinite(check.tolerance)
        assert check.tolerance >= 0
