"""`remedies`: what brings the light back from dark states, each with the scattering it would give."""

from collections.abc import Callable, Iterable, Mapping
from dataclasses import replace
from functools import partial
from typing import Any

from pydantic import Field

from levels.beams import Beam, Scheme
from levels.constants import MU_B_MHZ_PER_GAUSS
from levels.errors import OutsideValidity, UnknownName
from levels.pumping import prepare, solve
from levels.remedies import modulated_scattering, orthogonal, plane_of, scan_field, second_frequency
from levels.scheme import REMEDY_ANGLES, REMEDY_LARMOR
from service.answers import Answer
from service.beams import Degrees, LightAsked, Megahertz
from service.context import Context
from service.formats import Table
from service.parameters import FieldGauss, Name
from service.polarised import columns, plain
from service.question import Question
from service.routes.scheme import EXAMPLE
from service.schemas import MaybeNumbers, Numbers, Scalar, Shape, Tabular, Texts
from service.setups import laboratory, stretched, used_by, without_uncertainty

MOST = 40
WIDTHS = (0.1, 0.3, 1.0)  # modulation rates and shifts of a second beam, in natural widths, when none are given
Row = tuple[str, float | None, float | None, float | None, float | None, float]


class RemediesAsked(LightAsked):
    """A scheme that goes dark, and what to try."""

    beam: Name | None = Field(None, description="the beam to change, and whose polarisation field angles count from")
    magnitudes: list[FieldGauss] | None = Field(
        None, max_length=MOST, description="sizes of the field to try; by default up to a Larmor frequency of one width"
    )
    angles: list[Degrees] | None = Field(
        None, max_length=MOST, description="angles of the field from the beam's polarisation, towards its direction"
    )
    modulations: list[Megahertz] | None = Field(
        None, max_length=10, description="rates at which to switch to the orthogonal polarisation and back"
    )
    shifts: list[Megahertz] | None = Field(
        None, max_length=10, description="frequency shifts of a second beam of the orthogonal polarisation"
    )


class RemedyColumns(Shape):
    """One row for each remedy, brightest first; what a remedy does not have is null."""

    remedy: Texts = Field(description="field, modulation or second beam")
    magnitude_G: MaybeNumbers
    angle_deg: MaybeNumbers = Field(description="of the field from the beam's polarisation, towards its direction")
    modulation_MHz: MaybeNumbers
    shift_MHz: MaybeNumbers
    scattering_per_s: Numbers


class RemediesAnswered(Tabular):
    """Remedies with the scattering that each would give."""

    atom: str
    beam: str
    scattering: Scalar = Field(description="as the scheme is now")
    columns: RemedyColumns


def remedies(context: Context, path: Mapping[str, str], asked: RemediesAsked) -> Answer:
    """What brings light back from dark states: another field, a modulated polarisation, a second frequency.

    Each is predicted with the steady state of the changed scheme. A list that is left out is tried at a few values made
    from the natural width; an empty list is not tried. Modulation switches suddenly between the beam's polarisation and
    the orthogonal one. A second beam has the same intensity and the orthogonal polarisation; it is predicted with rate
    equations, which hold where its shift is faster than the pumping.
    """
    lab = laboratory(context, asked)
    scheme = lab.scheme
    names = [beam.name for beam in scheme.beams]
    if asked.beam is not None and asked.beam not in names:
        raise UnknownName("beam", asked.beam, names)
    beam = scheme.beams[names.index(asked.beam) if asked.beam else 0]
    light = prepare(scheme)
    structure = light.structure
    width = float(structure.width_mhz[structure.slice_of(beam.line.upper)].max())
    rows, refusals = _tried(scheme, beam, asked, width)
    rows.sort(key=lambda row: -row[-1])
    names_of_columns = list(RemedyColumns.model_fields)
    table: dict[str, Any] = {name: [row[k] for row in rows] for k, name in enumerate(names_of_columns)}
    used = used_by(structure)
    return Answer(
        {
            "atom": lab.setup.atom.isotope.name,
            "beam": beam.name,
            "scattering": plain(solve(light).scattering_per_s, "s-1"),
        },
        Table(columns(table), dict.fromkeys(names_of_columns[1:5], "what this remedy does not change")),
        used=used,
        warnings=list(dict.fromkeys((*refusals, *structure.notes, *stretched(structure)))),
        uncertainty_excludes=without_uncertainty(used),
    )


def _tried(scheme: Scheme, beam: Beam, asked: RemediesAsked, width: float) -> tuple[list[Row], list[str]]:
    magnitudes = asked.magnitudes
    if magnitudes is None:
        magnitudes = [share * width / MU_B_MHZ_PER_GAUSS for share in REMEDY_LARMOR]
    angles = list(REMEDY_ANGLES) if asked.angles is None else asked.angles
    rates = [share * width for share in WIDTHS] if asked.modulations is None else asked.modulations
    shifts = [share * width for share in WIDTHS] if asked.shifts is None else asked.shifts
    other = _with(scheme, beam)
    refusals: list[str] = []
    rows = list(_of_fields(scheme, beam, magnitudes, angles))
    for rate in rates:
        found = _unless_refused(refusals, partial(modulated_scattering, scheme, other, rate))
        rows += [("modulation", None, None, rate, None, one) for one in found]
    for shift in shifts:
        found = _unless_refused(refusals, partial(second_frequency, scheme, beam.name, shift))
        rows += [("second beam", None, None, None, shift, one) for one in found]
    return rows, list(dict.fromkeys(refusals))


def _of_fields(scheme: Scheme, beam: Beam, magnitudes: list[float], angles: list[float]) -> Iterable[Row]:
    if not magnitudes or not angles:
        return
    scanned = scan_field(scheme, magnitudes, angles, plane_of(beam))
    for row, magnitude in enumerate(magnitudes):
        for column, angle in enumerate(angles):
            yield "field", magnitude, angle, None, None, float(scanned.scattering_per_s[row, column])


def _with(scheme: Scheme, beam: Beam) -> Scheme:
    """The scheme with one beam in the orthogonal polarisation."""
    turned = replace(beam, polarisation=orthogonal(beam))
    return replace(scheme, beams=tuple(turned if one.name == beam.name else one for one in scheme.beams))


def _unless_refused(refusals: list[str], predict: Callable[[], float]) -> list[float]:
    """The prediction, or nothing and the reason among the refusals."""
    try:
        return [predict()]
    except OutsideValidity as error:
        refusals.append(f"not tried: {error}")
        return []


QUESTION = Question(
    name="remedies",
    path="/v1/remedies",
    asked=RemediesAsked,
    answered=RemediesAnswered,
    ask=remedies,
    summary="What brings light back from dark states",
    example="/v1/remedies",
    tag="scheme",
    body_example={**EXAMPLE, "field": [0, 0, 1], "magnitudes": [1, 3], "angles": [30, 55, 80]},
    heavy=True,
)
