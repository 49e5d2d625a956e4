"""Writes a plan as the records of an answer, as a table, and as a document that can be posted again."""

from collections.abc import Sequence
from typing import Any

from levels.advice import would_do
from levels.locks import Point, Wanted, gap_uncertainty
from levels.moves import Move
from levels.plan import Plan, Served
from levels.reaching import Route, Setting
from service.answers import DOUBTED, scalar
from service.formats import Column, Table
from service.plan_shapes import PlanAsked

KEPT = ("modulator", "order", "frequency_MHz")
UNSTATED = "an input states no uncertainty"
NO_SLOPE = "name the lower and upper sublevels to see how it moves with the field"
OUT_OF_REACH = "no chain of the modulators reaches it from any lock"
TAKEN = "its chains need modulators that the rest of the plan uses"


def route_record(plan: Plan, served: Served, route: Route | None, rank: int) -> dict[str, Any]:
    """One way to make one wanted frequency; empty where there is none."""
    wanted, point = served.wanted, served.wanted.point
    spread = point.uncertainty_mhz
    unstated = "" if spread is not None else UNSTATED
    slope = point.slope_mhz_per_gauss
    reason = "" if route else TAKEN if served.reachable else OUT_OF_REACH
    return {
        "wanted": wanted.name,
        "rank": rank,
        "reached": route is not None,
        "reason": reason,
        "frequency": scalar(point.frequency_mhz * 1e-6, None if spread is None else spread * 1e-6, "THz", unstated),
        "lock": route.source.lock.name if route else "",
        "tooth": route.tooth if route else 0,
        "beat_MHz": route.beat_mhz if route else None,
        "lock_light_MHz": route.lock_light_mhz if route else None,
        "laser_MHz": route.laser_mhz if route else None,
        "multiplier": route.multiplier if route else None,
        "gap": _gap(plan, wanted, route, reason),
        "elements": [_element(one) for one in route.settings] if route else [],
        "light_MHz": point.frequency_mhz + route.residual_mhz if route else None,
        "residual_kHz": 1e3 * route.residual_mhz if route else None,
        "share_of_range": route.share if route else None,
        "spare_MHz": route.spare_mhz if route else None,
        "slope": scalar(slope, point.slope_uncertainty, "MHz/G", _slope_reason(point)),
    }


def _slope_reason(point: Point) -> str:
    if point.slope_mhz_per_gauss is None:
        return NO_SLOPE
    return DOUBTED if point.slope_uncertainty is None else ""


def _gap(plan: Plan, wanted: Wanted, route: Route | None, reason: str) -> dict[str, Any]:
    if route is None:
        return scalar(None, None, "MHz", reason)
    lock: Point = plan.points[route.source.lock.name]
    start = lock.frequency_mhz + route.tooth * (route.source.lock.spacing_mhz or 0.0)
    spread = gap_uncertainty(wanted.point, lock, route.multiplier)
    value = wanted.point.frequency_mhz - route.multiplier * start
    return scalar(value, spread, "MHz", "" if spread is not None else UNSTATED)


def _element(setting: Setting) -> dict[str, Any]:
    one = setting.modulator
    return {
        "modulator": one.name,
        "kind": one.kind,
        "place": one.place,
        "order": setting.order,
        "passes": one.passes,
        "factor": one.factor,
        "frequency_MHz": setting.rf_mhz,
        "light_MHz": setting.light_mhz,
    }


def missed_record(plan: Plan, served: Served) -> dict[str, Any]:
    """The nearest miss of a wanted frequency, and what would reach it."""
    nearest = served.nearest
    return {
        "wanted": served.wanted.name,
        "lock": nearest.source.lock.name if nearest else "",
        "elements": [f"{one.modulator.name} {one.order:+d}" for one in nearest.settings] if nearest else [],
        "miss": scalar(nearest.miss_mhz if nearest else None, None, "MHz", "distance from the edge of the range"),
        "would_do": would_do(plan, served.wanted),
    }


def move_record(move: Move) -> dict[str, Any]:
    """What moved for one wanted frequency."""
    return {
        "wanted": move.wanted,
        "status": move.status,
        "frequency_moved_kHz": move.frequency_khz,
        "lock_moved_kHz": move.lock_khz,
        "beat_moved_kHz": move.beat_khz,
        "modulators": [name for name, _ in move.settings],
        "moved_kHz": [moved for _, moved in move.settings],
    }


def document_of(asked: PlanAsked, routes: Sequence[dict[str, Any]], release: str) -> dict[str, Any]:
    """The plan as a body that can be posted again, its settings and the data release as `previous`."""
    settings = [
        {
            "wanted": one["wanted"],
            "frequency_MHz": one["light_MHz"] - 1e-3 * one["residual_kHz"],
            "lock": one["lock"],
            "lock_light_MHz": one["lock_light_MHz"],
            "beat_MHz": one["beat_MHz"],
            "elements": [
                {key: part[key] for key in ("modulator", "order", "frequency_MHz")} for part in one["elements"]
            ],
        }
        for one in routes
        if one["reached"]
    ]
    body = asked.model_dump(mode="json", exclude={"format", "previous"})
    return {**body, "previous": {"release": release, "settings": settings}}


def table_of(routes: Sequence[dict[str, Any]]) -> Table:
    """One row for each element of the plan; a frequency taken from its lock as it is has one row without element."""
    rows: list[dict[str, Any]] = []
    for one in routes:
        for place, part in enumerate(one["elements"] or [{}]):
            rows.append(
                {
                    "wanted": one["wanted"],
                    "reached": one["reached"],
                    "frequency_THz": one["frequency"]["value"],
                    "lock": one["lock"],
                    "lock_light_MHz": one["lock_light_MHz"],
                    "element": place + 1 if part else 0,
                    "modulator": part.get("modulator", ""),
                    "order": part.get("order", 0),
                    "frequency_MHz": part.get("frequency_MHz"),
                    "light_MHz": part.get("light_MHz", one["light_MHz"]),
                    "residual_kHz": one["residual_kHz"],
                    "spare_MHz": one["spare_MHz"],
                }
            )
    columns: dict[str, Column] = {name: [row[name] for row in rows] for name in rows[0]}
    return Table(columns)
