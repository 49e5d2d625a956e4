"""What the physics is given: one isotope's levels and lines with their constants.

The catalogue makes these records from the data files; a test can write one by hand. Angular momenta are kept
doubled (`twice_J = 3` is J = 3/2), so that half-integers stay exact.
"""

from dataclasses import dataclass, field

from levels.quantity import Quantity


@dataclass(frozen=True, slots=True)
class Isotope:
    """One isotope of one charge: `87Rb`, `40Ca+`."""

    name: str
    symbol: str
    charge: int
    Z: int
    mass_number: int
    twice_I: int
    ground: str
    mass: Quantity | None = None
    abundance: Quantity | None = None
    half_life: Quantity | None = None
    g_I: Quantity | None = None
    moment: Quantity | None = None
    quadrupole: Quantity | None = None


@dataclass(frozen=True, slots=True)
class Level:
    """One fine-structure level of one isotope, with its hyperfine constants.

    `g_J`, `A`, `B`, `C` follow H/h = A I.J + B (quadrupole) + C (octupole) + (muB/h)(g_J J_z + g_I I_z) B with A, B, C
    in MHz and both g factors in units of the Bohr magneton. `energy` is in cm-1 above the ground level (centroids),
    `lifetime` in s, `width` (Gamma/2pi, full natural width) in MHz. A constant nobody has published is None.
    `neighbours` are the levels of the same configuration and LS term with J +- 1, as (2J', E(J') - E(J) in MHz).
    """

    atom: str
    name: str
    twice_J: int
    twice_I: int
    parity: int
    configuration: str = ""
    term: str = ""
    coupling: str = "LS"
    aliases: tuple[str, ...] = ()
    g_J: Quantity | None = None
    g_I: Quantity | None = None
    A: Quantity | None = None
    B: Quantity | None = None
    C: Quantity | None = None
    energy: Quantity | None = None
    energy_of: str = ""  # "40" or "natural": the isotope whose energy this is
    lifetime: Quantity | None = None
    width: Quantity | None = None
    neighbours: tuple[tuple[int, float], ...] = ()
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Line:
    """One line of one isotope between the centroids of two levels.

    `rank` is the multipole rank (1 for E1 and M1, 2 for E2, 3 for E3; 0 or 2 for two equal photons). `centroid` is the
    frequency in MHz between the hyperfine centroids (of two photons the sum), `wavelength` the vacuum wavelength in nm
    of each photon. `einstein_A` is the partial rate of this line in s-1, `branching` its fraction of the upper level's
    decays. `measured` are the components of this isotope that were measured themselves, as (2F, 2F', frequency in MHz).
    `centroid_isotope` says whose frequency the centroid's is: the isotope itself, or "natural" when only the element's
    average is known.
    """

    atom: str
    name: str
    lower: Level
    upper: Level
    multipole: str = "E1"
    rank: int = 1
    aliases: tuple[str, ...] = ()
    nominal_nm: float = 0.0
    photons: int = 1
    induced: str = ""  # "hyperfine" or "magnetic field" where J and the multipole alone forbid the line
    centroid: Quantity | None = None
    centroid_isotope: str = ""
    measured: tuple[tuple[int, int, Quantity], ...] = ()
    wavelength: Quantity | None = None
    einstein_A: Quantity | None = None
    branching: Quantity | None = None
    reduced_dipole: Quantity | None = None
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Atom:
    """An isotope with all its levels and lines, in the order of the data file.

    Polarisabilities are by level, scalar, in a0^3: of the core, of the levels above those of the file, and the whole
    static one.
    """

    isotope: Isotope
    levels: tuple[Level, ...] = ()
    lines: tuple[Line, ...] = ()
    core_polarisability: dict[str, Quantity] = field(default_factory=dict)
    tail_polarisability: dict[str, Quantity] = field(default_factory=dict)
    static_polarisability: dict[str, Quantity] = field(default_factory=dict)
