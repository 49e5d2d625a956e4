"""`pairs`: pairs of sublevels for a clock or a qubit, ranked."""

from collections.abc import Mapping
from typing import Annotated

from pydantic import Field

from levels.pairs import Asked as PairsWanted
from levels.pairs import Noise, Pair, ranked_pairs
from service.answers import DOUBTED, Answer
from service.context import Context
from service.formats import Column, Table
from service.inputs import level_inputs
from service.light import PolarisedAsked, Wavelength, light_inputs, light_warnings, partners, setting_of
from service.parameters import NUMBER_OR_TEXT, FieldGauss, LargestField, Name, measure
from service.question import Question
from service.schemas import Labels, MaybeNumbers, Numbers, Shape, Tabular, Texts

FieldNoise = Annotated[float, measure("field", "G", 0.0, 1e4), NUMBER_OR_TEXT]
Depth = Annotated[float, measure("frequency", "MHz", 0.0, 1e6), NUMBER_OR_TEXT]
NO_LIGHT = "no wavelength was given, or the light does not shift the lower sublevel"
NO_MAGIC = "no ellipticity makes this pair shift alike in this beam, or no wavelength was given"


class PairsAsked(PolarisedAsked):
    """Which pairs, in what noise."""

    level: Name = Field(description="level of the lower sublevel, as `5s_2S1/2`", examples=["5s_2S1/2"])
    upper_level: Name | None = Field(None, description="level of the upper sublevel; the same level when left out")
    max_field: LargestField = Field(2000.0, description="largest field of field-insensitive points")
    max_dm: int = Field(2, ge=0, le=20, description="largest difference of m between the two")
    field: FieldGauss | None = Field(  # type: ignore[assignment]
        None, description="also every pair at this field, in gauss or with a unit; only insensitive points without it"
    )
    wavelength: Wavelength | None = Field(
        None, description="of the trapping light, in nm or with a unit; none without it"
    )
    field_noise: FieldNoise = Field(1e-3, description="noise of the field, in gauss or with a unit")
    depth: Depth = Field(1.0, description="size of the lower sublevel's light shift, in MHz or with a unit")
    intensity_noise: float = Field(0.01, ge=0, le=1, description="relative noise of the light's intensity")
    limit: int = Field(20, ge=1, le=200, description="how many pairs to list")


class PairColumns(Shape):
    """One row for each pair and field, best first."""

    lower_F: Labels
    lower_m: Labels
    upper_F: Labels
    upper_m: Labels
    field_G: Numbers
    field_insensitive: list[bool]
    frequency_MHz: Numbers = Field(description="E(upper) - E(lower), between two levels less that of the centroids")
    frequency_uncertainty_MHz: MaybeNumbers
    slope_MHz_per_G: Numbers
    quadratic_Hz_per_G2: Numbers
    quadratic_uncertainty_Hz_per_G2: MaybeNumbers
    drive: Texts = Field(description="microwave, radio frequency, two photons, line or none")
    drive_polarisation: Texts
    drive_moment_muB: MaybeNumbers = Field(description="|<upper|mu_q|lower>| of a magnetic drive")
    drive_line: Texts
    drive_multipole: Texts
    drive_strength: MaybeNumbers
    field_noise_Hz: Numbers = Field(description="|slope| dB + |quadratic| dB^2")
    light_ratio: MaybeNumbers = Field(description="alpha(upper)/alpha(lower) - 1 in the light")
    light_ratio_uncertainty: MaybeNumbers
    light_noise_Hz: MaybeNumbers = Field(description="|light_ratio| times depth times intensity noise")
    magic_ellipticity_deg: MaybeNumbers = Field(description="nearest ellipticity at which the light moves them alike")
    figure_Hz: Numbers = Field(description="both noises in quadrature: what the list is ranked by")


class PairsAnswered(Tabular):
    """Ranked pairs."""

    atom: str
    level: str
    upper_level: str
    columns: PairColumns


def answer_pairs(context: Context, path: Mapping[str, str], asked: PairsAsked) -> Answer:
    """Field-insensitive pairs, and on request every pair at one field, ranked by what noise does to them.

    Each pair says how to drive it: with a microwave or radio wave within a level, with a line between two. The noises
    are yours to state; their defaults (1 mG, 1 MHz deep, 1 %) are common practice, and the figure ranks rather than
    predicts.
    """
    atom = path["atom"]
    side = partners(context, atom, asked.level)
    other = side if asked.upper_level is None else partners(context, atom, asked.upper_level)
    setting = None if asked.wavelength is None else setting_of(asked, asked.wavelength)
    wanted = PairsWanted(side, other, asked.max_field, 2 * asked.max_dm, asked.field)
    noise = Noise(asked.field_noise, asked.depth, asked.intensity_noise)
    found = ranked_pairs(wanted, context.atom(atom).lines, setting, noise, asked.limit)
    sides = (side,) if other is side else (side, other)
    names = dict.fromkeys((side.level.name, other.level.name))
    used = light_inputs(*sides) if setting else dict(item for one in sides for item in level_inputs(one.level)).items()
    return Answer(
        {"atom": side.level.atom, "level": side.level.name, "upper_level": other.level.name},
        _table(found),
        used=list(used),
        warnings=[
            *context.level_grounds(atom, *names).warnings(max((pair.field_gauss for pair in found), default=0.0)),
            *(light_warnings(*sides) if setting else ()),
            *([] if found else [f"no pair with m differing by {asked.max_dm} at most in this range of fields"]),
        ],
    )


def _table(found: list[Pair]) -> Table:
    columns: dict[str, Column] = {
        "lower_F": [pair.lower[0] / 2 for pair in found],
        "lower_m": [pair.lower[1] / 2 for pair in found],
        "upper_F": [pair.upper[0] / 2 for pair in found],
        "upper_m": [pair.upper[1] / 2 for pair in found],
        "field_G": [pair.field_gauss for pair in found],
        "field_insensitive": [pair.insensitive for pair in found],
        "frequency_MHz": [pair.difference_mhz for pair in found],
        "frequency_uncertainty_MHz": [pair.difference_uncertainty_mhz for pair in found],
        "slope_MHz_per_G": [pair.slope_mhz_per_gauss for pair in found],
        "quadratic_Hz_per_G2": [pair.quadratic_hz_per_gauss2 for pair in found],
        "quadratic_uncertainty_Hz_per_G2": [pair.quadratic_uncertainty_hz_per_gauss2 for pair in found],
        "drive": [pair.drive.kind for pair in found],
        "drive_polarisation": [pair.drive.polarisation for pair in found],
        "drive_moment_muB": [pair.drive.moment_mu_b for pair in found],
        "drive_line": [pair.drive.line for pair in found],
        "drive_multipole": [pair.drive.multipole for pair in found],
        "drive_strength": [pair.drive.strength for pair in found],
        "field_noise_Hz": [pair.field_noise_hz for pair in found],
        "light_ratio": [pair.light_ratio for pair in found],
        "light_ratio_uncertainty": [pair.light_ratio_uncertainty for pair in found],
        "light_noise_Hz": [pair.light_noise_hz for pair in found],
        "magic_ellipticity_deg": [pair.magic_ellipticity_deg for pair in found],
        "figure_Hz": [pair.figure_hz for pair in found],
    }
    reasons = {
        "frequency_uncertainty_MHz": DOUBTED,
        "quadratic_uncertainty_Hz_per_G2": DOUBTED,
        "drive_moment_muB": "the drive is not magnetic",
        "drive_strength": "the drive is not a line, or its strength is not in this model",
        "light_ratio": NO_LIGHT,
        "light_ratio_uncertainty": "no light, or what the lines leave out of its shifts is not known",
        "light_noise_Hz": NO_LIGHT,
        "magic_ellipticity_deg": NO_MAGIC,
    }
    return Table(columns, {name: text for name, text in reasons.items() if None in columns[name]})


QUESTION = Question(
    name="pairs",
    path="/v1/atoms/{atom}/pairs",
    asked=PairsAsked,
    answered=PairsAnswered,
    ask=answer_pairs,
    summary="Pairs of sublevels for clocks and qubits, ranked",
    example="/v1/atoms/87Rb/pairs?level=5s_2S1/2&wavelength=1064&max_field=2000",
    tag="light",
    heavy=True,
)
