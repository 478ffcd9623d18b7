"""What the page knows: the ranking, its shapes, reasons and words, as data that the page's scripts read."""

import math
from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from sitescreen.deliverables.classes import CLASS_EDGES, RAMP
from sitescreen.deliverables.columns import Column
from sitescreen.deliverables.landmarks import landmarks
from sitescreen.deliverables.questions import OVERALL, Asked, View, question_marks
from sitescreen.deliverables.sheet import Sheet
from sitescreen.deliverables.steps import in_steps
from sitescreen.deliverables.strips import strips
from sitescreen.deliverables.sureness import above_breeze, alike, varies
from sitescreen.deliverables.table import value_of
from sitescreen.deliverables.weighing import weighing
from sitescreen.grid import Bounds

if TYPE_CHECKING:
    from sitescreen.screening import Screening

MOST_LEAVES = 500
"""Plots whose reasons and readings go into the page, the best first and those set aside after them; those of the others
would make it too heavy to mail."""

MOST_SITINGS = 200
"""Plots whose siting hint goes into the page, the best first."""

_NOT_ON_A_LEAF = {
    "lon", "lat", "outcome", "water_disagrees", "zone_provisional", "zone_missing", "known_weight_share", "cells",
    "share_flat_water", "over_water_m", "group", "best_patch_mark", "worst_patch_mark", "mean_patch_mark",
    "patch_side_m", "rank_low_weights", "rank_high_weights", "rank_low_data", "rank_high_data", "drawn_mark_low",
    "drawn_mark_high", "not_checked",
}  # fmt: skip


_MARKS_BY_ZONE = ("mark_in_zone", "mark_in_zone_2")


def page_data(
    screening: "Screening",
    columns: Sequence[Column],
    sheet: Sheet,
    questions: Sequence[Asked],
    views: Mapping[str, Sequence[View]],
) -> dict[str, Any]:
    """The data of the page, ready for JSON.

    Parameters
    ----------
    screening : Screening
    columns : sequence of Column
    sheet : Sheet
    questions : sequence of Asked
        Those that the zones of these plots ask.
    views : mapping of question to its views
    """
    table = screening.table
    by_name = {column.name: column for column in columns}

    def column_values(name: str) -> list[Any]:
        if name not in table:
            return [None] * len(table)
        return [value_of(by_name[name], value) for value in table[name].tolist()]

    drawn, left_out = landmarks(screening.context, sheet)
    names = [c.name for c in columns]
    first = names.index("elevation_m")
    measured = [
        c for c in columns[first:] if c.name in _MARKS_BY_ZONE or not c.name.startswith(("membership_", "mark_"))
    ]
    readings = []
    for column in measured:
        values = column_values(column.name)
        if column.name in _MARKS_BY_ZONE and "zone_2" in by_name:  # where one zone alone judges it is the overall mark
            values = [v if shared else None for v, shared in zip(values, column_values("zone_2"), strict=True)]
        if column.says and column.name not in _NOT_ON_A_LEAF and any(value is not None for value in values):
            readings.append(_words(column) | {"values": values[:MOST_LEAVES]})
    return {
        "title": screening.brief.title or "",
        "bounds": _corners(sheet.bounds_deg),
        "focus": _corners(sheet.focus_deg),
        "ramp": RAMP,
        "edges": CLASS_EDGES,
        "shortlist": screening.brief.judge.shortlist,
        "varies": varies(screening.record),
        "questions": [
            {
                "name": one.name,
                "label": one.label,
                "column": one.column,
                "method": one.method,
                "views": [_view(view) for view in views.get(one.name, ())],
                "asked_by": [
                    zone
                    for zone, profile in screening.profiles.items()
                    if any(c.question == one.name for c in profile.criteria)
                ],
                "marks": [_number(mark) for mark in question_marks(table, screening.profiles, one.name)],
            }
            for one in questions
        ],
        "overall": {"name": OVERALL.name, "label": OVERALL.label, "column": OVERALL.column, "method": OVERALL.method},
        "zones": {name: _zone(profile) for name, profile in screening.profiles.items()},
        "plots": {
            name: column_values(name)
            for name in (
                "rank", "plot", "name", "overall_mark", "mark_low", "mark_high", "zone", "zone_share", "rank_in_zone",
                "set_aside", "lon", "lat",
            )
        }
        | {
            # the figure that would make the zone firm, where one is missing
            "zone_missing": column_values("zone_missing") if "zone_missing" in by_name else [None] * len(table),
            "rank_low": column_values("rank_low"),
            "rank_high": column_values("rank_high"),
            "alike": alike(table),
            "above_breeze": above_breeze(table),
        },
        "landmarks": drawn,
        "left_out": left_out,
        "online": _online(screening.brief),
        "shapes": [_shape(geometry) for geometry in table.geometry],
        "marks": {
            name.removeprefix("mark_"): column_values(name)[:MOST_LEAVES]
            for name in names
            if name.startswith("mark_") and name not in ("mark_low", "mark_high", *_MARKS_BY_ZONE)
        },
        "readings": readings,
        "weighing": weighing(screening),
        "siting": [
            screening.siting[plot].for_page() if plot in screening.siting else None
            for plot in table["plot"].head(MOST_SITINGS).tolist()
        ],
        "strips": strips(screening),
        "reasons": [
            _reasons(screening.reasons.get(plot)) if i < MOST_LEAVES else None
            for i, plot in enumerate(table["plot"].tolist())
        ],
    }  # fmt: skip


def _corners(bounds: Bounds) -> list[list[float]]:
    west, south, east, north = bounds
    return [[south, west], [north, east]]


def _words(column: Column) -> dict[str, Any]:
    return {"name": column.name, "title": column.title, "unit": column.unit, "decimals": column.decimals,
            "says": column.says, "kind": column.kind}  # fmt: skip


def _view(view: View) -> dict[str, Any]:
    return {
        "title": view.title,
        "zones": view.zones,
        "ranges": [{"class": one.number, "words": one.words} for one in view.ranges],
        "bare": view.is_best_bare,
        "picture": view.picture,
    }


def _zone(profile: Any) -> dict[str, Any]:
    return {
        "title": profile.title,
        "wants": profile.wants,
        "criteria": [
            {"name": c.name, "title": c.title, "question": c.question, "reading": c.column, "weight": c.weight}
            for c in profile.criteria
        ],
    }


def _number(value: float) -> float | None:
    return None if math.isnan(value) else round(float(value), 1)


def _reasons(one: Any) -> dict[str, list[str]] | None:
    if one is None:
        return None
    return {
        "for": list(one.for_),
        "against": list(one.against),
        "cautions": list(one.cautions),
        "unknown": list(getattr(one, "unknown", ())),
    }


def _online(brief: Any) -> dict[str, str] | None:
    """The map pictures that the page may ask for once its reader says so; None, as mostly, where there are none."""
    if brief.output.online_map is None:
        return None
    return {"address": brief.output.online_map, "credit": brief.output.online_credit or ""}


def _shape(geometry: Any) -> list[list[int]]:
    """Rings in whole steps: first corner, then the way to each next one."""
    if geometry is None or geometry.is_empty:
        return []
    polygons = [
        part for part in getattr(geometry, "geoms", [geometry]) if part.geom_type in ("Polygon", "MultiPolygon")
    ]
    polygons = [p for part in polygons for p in getattr(part, "geoms", [part])]
    rings = [ring for polygon in polygons for ring in (polygon.exterior, *polygon.interiors)]
    return [in_steps(np.asarray(ring.coords)[:-1, :2]) for ring in rings]
