"""The shapes of isotopes, levels, lines, publications and the release, as the catalogue answers them."""


from pydantic import Field

from service.schemas import Answered, Curated, Half, Shape, Texts


class AtomRecord(Shape):
    """An isotope of one charge."""

    name: str
    element: str
    charge: int
    Z: int
    mass_number: int
    nuclear_spin: Half
    ground_level: str


class AtomsAnswered(Answered):
    """Every isotope."""

    atoms: list[AtomRecord]


class CoolingRecord(Shape):
    """A line that might cool, and where its upper level decays besides."""

    line: str
    aliases: Texts
    lower: str
    upper: str
    wavelength: Curated = Field(description="in vacuum")
    width: Curated = Field(description="full natural width of the upper level, Gamma/2pi")
    branching: Curated = Field(description="fraction that decays back on this line")
    is_cycling: bool = Field(description="J grows by one, so that stretched sublevels decay to one sublevel only")
    closed: str = Field(description="yes: 99 % or more return; no; unknown: the branching is not in the catalogue")
    leak_lines: Texts = Field(description="other lines of the upper level: candidates for repumping")
    leak_levels: Texts = Field(description="where those lead, in the same order")


class AtomAnswered(Answered):
    """One isotope."""

    name: str
    element: str
    charge: int
    Z: int
    mass_number: int
    nuclear_spin: Half
    ground_level: str
    mass: Curated = Field(description="of the neutral atom")
    abundance: Curated
    half_life: Curated
    g_I: Curated = Field(description="in Bohr magnetons, with the sign of H = muB (g_J J + g_I I) B")
    moment: Curated = Field(description="nuclear magnetic moment")
    quadrupole: Curated = Field(description="nuclear electric quadrupole moment")
    levels: Texts
    lines: Texts
    cooling_lines: list[CoolingRecord] = Field(
        description="dipole lines from levels that live long, widest first; whether they are closed as far as is known"
    )


class LevelRecord(Shape):
    """One level of an isotope."""

    name: str
    aliases: Texts
    configuration: str
    term: str
    coupling: str
    J: Half
    parity: str
    energy: Curated = Field(description="above the ground level, between hyperfine centroids")
    energy_of: str = Field(description="the isotope whose energy this is, or natural")
    lifetime: Curated
    width: Curated = Field(description="full natural width Gamma/2pi")
    g_J: Curated
    g_I: Curated = Field(description="in Bohr magnetons")
    A: Curated = Field(description="magnetic dipole hyperfine constant")
    B: Curated = Field(description="electric quadrupole hyperfine constant")
    C: Curated = Field(description="magnetic octupole hyperfine constant")
    notes: Texts


class LevelsAnswered(Answered):
    """Every level of an isotope."""

    atom: str
    levels: list[LevelRecord]


class LineRecord(Shape):
    """One line of an isotope."""

    name: str
    aliases: Texts
    lower: str
    upper: str
    multipole: str
    photons: int
    nominal_nm: float = Field(description="vacuum wavelength that names the line")
    frequency: Curated = Field(description="between hyperfine centroids")
    frequency_of: str = Field(description="the isotope whose frequency this is, or natural")
    wavelength: Curated = Field(description="in vacuum")
    einstein_A: Curated = Field(description="rate of this line alone")
    branching: Curated = Field(description="fraction of the upper level's decays")
    reduced_dipole: Curated
    induced: str = Field(description="what opens a line that J and the multipole alone forbid; else empty")
    notes: Texts


class LinesAnswered(Answered):
    """Every line of an isotope."""

    atom: str
    lines: list[LineRecord]


class SourceAnswered(Answered):
    """One publication."""

    id: str
    citation: str
    doi: str
    csl_json: str = Field(description="the entry as a CSL-JSON item, as text: its own keys are not identifiers")


class TallyRecord(Shape):
    """How much of a species is in the catalogue and how far it was compared."""

    species: str
    isotopes: int
    levels: int
    lines: int
    values: int
    checked: int
    recalled: int
    computed: int
    alternatives: int
    exceptions: int = Field(description="answered findings of the audit")


class ReleaseAnswered(Answered):
    """The data release and the program that serves it."""

    version: str = Field(description="version of the program")
    species: int
    isotopes: int
    levels: int = Field(description="counted once for each isotope")
    lines: int = Field(description="counted once for each isotope")
    publications: int
    values: int = Field(description="recommended values")
    checked: int = Field(description="of them, compared with their publication or with an open data set")
    recalled: int = Field(description="of them, entered from memory of their publication")
    computed: int = Field(description="of them, following from others by a stated formula")
    alternatives: int = Field(description="other published values, kept beside the recommended ones")
    overlaid: Texts = Field(description="species with values of this laboratory's own")
    tally: list[TallyRecord] = Field(description="the same, species by species")
