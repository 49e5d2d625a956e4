"""Scattering rates and forces of laser beams on a two-level atom, and what slowers and traps make of them.

Plain functions in SI units. Detunings are in Hz (laser less atom, red is negative), `width` is Gamma/2pi in Hz, `slope`
dnu/dB of the driven component in Hz/T; a positive velocity runs along the beam. Semiclassical: an atom that scatters
many photons while it moves little, in beams that saturate it independently of each other.

Metcalf and van der Straten, Laser Cooling and Trapping (1999), chapters 3, 6, 7 and 11.
"""

import math
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from levels.constants import HBAR, H

Number = TypeVar("Number", float, NDArray[np.float64])


def scattering_rate(width: float, saturation: Number, detuning: Number) -> Number:
    """Return the photons scattered per second, (Gamma/2) s/(1 + s + 4 delta^2/Gamma^2); arrays broadcast."""
    return math.pi * width * saturation / (1 + saturation + 4 * (detuning / width) ** 2)


def acceleration(
    mass: float, wavelength: float, width: float, saturation: Number, detuning: Number, velocity: Number
) -> Number:
    """Return the acceleration along one beam of an atom with this velocity along it."""
    return H / (mass * wavelength) * scattering_rate(width, saturation, detuning - velocity / wavelength)


def molasses_acceleration(
    mass: float, wavelength: float, width: float, saturation: Number, detuning: Number, velocity: Number
) -> Number:
    """Return the acceleration in two opposite beams of equal saturation each: the sum of both forces."""
    along = acceleration(mass, wavelength, width, saturation, detuning, velocity)
    return along - acceleration(mass, wavelength, width, saturation, detuning, -velocity)


def largest_acceleration(mass: float, wavelength: float, width: float) -> float:
    """Return hbar k Gamma/2m, the limit at full saturation."""
    return H / (mass * wavelength) * math.pi * width


def damping_constant(wavelength: float, width: float, saturation: float, detuning: float) -> float:
    """Return beta of F = -beta v in two opposite beams, for small v; positive (damping) for red detuning.

    beta = -8 hbar k^2 (delta/Gamma) s/(1 + s + 4 delta^2/Gamma^2)^2.
    """
    k = 2 * math.pi / wavelength
    return -8 * HBAR * k**2 * (detuning / width) * saturation / (1 + saturation + 4 * (detuning / width) ** 2) ** 2


def spring_constant(damping: float, wavelength: float, slope: float, gradient: float) -> float:
    """Return kappa of F = -kappa z in a field gradient (T/m): damping constant x slope x gradient x wavelength."""
    return damping * slope * gradient * wavelength


def doppler_temperature_product(width: float, detuning: float) -> float:
    """Return k_B T at low intensity: (h gamma/8)(1 + 4 delta^2/gamma^2)/|delta/gamma|, with gamma the width."""
    ratio = abs(detuning) / width
    return H * width / 8 * (1 + 4 * ratio**2) / ratio


def slower_field(wavelength: float, slope: float, detuning: float, speed: Number) -> Number:
    """Return the field (T) that keeps an atom of this speed resonant with the beam it runs against.

    Laser and Doppler shift make up for the Zeeman shift: B = (delta + v/lambda)/slope.
    """
    return (detuning + speed / wavelength) / slope


def stopping_distance(initial: float, final: float, deceleration: float) -> float:
    """Return the way (m) from one speed to another at a constant deceleration."""
    return (initial**2 - final**2) / (2 * deceleration)
