"""Leaks, photons before loss and repumpers of small atoms whose answers are known."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.angular import line_strength
from levels.branching import DATA, METASTABLE, RULE, UNKNOWN, branching_of
from levels.decaygraph import Graph, graph_of, hyperfine_shares
from levels.errors import NotPublished, OutsideValidity, UnknownName
from levels.lasers import Laser, excitation, make_laser, saturation_of_intensity
from levels.leaks import DECAY, LOST, OFF_RESONANT, Leaks, leaks_of, metastable_elsewhere
from levels.racah import six_j_square
from levels.records import Atom, Line
from levels.repump import repump
from levels.repumpfacts import facts_of, reach_of, strongest_upper
from levels.walks import emptied_off_resonance, follow, resonant_mask, walk_of
from tests.atoms_for_tests import RATE, atom, decay, ladder_atom, lambda_atom, named, unpublished_atom, without_lifetime

DARK_S = 0.01


def find(some: Atom, name: str) -> Line:
    return next(one for one in some.lines if one.name == name)


def lasers(some: Atom, *names: str, **more: float) -> list[Laser]:
    return [make_laser(find(some, name), **more) for name in names]  # type: ignore[arg-type]


def photons_of_walks(graph: Graph, present: list[Laser], count: int, seed: int) -> np.ndarray:
    """Seeded walks on the graph itself: light up and down and decays until a dark state, cooling photons counted."""
    rng = np.random.default_rng(seed)
    tables = [_table(graph, one) for one in present]
    light = np.sum(tables, axis=0)
    driven = resonant_mask(graph, present)
    cooling = driven & (tables[0].sum(axis=1) > 0)
    weights = np.array([state.weight for state in graph.states])
    down = (light * weights[:, None] / weights[None, :]).T
    rows: list[np.ndarray] = []
    for state in range(graph.size):
        options, rate = graph.options[state], graph.rates[state]
        own = None if not len(options) or rate < 1 / DARK_S else options[0]
        chances = light[state] / light[state].sum() if driven[state] else own
        rows.append(np.zeros(0) if chances is None else np.cumsum(chances))
    first = present[0].component
    start = graph.at(present[0].line.lower, first[0] if first else None)
    counts = np.zeros(count)
    for walk in range(count):
        state = start
        photon = False
        while rows[state].size:
            taken_down = down[state].sum()
            if taken_down and rng.random() * (taken_down + graph.rates[state]) < taken_down:
                state = int(rng.choice(graph.size, p=down[state] / taken_down))
                continue
            counts[walk] += photon and not driven[state]
            photon = bool(cooling[state])
            state = int(np.searchsorted(rows[state], rng.random() * rows[state][-1]))
    return counts


def _table(graph: Graph, laser: Laser) -> np.ndarray:
    table = np.zeros((graph.size, graph.size))
    low, up = graph.spans[laser.line.lower.name], graph.spans[laser.line.upper.name]
    table[low.start : low.stop, up.start : up.stop] = excitation(graph, laser)
    return table


@given(st.floats(0.01, 0.99))
def test_photons_of_a_leaking_line(share: float) -> None:
    """A lone leak of share b is entered after 1/b photons, of which (1 - b)/b are emitted on the line."""
    some = lambda_atom(share)
    found = leaks_of(graph_of(some, False), lasers(some, "cool"), DARK_S)
    assert found.photons == pytest.approx(1 / (1 - share), rel=1e-12)
    assert found.emitted == pytest.approx(share, rel=1e-12)
    assert [(item.state.level.name, item.fate, item.cause) for item in found.reached] == [("d_2D3/2", LOST, DECAY)]


def test_uncertainty_of_the_photons() -> None:
    """The photons before loss carry the share's uncertainty: sigma/b^2 for one leak of share b."""
    some = lambda_atom(0.9, 0.002)
    found = leaks_of(graph_of(some, False), lasers(some, "cool"), DARK_S)
    assert found.uncertainty == pytest.approx(0.002 / 0.1**2, rel=1e-9)
    assert leaks_of(graph_of(lambda_atom(0.9), False), lasers(some, "cool"), DARK_S).uncertainty is None


def test_uncertainty_against_a_finite_difference() -> None:
    """In a scheme with two leaking levels the propagated uncertainty is that of moving the uncertain share."""
    certain = {"over": 1e-12, "side": 1e-12, "more": 1e-12}

    def photons(step: float) -> Leaks:
        moved = {"cool": -step, "back": step}
        lines = tuple(
            replace(
                one,
                branching=replace(
                    one.branching,
                    value=one.branching.value + moved.get(one.name, 0.0),
                    uncertainty=certain.get(one.name, 0.001),
                ),
            )
            for one in ladder_atom().lines
            if one.branching is not None
        )
        some = replace(ladder_atom(), lines=lines)
        return leaks_of(graph_of(some, False), lasers(some, "cool", "side"), DARK_S)

    still, up, down = photons(0.0), photons(1e-6), photons(-1e-6)
    assert up.photons is not None
    assert down.photons is not None
    assert still.uncertainty == pytest.approx(abs(up.photons - down.photons) / 2e-6 * 0.001, rel=1e-5)


@pytest.mark.parametrize("names", [("cool",), ("cool", "side")])
def test_photons_against_seeded_walks(names: tuple[str, ...]) -> None:
    """Photons before loss agree with 4,000 random walks on the same graph within four standard errors."""
    some = ladder_atom()
    graph, present = graph_of(some, False), lasers(some, *names)
    expected = leaks_of(graph, present, DARK_S).photons
    counts = photons_of_walks(graph, present, 4000, seed=5)
    assert expected == pytest.approx(counts.mean(), abs=4 * counts.std() / np.sqrt(len(counts)))


def test_hyperfine_photons_against_seeded_walks() -> None:
    """The same at hyperfine resolution, where off-resonant light and decays leak."""
    some = lambda_atom(0.8, twice_I=3)
    graph = graph_of(some, True)
    present = [make_laser(find(some, "cool"), (4, 2), -5.0, 0.7)]
    expected = leaks_of(graph, present, DARK_S).photons
    counts = photons_of_walks(graph, present, 4000, seed=6)
    assert expected == pytest.approx(counts.mean(), abs=4 * counts.std() / np.sqrt(len(counts)))


def test_hyperfine_leak_is_the_share_of_the_neighbour() -> None:
    """Weak light on J = 1/2 to 3/2 leaks, per photon, the excitation ratio of F' = 2 times its decay to F = 1."""
    S = named("s_2S1/2", 1, 1, 0.0, 3, A=3400.0)
    P = named("p_2P3/2", 3, -1, 12_800.0, 3, A=85.0)
    some = atom([decay(S, P, 1.0, name="cool")], twice_I=3)
    weak = make_laser(find(some, "cool"), (4, 6), saturation=1e-12)
    found = leaks_of(graph_of(some, True), [weak], DARK_S)
    width_mhz = RATE / (2e6 * np.pi)
    ratios = {}
    for F_up, distance_mhz in ((4, 3 * 85.0), (2, 5 * 85.0)):
        weight = float(line_strength(1, 3, 3, 4, F_up) / line_strength(1, 3, 3, 4, 6))
        ratios[F_up] = weight / (1 + 4 * (distance_mhz / width_mhz) ** 2)
    leaves = {F_up: float(line_strength(3, 1, 3, F_up, 2)) for F_up in ratios}
    expected = sum(ratios[F] * leaves[F] for F in ratios) / (1 + sum(ratios.values()))
    assert found.photons == pytest.approx(1 / expected, rel=1e-9)
    assert [(item.state.twice_F, item.cause, item.fate) for item in found.reached] == [(2, OFF_RESONANT, LOST)]


@pytest.mark.parametrize("saturation", [1e-3, 1.0, 30.0, 1e3])
def test_saturation_leaks_more_per_photon(saturation: float) -> None:
    """Photons over time is Gamma times the excited population W/(W + 5 W/7 + Gamma); saturation takes photons away.

    Off-resonant excitation is not saturated, so that photons before loss fall by 1 + 5 W/7 Gamma.
    """
    S = named("s_2S1/2", 1, 1, 0.0, 3, A=1e8)
    P = named("p_2P3/2", 3, -1, 12_800.0, 3, A=1000.0)
    some = atom([decay(S, P, 1.0, name="cool")], twice_I=3)
    strong, weak = (
        leaks_of(graph_of(some, True), [make_laser(find(some, "cool"), (4, 6), saturation=s)], DARK_S)
        for s in (saturation, 1e-9)
    )
    assert strong.photons is not None
    assert strong.seconds is not None
    assert weak.photons is not None
    W = RATE / 2 * saturation * 4 / 6 * float(line_strength(1, 3, 3, 4, 6))
    assert strong.photons / strong.seconds == pytest.approx(RATE * W / (W * 12 / 7 + RATE), rel=1e-3)
    assert strong.photons == pytest.approx(weak.photons / (1 + 5 / 7 * W / RATE), rel=1e-3)


def test_light_that_empties_faster_than_it_fills_is_no_leak() -> None:
    """A hyperfine level that the cooling light itself empties faster than the cycle fills it is driven, else dark."""
    S = named("s_2S1/2", 1, 1, 0.0, 3, A=3400.0)
    P = named("p_2P3/2", 3, -1, 12_800.0, 3, A=85.0)
    some = atom([decay(S, P, 1.0, name="cool")], twice_I=3)
    graph = graph_of(some, True)
    weak = [make_laser(find(some, "cool"), (4, 6), 0.0, 1.0)]
    assert emptied_off_resonance(graph, weak, 10.0) == ()
    near = replace(S, A=replace(S.A, value=1.0)) if S.A else S
    some = atom([decay(near, P, 1.0, name="cool")], twice_I=3)
    graph = graph_of(some, True)
    strong = [make_laser(find(some, "cool"), (4, 6), 0.0, 1.0)]
    assert [graph.states[k].twice_F for k in emptied_off_resonance(graph, strong, 10.0)] == [2]
    assert leaks_of(graph, strong, 10.0).photons is None


def test_detuning_towards_the_neighbour_leaks_more() -> None:
    """Light that is tuned off its component towards the neighbour leaks more; a field near zero changes little."""
    S = named("s_2S1/2", 1, 1, 0.0, 3, A=3400.0)
    P = named("p_2P3/2", 3, -1, 12_800.0, 3, A=85.0)
    some = atom([decay(S, P, 1.0, name="cool")], twice_I=3)
    photons = []
    for detuning in (0.0, -20.0, -40.0):
        laser = make_laser(find(some, "cool"), (4, 6), detuning)
        photons.append(leaks_of(graph_of(some, True), [laser], DARK_S).photons or 0.0)
    assert photons[0] > photons[1] > photons[2] > 0
    laser = make_laser(find(some, "cool"), (4, 6))
    in_field = leaks_of(graph_of(some, True, 1e-4), [laser], DARK_S, 1e-4).photons
    assert in_field == pytest.approx(photons[0], rel=1e-4)


def test_time_before_loss() -> None:
    """One leak: each photon takes 1/W + (1 + g/g')/Gamma, with W = (Gamma/2) s (2J'+1)/(3(2J+1)), times 1/b photons."""
    some = lambda_atom(0.9)
    for saturation in (0.01, 1.0, 1e6):
        found = leaks_of(graph_of(some, False), lasers(some, "cool", saturation=saturation), DARK_S)
        W = RATE / 2 * saturation / 3
        assert found.seconds == pytest.approx((1 / W + 2 / RATE) / 0.1, rel=1e-9)


def test_time_needs_every_lifetime() -> None:
    """Without the upper lifetime photons are known and the time is not; the level is named."""
    some = without_lifetime(lambda_atom(0.9), "p_2P1/2")
    found = leaks_of(graph_of(some, False), lasers(some, "cool"), DARK_S)
    assert found.photons == pytest.approx(10.0)
    assert found.seconds is None
    assert "p_2P1/2" in found.reason


def test_slow_decay_counts_as_dark_only_beyond_the_patience() -> None:
    """A leak that decays back within `dark_after` is passed through, one that does not is a loss."""
    S, D, P = named("s_2S1/2", 1, 1, 0.0), named("d_2D5/2", 5, 1, 10_000.0), named("p_2P3/2", 3, -1, 25_000.0)
    D = replace(D, lifetime=replace(P.lifetime, value=1e-3) if P.lifetime else None)
    some = atom(
        [
            decay(S, P, 0.9, name="cool"),
            decay(D, P, 0.1, name="back"),
            decay(S, D, 1.0, rank=2, name="slow"),
        ]
    )
    graph, present = graph_of(some, False), lasers(some, "cool")
    assert leaks_of(graph, present, 1e-2).photons is None
    assert leaks_of(graph, present, 1e-4).photons == pytest.approx(10.0)


def test_closures() -> None:
    """What closes the decays is told apart: data, selection rule, unknown; no dipole decay makes metastable."""
    some = lambda_atom(0.9)
    levels = {level.name: level for level in some.levels}
    assert branching_of(some, levels["p_2P1/2"]).closure == DATA
    assert branching_of(some, levels["d_2D3/2"]).closure == METASTABLE
    two = atom([decay(named("s", 1, 1, 0.0), named("p", 3, -1, 12_000.0), 1.0, name="cool")])
    assert branching_of(two, two.levels[1]).closure == RULE
    loose = unpublished_atom()
    found = branching_of(loose, loose.lines[0].upper)
    assert found.closure == UNKNOWN
    assert found.unknown == pytest.approx((0.01, 0.01))
    assert [level.name for level in found.possible] == ["d_3D1", "d_3D2"]


def test_one_possible_destination_is_a_selection_rule() -> None:
    """A remainder that only one level can take goes there: closed by a selection rule, not guessed."""
    S, D, P = named("s_1S0", 0, 1, 0.0), named("d_3D1", 2, 1, 9_000.0), named("p_1P1", 2, -1, 20_000.0)
    some = atom([decay(S, P, 0.99, 1e-4, name="cool"), decay(D, P, None, name="one")])
    assert branching_of(some, P).closure == RULE
    assert leaks_of(graph_of(some, False), lasers(some, "cool"), DARK_S).photons == pytest.approx(100.0, rel=1e-9)


def test_unknown_branching_is_bounded_not_guessed() -> None:
    """0.01 of unknown destination is lost whatever it is; a repumper of one of two is bounded, of both closes."""
    some = unpublished_atom()
    search = repump(graph_of(some, False), lasers(some, "cool"), DARK_S)
    assert (search.leaks.photons, search.leaks.most) == pytest.approx((100.0, 100.0))
    assert search.leaks.unknown
    for single in search.singles:
        assert single.photons == pytest.approx(100.0)
        assert single.most is None
    best = search.sets[0]
    assert {one.line.name for one in best.repumpers} == {"one", "two"}
    assert best.is_closed


def test_repumpers_are_ranked_by_photons() -> None:
    """Back to P1/2 closes the cycle; over P3/2 every excitation loses 0.15 of 0.95 to D5/2, which it opens."""
    some = ladder_atom()
    search = repump(graph_of(some, False), lasers(some, "cool"), DARK_S)
    assert [one.repumpers[0].line.name for one in search.singles] == ["back", "side"]
    back, side = search.singles
    assert back.is_closed
    assert back.per_leak == pytest.approx(1 / 0.9)
    assert side.photons == pytest.approx(1 / (0.1 * 0.15 / 0.95), rel=1e-9)
    assert side.opens == ("d_2D5/2",)
    assert search.bounds == ("pairs were not searched: one repumper closes the cycle",)


def test_pair_closes_what_one_does_not() -> None:
    """Driving P3/2 leaks into two metastable levels: no single repumper closes, the pairs of one for each do."""
    some = ladder_atom()
    search = repump(graph_of(some, False), lasers(some, "over"), DARK_S)
    assert not any(one.is_closed for one in search.singles)
    closing = [{part.line.name for part in one.repumpers} for one in search.sets if one.is_closed]
    assert {"back", "more"} in closing
    assert {"side", "more"} in closing
    assert all("more" in names for names in closing)


def test_photons_do_not_depend_on_intensity_between_levels() -> None:
    """Between whole levels the photons before loss do not depend on saturation or detuning; the time does."""
    some = ladder_atom()
    found = [
        leaks_of(graph_of(some, False), lasers(some, "cool", "side", saturation=s, detuning_mhz=d), DARK_S)
        for s, d in ((0.1, 0.0), (30.0, 50.0))
    ]
    assert found[0].photons == pytest.approx(found[1].photons, rel=1e-12)
    assert found[0].seconds != pytest.approx(found[1].seconds)


def test_hyperfine_repumper_has_a_component_for_each_leaking_level() -> None:
    """With nuclear spin the repumper of D3/2 lists a component from every F that decays fill."""
    some = lambda_atom(0.8, twice_I=1)
    search = repump(graph_of(some, True), [make_laser(find(some, "cool"), (2, 0))], DARK_S)
    back = next(one for one in search.singles if one.repumpers[0].line.name == "back")
    assert sorted(low for low, _ in back.repumpers[0].components) == [2, 4]


def test_metastable_levels_elsewhere_are_told() -> None:
    """A metastable level that no decay of the cycle reaches is listed: collisions may fill it."""
    some = ladder_atom()
    found = leaks_of(graph_of(some, False), lasers(some, "cool", "back"), DARK_S)
    assert [level.name for level in metastable_elsewhere(found)] == ["d_2D5/2"]


def test_facts_of_a_repumper() -> None:
    """Frequency, offset, reach, dark states and the shared upper level of the lambda atom's repumper."""
    some = lambda_atom(0.9)
    graph, present = graph_of(some, False), lasers(some, "cool")
    search = repump(graph, present, DARK_S)
    (facts,) = facts_of(graph, [search.singles[0].repumpers[0]], tuple(present))
    assert facts.settings[0].frequency_mhz == pytest.approx(15_000 * 29979.2458)
    assert facts.settings[0].offset_mhz == pytest.approx(-10_000 * 29979.2458)
    assert facts.vacuum_nm == pytest.approx(1e7 / 15_000, rel=1e-9)
    assert facts.air_nm == pytest.approx(666.483, abs=1e-2)
    assert facts.reach == "another laser"
    assert any("two dark states" in note for note in facts.notes)
    assert any("coherent dark resonance" in note for note in facts.notes)
    assert facts.relative_power == pytest.approx((0.9 / 0.1) * (15_000 / 25_000) ** 3)


@pytest.mark.parametrize(
    ("offset_mhz", "expected"),
    [(80.0, "acousto-optic"), (-6568.0, "electro-optic"), (3e5, "another laser"), (None, "another laser")],
)
def test_reach(offset_mhz: float | None, expected: str) -> None:
    """Offsets up to 1 GHz are acousto-optic, up to 25 GHz electro-optic (common practice), beyond another laser."""
    assert reach_of(offset_mhz, same_line=False) == expected


@given(*(st.integers(0, 9) for _ in range(5)))
def test_six_j_squares_are_those_of_the_algebra(J: int, J_up: int, I: int, F: int, F_up: int) -> None:
    """Racah's sum gives the line strengths of the exact algebra."""
    assert (F_up + 1) * (J + 1) * six_j_square(J, J_up, 2, F_up, F, I) == line_strength(J, J_up, I, F, F_up)


@given(st.integers(0, 8), st.integers(0, 8), st.integers(0, 9))
def test_hyperfine_decays_sum_to_one(J_up: int, J: int, I: int) -> None:
    """The decays of every F' are shared out completely."""
    table = hyperfine_shares(J_up, J, I, 1)
    assert table.sum(axis=1) == pytest.approx(np.ones(table.shape[0]), abs=1e-12)


def test_graph_is_complete() -> None:
    """Every option of every state is a distribution, in a field too."""
    for field in (0.0, 250.0):
        graph = graph_of(lambda_atom(0.8, twice_I=3), True, field)
        for options in graph.options:
            assert options.sum(axis=1) == pytest.approx(np.ones(len(options)), abs=1e-9)


def test_worst_is_never_better_than_best() -> None:
    """Bounds of every set of repumpers keep their order."""
    for some in (unpublished_atom(), ladder_atom()):
        search = repump(graph_of(some, False), lasers(some, "cool"), DARK_S)
        for scheme in (*search.singles, *search.sets):
            assert scheme.most is None or (scheme.photons is not None and scheme.photons <= scheme.most * (1 + 1e-9))


def test_endless_loop_is_not_a_loss() -> None:
    """Unknown branching back to the pumped level itself is no loss: the next decay may go elsewhere."""
    S, D, P = named("s_1S0", 0, 1, 0.0), named("d_3D1", 2, 1, 9_000.0), named("p_1P1", 2, -1, 20_000.0)
    X = replace(named("x_3P1", 2, -1, 24_000.0), lifetime=None)
    some = atom([decay(S, P, 0.9, 1e-9, name="cool"), decay(D, P, 0.1, 1e-9, name="one"), decay(D, X, None, name="up")])
    graph = graph_of(some, False)
    walk = walk_of(graph, lasers(some, "cool"), DARK_S)
    stop, up = walk.place(graph.at(D)), graph.at(X)
    outcome = follow(walk, [[(stop, walk.onward[up])]], worst=True)
    assert outcome.photons[0] > 1e25


def test_refusals() -> None:
    """Lasers that cannot be are refused with what would do."""
    some = lambda_atom(0.8, twice_I=1)
    cool = find(some, "cool")
    with pytest.raises(UnknownName, match="0-1"):
        make_laser(cool, (0, 0))
    with pytest.raises(OutsideValidity, match="saturation"):
        make_laser(cool, None, 0.0, 0.0)
    with pytest.raises(OutsideValidity, match="detuning"):
        make_laser(cool, None, 1e9)
    with pytest.raises(OutsideValidity, match="one-photon"):
        make_laser(replace(cool, photons=2))
    dark = without_lifetime(some, "p_2P1/2")
    with pytest.raises(NotPublished, match="lifetime"):
        leaks_of(graph_of(dark, True), [make_laser(find(dark, "cool"), (2, 0))], DARK_S)
    with pytest.raises(NotPublished, match="Einstein A"):
        saturation_of_intensity(graph_of(dark, True), find(dark, "cool"), 1.0)


def test_strongest_component() -> None:
    """From F = 1 of J = 3/2, I = 1/2 to J = 1/2 the component to F' = 0 is the strongest (2/3 of the absorption)."""
    some = lambda_atom(0.8, twice_I=1)
    assert strongest_upper(find(some, "back"), 2) == 0
    assert strongest_upper(find(some, "back"), 4) == 2
