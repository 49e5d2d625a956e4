"""How generated tests run: few, the same every time, and without a clock on a busy machine.

`pytest --hypothesis-profile=explore` draws fresh and many examples.
"""

from pathlib import Path

import pytest
from hypothesis import HealthCheck, settings

from levels.catalogue import Catalogue, load

FICTIONAL = Path(__file__).parent / "data"

settings.register_profile(
    "steady",
    max_examples=40,
    deadline=None,
    derandomize=True,
    database=None,
    suppress_health_check=[HealthCheck.too_slow, HealthCheck.filter_too_much],
)
settings.register_profile("explore", parent=settings.get_profile("steady"), max_examples=500, derandomize=False)
settings.load_profile("steady")


@pytest.fixture(scope="session")
def fictional() -> Catalogue:
    """The fictional element's catalogue, which freezes behaviour whatever happens to real numbers."""
    return load([FICTIONAL])


@pytest.fixture(scope="session")
def book() -> Catalogue:
    """The packaged catalogue."""
    return load()
