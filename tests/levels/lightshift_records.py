"""Atoms written by hand for the tests of light shifts, and a plain second construction of the operator.

The operator is built in the full dimension from Cartesian vectors, with a magnetic field in any direction, and solved
by linear equations: it shares with `levels.lightshift` neither blocks nor eigenstates nor spherical components.
"""

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from levels.constants import EA0, EPS0, HARTREE_MHZ, MHZ_NM, MU_B_MHZ_PER_GAUSS, C, H
from levels.records import Atom, Isotope, Level, Line
from tests.full_dimension import multipole, operators, spin
from tests.records_for_tests import RB87_GROUND, RB87_P1, RB87_P3, level, line, quantity

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

# 87Rb with round numbers of the literature: dipole elements in e a0 (Steck), centroids in MHz.
D1 = line(
    RB87_GROUND,
    RB87_P1,
    name="795",
    centroid=quantity(377107463.38, 0.011, "MHz"),
    reduced_dipole=quantity(4.231, 0.003, "e*a0"),
)
D2 = line(
    RB87_GROUND,
    replace(RB87_P3, width=quantity(6.0666, 0.0018, "MHz")),
    name="780",
    centroid=quantity(384230484.4685, 0.0062, "MHz"),
    reduced_dipole=quantity(5.978, 0.004, "e*a0"),
)
# INVENTED: a level with J = 2 whose lines go up and down, with every rank and every constant.
MIDDLE = level(4, 5, 300.0, 40.0, 0.2, g_J=1.3, g_I=-4e-4, atom="Zz", name="middle")
ABOVE = level(6, 5, -90.0, 10.0, None, g_J=1.1, g_I=-4e-4, atom="Zz", name="above", parity=-1)
BESIDE = level(4, 5, 150.0, -30.0, None, g_J=0.9, g_I=-4e-4, atom="Zz", name="beside", parity=-1)
BELOW = level(2, 5, 500.0, 5.0, None, g_J=1.5, g_I=-4e-4, atom="Zz", name="below", parity=-1)
LINES = (
    line(MIDDLE, ABOVE, name="600", centroid=quantity(5.0e8, None, "MHz"), reduced_dipole=quantity(3.0, 0.03, "e*a0")),
    line(MIDDLE, BESIDE, name="700", centroid=quantity(4.3e8, None, "MHz"), reduced_dipole=quantity(1.5, 0.01, "e*a0")),
    line(BELOW, MIDDLE, name="900", centroid=quantity(3.3e8, None, "MHz"), reduced_dipole=quantity(2.0, 0.02, "e*a0")),
)


def atom(*lines: Line, **polarisabilities: dict[str, object]) -> Atom:
    """An atom of these lines and their levels."""
    first = lines[0].lower
    isotope = Isotope(first.atom, first.atom, 0, 1, 1, first.twice_I, first.name)
    ends = {end.name: end for item in lines for end in (item.lower, item.upper)}
    return Atom(isotope, tuple(ends.values()), lines, **polarisabilities)  # type: ignore[arg-type]


RB87 = atom(D1, D2)
INVENTED = atom(*LINES)


def hamiltonian(of: Level, field: Array) -> Complex:
    """H/h in MHz of a level in a field vector (gauss), in the product basis of `full_dimension`."""
    ops = operators(of.twice_J, of.twice_I)
    A, B, C_ = (0.0 if part is None else part.value for part in (of.A, of.B, of.C))
    total = A * ops.dipole + B * ops.quadrupole + C_ * ops.octupole + 0j
    for g, twice_j, inner in ((of.g_J, of.twice_J, True), (of.g_I, of.twice_I, False)):
        z, raising, lowering = spin(twice_j)
        parts = ((raising + lowering) / 2, (raising - lowering) / 2j, z)
        turned = sum(component * part for component, part in zip(field, parts, strict=True))
        one = np.eye(of.twice_I + 1) if inner else np.eye(of.twice_J + 1)
        moment = np.kron(turned, one) if inner else np.kron(one, turned)
        total = total + MU_B_MHZ_PER_GAUSS * (g.value if g else 0.0) * moment
    return total


def cartesian(item: Line) -> Complex:
    """The three Cartesian components (upper, lower) of the dipole in e a0: d_+-1 = -+(x +- iy)/sqrt2."""
    size = item.reduced_dipole.value / np.sqrt(item.upper.twice_J + 1) if item.reduced_dipole else 0.0
    minus, none, plus = (
        size * multipole(item.lower.twice_J, item.upper.twice_J, item.lower.twice_I, 1, q) for q in (-1, 0, 1)
    )
    return np.stack([(minus - plus) / np.sqrt(2), 1j * (minus + plus) / np.sqrt(2), none + 0j])


def full_operator(
    of: Level, lines: tuple[Line, ...], eps: Complex, wavelength_nm: float, intensity: float, field: Array
) -> Complex:
    """The light-shift operator in the eigenbasis of the level's own Hamiltonian, and its energies on the diagonal."""
    energies, states = np.linalg.eigh(hamiltonian(of, field))
    nu = MHZ_NM / wavelength_nm
    square = 2 * intensity * 10 / (C * EPS0) * (EA0 / H) ** 2 * 1e-12
    total = np.zeros((energies.size, energies.size), dtype=complex)
    for item in lines:
        centre = item.centroid.value if item.centroid else 0.0
        if item.lower.name == of.name:
            other, frequency, d = item.upper, centre, cartesian(item)
        else:
            other, frequency, d = item.lower, -centre, np.conj(cartesian(item)).swapaxes(1, 2)
        far = hamiltonian(other, field)
        for vector, turning in ((eps, -nu), (np.conj(eps), nu)):
            V = np.tensordot(vector, d, 1) @ states
            answered = np.stack(
                [
                    np.linalg.solve(far + (frequency + turning - energies[k]) * np.eye(len(far)), V[:, k])
                    for k in range(energies.size)
                ],
                axis=1,
            )
            total += (V.conj().T @ answered + answered.conj().T @ V) / 2
    return np.diag(energies) - square / 4 * total


def static_dipole_a03(d: float, frequency_mhz: float, twice_J: int) -> float:
    """2 d^2/(3 (2J+1) omega) in a0^3, the textbook scalar of one line."""
    return 2 * d**2 / (3 * (twice_J + 1)) * HARTREE_MHZ / frequency_mhz
