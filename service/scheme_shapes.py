"""The shapes of what is answered about a scheme: beams, components, populations, dark states, findings."""

from pydantic import Field

from service.schemas import Answered, Labels, MaybeNumbers, Numbers, Scalar, Shape, Texts


class FieldRecord(Shape):
    """The field and its direction; without a field the quantisation axis is the laboratory z."""

    magnitude: Scalar
    x: float
    y: float
    z: float


class BeamRecord(Shape):
    """One beam as the library took it."""

    name: str
    line: str
    lower_level: str
    upper_level: str
    offset: Scalar = Field(description="laser frequency from the line's centroid")
    frequency: Scalar = Field(description="laser frequency")
    intensity: Scalar
    saturation: Scalar = Field(description="I/I_sat of a component of strength 1, 2 (Omega/Gamma)^2")
    rabi: Scalar = Field(description="Rabi frequency over 2 pi of a component of strength 1, driven purely")
    angle_to_field: Scalar
    helicity: Scalar = Field(description="mean photon spin along the beam, from -1 to 1")
    ellipticity: Scalar = Field(description="from -45 (helicity -1) to 45 degrees")
    azimuth: Scalar = Field(description="long axis of the ellipse, from the first transverse axis")
    first_axis_x: float = Field(description="the first transverse axis, that angles of the polarisation count from")
    first_axis_y: float
    first_axis_z: float
    wanted: str = Field(description="what the beam is meant to drive; empty for everything")
    unwanted_near: int = Field(description="unwanted components within `linewidths` natural widths")


class PolarisationColumns(Shape):
    """One row for each beam and each q = m' - m of its line's multipole."""

    beam: Texts
    q: list[int]
    polarisation: Texts
    fraction: Numbers = Field(description="share of the light that drives this q")
    amplitude_re: Numbers = Field(description="complex amplitude along the field")
    amplitude_im: Numbers
    attainable: Numbers = Field(description="largest share that any light in this direction reaches")
    half_wave_deg: MaybeNumbers = Field(
        description="fast axis of a half-wave plate after the polariser that reaches it"
    )
    quarter_wave_deg: MaybeNumbers = Field(description="fast axis of the quarter-wave plate after that")


class ComponentColumns(Shape):
    """One row for each component that a beam drives, strongest first."""

    beam: Texts
    line: Texts
    lower_level: Texts
    lower_F: Labels
    lower_m: Labels
    upper_level: Texts
    upper_F: Labels
    upper_m: Labels
    polarisation: Texts
    detuning_MHz: Numbers = Field(description="laser minus component, at this field")
    detuning_linewidths: Numbers = Field(description="its size in natural widths of the upper level")
    rabi_MHz: Numbers = Field(description="Rabi frequency over 2 pi")
    saturation: Numbers = Field(description="2 Omega^2/(Gamma^2 + 4 Delta^2)")
    scattering_per_s: Numbers = Field(description="at low saturation, for an atom in the lower sublevel")
    wanted: list[bool] = Field(description="whether the beam is meant to drive it")
    near: list[bool] = Field(description="whether it is within `linewidths` natural widths")


class OtherLineColumns(Shape):
    """Other lines of the atom, from the levels of the scheme, that a beam drives off resonance."""

    beam: Texts
    line: Texts
    lower_level: Texts
    upper_level: Texts
    detuning_GHz: Numbers
    rabi_MHz: Numbers = Field(description="of a component of strength 1")
    scattering_per_s: Numbers = Field(description="at most, for a component of strength 1")


class PopulationColumns(Shape):
    """The steady state, one row for each sublevel that light or decays reach."""

    level: Texts
    F: Labels
    m: Labels
    energy_MHz: Numbers = Field(description="from the level's centroid, without light")
    population: Numbers = Field(description="share of the atoms")


class LineColumns(Shape):
    """Spontaneous photons per atom on each line."""

    line: Texts
    photons_per_s: Numbers


class ManifoldRecord(Shape):
    """One hyperfine level at the lower end of a driven line."""

    name: str
    sublevels: int
    beams: Texts = Field(description="the beams within reach of its resonances")
    pump: Scalar = Field(description="largest excitation rate of any state in it; 0 where no beam is near")
    dark_states: int


class DarkRecord(Shape):
    """One dark state of a hyperfine level, as a vector in `dark_amplitudes`."""

    state: int
    manifold: str
    text: str
    held: Scalar = Field(description="share of the atoms in it")
    mixing: Scalar = Field(description="how fast the field turns it into other states, over 2 pi")
    residual: Scalar = Field(description="rate at which light far from resonance still excites it")
    stationary: bool = Field(description="whether the field leaves it dark for good")


class AmplitudeColumns(Shape):
    """Amplitudes of dark states: one row for each state and sublevel."""

    state: list[int]
    level: Texts
    F: Labels
    m: Labels
    amplitude_re: Numbers
    amplitude_im: Numbers


class PumpingRecord(Shape):
    """Optical pumping to the target; without one to the sublevel that ends with most atoms, the best these beams do."""

    target: str
    asked: bool = Field(description="whether it was asked for")
    purity: Scalar = Field(description="share of the atoms that end in the target")
    mean_time: Scalar = Field(description="integral of the missing population over its start")
    slowest_time: Scalar = Field(description="longest time constant")
    photons: Scalar = Field(description="photons that the approach costs, per atom")
    recoils: Scalar = Field(description="recoil energies that it costs: one for each absorption and emission")
    heating: Scalar = Field(description="two thirds of that energy over kB")
    fullest: str = Field(description="the sublevel that ends with most atoms")
    fullest_share: Scalar


class ExitColumns(Shape):
    """Where atoms leave the cycle to."""

    name: Texts
    share: Numbers


class CyclingRecord(Shape):
    """Photons before an atom leaves the levels that the beams address."""

    photons: Scalar
    per_photon: Scalar = Field(description="chance of leaving per photon")
    time: Scalar
    exits: ExitColumns


class FindingRecord(Shape):
    """One finding; /v1/findings lists every kind."""

    code: str
    severity: str = Field(description="problem, warning or note")
    about: str
    text: str
    value: float | None = Field(description="the number behind it; null where none belongs to it")
    unit: str
    change: str = Field(description="what would change it")


class SchemeAnswered(Answered):
    """A scheme checked: what each beam drives, where the atoms end up, and what to change."""

    atom: str
    works: bool = Field(description="whether no finding is a problem")
    findings: list[FindingRecord]
    model: str = Field(description="`bloch` (optical Bloch equations) or `rate` (rate equations)")
    model_reason: str
    unique: bool = Field(description="whether the steady state is the same wherever atoms start")
    field: FieldRecord
    scattering: Scalar = Field(description="spontaneous photons per atom in the steady state")
    scattering_by_rates: Scalar = Field(description="what rate equations would give")
    scattering_by_line: LineColumns
    lost: Scalar = Field(description="rate of losing atoms for good")
    beams: list[BeamRecord]
    polarisations: PolarisationColumns
    components: ComponentColumns
    other_lines: OtherLineColumns
    populations: PopulationColumns
    manifolds: list[ManifoldRecord]
    dark_states: list[DarkRecord]
    dark_amplitudes: AmplitudeColumns
    shared_dark: AmplitudeColumns = Field(
        description="exactly stationary dark states of all lasers together, over several levels at a two-photon"
        " resonance; empty with rate equations"
    )
    pumping: PumpingRecord
    cycling: CyclingRecord
