"""The same optical Bloch equations handed to a general quantum library, for comparison."""

import warnings
from typing import Any

import numpy as np
import scipy.sparse as sp

from levels.bloch import Bloch

with warnings.catch_warnings():
    warnings.simplefilter("ignore")  # it mentions plotting libraries that are not installed
    import qutip


def model(bloch: Bloch) -> tuple[Any, list[Any]]:
    """Hamiltonian and collapse operators; laser linewidths must be zero."""
    operators = [
        qutip.Qobj(sp.csr_matrix((jump.amplitude, (jump.end, jump.start)), shape=(bloch.size, bloch.size)))
        for jump in bloch.jumps
    ]
    for end, start, rate in zip(*bloch.hops, strict=True):
        operators.append(qutip.Qobj(sp.csr_matrix(([np.sqrt(rate)], ([end], [start])), shape=(bloch.size, bloch.size))))
    return qutip.Qobj(sp.csr_matrix(np.diag(bloch.energy) + bloch.coupling)), operators


def steady_matrix(bloch: Bloch) -> np.ndarray:
    hamiltonian, operators = model(bloch)
    return np.asarray(qutip.steadystate(hamiltonian, operators, method="direct", solver="spsolve").full())


def evolved(bloch: Bloch, rho: np.ndarray, times_us: list[float]) -> list[np.ndarray]:
    hamiltonian, operators = model(bloch)
    options = {"rtol": 1e-9, "atol": 1e-11, "nsteps": 100000, "progress_bar": "", "store_states": True}
    result = qutip.mesolve(hamiltonian, qutip.Qobj(rho), times_us, operators, options=options)
    return [state.full() for state in result.states]
