"""A term in strong fields against the whole space of L, S and I, built without the module's formulas."""

import warnings
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st
from numpy.typing import NDArray

from levels.constants import G_S, MU_B_MHZ_PER_GAUSS
from levels.crossings import crossings
from levels.derive import lande
from levels.errors import NotPublished, OutsideValidity
from levels.records import Atom, Isotope, Level
from levels.sensitivity import ENERGY, QUADRATIC, SHIFT, SLOPE
from levels.strongfield import solve_term_block, spin_operator, term_constants, term_ms, term_sublevels
from levels.strongfield_lines import Ends, pair_ratios, term_component, term_component_spread, term_components
from levels.strongfield_spread import contributions, term_spread
from levels.sublevels import labels_of, sublevels
from levels.terms import ZERO_GAP, Term, alone, interval, term_notes, term_of
from levels.uncertainty import component_spread
from tests.full_dimension import multipole, operators, spin, term_states, wig3jj
from tests.records_for_tests import RB87_D2, level, line, quantity

with warnings.catch_warnings():
    warnings.simplefilter("ignore")  # it misses a plotting library that nothing here needs
    import qutip

Array = NDArray[np.float64]
LETTERS = "SPDFGHIKLMNOQ"
LITHIUM_GAP = 10053.31


def lande_of(twice_L: int, twice_S: int, twice_J: int) -> float | None:
    found = lande("x", f"{twice_S + 1}{LETTERS[twice_L // 2]}", "LS", twice_J)
    return None if found is None else found.value


def term(
    twice_L: int,
    twice_S: int,
    twice_I: int = 0,
    step_mhz: float = LITHIUM_GAP,
    A: tuple[float, ...] = (45.9, -3.06, 7.0, 2.0, 1.0),
    own: int = 0,
    spread: dict[str, float] | None = None,
) -> Term:
    """A term with Lande factors; its levels lie `step_mhz` times (0, 1, 1.6, 2.1, ...) above the first."""
    g_I = -0.00118 if twice_I else None
    levels = []
    for k, J in enumerate(range(abs(twice_L - twice_S), twice_L + twice_S + 1, 2)):
        dipole = A[k % len(A)] if twice_I and J else None
        quadrupole = -0.2 if twice_I >= 2 and J >= 2 else None
        name, letters = f"p_{J}", f"{twice_S + 1}{LETTERS[twice_L // 2]}"
        constants = (dipole, quadrupole, None, lande_of(twice_L, twice_S, J), g_I)
        levels.append(level(J, twice_I, *constants, atom="7Zz", name=name, term=letters, spread=spread, parity=-1))
    height = [step_mhz * k * (1 - 0.1 * (k - 1)) for k in range(len(levels))]
    gaps = tuple(quantity(h - height[own], 0.02, "MHz") if k != own else ZERO_GAP for k, h in enumerate(height))
    return Term(levels[own], tuple(levels), gaps)


def whole_space(of: Term, field: float) -> tuple[Array, Array]:
    """H and m in the product space of L, S and I: E_J and hyperfine by projection, Zeeman from L, S and I."""
    constants = term_constants(of)
    L, S, I = constants.twice_L, constants.twice_S, constants.twice_I
    S_z, _ = term_states(L, S)
    L_z = np.kron(spin(L)[0], np.eye(S + 1))
    zeeman = np.kron(L_z + G_S * S_z, np.eye(I + 1))
    g_I = of.level.g_I.value if of.level.g_I else 0.0
    zeeman += np.kron(np.eye((L + 1) * (S + 1)), g_I * spin(I)[0])
    matrix = MU_B_MHZ_PER_GAUSS * field * zeeman
    for one, gap in zip(of.levels, of.gaps, strict=True):
        J = one.twice_J
        lifted = np.kron(coupled(L, S, J), np.eye(I + 1))
        ops = operators(J, I)
        inside = gap.value * np.eye((J + 1) * (I + 1))
        inside += (one.A.value if one.A else 0.0) * ops.dipole + (one.B.value if one.B else 0.0) * ops.quadrupole
        matrix += lifted @ inside @ lifted.T
    return matrix, np.kron(L_z + S_z, np.eye(I + 1)) + np.kron(np.eye((L + 1) * (S + 1)), spin(I)[0])


def coupled(twice_L: int, twice_S: int, twice_J: int) -> Array:
    """The states |J M> as columns, M falling, lowered step by step from |J J>, so that all M share one phase."""
    _, states = term_states(twice_L, twice_S)
    lowering = np.kron(spin(twice_L)[2], np.eye(twice_S + 1)) + np.kron(np.eye(twice_L + 1), spin(twice_S)[2])
    columns = [states[twice_J, twice_J]]
    for _ in range(twice_J):
        vector = lowering @ columns[-1]
        columns.append(vector / np.linalg.norm(vector))
    return np.array(columns).T


terms = st.builds(
    term,
    st.sampled_from([2, 4, 6]),
    st.integers(1, 4),
    st.integers(0, 4),
    st.floats(2e3, 1e6) | st.floats(-1e6, -2e3),
)


@given(terms, st.floats(-3e4, 3e4))
def test_energies_are_those_of_the_whole_space(of: Term, field: float) -> None:
    """Every energy of a term, at any field, is an eigenvalue of the Hamiltonian in the space of L, S and I."""
    constants = term_constants(of)
    matrix, _ = whole_space(of, field)
    ours = [solve_term_block(constants, m, np.array([field])).energy_mhz[0] for m in term_ms(constants)]
    expected = np.linalg.eigvalsh(matrix)
    assert np.sort(np.concatenate(ours)) == pytest.approx(expected, abs=1e-11 * np.abs(expected).max() + 1e-9)


@given(terms, st.floats(1.0, 3e4))
def test_slopes_and_quadratic_coefficients_are_derivatives(of: Term, field: float) -> None:
    """Slopes and quadratic coefficients are those of fourth-order differences of the energies."""
    step = 1e-3 * field + 0.01
    points = field + step * np.arange(-2, 3)
    found = term_sublevels(of, points)
    energy = found.energy_mhz
    rounding = 1e-12 * (np.abs(energy).max() + max(abs(gap.value) for gap in of.gaps))
    curvature = np.abs(found.quadratic_hz_per_gauss2) * 1e-6
    gentle = curvature.max(axis=0) < 1.2 * curvature.min(axis=0) + 1e-9
    slope = (energy[0] - 8 * energy[1] + 8 * energy[3] - energy[4]) / (12 * step)
    second = (-energy[0] + 16 * energy[1] - 30 * energy[2] + 16 * energy[3] - energy[4]) / (24 * step**2)
    wide = 10 * rounding / step
    assert found.slope_mhz_per_gauss[2, gentle] == pytest.approx(slope[gentle], rel=1e-6, abs=wide + 1e-7)
    quadratic = found.quadratic_hz_per_gauss2[2, gentle] * 1e-6
    assert quadratic == pytest.approx(second[gentle], rel=1e-2, abs=wide / step + 1e-12)


@given(terms)
def test_zero_field_is_the_published_hyperfine_structure(of: Term) -> None:
    """At zero field nothing mixes: energies, labels and slopes are those of the level by itself."""
    whole, single = term_sublevels(of, 0.0), sublevels(of.level, 0.0)
    assert whole.energy_mhz == pytest.approx(single.energy_mhz, abs=1e-8)
    for name in ("twice_F", "twice_m", "twice_mJ", "twice_mI"):
        assert (getattr(whole, name) == getattr(single, name)).all()
    assert whole.slope_mhz_per_gauss == pytest.approx(single.slope_mhz_per_gauss, abs=1e-9)


def test_weak_field_departs_from_second_order_by_the_third() -> None:
    """Below 1 % mixing second order and the whole term agree, up to the third power of the field."""
    of = term(2, 1)
    single = replace(of.level, neighbours=((3, LITHIUM_GAP),))
    fields = np.array([25.0, 50.0, 100.0])
    apart = term_sublevels(of, fields).energy_mhz - sublevels(single, fields).energy_mhz
    assert np.abs(apart).max(axis=1) == pytest.approx(np.abs(apart[-1]).max() * np.array([1 / 64, 1 / 8, 1]), rel=0.05)
    assert np.abs(apart[-1]).max() < 1e-2


def test_strong_field_reaches_the_paschen_back_pattern() -> None:
    """Far above the fine structure the slopes of a 2P are (m_L + g_S m_S) muB/h: six states, two near zero."""
    of = term(2, 1)
    constants = term_constants(of)
    fields = np.array([1e6])
    found = np.concatenate([solve_term_block(constants, m, fields).slope_mhz_per_gauss()[0] for m in (-3, -1, 1, 3)])
    expected = [m_L + G_S * m_S for m_L in (-1, 0, 1) for m_S in (-0.5, 0.5)]
    assert np.sort(found) / MU_B_MHZ_PER_GAUSS == pytest.approx(sorted(expected), abs=2e-4)


@pytest.mark.parametrize("field", [0.0, 137.0, 5000.0, 80000.0])
def test_spin_orbit_hamiltonian_of_a_general_library(field: float) -> None:
    """A 2P with zeta L.S in qutip's product space has the same energies, mean L_z and mean S_z."""
    of = term(2, 1)
    zeta = LITHIUM_GAP / 1.5
    L = [qutip.tensor(qutip.jmat(1, axis), qutip.qeye(2)) for axis in "xyz"]
    S = [qutip.tensor(qutip.qeye(3), qutip.jmat(0.5, axis)) for axis in "xyz"]
    matrix = sum(zeta * a * b for a, b in zip(L, S, strict=True)) + MU_B_MHZ_PER_GAUSS * field * (L[2] + G_S * S[2])
    tilted = matrix + 1e-3 * (L[2] + S[2])
    energies, vectors = tilted.eigenstates()
    rows = sorted(
        (
            round(qutip.expect(L[2] + S[2], v), 6),
            e - 1e-3 * qutip.expect(L[2] + S[2], v) + zeta,
            qutip.expect(S[2], v),
        )
        for e, v in zip(energies, vectors, strict=True)
    )
    constants = term_constants(of)
    ours = []
    for m in term_ms(constants):
        eigen = solve_term_block(constants, m, np.array([field]))
        spins = eigen.mean(spin_operator(constants, eigen.block))[0]
        ours += [(m / 2, e, s) for e, s in zip(eigen.energy_mhz[0], spins, strict=True)]
    assert np.array(ours) == pytest.approx(np.array(rows), abs=1e-6)


@given(terms, st.floats(1.0, 2e4))
def test_derivatives_by_every_constant(of: Term, field: float) -> None:
    """Each contribution to the uncertainty is the derivative by its constant, as a symmetric difference has it."""
    labels = labels_of(term_constants(of).levels[of.own])
    total = contributions(of, np.array([field]), labels)
    for parameter, numbers in total.values():
        if parameter.constant is None or parameter.name.startswith("g_I"):
            continue
        step = 1e-4 * max(abs(parameter.constant.value), 1e-3)
        ends = [term_sublevels(_moved(of, parameter.name, sign * step), field) for sign in (1, -1)]
        spans = [
            (ends[0].energy_mhz - ends[1].energy_mhz)[0],
            (ends[0].slope_mhz_per_gauss - ends[1].slope_mhz_per_gauss)[0],
        ]
        middle = term_sublevels(of, field)
        for kind, span in zip((ENERGY, SLOPE), spans, strict=True):
            noise = 1e-11 * (abs(middle.energy_mhz).max() + max(abs(g.value) for g in of.gaps)) / step
            scale = np.abs(numbers[kind, 0]).max()
            assert numbers[kind, 0] == pytest.approx(span / (2 * step), rel=2e-3, abs=noise + 2e-3 * scale + 1e-9)


def _moved(of: Term, name: str, step: float) -> Term:
    """The term with one constant moved: A(p_1), interval(p_1, p_3)."""
    kind, _, inner = name.rstrip(")").partition("(")
    if kind == "interval":
        at = next(k for k, one in enumerate(of.levels) if one.name == inner.split(", ")[1])
        gaps = tuple(replace(g, value=g.value + step) if k == at else g for k, g in enumerate(of.gaps))
        return replace(of, gaps=gaps)

    def changed(one: Level) -> Level:
        constant = getattr(one, kind)
        return replace(one, **{kind: replace(constant, value=constant.value + step)}) if one.name == inner else one

    return replace(of, level=changed(of.level), levels=tuple(map(changed, of.levels)))


def test_quadratic_coefficient_moves_with_the_interval() -> None:
    """Of a 3P0 far below its 3P1, q = -c/gap, so dq/dgap = c/gap^2; the shift moves as the energy does."""
    of = term(2, 2, step_mhz=5.6e6)
    spread = contributions(of, np.array([1.0]), [(0, 0)])
    q = term_sublevels(of, 1.0).quadratic_hz_per_gauss2[0, 0]
    _, numbers = next(item for item in spread.values() if item[0].name == "interval(p_0, p_2)")
    assert numbers[QUADRATIC, 0, 0] == pytest.approx(-q / 5.6e6, rel=1e-6)
    assert numbers[SHIFT, 0, 0] == pytest.approx(-q * 1e-6 / 5.6e6, rel=1e-6)


def test_hyperfine_between_levels_is_the_doubt() -> None:
    """With I and mixing, the hyperfine interaction between J makes the uncertainty unknown; without I it is silent."""
    known = {"A": 0.01, "B": 0.01, "g_J": 1e-6, "g_I": 1e-9}
    with_spin = term_spread(term(2, 1, 3, spread=known), 3000.0)
    assert np.isnan(with_spin.uncertainty[ENERGY]).any()
    assert any("hyperfine interaction between J = 1/2 and 3/2" in name for name in with_spin.excludes)
    without = term_spread(term(2, 1, 0, spread={"g_J": 1e-3}), 1.0)
    assert not any("hyperfine" in name for name in without.excludes)
    assert without.uncertainty[ENERGY, 0] == pytest.approx(0.5 * MU_B_MHZ_PER_GAUSS * 1e-3, rel=1e-2)


def test_stretched_states_stay_straight() -> None:
    """The stretched states of a term do not mix: their energy is linear at any field."""
    of = term(2, 1, 3, own=1)
    fields = np.array([0.0, 1e3, 1e5])
    found = term_sublevels(of, fields)
    at = int(np.argmax(found.twice_m))
    assert np.diff(found.energy_mhz[:, at]) / np.diff(fields) == pytest.approx(
        found.slope_mhz_per_gauss[0, at], rel=1e-12
    )
    assert found.quadratic_hz_per_gauss2[:, at] == pytest.approx(0.0, abs=1e-9)


@given(terms, st.floats(0.0, 3e4))
def test_field_and_m_reverse_together(of: Term, field: float) -> None:
    """Reversing the field and every m leaves all energies as they are."""
    one, two = term_sublevels(of, field), term_sublevels(of, -field)
    for k, (F, m) in enumerate(zip(one.twice_F, one.twice_m, strict=True)):
        mirror = int(np.nonzero((two.twice_F == F) & (two.twice_m == -m))[0][0])
        scale = np.abs(one.energy_mhz).max() + max(abs(g.value) for g in of.gaps)
        assert two.energy_mhz[0, mirror] == pytest.approx(one.energy_mhz[0, k], abs=1e-11 * scale)


def test_long_grids_agree_with_single_fields() -> None:
    """A grid long enough for Chebyshev pieces gives what each field alone gives."""
    of = term(2, 1, 3)
    fields = np.linspace(0, 2000, 1001)
    grid = term_sublevels(of, fields)
    for at in (0, 333, 1000):
        single = term_sublevels(of, fields[at])
        assert grid.energy_mhz[at] == pytest.approx(single.energy_mhz[0], abs=1e-7)
        assert grid.slope_mhz_per_gauss[at] == pytest.approx(single.slope_mhz_per_gauss[0], abs=1e-8)


# Lines


def lower_alone() -> Term:
    return alone(level(1, 3, 401.75, g_J=2.0023, g_I=-0.00118, atom="7Zz", name="s_1", term="2S"))


def ends_of(upper: Term, lower: Term | None = None, rank: int = 1) -> Ends:
    lower = lower or lower_alone()
    return Ends(line(lower.level, upper.level, rank), lower, upper)


@given(st.floats(0.0, 3e4), st.sampled_from([0, 1]))
def test_strengths_from_one_upper_sublevel_sum_to_one(field: float, own: int) -> None:
    """However the field mixes 2P1/2 and 2P3/2, each of their sublevels decays to 2S1/2 with all its strength."""
    found = term_components(ends_of(term(2, 1, 3, own=own)), field)
    upper = list(zip(found.upper_twice_F.tolist(), found.upper_twice_m.tolist(), strict=True))
    for label in set(upper):
        total = sum(found.strength[0, k] for k, one in enumerate(upper) if one == label)
        assert total == pytest.approx(1.0, abs=1e-11)


@pytest.mark.parametrize(("twice_S", "field"), [(1, 6000.0), (1, -900.0), (2, 2500.0), (3, 1200.0)])
def test_strengths_are_those_of_an_operator_on_the_orbit(twice_S: int, field: float) -> None:
    """Strengths of S-P lines in a strong field are those of a rank-1 operator on L alone, in the product space."""
    of = term(2, twice_S, own=min(twice_S, 2))
    matrix, total = whole_space(of, field)
    apart = 1e7
    energy, upper = np.linalg.eigh(matrix + apart * total)
    twice_m = np.rint(2 * np.einsum("ik,ij,jk->k", upper, total, upper)).astype(int)
    ground = level(twice_S, 0, g_J=2.0023, name="s_1", term=f"{twice_S + 1}S")
    found = term_components(ends_of(of, alone(ground)), field)
    assert found.strength_known
    for k in range(found.q.size):
        m_up, m_low, q = int(found.upper_twice_m[k]), int(found.lower_twice_m[k]), int(found.q[k])
        states = [at for at in np.argsort(energy) if twice_m[at] == m_up]
        vector = upper[:, states[-1]]  # the level asked for is the highest of the term
        orbital = np.array([(-1) ** (1 - L_z) * wig3jj(2, 2, 0, -2 * L_z, 2 * q, 0) for L_z in (1, 0, -1)])
        lower = np.eye(twice_S + 1)[(twice_S - m_low) // 2]
        strength = 3 * (vector @ np.kron(orbital, lower)) ** 2
        assert found.strength[0, k] == pytest.approx(strength, abs=1e-12)


def test_hyperfine_between_levels_is_a_rank_one_tensor() -> None:
    """The doubt about the hyperfine interaction between J is the mean of I.S between them, in the product space."""
    of, field = term(2, 1, 3, own=1), 1500.0
    matrix, total = whole_space(of, field)
    halves = [np.kron(coupled(2, 1, J), np.eye(4)) for J in (1, 3)]
    I, S = [spin(3)[k] for k in range(3)], [np.kron(np.eye(3), spin(1)[k]) for k in range(3)]
    product = np.kron(S[0], I[0]) + (np.kron(S[1], I[2]) + np.kron(S[2], I[1])) / 2
    off = halves[0] @ halves[0].T @ product @ halves[1] @ halves[1].T
    off = (off + off.T) / abs(float(coupled(2, 1, 1)[:, 0] @ S[0] @ coupled(2, 1, 3)[:, 1]))
    apart = 1e7
    _, states = np.linalg.eigh(matrix + apart * total)  # by m, then by energy
    twice_m = np.rint(2 * np.einsum("ik,ij,jk->k", states, total, states)).astype(int)
    expected = np.einsum("ik,ij,jk->k", states, off, states)[twice_m == 0][2:]  # above the two of 2P1/2
    labels = [(6, 0), (4, 0), (2, 0), (0, 0)]  # A < 0: F = 3 lowest
    found = contributions(of, np.array([field]), [*labels, (6, 6)])
    _, numbers = next(item for item in found.values() if item[0].name.startswith("hyperfine"))
    unit = 2.0 * abs(wig3jj(3, 2, 1, -1, 0, 1))  # the size of sqrt(2J'+1) (J' 1 J; -1/2 0 1/2)
    assert numbers[ENERGY, 0] == pytest.approx([*(unit * expected), 0.0], abs=1e-9)


def test_a_level_by_itself_answers_as_components_do() -> None:
    """Two terms of one level each give the strengths and uncertainties of `components`."""
    ends = Ends(RB87_D2, alone(RB87_D2.lower), alone(RB87_D2.upper))
    whole, single = term_component_spread(ends, 50.0), component_spread(RB87_D2, 50.0)
    assert whole.stated == pytest.approx(single.stated, rel=1e-9, abs=1e-15)
    one = term_component(ends, (4, 4), (6, 6), 50.0)
    assert one.strength == pytest.approx(1.0)
    operator = multipole(1, 3, 0, 1, 1)
    assert operator[0, 0] ** 2 == pytest.approx(one.strength)


def test_ratios_of_pairs_need_no_model_where_only_one_pair_is_allowed() -> None:
    """1S0-3P1 has one pair of J and any coupling; 1S0-3P0 has none; a spin-forbidden line with several has no model."""
    ground = alone(level(0, 0, name="s_0", term="1S"))
    triplet = term(2, 2, own=1)
    assert pair_ratios(ends_of(triplet, ground)) == {(0, 2): 1.0}
    assert pair_ratios(ends_of(term(2, 2, own=0), ground)) == {}
    singlet = alone(level(2, 0, g_J=1.0, name="p_2", term="1P"))
    assert pair_ratios(ends_of(triplet, singlet)) == {}
    found = term_components(ends_of(triplet, singlet), 10.0)
    assert not found.strength_known


def test_component_of_the_table_and_alone_agree() -> None:
    """One component solved alone is the row of the table, with the same uncertainty."""
    ends = ends_of(term(2, 1, 3, own=1, A=(45.9, -3.06), spread={"g_J": 1e-3}))
    table, spread = term_components(ends, 800.0), term_component_spread(ends, 800.0)
    k = 11
    label = (int(table.lower_twice_F[k]), int(table.lower_twice_m[k]))
    one = term_component(ends, label, (int(table.upper_twice_F[k]), int(table.upper_twice_m[k])), 800.0)
    assert one.offset_mhz == pytest.approx(table.offset_mhz[0, k], abs=1e-9)
    assert one.shift_mhz == pytest.approx(table.shift_mhz[0, k], abs=1e-9)
    assert one.strength == pytest.approx(table.strength[0, k], abs=1e-12)
    assert one.spread.stated[:, 0, 0] == pytest.approx(spread.stated[:, 0, k], rel=1e-9)
    with pytest.raises(OutsideValidity, match="m' - m"):
        term_components(ends, 1.0, 2)


# Terms and crossings


def record(of: Term, **lines: float) -> Atom:
    energies = {one.name: 15000.0 + gap.value / 29979.2458 for one, gap in zip(of.levels, of.gaps, strict=True)}
    levels = [replace(one, energy=quantity(energies[one.name], 1e-3, "cm-1")) for one in of.levels]
    ground = level(1, of.level.twice_I, 400.0, g_J=2.0, g_I=-0.001, name="s_1", term="2S", energy=quantity(0.0, 0.0))
    named = {one.name: one for one in levels}
    found = tuple(
        line(ground, named[name], centroid=quantity(value, 0.01, "MHz"), centroid_isotope="7", name=name)
        for name, value in lines.items()
    )
    isotope = Isotope("7Zz", "Zz", 0, 119, 7, of.level.twice_I, "s_1")
    return Atom(isotope, (ground, *levels), found)


def test_intervals_prefer_lines_to_energies() -> None:
    """With both D lines stated the interval is theirs; with one it is that of the energies, with their uncertainty."""
    of = term(2, 1, 3)
    atom = record(of, p_1=4.468e8, p_3=4.468e8 + 10053.31)
    found = term_of(atom, atom.levels[1])
    assert [one.twice_J for one in found.levels] == [1, 3]
    assert found.gaps[0] == ZERO_GAP
    assert (found.gaps[1].value, found.gaps[1].uncertainty) == (
        pytest.approx(10053.31),
        pytest.approx(0.0141, rel=0.01),
    )
    other = interval(record(of, p_1=4.468e8), atom.levels[1], atom.levels[2])
    assert (other.value, other.uncertainty) == (pytest.approx(10053.31, abs=1e-3), pytest.approx(42.4, rel=0.01))


def test_what_the_model_leaves_out_is_said() -> None:
    """A missing J and the hyperfine interaction between J are named; a lone level is refused, a hollow one named."""
    of = term(2, 2, 1)
    without = replace(of, levels=of.levels[:2], gaps=of.gaps[:2])
    said = term_notes(without)
    assert said[0] == "J = 2 of 3P is not in the catalogue: its mixing is left out"
    assert "of the size of A, up to 3.06 MHz" in said[1]
    assert term_notes(term(2, 1)) == ()
    atom = record(term(2, 1))
    with pytest.raises(OutsideValidity, match="no other level of its term"):
        term_of(atom, atom.levels[0])
    hollow = replace(of, levels=(of.levels[0], replace(of.levels[1], A=None), of.levels[2]))
    with pytest.raises(NotPublished, match="A of 7Zz p_2"):
        term_sublevels(hollow, 1.0)


def test_crossing_of_2p_in_closed_form() -> None:
    """With g_S = 2, |3/2,-3/2> meets |1/2,1/2> at 4/9 and |1/2,-1/2> at 2/3 of interval/(muB/h); here within 0.15 %."""
    found = crossings(term(2, 1, step_mhz=2882.9), 3000.0)
    unit = 2882.9 / MU_B_MHZ_PER_GAUSS
    assert [one.field_gauss for one in found] == pytest.approx([4 / 9 * unit, 2 / 3 * unit], rel=1.5e-3)
    assert [(one.first.twice_m, one.second.twice_m) for one in found] == [(1, -3), (-1, -3)]


@given(terms)
def test_crossings_are_crossings(of: Term) -> None:
    """At every crossing the two sublevels have one energy, they differ in m, and the order changes there."""
    assume(of.level.twice_I < 3)
    found = crossings(of, 2e4)
    constants = term_constants(of)
    for one in found[:20]:
        assert one.first.twice_m != one.second.twice_m
        energies = []
        for state in (one.first, one.second):
            eigen = solve_term_block(constants, state.twice_m, np.array([one.field_gauss]))
            energies.append(eigen.energy_mhz[0, eigen.block.labels.index((state.position, state.twice_F))])
        scale = max(abs(g.value) for g in of.gaps) + abs(one.energy_mhz)
        assert energies[0] == pytest.approx(energies[1], abs=1e-10 * scale + 1e-8)
        assert energies[0] == pytest.approx(one.energy_mhz, abs=1e-9 * scale)
    with pytest.raises(OutsideValidity, match="max_field"):
        crossings(of, 0.0)
