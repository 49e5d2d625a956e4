"""The shapes of leaks, repumpers and sets of them, as `repump` answers them."""

from pydantic import Field

from service.schemas import Answered, Scalar, Shape, Texts


class Drive(Shape):
    """One laser that is there."""

    drive: str
    lower_level: str
    upper_level: str
    detuning_MHz: float
    saturation: float


class Leak(Shape):
    """One state that the drives do not address."""

    level: str
    F: float | None = Field(description="null at the resolution of whole levels")
    per_photon: Scalar = Field(description="how often it is entered for each photon scattered from the cooling laser")
    per_photon_at_most: Scalar = Field(description="the same where unknown branching goes there; else equal")
    cause: str = Field(description="decay, or off-resonant excitation of another hyperfine level")
    through: Texts = Field(description="the levels it comes from, most frequent first")
    fate: str = Field(description="lost, returns, or either")
    returns: Scalar = Field(description="probability to come back to the cycle")
    lifetime: Scalar


class RepumperRecord(Shape):
    """One laser that empties a leak."""

    rank: int
    line: str
    empties: str
    upper_level: str
    multipole: str
    components: Texts = Field(description="hyperfine components F-F' that it needs; empty where there are none")
    frequency: Scalar = Field(description="of the first component, or of the line")
    vacuum_wavelength: Scalar
    air_wavelength: Scalar
    offset: Scalar = Field(description="frequency less that of the cooling laser")
    sidebands_MHz: list[float | None] = Field(description="each component less the first")
    reach: str = Field(description="what makes that offset: acousto-optic, electro-optic, another laser")
    photons_before_loss: Scalar = Field(description="with this laser beside the drives; null when the cycle is closed")
    photons_at_most: Scalar = Field(description="the same with unknown branching at its best")
    closes: bool = Field(description="whether it closes the cycle by data or selection rule")
    repump_photons: Scalar = Field(description="photons that it scatters for each one of the cooling laser")
    photons_per_leak: Scalar = Field(description="photons that it scatters for each entry into the leak")
    relative_power: Scalar = Field(description="power that saturates it over that of the cooling line, same beam")
    field_spread: Scalar = Field(description="rms spread of its Zeeman components at the field")
    opens: Texts = Field(description="dark states that its decays reach or may reach and the drives' do not")
    shares_upper_level: bool = Field(description="whether it ends where a drive ends: coherent dark resonances")
    closure: str = Field(description="of its upper level's decays: data, selection rule, unknown or metastable")
    notes: Texts


class SchemeRecord(Shape):
    """A set of repumpers beside the drives."""

    rank: int
    lasers: Texts
    photons_before_loss: Scalar
    photons_at_most: Scalar
    closes: bool
    repump_photons: Scalar
    opens: Texts


class Elsewhere(Shape):
    """A metastable level that no decay reaches; collisions or other light may fill it."""

    level: str
    lifetime: Scalar
    lines: Texts = Field(description="lines that empty it")


class RepumpAnswered(Answered):
    """Leaks and repumpers."""

    atom: str
    resolution: str = Field(description="level or hyperfine")
    drives: list[Drive]
    photons_before_loss: Scalar = Field(
        description="photons of the cooling laser before loss, unknown branching at its worst; null if closed"
    )
    photons_at_most: Scalar = Field(description="the same with unknown branching at its best")
    loss_per_photon: Scalar
    emitted_per_photon: Scalar = Field(description="photons emitted on the cooling line for each one scattered from it")
    time_before_loss: Scalar = Field(description="mean time, by rate equations between evenly filled levels")
    closure: str = Field(description="what closes the decays on the way: data, selection rule, or unknown")
    unpublished: Texts = Field(description="what is not published and where it may go")
    leaks: list[Leak]
    repumpers: list[RepumperRecord]
    schemes: list[SchemeRecord] = Field(description="sets of two or more repumpers, best first")
    elsewhere: list[Elsewhere]
    search: Texts = Field(description="how far the search went")
