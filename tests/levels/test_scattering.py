"""Scattering of far-off light: closed forms, a second construction, interference of lines."""

from dataclasses import replace

import numpy as np
import pytest

from levels.constants import EA0, EPS0, HBAR, MHZ_NM, POLARISABILITY_SI, C, H
from levels.lightshift import Light, couple, drive_of
from levels.partners import partners_of
from levels.records import Atom, Line
from levels.scattering import Scattering, lande_sign, scattering
from tests.full_dimension import wig6jj
from tests.levels.lightshift_records import (
    D1,
    D2,
    INVENTED,
    LINES,
    MIDDLE,
    RB87,
    atom,
    cartesian,
    hamiltonian,
)
from tests.records_for_tests import level, line, quantity

GROUND = RB87.levels[0]
INTENSITY = 1e7
EPS = np.array([0.3 + 0.1j, -0.5j, 0.7])


def solve(whole: Atom, name: str, light: Light, field: float = 0.0) -> Scattering:
    partners = partners_of(whole, next(item for item in whole.levels if item.name == name))
    here, coupled = couple(partners, field)
    return scattering(whole, partners, here, coupled, light)


def field_squared(intensity: float) -> float:
    return 2 * intensity * 10 / (C * EPS0)


def test_two_level_atom_scatters_as_the_textbook_says() -> None:
    """J = 0 to J' = 1 scatters A (w/w0)^3 (Omega/2)^2 [1/(w0-w) + 1/(w0+w)]^2, all of it elastically."""
    lower, upper = level(0, 0, name="g"), level(2, 0, g_J=1.0, name="e", parity=-1)
    item = line(lower, upper, centroid=quantity(5e8), reduced_dipole=quantity(3.0, 0.03, "e*a0"))
    found = solve(atom(item), "g", Light(900.0, INTENSITY, drive_of(0.0, 45.0, 0.0)))
    w0, w = 2e6 * np.pi * 5e8, 2e6 * np.pi * MHZ_NM / 900.0
    d = 3.0 / np.sqrt(3) * EA0
    rate = w0**3 * d**2 / (3 * np.pi * EPS0 * HBAR * C**3)
    rabi = d * np.sqrt(field_squared(INTENSITY)) / HBAR
    expected = rate * (w / w0) ** 3 * (rabi / 2) ** 2 * (1 / (w0 - w) + 1 / (w0 + w)) ** 2
    assert found.rayleigh[0] == pytest.approx(expected, rel=1e-10)
    assert found.raman[0] == 0.0
    assert found.uncertainty[0, 0] == pytest.approx(expected * 2 * 2 * 0.01, rel=1e-9)


def test_elastic_scattering_is_that_of_the_polarisability() -> None:
    """A remainder alone scatters w^3 (alpha E0/2)^2/(3 pi eps0 hbar c^3), the cross-section of a polarisable body."""
    lower, upper = level(0, 0, name="g"), level(2, 0, g_J=1.0, name="e", parity=-1)
    item = line(lower, upper, centroid=quantity(5e8), reduced_dipole=quantity(1e-9, None, "e*a0"))
    whole = replace(atom(item), core_polarisability={"g": quantity(10.0)})
    found = solve(whole, "g", Light(900.0, INTENSITY, drive_of(40.0, 10.0, 0.0)))
    w = 2e6 * np.pi * MHZ_NM / 900.0
    dipole = 10.0 * POLARISABILITY_SI * np.sqrt(field_squared(INTENSITY)) / 2
    assert found.rayleigh[0] == pytest.approx(w**3 * dipole**2 / (3 * np.pi * EPS0 * HBAR * C**3), rel=1e-9)


def test_d_lines_far_off_resonance() -> None:
    """Linear light far from the D lines induces a dipole s E - i v E x sigma, and scatters (s^2 + 2 v^2) E^2.

    s and v are the scalar and vector sums over the two lines; hyperfine structure is not resolved there.
    """
    light = Light(1064.0, INTENSITY, drive_of(90.0, 0.0, 0.0))
    total = solve(RB87, GROUND.name, light).total
    w = 2e6 * np.pi * light.frequency_mhz
    terms = []
    for item in (D1, D2):
        wk = 2e6 * np.pi * item.centroid.value  # type: ignore[union-attr]
        d = item.reduced_dipole.value * EA0  # type: ignore[union-attr]
        terms.append((d**2 / HBAR * (1 / (wk - w) + 1 / (wk + w)), d**2 / HBAR * (1 / (wk - w) - 1 / (wk + w))))
    s, v = sum(t[0] for t in terms) / 6, (-terms[0][1] + terms[1][1] / 2) / 6
    square = field_squared(INTENSITY) / 4
    expected = w**3 * square * (s**2 + 2 * v**2) / (3 * np.pi * EPS0 * HBAR * C**3)
    assert total == pytest.approx(np.full(8, expected), rel=2e-3)


def test_raman_scattering_fades_between_distant_lines() -> None:
    """The Raman part fades as the amplitudes of the two lines cancel (Cline et al., Opt. Lett. 19, 207, 1994)."""
    share = {}
    for wavelength in (820.0, 1064.0, 1550.0):
        found = solve(RB87, GROUND.name, Light(wavelength, INTENSITY, drive_of(90.0, 0.0, 0.0)))
        share[wavelength] = found.raman[4] / found.rayleigh[4]
    assert share[820.0] > 20 * share[1064.0]
    assert 5e-4 < share[1064.0] < 1.5e-3
    assert share[1550.0] < share[1064.0]


@pytest.mark.parametrize("wavelength", [560.0, 1000.0])
def test_rates_against_full_dimension(wavelength: float) -> None:
    """Every rate within J = 2 with lines both ways is that of a construction from Cartesian matrices, in a field."""
    eps = EPS / np.linalg.norm(EPS)
    drive = ((eps[0] + 1j * eps[1]) / np.sqrt(2), eps[2], -(eps[0] - 1j * eps[1]) / np.sqrt(2))
    light = Light(wavelength, INTENSITY, drive)
    field = 60.0
    found = solve(INVENTED, MIDDLE.name, light, field)
    energies, states = np.linalg.eigh(hamiltonian(MIDDLE, np.array([0.0, 0.0, field])))
    total = np.zeros((3, energies.size, energies.size), dtype=complex)
    for item in LINES:
        centre, d = item.centroid.value, cartesian(item)  # type: ignore[union-attr]
        other, frequency = (item.upper, centre)
        if item.lower.name != MIDDLE.name:
            other, frequency, d = item.lower, -centre, np.conj(d).swapaxes(1, 2)
        far, turn = np.linalg.eigh(hamiltonian(other, np.array([0.0, 0.0, field])))
        d = np.stack([turn.conj().T @ part @ states for part in d])
        V, back = np.tensordot(eps, d, 1), np.tensordot(eps.conj(), d, 1)
        gap = frequency + far[:, None] - energies[None, :]
        for axis in range(3):
            total[axis] += d[axis].conj().T @ (V / (gap - light.frequency_mhz))
            total[axis] += (back / (gap + light.frequency_mhz)).conj().T @ d[axis]
    w = 2e6 * np.pi * (light.frequency_mhz + energies[None, :] - energies[:, None])
    scale = (EA0 / H * 1e-6) ** 2 * field_squared(INTENSITY) / 4 * EA0**2
    rates = w**3 * scale * (np.abs(total) ** 2).sum(axis=0) / (3 * np.pi * EPS0 * HBAR * C**3)
    assert np.sort(found.total - sum(found.elsewhere.values())) == pytest.approx(np.sort(rates.sum(axis=0)), rel=1e-6)
    assert np.sort(found.rayleigh) == pytest.approx(np.sort(np.diag(rates)), rel=1e-6)
    assert found.table.sum() == pytest.approx(rates.sum(), rel=1e-8)


def spinning(twice_S: int) -> tuple[Atom, list[Line]]:
    """S - P - D levels of one valence electron with spin S, fine structure switched off: dipoles by LS coupling."""
    radial = {("s", "p"): 2.0, ("p", "d"): 3.0}
    letters, L = "SPD", {"s": 0, "p": 1, "d": 2}
    height = {"s": 0.0, "p": 5.0e8, "d": 2.0e8}
    levels = {
        (name, J): level(
            J, 0, g_J=0.0, name=f"{name}_{twice_S + 1}{letters[l]}{J}/2", parity=(-1) ** l,
            configuration=name, term=f"{twice_S + 1}{letters[l]}",
        )
        for name, l in L.items()
        for J in range(abs(2 * l - twice_S), 2 * l + twice_S + 1, 2)
    }  # fmt: skip
    lines = []
    for (low, J), lower in levels.items():
        for (up, K), upper in levels.items():
            radius = radial.get((low, up)) or radial.get((up, low))
            if radius is None or height[low] > height[up] or abs(J - K) > 2 or (J == 0 and K == 0):
                continue
            symbol = wig6jj(2 * L[up], K, twice_S, J, 2 * L[low], 2)
            size = abs(np.sqrt((J + 1) * (K + 1)) * symbol * radius)
            if size > 0:
                name = f"{low}{J}{up}{K}"
                frequency = quantity(height[up] - height[low], None, "MHz")
                lines.append(line(lower, upper, name=name, centroid=frequency, reduced_dipole=quantity(size)))
    return atom(*lines), lines


@pytest.mark.parametrize("twice_S", [1, 2])
def test_spin_looks_on_when_fine_structure_is_small(twice_S: int) -> None:
    """Without fine structure the rates into D, summed over J, do not know the spin: the signs are right."""
    light = Light(900.0, INTENSITY, drive_of(50.0, 15.0, 20.0))
    plain, _ = spinning(0)
    orbital = solve(plain, "s_1S0/2", light)
    whole, lines = spinning(twice_S)
    found = solve(whole, f"s_{twice_S + 1}S{twice_S}/2", light)
    assert not found.without_interference
    into_d = sum(rates for name, rates in found.elsewhere.items() if name.startswith("d"))
    assert into_d == pytest.approx(np.full(twice_S + 1, sum(orbital.elsewhere.values())[0]), rel=1e-9)
    assert found.rayleigh == pytest.approx(np.full(twice_S + 1, orbital.rayleigh[0]), rel=1e-9)
    assert np.abs(found.raman).max() < 1e-12 * orbital.rayleigh[0]
    assert {lande_sign(item) for item in lines} == {1, -1}


def test_unknown_signs_are_told() -> None:
    """Ways through levels without a common multiplet are added without interference, and the final level is named."""
    whole, _ = spinning(1)
    jj = replace(
        whole,
        lines=tuple(
            replace(item, lower=replace(item.lower, coupling="JJ"), upper=replace(item.upper, coupling="JJ"))
            for item in whole.lines
        ),
    )
    found = solve(jj, "s_2S1/2", Light(900.0, INTENSITY, drive_of(90.0, 0.0, 0.0)))
    assert found.without_interference == ("d_2D3/2",)


def test_light_too_red_for_a_final_level_scatters_nothing_there() -> None:
    """A final level further up than a photon carries is not listed."""
    whole, _ = spinning(1)
    found = solve(whole, "s_2S1/2", Light(MHZ_NM / 1.9e8, INTENSITY, drive_of(90.0, 0.0, 0.0)))
    assert found.elsewhere == {}
