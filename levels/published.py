"""The tables of a data file that hold one published number each: digits and unit, source, evidence.

One class per dimension; an entry of a list says besides whose number it is and of what.
"""

import re
from dataclasses import replace
from typing import Annotated, Any, ClassVar, Literal, Self

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, model_validator

from levels.errors import OutsideValidity, UnknownName
from levels.notation import parse_feature, parse_half, parse_level
from levels.quantity import Quantity, in_unit, read

Evidence = Literal["checked", "recalled", "computed"]


def _names(reader: Any) -> AfterValidator:
    """A check that text can be read by one of the notation's readers, its message being the reader's."""

    def check(text: str) -> str:
        try:
            reader(text)
        except (OutsideValidity, UnknownName) as error:
            raise ValueError(str(error)) from None
        return text

    return AfterValidator(check)


HalfText = Annotated[str, _names(parse_half)]
LevelText = Annotated[str, _names(parse_level)]
FeatureText = Annotated[str, _names(lambda text: text in ("centroid", "average") or parse_feature(text))]


def _mass_number(key: object) -> int:
    if not re.fullmatch("[1-9][0-9]{0,2}", str(key)):  # TOML keys are text: "040" and "4e1" are no isotopes
        raise ValueError("a mass number such as 87")
    return int(str(key))


MassNumber = Annotated[int, BeforeValidator(_mass_number)]
WhoseValue = MassNumber | Literal["natural"]


class Table(BaseModel):
    """A table of a data file: frozen, and a key it does not know is an error."""

    model_config = ConfigDict(extra="forbid", frozen=True)


class Value(Table):
    """A published number: digits and unit as published, where from, and how far it was compared.

    `exact` marks what is so by definition (the ground splitting of 133Cs defines the second).
    """

    dimensions: ClassVar[tuple[str, ...]] = ("number",)
    positive: ClassVar[bool] = False

    value: str
    source: str = ""
    evidence: Evidence
    note: str = ""
    of: str = ""
    formula: str = ""
    exact: bool = False
    alternatives: tuple[Self, ...] = ()

    @model_validator(mode="after")
    def _provenance(self) -> Self:
        if self.evidence == "computed" and not self.formula:
            raise ValueError('evidence = "computed" needs formula = "..."')
        if self.evidence != "computed" and not self.source:
            raise ValueError(f'evidence = "{self.evidence}" needs source = "<reference key>"')
        try:
            quantity = self.quantity()
        except OutsideValidity as error:
            raise ValueError(str(error)) from None
        if self.positive and not quantity.value > 0:
            raise ValueError(f"{self.value}: must be above zero")
        if self.exact and "(" in self.value:
            raise ValueError(f"{self.value}: exact by definition, so it has no uncertainty to print")
        return self

    def quantity(self) -> Quantity:
        """The number with its provenance, in the unit it was published in."""
        formula = f"computed: {self.formula}" if self.formula else ""
        number = read(
            self.value,
            source=self.source,
            evidence=self.evidence,
            dimension=self.dimensions,
            note="; ".join(filter(None, (formula, self.note))),
            alternatives=[other.quantity() for other in self.alternatives],
        )
        return replace(number, uncertainty=0.0) if self.exact else number


class Frequency(Value):
    """A hyperfine constant, an interval, a width or a shift."""

    dimensions = ("frequency",)


class Width(Frequency):
    """A full natural width Gamma/2pi."""

    positive = True


class Fraction(Value):
    """A fraction of a whole: an abundance or a branching."""

    positive = True

    @model_validator(mode="after")
    def _at_most_one(self) -> Self:
        if in_unit(self.quantity(), "1").value > 1:
            raise ValueError(f"{self.value}: is more than the whole")
        return self


class Strength(Value):
    """An absorption oscillator strength."""

    positive = True


class Time(Value):
    """A lifetime or half-life."""

    dimensions = ("time",)
    positive = True


class Mass(Value):
    """The mass of the neutral atom."""

    dimensions = ("mass",)
    positive = True


class Moment(Value):
    """A nuclear magnetic moment."""

    dimensions = ("moment",)


class Area(Value):
    """A nuclear quadrupole moment."""

    dimensions = ("area",)


class Rate(Value):
    """A partial decay rate."""

    dimensions = ("rate",)
    positive = True


class Dipole(Value):
    """A reduced dipole element, by the 3j form of the Wigner-Eckart theorem."""

    dimensions = ("dipole",)


class Polarisability(Value):
    """A scalar static contribution to a polarisability."""

    dimensions = ("polarisability",)


class Energy(Value):
    """An energy above the ground level, between hyperfine centroids, and whose it is."""

    dimensions = ("wavenumber", "frequency")

    isotope: WhoseValue | None = None


class Interval(Frequency):
    """E(second F) - E(first F) of a level, signed."""

    between: FeatureText = ""


class LineFrequency(Value):
    """A frequency, wavenumber or wavelength of a line: of which isotope and of what it is."""

    dimensions = ("frequency", "wavenumber", "length")
    positive = True

    isotope: WhoseValue | None = None
    of: FeatureText = "centroid"
    medium: Literal["vacuum", "air"] = "vacuum"


class Shift(Frequency):
    """nu(isotope) - nu(reference isotope)."""

    isotope: MassNumber | None = None
    of: FeatureText = "centroid"
