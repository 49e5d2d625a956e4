"""The shapes of a frequency plan: what is asked for, and what is answered."""

from typing import Annotated, Any, Literal

from pydantic import Field

from service.measures import LightMhz, Megahertz, PositiveMhz
from service.parameters import FieldGauss, Name, Sublevel
from service.question import Computed, Strict
from service.schemas import Answered, Scalar, Shape, Texts

Label = Annotated[str, Field(min_length=1, max_length=40)]


class WantedAsked(Strict):
    """One laser frequency: a component with detuning and field, or the frequency itself."""

    name: Label = Field(description="what the plan calls it")
    atom: Name | None = Field(None, description="isotope and charge, as `87Rb`")
    line: Name | None = Field(None, description="line, as `780`")
    component: Label | None = Field(None, description="F-F' without a field, as `2-3`; the line's centroid if left out")
    lower: Sublevel | None = Field(None, description="F,m of the lower sublevel, in a field")
    upper: Sublevel | None = Field(None, description="F,m of the upper sublevel, in a field")
    field: FieldGauss = Field(0.0, description="magnetic field along z, in gauss or with a unit")
    detuning: Megahertz = Field(0.0, description="laser less component, in MHz or with a unit")
    frequency: LightMhz | None = Field(None, description="the frequency itself, in MHz or with a unit")
    locks: list[Label] = Field([], max_length=8, description="the locks it may use; all when empty")


class LockAsked(Strict):
    """One lock point."""

    name: Label
    kind: Literal["feature", "frequency", "comb", "beat"] = Field(
        description="a spectroscopic feature, a stated frequency, a comb or cavity, or a beat with another laser"
    )
    atom: Name | None = Field(None, description="of a feature: isotope and charge")
    line: Name | None = Field(None, description="of a feature: line")
    feature: Label | None = Field(None, description="of a feature: `2-3`, or a crossover `2-(2,3)`; else the centroid")
    frequency: LightMhz | None = Field(None, description="of a stated frequency, or of any one line of a comb, in MHz")
    uncertainty: PositiveMhz | None = Field(None, description="standard uncertainty of that frequency, in MHz")
    spacing: PositiveMhz | None = Field(None, description="of a comb or cavity: distance of its lines, in MHz")
    span: PositiveMhz | None = Field(
        None,
        description="of a comb: how far its lines reach to either side of the stated one; 10 THz if left out",
    )
    beat_with: Label | None = Field(
        None, description="of a beat: a wanted frequency that stands before, or a lock of fixed frequency"
    )
    beat_low: PositiveMhz | None = Field(None, description="lowest beat frequency, in MHz; either sign is tried")
    beat_high: PositiveMhz | None = Field(None, description="highest beat frequency, in MHz")


class ModulatorAsked(Strict):
    """One device: its range as centre and bandwidth or as low and high."""

    name: Label
    kind: Literal["acousto-optic", "electro-optic", "harmonic"]
    centre: PositiveMhz | None = Field(None, description="centre of its range, in MHz")
    bandwidth: PositiveMhz | None = Field(None, description="full width of its range, in MHz")
    low: PositiveMhz | None = Field(None, description="lowest frequency, in MHz, instead of centre and bandwidth")
    high: PositiveMhz | None = Field(None, description="highest frequency, in MHz")
    orders: list[int] = Field([1, -1], min_length=1, max_length=8, description="signed diffraction or sideband orders")
    passes: int = Field(1, ge=1, le=2, description="of an acousto-optic modulator: 1 or 2")
    factor: int = Field(2, ge=2, le=8, description="of a harmonic stage: 2 for doubling")
    step: PositiveMhz = Field(0.0, description="resolution of its synthesiser, in MHz; 0 for none")
    place: Literal["atoms", "lock"] = Field(
        "atoms", description="between laser and atoms, or between laser and lock point"
    )


class ShareAsked(Strict):
    """Wanted frequencies that come from one laser, perhaps through one modulator that all pass first."""

    wanted: list[Label] = Field(min_length=2, max_length=12)
    modulator: Label | None = None


class EarlierElement(Strict):
    """One element as an earlier plan set it."""

    modulator: Label
    order: int
    frequency_MHz: float


class EarlierSetting(Strict):
    """What an earlier plan set for one wanted frequency."""

    wanted: Label
    frequency_MHz: float
    lock: str
    lock_light_MHz: float
    beat_MHz: float
    elements: list[EarlierElement] = Field(max_length=8)


class PreviousAsked(Strict):
    """An earlier plan's settings, as `plan.previous` of its answer has them."""

    release: str = Field("", max_length=200)
    settings: list[EarlierSetting] = Field(max_length=12)


class PlanAsked(Computed):
    """A frequency plan. The answer's `plan` is such a body again, with its settings as `previous`."""

    wanted: list[WantedAsked] = Field(min_length=1, max_length=12)
    locks: list[LockAsked] = Field(min_length=1, max_length=8)
    modulators: list[ModulatorAsked] = Field([], max_length=14)
    max_chain: int = Field(2, ge=0, le=4, description="how many modulators one beam may pass")
    share: list[ShareAsked] = Field([], max_length=6, description="wanted frequencies that one laser serves")
    tolerance: PositiveMhz = Field(0.001, description="how far off a frequency may be, in MHz or with a unit")
    alternatives: int = Field(3, ge=0, le=20, description="how many other ways are listed for each wanted frequency")
    previous: PreviousAsked | None = Field(None, description="an earlier plan: what moves is told, structures are kept")


class ElementRecord(Shape):
    """One modulator as it is to be set, from lock to atoms."""

    modulator: str
    kind: str
    place: str
    order: int
    passes: int
    factor: int
    frequency_MHz: float = Field(description="radio frequency; 0 for a harmonic stage")
    light_MHz: float = Field(description="the light after it")


class RouteRecord(Shape):
    """How one wanted frequency is made."""

    wanted: str
    rank: int = Field(description="0 in the plan itself; from 1 among the alternatives")
    reached: bool
    reason: str = Field(description="why it is not reached; else empty")
    frequency: Scalar = Field(description="the wanted frequency")
    lock: str
    tooth: int = Field(description="comb line, counted from the one stated")
    beat_MHz: float | None
    lock_light_MHz: float | None = Field(description="light at the lock point, comb line and beat included")
    laser_MHz: float | None = Field(description="where the laser runs, after the elements placed at the lock")
    multiplier: float | None = Field(description="product of the harmonic stages")
    gap: Scalar = Field(description="wanted frequency less multiplier times lock point: what is to be made")
    elements: list[ElementRecord]
    light_MHz: float | None = Field(description="the light that reaches the atoms")
    residual_kHz: float | None = Field(description="that light less the wanted frequency")
    share_of_range: float | None = Field(description="distance of the settings from centre over half the range, signed")
    spare_MHz: float | None = Field(description="how far the light can still be tuned on the nearer side")
    slope: Scalar = Field(description="how fast the wanted frequency moves with the field")


class Missed(Shape):
    """A wanted frequency that no chain reaches, with the nearest miss."""

    wanted: str
    lock: str
    elements: Texts = Field(description="the chain that comes nearest, as modulator and order")
    miss: Scalar = Field(description="what is still missing")
    would_do: Texts = Field(description="modulators that would reach it")


class MoveRecord(Shape):
    """What moved since the earlier plan."""

    wanted: str
    status: str = Field(description="kept, replanned, out of reach, added, or gone")
    frequency_moved_kHz: float | None
    lock_moved_kHz: float | None = Field(description="light at the lock")
    beat_moved_kHz: float | None
    modulators: Texts
    moved_kHz: list[float] = Field(description="radio frequency of each modulator, new less earlier")


class SearchRecord(Shape):
    """How far the search went."""

    options: int = Field(description="combinations of wanted frequency, lock and chain that were tried")
    exhaustive: bool = Field(description="whether every chain of up to max_chain elements was compared")
    bounds: Texts = Field(description="what was not compared")


class PlanAnswered(Answered):
    """A frequency plan."""

    settings: list[RouteRecord] = Field(description="the plan: one record for each wanted frequency")
    alternatives: list[RouteRecord] = Field(description="other ways, whether or not the plan uses their modulators")
    missed: list[Missed]
    moves: list[MoveRecord] = Field(description="against `previous`; empty without one")
    search: SearchRecord
    plan: dict[str, Any] = Field(description="the plan as a document that can be posted again")
