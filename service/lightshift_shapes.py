"""The shapes of answers about light shifts and polarisabilities."""

from pydantic import Field

from service.light import Fractions, LeftOut
from service.schemas import Labels, MaybeNumbers, Numbers, Scalar, Shape, Tabular


class Three(Shape):
    """Scalar, vector and tensor polarisability."""

    scalar: Scalar
    vector: Scalar
    tensor: Scalar


class OfHyperfineLevel(Shape):
    """The polarisability of one hyperfine level, from the components of every line at their own frequencies."""

    F: float
    scalar: Scalar
    vector: Scalar
    tensor: Scalar


class Share(Shape):
    """What one line adds to the polarisability of the whole level."""

    line: str
    other_level: str
    wavelength_nm: float
    dipole_ea0: float = Field(description="reduced dipole element, symmetric in J and J'")
    strength_evidence: str = Field(description="checked, recalled or computed")
    scalar_a03: float | None
    vector_a03: float | None
    tensor_a03: float | None


class FictitiousField(Shape):
    """The magnetic field that acts on J as the vector shift does; the beam lies in the plane of x and z."""

    x_G: float | None
    y_G: float | None
    z_G: float | None
    reason: str


class Trap(Shape):
    """What the beam's focus does to the sublevel asked for, or to the mean of all; null without power and waist."""

    of: str = Field(description="the sublevel, or mean")
    trapped: bool | None = Field(description="false where the shift is positive: the focus repels")
    depth_MHz: float | None
    depth_uK: float | None
    depth_recoils: float | None
    frequency_x_Hz: float | None
    frequency_y_Hz: float | None
    frequency_axial_Hz: float | None
    rayleigh_range_um: float | None
    sag_um: float | None = Field(description="how far gravity pulls along x")
    opened_by_gravity: bool | None
    recoil_Hz: float | None
    scattering_per_s: float | None
    heating_uK_per_s: float | None
    reason: str = Field(description="why members are null; else empty")


class OtherLevel(Shape):
    """Raman scattering into another level, of the sublevel asked for or the mean of all."""

    level: str
    rate_per_s: float
    interference: bool = Field(description="false where ways whose relative sign nobody published are added as rates")


class Elements(Shape):
    """The off-diagonal elements of the operator that are not zero, each pair once: <row|H|column>."""

    row_F: Labels
    row_m: Labels
    column_F: Labels
    column_m: Labels
    real_MHz: Numbers
    imaginary_MHz: Numbers


class ShiftColumns(Shape):
    """One row for each sublevel, by F and m."""

    F: Labels
    m: Labels
    polarisability_a03: Numbers = Field(description="of the sublevel in this light")
    polarisability_uncertainty_a03: MaybeNumbers
    shift_MHz: Numbers = Field(description="diagonal element of the operator")
    shift_uncertainty_MHz: MaybeNumbers = Field(description="without that of the intensity")
    coupling_MHz: Numbers = Field(description="size of the largest off-diagonal element")
    dressed_shift_MHz: Numbers = Field(description="shift of the eigenstate of field and light together")
    overlap: Numbers = Field(description="weight of the sublevel in that eigenstate; below 0.5 the label is ambiguous")
    rayleigh_per_s: Numbers = Field(description="photons scattered without a change of sublevel")
    rayleigh_uncertainty_per_s: MaybeNumbers
    raman_per_s: Numbers = Field(description="photons that leave another sublevel of the level")
    raman_uncertainty_per_s: MaybeNumbers
    elsewhere_per_s: Numbers = Field(description="photons that leave another level")
    excited: Numbers = Field(description="share of the time in excited levels; must be small")


class LightshiftAnswered(Tabular):
    """The light shift of every sublevel of a level."""

    atom: str
    level: str
    intensity_mW_per_cm2: float = Field(description="that the shifts are for: as asked, or the beam's peak")
    fractions: Fractions
    circularity: float = Field(description="along the field, -1 to 1")
    polarisability: Three
    hyperfine: list[OfHyperfineLevel]
    shares: list[Share]
    left_out: LeftOut
    fictitious_field: FictitiousField
    trap: Trap
    elsewhere: list[OtherLevel]
    elements: Elements
    columns: ShiftColumns


class CurveColumns(Shape):
    """One row for each wavelength; null within a line."""

    wavelength_nm: Numbers
    scalar_a03: MaybeNumbers
    scalar_uncertainty_a03: MaybeNumbers
    vector_a03: MaybeNumbers
    vector_uncertainty_a03: MaybeNumbers
    tensor_a03: MaybeNumbers
    tensor_uncertainty_a03: MaybeNumbers


class StaticShare(Shape):
    """What one line adds to the static scalar polarisability."""

    line: str
    other_level: str
    wavelength_nm: float
    dipole_ea0: float
    strength_evidence: str
    static_a03: float


class PolarisabilityAnswered(Tabular):
    """A polarisability against wavelength."""

    atom: str
    level: str
    static: Three
    shares: list[StaticShare]
    left_out: LeftOut
    columns: CurveColumns
