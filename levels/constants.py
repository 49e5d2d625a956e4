"""The physical constants, CODATA 2022 as scipy distributes them, in the units the trade computes in.

Nothing else in the project spells out a constant. Their own uncertainties (1e-10 or better, where not exact) are
neglected beside those of the atomic data. G_S is positive: H = muB g_J J_z B.
"""

from scipy.constants import physical_constants as _codata

CODATA_YEAR = 2022


def _value(name: str) -> float:
    return float(_codata[name][0])


C = _value("speed of light in vacuum")  # m/s, exact
H = _value("Planck constant")  # J s, exact
HBAR = _value("reduced Planck constant")  # J s
KB = _value("Boltzmann constant")  # J/K, exact
E = _value("elementary charge")  # C, exact
EPS0 = _value("vacuum electric permittivity")  # F/m
U = _value("unified atomic mass unit")  # kg
M_E = _value("electron mass")  # kg
A0 = _value("Bohr radius")  # m
EA0 = E * A0  # C m, the atomic unit of an electric dipole
ALPHA = _value("fine-structure constant")
HARTREE_MHZ = _value("Hartree energy in eV") * E / H * 1e-6
RYDBERG_PER_CM = _value("Rydberg constant") * 1e-2
G_S = -_value("electron g factor")

MU_B = _value("Bohr magneton")  # J/T
MU_N = _value("nuclear magneton")  # J/T
MU_B_MHZ_PER_GAUSS = _value("Bohr magneton in Hz/T") * 1e-10
MU_N_MHZ_PER_GAUSS = _value("nuclear magneton in MHz/T") * 1e-4
M_E_OVER_M_P = 1.0 / _value("proton-electron mass ratio")  # muN / muB
M_E_U = _value("electron mass in u")

MHZ_PER_WAVENUMBER = C * 1e-4  # 1 cm-1 = 29979.2458 MHz, exact
MHZ_NM = C * 1e3  # vacuum wavelength (nm) = MHZ_NM / frequency (MHz), exact
POLARISABILITY_SI = _value("atomic unit of electric polarizability")  # C2 m2/J per a0^3
