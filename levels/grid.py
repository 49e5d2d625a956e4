"""A scheme solved over a grid of up to three parameters, point by point and in pieces.

A point depends on nothing but its place in the grid, so pieces may be solved anywhere and in any order.
"""

import time
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any, TypeVar

import numpy as np

from levels.beams import Beam, Scheme, with_field
from levels.cycling import photons_before_leaving
from levels.errors import OutsideValidity
from levels.geometry import axes_of
from levels.pumping import Outcome, Pumping, prepare, pump, solve
from levels.records import Level
from levels.setup import Setup, Share, build, build_at, populations_of, with_beam_setup
from levels.structure import Label, Structure, structure_of
from levels.vary import PARAMETERS, Axis, check_axes, varied_beam, varied_field, varied_magnitude

KEPT = 256  # structures and beams held at a time: what one axis makes comes back along the next
Cell = float | str | None
Item = TypeVar("Item")


@dataclass(frozen=True, slots=True)
class Column:
    """One number to compute at each point; it is read from the steady `outcome`, the `pumping` or the `cycling`."""

    name: str
    needs: str
    meaning: str
    read: Callable[..., Cell]


def _fullest(outcome: Outcome) -> int:
    return int(np.argmax(outcome.populations))


def _excited(outcome: Outcome) -> float:
    structure = outcome.light.structure
    driven = {structure.index_of(item.beam.line.upper) for item in outcome.light.drive.couplings}
    return float(outcome.populations[np.isin(structure.level_index, list(driven))].sum())


COLUMNS = {
    row.name: row
    for row in (
        Column("scattering_per_s", "outcome", "spontaneous photons per atom", lambda o: o.scattering_per_s),
        Column("excited", "outcome", "share of the atoms in the upper levels of the beams' lines", _excited),
        Column("lost_per_s", "outcome", "rate of losing atoms for good", lambda o: o.lost_per_s),
        Column("fullest", "outcome", "the sublevel with most atoms", lambda o: o.light.structure.name(_fullest(o))),
        Column("fullest_share", "outcome", "its share of the atoms", lambda o: float(o.populations[_fullest(o)])),
        Column("unique", "outcome", "1 for one steady state, 0 where the start decides", lambda o: float(o.unique)),
        Column("purity", "pumping", "share of the atoms that end in the target", lambda p: p.purity),
        Column("pumping_time_us", "pumping", "mean time of pumping to the target", lambda p: p.mean_time_us),
        Column("pumping_photons", "pumping", "photons that the pumping costs, per atom", lambda p: p.photons),
        Column("heating_uK", "pumping", "heating by the pumping", lambda p: p.heating_uk),
        Column("photons_before_loss", "cycling", "photons before an atom leaves the cycle", lambda c: c.photons),
        Column("time_before_loss_us", "cycling", "mean time until it leaves", lambda c: c.time_us),
    )
}


@dataclass(frozen=True, slots=True)
class Scan:
    """What to solve: a setup, its axes (the last one runs fastest) and the columns to compute."""

    setup: Setup
    axes: tuple[Axis, ...]
    columns: tuple[str, ...]
    target: tuple[Level, Label] | None = None
    initial: tuple[Share, ...] = ()
    model: str = "auto"

    @property
    def shape(self) -> tuple[int, ...]:
        """How many values each axis has."""
        return tuple(axis.values.size for axis in self.axes)

    @property
    def size(self) -> int:
        """How many points the grid has."""
        return int(np.prod(self.shape, dtype=np.int64))

    def at(self, point: int) -> tuple[tuple[Axis, float], ...]:
        """Each axis with its value at one point."""
        places = np.unravel_index(point, self.shape)
        return tuple((axis, float(axis.values[place])) for axis, place in zip(self.axes, places, strict=True))


@dataclass(frozen=True, slots=True)
class Piece:
    """The columns (`model` first) of the points from `start` on, and the seconds they took."""

    start: int
    columns: dict[str, list[Cell]]
    seconds: float

    @property
    def size(self) -> int:
        """How many points it has."""
        return len(self.columns["model"])


def check_scan(scan: Scan) -> None:
    """Refuse a scan that cannot be, before anything is solved: its axes, its columns, the ends of its grid."""
    check_axes(scan.setup, scan.axes)
    for name in scan.columns:
        if name not in COLUMNS:
            raise OutsideValidity("columns", name, f"some of {', '.join(COLUMNS)}")
        if COLUMNS[name].needs == "pumping" and scan.target is None:
            raise OutsideValidity("target", "nothing", f"the sublevel that {name} is about")
    solver = Solver(scan)
    structure = solver.structure(solver.axes.magnitude_gauss)
    populations_of(structure, scan.initial)
    if scan.target is not None:
        structure.position(*scan.target)
    for end in (np.min, np.max):
        axes_of(solver.scheme(tuple((axis, float(end(axis.values))) for axis in scan.axes)).field_gauss)


class Solver:
    """Solves points of a scan, and keeps what neighbouring points share."""

    def __init__(self, scan: Scan) -> None:
        self.scan, self.base, self.axes = scan, build(scan.setup), axes_of(scan.setup.field_gauss)
        self._structures: dict[float, Structure] = {}
        self._beams: dict[tuple[int, tuple[float, ...]], Beam] = {}

    def scheme(self, at: tuple[tuple[Axis, float], ...]) -> Scheme:
        """The scheme with each axis at a value."""
        beams = tuple(self._beam(place, at) for place in range(len(self.base.beams)))
        return with_field(replace(self.base, beams=beams), varied_field(self.axes, beams, at))

    def structure(self, magnitude_gauss: float) -> Structure:
        """The sublevels in a field of this size."""
        lines = [beam.line for beam in self.base.beams]
        return _kept(self._structures, magnitude_gauss, lambda: structure_of(self.base.atom, lines, magnitude_gauss))

    def cells(self, point: int) -> dict[str, Cell]:
        """The columns at one point."""
        scan, at = self.scan, self.scan.at(point)
        light = prepare(self.scheme(at), scan.model, self.structure(abs(varied_magnitude(self.axes, at))))
        wanted = {COLUMNS[name].needs for name in scan.columns}
        initial = populations_of(light.structure, scan.initial)
        found: dict[str, Any] = {}
        if "pumping" in wanted and scan.target is not None:
            pumping: Pumping = pump(light, light.structure.position(*scan.target), initial)
            found |= {"pumping": pumping, "outcome": pumping.outcome}
        elif "outcome" in wanted:
            found["outcome"] = solve(light, initial)
        if "cycling" in wanted:
            found["cycling"] = photons_before_leaving(light.drive.scheme, model=scan.model)
        return {"model": light.model, **{name: _read(COLUMNS[name], found) for name in scan.columns}}

    def _beam(self, place: int, at: tuple[tuple[Axis, float], ...]) -> Beam:
        base = self.base.beams[place]
        own = [
            (axis, value) for axis, value in at if axis.beam == base.name and PARAMETERS[axis.parameter].of == "beam"
        ]
        if not own:
            return base

        def make() -> Beam:
            varied = varied_beam(self.scan.setup.beams[place], base, self.axes, own)
            return build_at(with_beam_setup(self.scan.setup, place, varied), place, self.axes)

        return _kept(self._beams, (place, tuple(value for _, value in own)), make)


def _read(column: Column, found: dict[str, Any]) -> Cell:
    return column.read(found[column.needs])


def _kept(held: dict[Any, Item], key: Any, make: Callable[[], Item]) -> Item:
    if key not in held:
        if len(held) >= KEPT:
            held.pop(next(iter(held)))
        held[key] = make()
    return held[key]


def solve_points(scan: Scan, start: int, stop: int) -> Piece:
    """Solve the points from `start` to before `stop`."""
    began = time.perf_counter()
    solver = Solver(scan)
    rows = [solver.cells(point) for point in range(start, min(stop, scan.size))]
    columns = {name: [row[name] for row in rows] for name in ("model", *scan.columns)}
    return Piece(start, columns, time.perf_counter() - began)
