"""Frequency plans: settings recomputed forward, bounds, sharing, and what moves; against brute force on small cases."""

from itertools import product

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from levels.advice import would_do
from levels.assignment import WITHOUT, Variant, assign
from levels.errors import OutsideValidity, UnknownName
from levels.locks import BEAT, COMB, FREQUENCY, Lock, Point, Wanted
from levels.modulators import ACOUSTO, ELECTRO, HARMONIC, Modulator, after, chains_of, check_modulator
from levels.moves import ADDED, GONE, KEPT, LOST, REPLANNED, Earlier, moves_of
from levels.plan import Order, Plan, plan, structure_of
from levels.reaching import Route
from levels.sharing import Share

HZ = 1e-6  # MHz
BASE = 384_230_000.0
AO80 = Modulator("ao80", ACOUSTO, 60.0, 100.0)
AO110 = Modulator("ao110", ACOUSTO, 90.0, 130.0, passes=2)
EO = Modulator("eo", ELECTRO, 6_000.0, 7_000.0)
SHG = Modulator("shg", HARMONIC, factor=2)


def at(offset_mhz: float, base: float = BASE) -> Point:
    return Point(base + offset_mhz, 0.01)


def wanted(*offsets: float, **more: tuple[str, ...]) -> tuple[Wanted, ...]:
    return tuple(Wanted(f"w{k}", at(offset), **more) for k, offset in enumerate(offsets))


CELL = Lock("cell", FREQUENCY, at(0.0))


def forward(route: Route) -> float:
    """The light at the atoms by the elements alone, from the lock on."""
    light = route.lock_light_mhz
    for one in route.settings:
        light = after(one.modulator, one.order, one.rf_mhz, light)
    return light


def routes(found: Plan) -> list[Route | None]:
    return [one.route for one in found.served]


def test_one_modulator_reaches_and_says_how_much_is_left() -> None:
    """A double pass of order +1 about 110 MHz makes +210 MHz at 105 MHz, 30 MHz of light from the nearer edge."""
    (route,) = routes(plan(Order(wanted(210.0), (CELL,), (AO80, AO110))))
    assert route is not None
    (setting,) = route.settings
    assert (setting.modulator.name, setting.order) == ("ao110", 1)
    assert setting.rf_mhz == pytest.approx(105.0)
    assert route.share == pytest.approx(-0.25)
    assert route.spare_mhz == pytest.approx(30.0)
    assert forward(route) == pytest.approx(BASE + 210.0, abs=HZ)


def test_fewest_elements_come_first() -> None:
    """What one modulator reaches is not made with two, even nearer to the centre of their ranges."""
    (route,) = routes(plan(Order(wanted(80.0 + 19.0), (CELL,), (AO80, AO110, EO), longest=3)))
    assert route is not None
    assert [one.modulator.name for one in route.settings] == ["ao80"]


@given(st.integers(0, 10**6))
def test_settings_recomputed_forward_give_the_wanted_frequency(seed: int) -> None:
    """Every route's light, recomputed element by element, is the wanted frequency to 1 Hz and in every range."""
    rng = np.random.default_rng(seed)
    modulators = tuple(
        Modulator(
            f"m{k}",
            kind := str(rng.choice([ACOUSTO, ELECTRO])),
            low := float(rng.uniform(40, 400)),
            low + float(rng.uniform(1, 200)),
            orders=((1, -1), (1,), (-1,), (1, -1, 2, -2))[int(rng.integers(4))],
            passes=int(rng.integers(1, 3)) if kind == ACOUSTO else 1,
            place=str(rng.choice(["atoms", "lock"])),
        )
        for k in range(4)
    )
    modulators = (*modulators, Modulator("shg", HARMONIC, factor=2, place=str(rng.choice(["atoms", "lock"]))))
    locks = (
        CELL,
        Lock("half", FREQUENCY, at(0.0, BASE / 2)),
        Lock("twice", FREQUENCY, at(0.0, BASE * 2)),
        Lock("comb", COMB, at(37.0), 250.0, (10.0, 30.0)),
    )
    targets = wanted(*rng.uniform(-900, 900, 3))
    found = plan(Order(targets, locks, modulators, longest=3))
    used: list[str] = []
    for one, route in zip(targets, routes(found), strict=True):
        assert route is not None
        assert forward(route) == pytest.approx(one.point.frequency_mhz, abs=HZ)
        assert route.residual_mhz == pytest.approx(0.0, abs=HZ)
        for part in route.settings:
            assert part.order in part.modulator.orders or part.modulator.kind == HARMONIC
            assert part.modulator.low_mhz - 1e-9 <= part.rf_mhz <= part.modulator.high_mhz + 1e-9
            used.append(part.modulator.name)
        if route.source.lock.name == "comb":
            assert 10.0 - 1e-9 <= abs(route.beat_mhz) <= 30.0 + 1e-9
            assert route.lock_light_mhz == pytest.approx(BASE + 37.0 + 250.0 * route.tooth + route.beat_mhz, abs=HZ)
    assert len(set(used)) == len(used)


def brute_force(order: Order) -> float:
    """The least total cost by trying every combination of options (elements, then distance from centre)."""
    found = []
    for one in order.wanted:
        options: list[tuple[frozenset[str], float]] = [(frozenset(), WITHOUT)]
        chains = chains_of(order.modulators, order.longest)
        for lock in order.locks:
            for k, elements in enumerate(chains.elements):
                assert lock.point is not None
                gap = one.point.frequency_mhz - chains.multiplier[k] * lock.point.frequency_mhz - chains.centre[k]
                reach = chains.reach[k]
                if abs(gap) <= reach + order.tolerance_mhz:
                    share = abs(gap) / reach if reach else 0.0
                    names = frozenset(order.modulators[part.modulator].name for part in elements)
                    options.append((names, 1000.0 * len(elements) + min(share, 1.0)))
        found.append(options)
    best = np.inf
    for combination in product(*found):
        names = [name for option, _ in combination for name in option]
        if len(names) == len(set(names)):
            best = min(best, sum(cost for _, cost in combination))
    return float(best)


@given(st.integers(0, 10**6))
def test_assignment_is_the_best_of_all(seed: int) -> None:
    """No modulator is used twice and the total cost is that of trying every combination."""
    rng = np.random.default_rng(seed)
    modulators = tuple(
        Modulator(f"m{k}", ACOUSTO, low := float(rng.uniform(50, 120)), low + float(rng.uniform(20, 80)), orders=(1,))
        for k in range(3)
    )
    order = Order(wanted(*rng.uniform(60, 260, 3)), (CELL,), modulators, longest=2)
    cost = 0.0
    for route in routes(plan(order)):
        cost += WITHOUT if route is None else 1000.0 * len(route.settings) + abs(route.share)
    assert cost == pytest.approx(brute_force(order), abs=0.01)


def test_locks_may_serve_many_but_modulators_one() -> None:
    """Two frequencies that only one modulator reaches cannot both have it; who goes without is told why."""
    found = plan(Order(wanted(80.0, 85.0), (CELL,), (AO80,)))
    reached = [one for one in found.served if one.route is not None]
    assert len(reached) == 1
    without = next(one for one in found.served if one.route is None)
    assert without.reachable
    assert without.nearest is None


def test_harmonic_stages_count() -> None:
    """Doubling after a shift doubles the shift; a lock at the harmonic lets the laser run at half."""
    target = wanted(0.0)
    below = Lock("below", FREQUENCY, Point(BASE / 2 - 40.0, 0.0))
    (route,) = routes(plan(Order(target, (below,), (AO80, SHG), longest=2)))
    assert route is not None
    assert [one.modulator.name for one in route.settings] in (["ao80", "shg"], ["shg", "ao80"])
    assert route.multiplier == 2.0
    assert forward(route) == pytest.approx(BASE, abs=HZ)
    at_lock = Modulator("shg", HARMONIC, factor=2, place="lock")
    half = (Wanted("half", Point(BASE / 2, 0.0)),)
    (route,) = routes(plan(Order(half, (CELL,), (at_lock,), longest=1)))
    assert route is not None
    assert route.multiplier == 0.5
    assert route.laser_mhz == pytest.approx(BASE / 2, abs=HZ)
    assert route.lock_light_mhz == pytest.approx(BASE, abs=HZ)


def test_modulator_at_the_lock_turns_the_sign() -> None:
    """Light shifted up on its way to the lock point means a laser that runs below it."""
    up = Modulator("ao", ACOUSTO, 60.0, 100.0, orders=(1,), place="lock")
    below, above = (routes(plan(Order(wanted(offset), (CELL,), (up,))))[0] for offset in (-80.0, 80.0))
    assert above is None
    assert below is not None
    assert below.laser_mhz == pytest.approx(BASE - 80.0, abs=HZ)


def test_comb_takes_its_nearest_line() -> None:
    """From a comb of 250 MHz a frequency 10,010 MHz up is 10 MHz from line 40; a beat of 5 to 20 MHz makes it."""
    comb = Lock("comb", COMB, at(0.0), 250.0, (5.0, 20.0))
    (route,) = routes(plan(Order(wanted(10_010.0), (comb,), ())))
    assert route is not None
    assert (route.tooth, route.beat_mhz) == (40, pytest.approx(10.0))
    assert route.settings == ()


def test_comb_ends() -> None:
    """A comb whose lines reach 1 GHz has none for light 2 GHz away: the miss counts from its last line."""
    comb = Lock("comb", COMB, at(0.0), 250.0, None, span_mhz=1_100.0)
    (served,) = plan(Order(wanted(2_000.0), (comb,), ())).served
    assert served.route is None
    assert served.nearest is not None
    assert served.nearest.tooth == 4
    assert served.nearest.miss_mhz == pytest.approx(1_000.0)
    assert "+1000.000 MHz" in would_do(plan(Order(wanted(2_000.0), (comb,), ())), served.wanted)[0]


def test_beat_with_another_laser_of_the_plan() -> None:
    """A repump locked by its beat with the cooling light needs that to be reached, and to stand before it."""
    beat = Lock("beat", BEAT, None, None, (6_000.0, 7_000.0), "w0")
    found = plan(Order(wanted(0.0, 6_568.0), (CELL, beat), ()))
    first, second = routes(found)
    assert first is not None
    assert second is not None
    assert second.source.lock.name == "beat"
    assert second.beat_mhz == pytest.approx(6_568.0)
    loose = plan(Order(wanted(50.0, 6_618.0), (CELL, beat), ()))
    assert routes(loose) == [None, None]
    backward = plan(Order((Wanted("a", at(6_568.0)), Wanted("w0", at(0.0))), (CELL, beat), ()))
    assert [one is None for one in routes(backward)] == [True, False]


def test_sharing_a_laser_and_a_modulator() -> None:
    """Two frequencies 30 MHz apart behind one shared modulator run it at one setting and keep one lock light."""
    fine = Modulator("fine", ACOUSTO, 20.0, 40.0)
    share = (Share(("w0", "w1"), "ao110"),)
    found = plan(Order(wanted(200.0, 230.0), (CELL,), (AO110, fine), longest=2, shares=share))
    first, second = routes(found)
    assert first is not None
    assert second is not None
    assert [one.modulator.name for one in first.settings] in (["ao110"], ["ao110", "fine"])
    assert first.settings[0].rf_mhz == second.settings[0].rf_mhz
    assert first.settings[0].modulator.name == second.settings[0].modulator.name == "ao110"
    for route, offset in ((first, 200.0), (second, 230.0)):
        assert forward(route) == pytest.approx(BASE + offset, abs=HZ)
    alone = plan(Order(wanted(200.0, 230.0), (CELL,), (AO110, fine), longest=2))
    assert sum(one is None for one in routes(alone)) == 1


def test_sharing_a_comb_line() -> None:
    """Frequencies that share a laser on a comb sit on one line with one beat."""
    comb = Lock("comb", COMB, at(3.0), 100.0, (10.0, 40.0))
    share = (Share(("w0", "w1")),)
    wide = Modulator("wide", ELECTRO, 300.0, 900.0)
    found = plan(Order(wanted(23.0, 523.0), (comb,), (wide,), longest=1, shares=share))
    first, second = routes(found)
    assert first is not None
    assert second is not None
    assert (first.tooth, first.beat_mhz) == (second.tooth, second.beat_mhz)
    assert forward(second) == pytest.approx(BASE + 523.0, abs=HZ)


def test_synthesiser_steps_leave_a_residual() -> None:
    """A step of 1 kHz leaves at most 1 kHz of light in double pass; a finer one in the chain takes most of it away."""
    coarse = Modulator("coarse", ACOUSTO, 90.0, 130.0, passes=2, step_mhz=1e-3)
    (route,) = routes(plan(Order(wanted(210.00034), (CELL,), (coarse,))))
    assert route is not None
    assert abs(route.residual_mhz) <= 1e-3 + HZ
    assert route.settings[0].rf_mhz * 1000 == pytest.approx(round(route.settings[0].rf_mhz * 1000), abs=1e-6)
    fine = Modulator("fine", ACOUSTO, 60.0, 100.0, step_mhz=1e-6)
    (route,) = routes(plan(Order(wanted(210.00034 + 80), (CELL,), (coarse, fine))))
    assert route is not None
    assert abs(route.residual_mhz) <= 1e-6 + HZ


def test_nearest_miss_and_what_would_do() -> None:
    """Out of reach: the chain that comes nearest, how far it misses, and a modulator that would reach."""
    found = plan(Order(wanted(6_568.0, 300.0), (CELL,), (AO80,)))
    first, second = found.served
    assert first.route is None
    assert first.nearest is not None
    assert first.nearest.miss_mhz == pytest.approx(6_468.0)
    assert would_do(found, first.wanted) == [
        "from cell: +6568.000 MHz, an electro-optic sideband of order +1 at 6568.000 MHz"
    ]
    assert "300.000 MHz, one pass, order +1" in would_do(found, second.wanted)[0]


def test_bounds_are_told() -> None:
    """A search that is cut says so; one within its bounds is exhaustive."""
    many = tuple(Modulator(f"m{k}", ACOUSTO, 60.0 + k, 100.0 + k) for k in range(14))
    assert plan(Order(wanted(80.0), (CELL,), many, longest=2)).is_exhaustive
    chains = chains_of(many, 3, most=1000)
    assert "chains of 3 elements or more" in chains.cut
    assert int(chains.length.max()) == 2


def earlier(found: Plan) -> list[Earlier]:
    return [
        Earlier(
            one.wanted.name,
            one.wanted.point.frequency_mhz,
            one.route.source.lock.name,
            one.route.lock_light_mhz,
            one.route.beat_mhz,
            tuple((part.modulator.name, part.order, part.rf_mhz) for part in one.route.settings),
        )
        for one in found.served
        if one.route is not None
    ]


def test_moves_after_the_data_changed() -> None:
    """When a wanted frequency moves by 2 MHz a double-pass setting moves by 1000 kHz and the structure stays."""
    first = plan(Order(wanted(200.0, 80.0), (CELL,), (AO80, AO110)))
    old = earlier(first)
    keep = {one.wanted: one.structure for one in old}
    moved = plan(Order(wanted(202.0, 80.0), (CELL,), (AO80, AO110), keep=keep))
    changes = moves_of(moved, old)
    assert [one.status for one in changes] == [KEPT, KEPT]
    assert changes[0].frequency_khz == pytest.approx(2000.0)
    assert changes[0].settings == (("ao110", pytest.approx(1000.0, abs=1e-3)),)
    assert changes[1].settings == (("ao80", pytest.approx(0.0, abs=1e-6)),)
    beyond = plan(Order(wanted(90.0, 400.0), (CELL,), (AO80, AO110), keep=keep))
    assert [one.status for one in moves_of(beyond, old)] == [REPLANNED, LOST]
    other = plan(Order((Wanted("new", at(80.0)),), (CELL,), (AO80,)))
    assert {one.wanted: one.status for one in moves_of(other, old)} == {"new": ADDED, "w0": GONE, "w1": GONE}


def test_earlier_structure_is_kept_though_another_is_nearer_to_centre() -> None:
    """A plan that is posted again keeps its modulators while they reach, even where others would now be better."""
    twin = Modulator("twin", ACOUSTO, 70.0, 130.0)
    order = Order(wanted(80.0), (CELL,), (AO80, twin))
    first = plan(order)
    route = first.served[0].route
    assert route is not None
    assert route.settings[0].modulator.name == "ao80"
    again = plan(Order(wanted(98.0), (CELL,), (AO80, twin), keep={"w0": structure_of(route)}))
    kept = again.served[0].route
    assert kept is not None
    assert kept.settings[0].modulator.name == "ao80"
    fresh = plan(Order(wanted(98.0), (CELL,), (AO80, twin))).served[0].route
    assert fresh is not None
    assert fresh.settings[0].modulator.name == "twin"


def test_alternatives_are_other_ways() -> None:
    """Alternatives differ in lock or chain from the choice, are ranked, and reach too."""
    (served,) = plan(Order(wanted(80.0), (CELL,), (AO80, AO110, EO), longest=3, alternatives=5)).served
    assert served.route is not None
    assert structure_of(served.route) not in {structure_of(one) for one in served.others}
    lengths = [len(one.settings) for one in served.others]
    assert lengths == sorted(lengths)
    for one in served.others:
        assert forward(one) == pytest.approx(BASE + 80.0, abs=HZ)


@given(st.integers(2, 5), st.integers(1, 3))
def test_chains_are_listed_once(count: int, longest: int) -> None:
    """Chains differ in what they do, and their coefficients say what their elements do."""
    assume(longest <= count)
    modulators = (*(Modulator(f"m{k}", ACOUSTO, 50.0 + k, 60.0 + k) for k in range(count - 1)), SHG)
    chains = chains_of(modulators, longest)
    keys = {(chains.multiplier[k], tuple(chains.coefficients[k])) for k in range(len(chains.elements))}
    assert len(keys) == len(chains.elements)
    for k, elements in enumerate(chains.elements):
        light = 1000.0
        for part in elements:
            light = after(modulators[part.modulator], part.order, modulators[part.modulator].centre_mhz, light)
        assert light == pytest.approx(chains.multiplier[k] * 1000.0 + chains.centre[k], abs=1e-9)


def test_assignment_by_hand() -> None:
    """Two items want modulator 0; the one that has a cheap alternative gives way."""
    one = Variant(0, 0.0, ((np.array([1]), np.array([1.0]), np.array([7])),))
    two = Variant(0, 0.0, ((np.array([1, 2]), np.array([1.0, 3.0]), np.array([8, 9])),))
    assert [choice.options for choice in assign([[one], [two]], 2)] == [(7,), (9,)]
    assert [choice.options for choice in assign([[two], [one]], 2)] == [(9,), (7,)]
    assert [choice.options for choice in assign([[one], [one]], 2)] in ([(7,), (-1,)], [(-1,), (7,)])


@pytest.mark.parametrize(
    ("change", "named"),
    [
        ({"kind": "magneto-optic"}, "acousto-optic"),
        ({"place": "roof"}, "atoms"),
        ({"low_mhz": 0.0}, "low"),
        ({"low_mhz": 120.0}, "low"),
        ({"passes": 3}, "1 or 2"),
        ({"orders": ()}, "signed orders"),
        ({"orders": (0,)}, "signed orders"),
        ({"step_mhz": 5.0}, "step"),
        ({"kind": HARMONIC, "factor": 1}, "harmonic"),
    ],
)
def test_impossible_modulators_are_refused(change: dict[str, object], named: str) -> None:
    """A modulator that cannot be is refused with what would do."""
    values: dict[str, object] = {"name": "m", "kind": ACOUSTO, "low_mhz": 60.0, "high_mhz": 100.0}
    with pytest.raises(OutsideValidity, match=named):
        check_modulator(Modulator(**{**values, **change}))  # type: ignore[arg-type]


def test_impossible_plans_are_refused() -> None:
    """Plans beyond the bounds, with doubled or unknown names, or with beats that lead nowhere are refused."""
    with pytest.raises(OutsideValidity, match="wanted = 0"):
        plan(Order((), (CELL,), ()))
    with pytest.raises(OutsideValidity, match="names that differ"):
        plan(Order((*wanted(1.0), *wanted(2.0)), (CELL,), ()))
    with pytest.raises(UnknownName, match="'roof'; nearest: cell"):
        plan(Order(wanted(1.0, locks=("roof",)), (CELL,), ()))
    with pytest.raises(UnknownName, match="nobody"):
        plan(Order(wanted(1.0), (Lock("b", BEAT, None, None, (1.0, 2.0), "nobody"),), ()))
    around = (Lock("a", BEAT, None, None, None, "b"), Lock("b", BEAT, None, None, None, "a"))
    with pytest.raises(OutsideValidity, match="leads back to itself"):
        plan(Order(wanted(1.0), around, ()))
    comb = Lock("c", COMB, at(0.0), 100.0)
    with pytest.raises(OutsideValidity, match="whose frequency is fixed"):
        plan(Order(wanted(1.0), (comb, Lock("a", BEAT, None, None, (1.0, 2.0), "c")), ()))
    with pytest.raises(OutsideValidity, match="max_chain"):
        plan(Order(wanted(1.0), (CELL,), (), longest=9))
    with pytest.raises(OutsideValidity, match="at most one share"):
        plan(Order(wanted(1.0, 2.0), (CELL,), (), shares=(Share(("w0", "w1")), Share(("w0", "w1")))))
    with pytest.raises(UnknownName, match="modulator 'x'"):
        plan(Order(wanted(1.0, 2.0), (CELL,), (), shares=(Share(("w0", "w1"), "x"),)))
    with pytest.raises(OutsideValidity, match="harmonic stages are not shared"):
        plan(Order(wanted(1.0, 2.0), (CELL,), (SHG,), shares=(Share(("w0", "w1"), "shg"),)))
