"""Which model of the field answers, and that the whole term's answers are those of the library."""

from itertools import pairwise

import pytest
from starlette.testclient import TestClient

from levels.catalogue import Catalogue
from levels.strongfield import term_sublevels
from levels.terms import term_of

LITHIUM = "/v1/atoms/7Li"


def test_weak_fields_are_answered_by_the_level(client: TestClient) -> None:
    """Up to 1 % of mixing the level answers and says nothing; 87Rb stays there at any laboratory field."""
    for url in (f"{LITHIUM}/sublevels?level=2p_2P3/2&field=100", "/v1/atoms/87Rb/sublevels?level=5P3/2&field=10000"):
        answer = client.get(url).json()
        assert answer["model"] == "level"
        assert not any("mixes" in text for text in answer["warnings"])


def test_strong_fields_are_answered_by_the_term(client: TestClient, book: Catalogue) -> None:
    """Beyond, the term answers: the mixing's warning is gone, what is left out is said, numbers are the library's."""
    answer = client.get(f"{LITHIUM}/sublevels?level=2p_2P3/2&field=2000").json()
    assert answer["model"] == "multiplet"
    assert not any("mixes 2p_2P3/2 with" in text for text in answer["warnings"])
    assert any("hyperfine interaction of 2p_2P3/2 with other J" in text for text in answer["warnings"])
    atom = book.atom("7Li")
    found = term_sublevels(term_of(atom, book.find_level(atom, "2p_2P3/2")), 2000.0)
    assert answer["columns"]["energy_MHz"] == pytest.approx(found.energy_mhz[0].tolist(), abs=1e-9)
    assert any("interval of 2p_2P1/2 and 2p_2P3/2" in source["used_for"] for source in answer["sources"])
    forced = client.get(f"{LITHIUM}/sublevels?level=2p_2P3/2&field=2000&model=level").json()
    assert forced["model"] == "level"
    assert any("mixes 2p_2P3/2 with J = 1/2" in text for text in forced["warnings"])


def test_a_level_without_partners_has_no_multiplet(client: TestClient) -> None:
    """Asking for the multiplet of a lone level is refused with what would do, for levels and for lines."""
    for url in (
        "/v1/atoms/87Rb/sublevels?level=5s_2S1/2&field=1&model=multiplet",
        "/v1/atoms/52Cr/shift?line=425&lower=3,3&upper=9,9&field=1&model=whole",
    ):
        response = client.get(url)
        assert response.status_code == 422
        assert response.json()["parameter"] == "model"
        assert response.json()["type"] == "/problems/invalid-parameter"


def test_what_the_term_lacks_is_said(client: TestClient) -> None:
    """171Yb 3P2 has no A in the catalogue: the multiplet is refused by name, and `auto` answers with the level."""
    url = "/v1/atoms/171Yb/sublevels?level=3P1&field=300000"
    refused = client.get(f"{url}&model=multiplet")
    assert (refused.status_code, refused.json()["type"]) == (422, "/problems/not-published")
    answer = client.get(url).json()
    assert answer["model"] == "level"
    assert any("the whole term would answer here, but A of 171Yb 6s.6p_3P2" in text for text in answer["warnings"])


def test_shift_components_and_sweep_agree(client: TestClient) -> None:
    """In the whole term too, one component is the row of the table and of the sweep, and strengths sum to 1."""
    shift = client.get(f"{LITHIUM}/shift?line=D2&lower=2,2&upper=2,1&field=1500").json()
    table = client.get(f"{LITHIUM}/components?line=D2&field=1500").json()
    body = {"atom": "7Li", "line": "D2", "fields": {"values": [0, 1500]}, "lower": "2,2", "upper": "2,1"}
    sweep = client.post("/v1/sweep", json={**body, "columns": ["offset_MHz", "strength", "slope_MHz_per_G"]}).json()
    assert shift["model"] == table["model"] == sweep["model"] == "multiplet"
    columns = table["columns"]
    labels = list(zip(*(columns[name] for name in ("lower_F", "lower_m", "upper_F", "upper_m")), strict=True))
    row = labels.index((2.0, 2.0, 2.0, 1.0))
    for name, key in (("offset_MHz", "offset"), ("slope_MHz_per_G", "slope"), ("strength", "strength")):
        assert columns[name][row] == pytest.approx(shift[key]["value"], abs=1e-9)
        assert sweep["columns"][name][1] == pytest.approx(shift[key]["value"], abs=1e-7)
    upper = [(label[2], label[3]) for label in labels]
    for one in set(upper):
        total = sum(strength for strength, label in zip(columns["strength"], upper, strict=True) if label == one)
        assert total == pytest.approx(1.0, abs=1e-9)


def test_a_strength_without_a_model_is_null_with_a_reason(client: TestClient) -> None:
    """4He 1083 nm goes between terms and has strengths; a spin-forbidden line between several J has none in a term."""
    known = client.get("/v1/atoms/4He/components?line=1083.33&field=2000").json()
    assert known["model"] == "multiplet"
    assert all(strength is not None for strength in known["columns"]["strength"])
    narrow = client.get("/v1/atoms/88Sr/shift?line=689&lower=0,0&upper=1,1&field=50000").json()
    assert narrow["strength"]["value"] == pytest.approx(1.0, abs=1e-3)


def test_one_model_for_a_whole_sweep(client: TestClient) -> None:
    """The model of a sweep is that of its largest field, so that no step stands between two rows."""
    body = {"atom": "7Li", "level": "2p_2P1/2", "sublevels": ["2,2"], "columns": ["energy_MHz"]}
    fields = {"start": 0, "stop": 400, "points": 401}
    answer = client.post("/v1/sweep", json={**body, "fields": fields}).json()
    assert answer["model"] == "multiplet"
    energy = answer["columns"]["energy_MHz"]
    steps = [two - one for one, two in pairwise(energy)]
    assert max(abs(two - one) for one, two in pairwise(steps)) < 1e-3
