"""(e) Steady states with all coherences against a general quantum library's direct sparse solver on the same model.

The library gets its Liouvillian ready-made in its quicker sparse form; ours starts from the Hamiltonian and the jump
operators and ends with the density matrix. The eight-level ion is timed from the scheme to the scattering rate.
"""

import statistics
from dataclasses import dataclass
from typing import Any

import numpy as np

from levels.beams import make_scheme, offset_of_hyperfine
from levels.bloch import Bloch, bloch_of
from levels.driven import drive_of
from levels.frames import frame_of
from levels.jones import elliptical
from levels.pumping import prepare, solve
from levels.records import Atom
from levels.steady import steady_state
from tests.bench.measure import median_ratio, report, seconds
from tests.levels.pumping_records import CS133_D2, RB87_D2, SR88, beam


@dataclass(frozen=True)
class Case:
    """One atom with cooling and repump light, general or pure along the field, and its bar."""

    name: str
    atom: Atom
    twice_F: int
    pure: bool
    bar: float
    pairs: int


CASES = (
    Case("87Rb D2, 24 sublevels, general", RB87_D2, 4, False, 2.0, 15),
    Case("87Rb D2, 24 sublevels, pure", RB87_D2, 4, True, 10.0, 25),
    Case("133Cs D2, 48 sublevels, general", CS133_D2, 8, False, 1.2, 7),
    Case("133Cs D2, 48 sublevels, pure", CS133_D2, 8, True, 10.0, 25),
)


def equations(case: Case) -> Bloch:
    """The optical Bloch equations of a case."""
    line, F = case.atom.lines[0], case.twice_F
    cool, repump = offset_of_hyperfine(line, F, F + 2, -6.0), offset_of_hyperfine(line, F - 2, F)
    first: dict[str, Any] = {} if case.pure else {"direction": (0.3, 0.2, 0.5), "light": elliptical(20, 30)}
    second: dict[str, Any] = {} if case.pure else {"direction": (1, 0.2, 0.1), "light": 20.0}
    beams = [
        beam(case.atom, offset_mhz=cool, intensity=2.0, **first),
        beam(case.atom, offset_mhz=repump, intensity=0.5, name="repump", **second),
    ]
    drive = drive_of(make_scheme(case.atom, beams, (0.0, 0.0, 1.0)))
    return bloch_of(drive, frame_of(drive))


def ours(bloch: Bloch) -> np.ndarray:
    """The density matrix from the library under test."""
    return steady_state(bloch, np.full(bloch.size, 1.0 / bloch.size)).rho


def liouvillian(bloch: Bloch) -> Any:
    """The general library's superoperator, sparse."""
    from tests.levels import quantum_library

    return quantum_library.qutip.liouvillian(*quantum_library.model(bloch)).to("csr")


def plain(superoperator: Any) -> np.ndarray:
    """The density matrix from the general library."""
    from tests.levels import quantum_library

    solved = quantum_library.qutip.steadystate(superoperator, method="direct", solver="spsolve")
    return np.asarray(solved.full())


def ion() -> float:
    """The scattering rate of an eight-level 88Sr+ in a field askew, from the scheme on."""
    shape: dict[str, Any] = {"direction": (1, 0, 0), "light": 30.0}
    beams = [
        beam(SR88, "blue", offset_mhz=-10.0, intensity=30.0, **shape),
        beam(SR88, "red", offset_mhz=15.0, intensity=100.0, name="repump", **shape),
    ]
    return solve(prepare(make_scheme(SR88, beams, (1.0, 1.0, 2.0)))).scattering_per_s


def run() -> None:
    for case in CASES:
        bloch = equations(case)
        superoperator = liouvillian(bloch)
        ours(bloch), plain(superoperator)
        ratio = median_ratio(lambda s=superoperator: plain(s), lambda b=bloch: ours(b), case.pairs)
        report(f"(e) steady state, {case.name}", f"{ratio:.1f} x", f"{case.bar:g} x")
    ion()
    spent = statistics.median(seconds(ion) for _ in range(25))
    report("(e) steady state, 88Sr+ eight levels, whole", f"{spent * 1e3:.2f} ms", "4 ms")
