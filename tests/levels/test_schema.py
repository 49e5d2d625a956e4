"""What a data file may contain, and how it is refused."""

import tomllib
from pathlib import Path
from typing import Any

import pytest
from pydantic import ValidationError

from levels.errors import DataError
from levels.published import Table, Value
from levels.schema import validate

SECOND = '{ value = "1 s", source = "x", evidence = "checked" }'
ZZ = (Path(__file__).parents[1] / "data" / "Zz.toml").read_text()


def document(old: str = "", new: str = "") -> dict[str, Any]:
    """The fictional element's file with one piece of text replaced."""
    assert ZZ.count(old) >= 1
    return tomllib.loads(ZZ.replace(old, new, 1))


def test_the_fictional_element_is_legal() -> None:
    """One file holds every kind of table and validates."""
    data = validate(document(), "Zz.toml")
    assert data.species == "Zz"
    assert data.levels["6p_2P3/2"].hyperfine[305].intervals[0].quantity().value == 80.0


def test_a_validated_file_is_frozen() -> None:
    """Nobody changes data after it was read."""
    data = validate(document(), "Zz.toml")
    with pytest.raises(ValueError, match="frozen"):
        data.element.Z = 1  # type: ignore[misc]


@pytest.mark.parametrize(
    ("old", "new", "key", "reason"),
    [
        ("Z = 120", "Z = 120\ncolour = 'red'", "element.colour", "unknown key"),
        ('name = "zzium"', "", "element.name", "Field required"),
        ('spin = "3/2"', 'spin = "1/3"', "isotopes.303.spin", "half-integer"),
        ("[isotopes.303]", "[isotopes.0303]", "isotopes.0303", "mass number"),
        ('"-3600.000(2) MHz"', '"-3600.000(2) ns"', 'levels.6s_2S1/2.hyperfine.303.A', "kHz"),
        ('"-3600.000(2) MHz"', '"-3600,000 MHz"', "levels.6s_2S1/2.hyperfine.303.A", "digits such as"),
        ('"599584916(2) MHz", isotope = 300,', '"599584916(2) MHz",', "levels.7s_2S1/2", "natural"),
        (', formula = "only decay channel"', "", "lines.1333.branching", "formula"),
        ('"6.00(5) MHz", source = "zedd2001",', '"6.00(5) MHz",', "levels.6p_2P3/2.width", "reference key"),
        ('evidence = "checked"', 'evidence = "guessed"', "isotopes.300.mass.evidence", "recalled"),
        ("nominal_nm = 800.0", "nominal_nm = nan", "lines.800.nominal_nm", "less than"),
        ('multipole = "E3"', 'multipole = "E4"', "lines.476.multipole", "E2"),
        ('of = "2-3"', 'of = "two to three"', "lines.800.frequency.1.of", "crossover"),
        ("width = {", f"lifetime = {SECOND}\nwidth = {{", "levels.6p_2P3/2", "same fact"),
        ('[levels."7s_2S1/2"]', '[levels."7s"]', "levels.7s", "5p_2P3/2"),
        ('term = "2F"', 'term = "XY"', "levels.4f13.6s2_2F7/2", 'coupling = "none"'),
        ('ground = "6s_2S1/2"', 'ground = "5s_2S1/2"', "", "element.ground"),
        ("reference_isotope = 300", "reference_isotope = 299", "", "no isotope 299"),
        ('upper = "7s_2S1/2"', 'upper = "8s_2S1/2"', "", "lines.1000: no level '8s_2S1/2'"),
        ("{ isotope = 301, value", "{ isotope = 302, value", "", "lines.800: no isotope 302"),
        ('term = "2P"\nJ = "1/2"', 'term = "2P"\nJ = "3/2"', "", "the name says J = 1/2"),
        ('"30.0(5) ns"', '"-30.0(5) ns"', "levels.6p_2P1/2.lifetime", "above zero"),
        ('"60.0(1) %"', '"600(1) %"', "isotopes.300.abundance", "more than the whole"),
        ("[lines.833]", '[lines."833 nm"]', "", "digits only"),
        ("hyperfine.303]", "hyperfine.300]", "", "no nuclear spin"),
    ],
)  # fmt: skip
def test_what_is_wrong_is_named_with_file_key_and_reason(old: str, new: str, key: str, reason: str) -> None:
    """Every breach of the schema raises DataError that says which file, which key and what would do."""
    with pytest.raises(DataError) as refused:
        validate(document(old, new), "Zz.toml")
    assert refused.value.file == "Zz.toml"
    assert refused.value.key == key
    assert reason in refused.value.reason


def test_every_problem_of_a_file_is_told_at_once() -> None:
    """A curator fixes a file in one go, not one error at a time."""
    broken = tomllib.loads(ZZ.replace('spin = "3/2"', 'spin = "x"').replace("Z = 120", "Z = 0"))
    with pytest.raises(DataError, match=r"element\.Z") as refused:
        validate(broken, "Zz.toml")
    assert "isotopes.303.spin" in str(refused.value)


def test_every_table_refuses_unknown_keys() -> None:
    """No table of the schema forgets to forbid what it does not know."""
    tables = [Table]
    for table in tables:
        tables += table.__subclasses__()
    assert len(tables) > 20
    assert all(table.model_config["extra"] == "forbid" and table.model_config["frozen"] for table in tables)


def test_a_value_carries_its_provenance_into_the_quantity() -> None:
    """Text, source, evidence, note and alternatives arrive together."""
    lifetime = validate(document(), "Zz.toml").levels["6p_2P1/2"].lifetime
    assert lifetime is not None
    quantity = lifetime.quantity()
    assert (quantity.text, quantity.source, quantity.evidence) == ("30.0(5) ns", "zedd2001", "checked")
    assert [(other.value, other.note) for other in quantity.alternatives] == [
        (28.0, "radiation trapping not corrected")
    ]


def test_what_is_exact_by_definition_has_no_uncertainty_left() -> None:
    """`exact` turns an unknown uncertainty into none at all, and refuses one in print."""
    exact = Value(value="9192.5", exact=True, source="x", evidence="recalled").quantity()
    assert exact.uncertainty == 0.0
    with pytest.raises(ValidationError, match="exact by definition"):
        Value(value="9192.5(1)", exact=True, source="x", evidence="recalled")
