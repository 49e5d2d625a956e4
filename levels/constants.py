"""The physical constants, CODATA 2022 as scipy distributes them, in the units the trade computes in.

Nothing else in the project spells out a constant. Their own uncertainties (1e-10 or better, where not exact) are
neglected beside those of the atomic data. G_S is positive: H = muB g_J J_z B.
"""

from scipy.constants import physical_constants as _codata

CODATA_YEAR = 2022

C = _codata["speed of light in vacuum"][0]  # m/s, exact
H = _codata["Planck constant"][0]  # J s, exact
HBAR = _codata["reduced Planck constant"][0]  # J s
KB = _codata["Boltzmann constant"][0]  # J/K, exact
E = _codata["elementary charge"][0]  # C, exact
EPS0 = _codata["vacuum electric permittivity"][0]  # F/m
U = _codata["unified atomic mass unit"][0]  # kg
M_E = _codata["electron mass"][0]  # kg
A0 = _codata["Bohr radius"][0]  # m
EA0 = E * A0  # C m, the atomic unit of an electric dipole
ALPHA = _codata["fine-structure constant"][0]
HARTREE_MHZ = _codata["Hartree energy in eV"][0] * E / H * 1e-6
RYDBERG_PER_CM = _codata["Rydberg constant"][0] * 1e-2
G_S = -_codata["electron g factor"][0]

MU_B = _codata["Bohr magneton"][0]  # J/T
MU_N = _codata["nuclear magneton"][0]  # J/T
MU_B_MHZ_PER_GAUSS = _codata["Bohr magneton in Hz/T"][0] * 1e-10
MU_N_MHZ_PER_GAUSS = _codata["nuclear magneton in MHz/T"][0] * 1e-4
M_E_OVER_M_P = 1.0 / _codata["proton-electron mass ratio"][0]  # muN / muB
M_E_U = _codata["electron mass in u"][0]

MHZ_PER_WAVENUMBER = C * 1e-4  # 1 cm-1 = 29979.2458 MHz, exact
MHZ_NM = C * 1e3  # vacuum wavelength (nm) = MHZ_NM / frequency (MHz), exact
POLARISABILITY_SI = _codata["atomic unit of electric polarizability"][0]  # C2 m2/J per a0^3
