"""Atoms written by hand for the tests of light on atoms, and short ways to make beams.

Constants are in round form from the literature: 87Rb and 133Cs D lines (Steck, Alkali D Line Data), 40Ca+ (lifetime
6.904 ns: Hettrich et al. 2015; branching 0.93565: Ramm et al. 2013), 88Sr+ (branching 0.9453: Likforman et al. 2016;
lifetime 7.39 ns: Pinnington et al. 1995). Atoms called Zz are nobody's.
"""

from typing import Any

import numpy as np

from levels.beams import Beam, make_beam
from levels.geometry import polarisation_vector
from levels.jones import circular, linear
from levels.records import Atom, Isotope, Level, Line
from tests.records_for_tests import level, line, quantity


def isotope(name: str = "Zz", twice_I: int = 0) -> Isotope:
    return Isotope(name, "Zz", 0, 1, 1, twice_I, "g", mass=quantity(86.909180531, unit="u"))


def excited(twice_J: int, twice_I: int = 0, lifetime_ns: float = 26.2348, **constants: Any) -> Level:
    lifetime = quantity(lifetime_ns * 1e-9, unit="s")
    return level(twice_J, twice_I, lifetime=lifetime, parity=-1, **constants)


def driven_line(lower: Level, upper: Level, branching: float = 1.0, nm: float = 780.241, **more: Any) -> Line:
    frequency = quantity(299792458e3 / nm, unit="MHz")
    return line(lower, upper, branching=quantity(branching), centroid=frequency, nominal_nm=nm, **more)


def simple_atom(twice_J: int, twice_J_up: int, g_low: float = 1.0, g_up: float = 1.0, **more: Any) -> Atom:
    """A line J - J' without nuclear spin, Gamma/2pi = 6.0666 MHz, 780 nm."""
    lower = level(twice_J, 0, g_J=g_low, name="g", energy=quantity(0.0, unit="cm-1"))
    upper = excited(twice_J_up, g_J=g_up, name="e", energy=quantity(12816.5, unit="cm-1"), **more)
    return Atom(isotope(), (lower, upper), (driven_line(lower, upper, name="780"),))


def alkali(twice_I: int, A: float, upper: Level, g_J: float, g_I: float, nm: float, name: str) -> Atom:
    lower = level(1, twice_I, A, g_J=g_J, g_I=g_I, name="s_2S1/2", atom=name)
    return Atom(isotope(name, twice_I), (lower, upper), (driven_line(lower, upper, nm=nm, name="780"),))


RB87_D2 = alkali(
    3, 3417.34130545,
    excited(3, 3, 26.2348, A=84.7185, B=12.4965, g_J=1.3362, g_I=-0.0009951414, name="p_2P3/2", atom="87Rb"),
    2.00233113, -0.0009951414, 780.241, "87Rb",
)  # fmt: skip
RB87_D1 = alkali(
    3, 3417.34130545,
    excited(1, 3, 27.679, A=408.328, g_J=0.666, g_I=-0.0009951414, name="p_2P1/2", atom="87Rb"),
    2.00233113, -0.0009951414, 794.979, "87Rb",
)  # fmt: skip
CS133_D2 = alkali(
    7, 2298.1579425,
    excited(3, 7, 30.405, A=50.28827, B=-0.4934, C=0.00056, g_J=1.334087, g_I=-0.00039885395, name="p_2P3/2",
            atom="133Cs"),
    2.00254032, -0.00039885395, 852.347, "133Cs",
)  # fmt: skip


def ion(name: str, lifetime_ns: float, to_ground: float, nm: tuple[float, float], d_lifetime_s: float) -> Atom:
    """An S1/2 - P1/2 - D3/2 ion without nuclear spin; D3/2 decays slowly by an E2 line."""
    S = level(1, 0, g_J=2.00225664, name="S1/2", atom=name, energy=quantity(0.0, unit="cm-1"))
    D = level(3, 0, g_J=0.7995, name="D3/2", atom=name, energy=quantity(1e7 / nm[0] - 1e7 / nm[1], unit="cm-1"),
              lifetime=quantity(d_lifetime_s, unit="s"))  # fmt: skip
    P = excited(1, 0, lifetime_ns, g_J=0.6659, name="P1/2", atom=name, energy=quantity(1e7 / nm[0], unit="cm-1"))
    blue = driven_line(S, P, to_ground, nm[0], name="blue")
    red = driven_line(D, P, 1.0 - to_ground, nm[1], name="red")
    quadrupole = driven_line(S, D, 1.0, 1 / (1 / nm[0] - 1 / nm[1]), name="E2", rank=2)
    return Atom(isotope(name), (S, D, P), (blue, red, quadrupole))


CA40 = ion("40Ca+", 6.904, 0.93565, (396.959, 866.452), 1.1998)
SR88 = ion("88Sr+", 7.39, 0.9453, (421.671, 1091.79), 0.435)


def beam(
    atom: Atom,
    line_name: str = "780",
    *,
    offset_mhz: float = 0.0,
    intensity: float = 1.0,
    direction: Any = (0.0, 0.0, 1.0),
    light: Any = "right",
    name: str = "a",
    **more: Any,
) -> Beam:
    """A beam; `light` is a handedness (helicity), a linear angle in degrees or a Jones vector."""
    jones = circular(light) if isinstance(light, str) else linear(light) if np.isscalar(light) else light
    chosen = next(item for item in atom.lines if item.name == line_name)
    vector = polarisation_vector(direction, jones)
    return make_beam(name, chosen, direction, vector, offset_mhz, intensity, **more)
