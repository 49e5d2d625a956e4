"""Errors carry what it takes to recover, also from another process."""

import pickle

import pytest

from levels.errors import NotPublished, OutsideValidity, UnknownName

ERRORS = (
    UnknownName("line", "781", ["780"], "or D2"),
    NotPublished("A", "87Rb 9s_2S1/2", "an overlay can supply it"),
    OutsideValidity("field", 1e9, "up to 1e6 G"),
)


@pytest.mark.parametrize("error", ERRORS, ids=lambda error: type(error).__name__)
def test_errors_survive_the_way_from_another_process(error: Exception) -> None:
    """Pickled and read again, an error has its kind, its words and its data."""
    again = pickle.loads(pickle.dumps(error))
    assert type(again) is type(error)
    assert str(again) == str(error)
    assert vars(again) == vars(error)
