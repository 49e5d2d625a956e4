"""The shapes of finding lines and levels over all species: what is asked for, and what is answered."""

from typing import Annotated, Literal

from pydantic import Field

from service.parameters import Half, Name
from service.question import Asked
from service.schemas import Labels, MaybeNumbers, Numbers, Shape, Tabular, Texts

Positive = Annotated[float, Field(gt=0, le=1e12)]
Multipole = Literal["E1", "M1", "E2", "M2", "E3"]
SPECIES = Field("", max_length=400, description="only these, by commas: `Rb,Ca+` (the plus as %2B)", examples=["Rb,Sr"])
ISOTOPES = "each line once, of the isotope that shifts count from, or of every isotope"
LIMIT = Field(200, ge=1, le=5000, description="most rows")


class FindingAsked(Asked):
    """Where to look among the species."""

    species: str = SPECIES
    isotopes: Literal["reference", "all"] = Field("reference", description=ISOTOPES)
    limit: int = LIMIT


class LinesAsked(FindingAsked):
    """Lines near a wavelength, frequency or wavenumber, or all that fit the filters."""

    near: Positive | None = Field(None, description="where to look, in `unit`; else everywhere", examples=["780.2"])
    within: Positive | None = Field(None, description="how far around, in `unit`; else 0.1 %", examples=["0.5"])
    unit: Literal["nm", "THz", "cm-1"] = Field("nm", description="of `near` and `within`: of one photon")
    medium: Literal["vacuum", "air"] = Field("vacuum", description="of a wavelength in nm: vacuum, or standard air")
    min_width: Positive | None = Field(None, description="least natural width of the upper level in MHz")
    max_width: Positive | None = Field(None, description="largest natural width of the upper level in MHz")
    multipole: Multipole | None = Field(None, description="E1, M1, E2, M2 or E3")
    lower: Name | None = Field(None, description="lower level: `ground`, or a name such as `3P2`", examples=["ground"])
    upper: Name | None = Field(None, description="upper level: a name such as `1P1`")
    evidence: Literal["any", "checked"] = Field(
        "any", description="`checked`: only frequencies, widths and rates that rest on nothing entered from memory"
    )


class LevelsAsked(FindingAsked):
    """Levels that fit the filters."""

    isotopes: Literal["reference", "all"] = Field("all", description=ISOTOPES)

    level: Name | None = Field(None, description="`ground`, a name or a short spelling: `3P0`", examples=["3P0"])
    term: Name | None = Field(None, description="term as the level's name has it: `3P`, `2[3/2]`", examples=["3P"])
    J: Half | None = Field(None, description="total electronic angular momentum")
    parity: Literal["even", "odd"] | None = Field(None, description="even or odd")
    min_energy: Annotated[float, Field(ge=0)] | None = Field(None, description="least energy in cm-1")
    max_energy: Annotated[float, Field(ge=0)] | None = Field(None, description="largest energy in cm-1")
    min_lifetime: Positive | None = Field(None, description="least lifetime in s", examples=["0.1"])
    max_lifetime: Positive | None = Field(None, description="largest lifetime in s")


class LineColumns(Shape):
    """One row for each line, the nearest first; by wavelength where nothing was asked to be near."""

    atom: Texts
    line: Texts = Field(description="name of the line within its atom")
    aliases: Texts
    lower_level: Texts
    upper_level: Texts
    multipole: Texts
    photons: list[int]
    wavelength_nm: Numbers = Field(description="in vacuum, of each photon; nominal where no frequency is known")
    air_wavelength_nm: MaybeNumbers = Field(description="in standard air, 230 to 1700 nm")
    frequency_THz: MaybeNumbers = Field(description="between hyperfine centroids; for two photons their sum")
    frequency_uncertainty_THz: MaybeNumbers
    frequency_of: Texts = Field(description="the isotope whose frequency this is, or natural")
    distance_nm: MaybeNumbers = Field(description="wavelength, in the medium asked for, less that asked for")
    distance_GHz: MaybeNumbers = Field(description="frequency of each photon less that asked for")
    width_MHz: MaybeNumbers = Field(description="full natural width of the upper level, Gamma/2pi")
    einstein_A_per_s: MaybeNumbers = Field(description="rate of this line alone")
    branching: MaybeNumbers = Field(description="fraction of the upper level's decays")
    evidence: Texts = Field(description="of the frequency: checked, recalled, computed")
    source: Texts = Field(description="of the frequency")


class LinesFound(Tabular):
    """Lines over all species."""

    found: int = Field(description="how many fit; `limit` may show fewer")
    columns: LineColumns


class LevelColumns(Shape):
    """One row for each level, species by species by energy."""

    atom: Texts
    level: Texts
    configuration: Texts
    term: Texts
    J: Labels
    parity: Texts
    energy_per_cm: MaybeNumbers = Field(description="above the ground level")
    energy_of: Texts = Field(description="the isotope whose energy this is, or natural")
    lifetime_s: MaybeNumbers
    width_MHz: MaybeNumbers
    g_J: MaybeNumbers


class LevelsFound(Tabular):
    """Levels over all species."""

    found: int = Field(description="how many fit; `limit` may show fewer")
    columns: LevelColumns
