"""Both sides of each benchmark give the same answers, so that a ratio compares like with like."""

import numpy as np
import pytest

from tests.bench import algebra, spectra, steady


@pytest.mark.parametrize("case", spectra.CASES, ids=[case[0] for case in spectra.CASES])
def test_both_ways_give_the_same_spectrum(case: spectra.Case) -> None:
    """The plain and the library's energies and slopes are equal, field by field, once sorted."""
    fields = np.linspace(0.0, case.largest_gauss, 7)[1:]
    for level in case.levels:
        energy, slope = spectra.plain(level, fields)
        our_energy, our_slope = spectra.ours(level, fields)
        order = np.argsort(our_energy, axis=1)
        assert np.take_along_axis(our_energy, order, axis=1) == pytest.approx(energy, abs=1e-8)
        assert np.take_along_axis(our_slope, order, axis=1) == pytest.approx(slope, abs=1e-8)


def test_both_ways_give_the_same_strengths() -> None:
    """sympy called naively and the library give the same eight fractions of the Cs D2 line."""
    assert algebra.ours() == algebra.naive()
    assert sum(algebra.ours()) == 2


@pytest.mark.parametrize("case", steady.CASES, ids=[case.name for case in steady.CASES])
def test_both_ways_give_the_same_state(case: steady.Case) -> None:
    """The general library and ours give the same density matrix, element by element."""
    bloch = steady.equations(case)
    assert steady.ours(bloch) == pytest.approx(steady.plain(steady.liouvillian(bloch)), abs=1e-11)
