"""The questions a planner asks of the map, and the field that answers each of them."""

from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from sitescreen.deliverables.classes import RAMP, ClassRange, Curve, class_of, class_ranges, marks_by
from sitescreen.deliverables.columns import BY_NAME, MORE, Column, in_slot
from sitescreen.deliverables.relief import webp
from sitescreen.deliverables.sheet import Sheet, by_quantity, on_sheet, warped
from sitescreen.grid import Field

if TYPE_CHECKING:
    import pandas as pd

    from sitescreen.judgement.profiles import ZoneProfile


@dataclass(frozen=True)
class Asked:
    """One question in words.

    Parameters
    ----------
    name : str
        As criteria name it; "overall" for all of them together.
    label : str
        The question.
    column : str
        The head of its column in the table.
    method : str
        How it is answered in this version, in a sentence or two.
    """

    name: str
    label: str
    column: str
    method: str


OVERALL = Asked(
    "overall",
    "Overall",
    "Overall",
    "The overall mark is the weighted mean of a plot’s marks, by the profile of its own climate zone. "
    "Ranks go by the mark with everything unknown at its worst, so a gap never helps a plot.",
)

ASKED = (
    Asked(
        "breeze",
        "Breeze?",
        "Breeze",
        "How much of the daytime breeze of sea or lake is left by the time it arrives, "
        "and how much of that the ground on its way from the shore lets through.",
    ),
    Asked(
        "wind",
        "Windy or sheltered?",
        "Wind",
        "Wind compared with open level ground: hills speed it up, ground upwind shelters. "
        "For neutral, moderate wind only: not for calm nights, breezes or gusts, nor on ground steeper than 17°, "
        "which is left blank.",
    ),
    Asked(
        "cold",
        "Cold air at night?",
        "Cold air",
        "Where cold air lies on calm clear nights: in hollows without an outlet, and where the air of a computed night "
        "is held back, deeper than on level ground. How sure that is, a plot’s leaf says as its chance of cold air.",
    ),
    Asked(
        "sun",
        "Sun?",
        "Sun",
        "When the sun gets past the ground around: hours of it, first on cool-season mornings where those are cold, "
        "and its light on west walls where afternoons are hot. Under a clear sky, unless clouds were given.",
    ),
    Asked("ground", "Can it be built on?", "Ground", "How steep the ground is, and whether water could stand on it."),
    Asked("own", "Own criteria", "Own", "Criteria that were added for this screening."),
)

PLAIN: Mapping[str, tuple[tuple[str, Curve, str], ...]] = {
    "breeze": (
        ("shore_distance_km", ((0.0, 100.0), (2.0, 80.0), (8.0, 60.0), (16.0, 40.0), (32.0, 20.0), (64.0, 0.0)),
         "Distance to the nearest shore"),
    ),
    "cold": (
        ("cold_deficit_k", ((0.0, 100.0), (0.5, 80.0), (1.0, 60.0), (2.0, 40.0), (4.0, 20.0), (6.0, 0.0)),
         "Colder than level ground"),
    ),
    "ground": (
        ("slope_deg", ((0.0, 100.0), (3.0, 80.0), (6.0, 60.0), (9.0, 40.0), (14.0, 20.0), (20.0, 0.0)), "Slope"),
    ),
    "sun": (
        ("sun_year_h", ((2600.0, 0.0), (3200.0, 20.0), (3600.0, 40.0), (3850.0, 60.0), (4050.0, 80.0), (4200.0, 100.0)),
         "Hours of sun in a year"),
    ),
}  # fmt: skip
"""What a question shows where no criterion's own reading is there as a field. The classes are ours, for the eye only:
they mark nothing."""

_OTHER_COLUMNS = {
    "hollow_depth_m": Column("hollow_depth_m", "number", 1, "m", "hollow depth", ""),
    "cold_depth_m": Column("cold_depth_m", "number", 0, "m", "depth of cold air", ""),
}

MOST_VIEWS = 6
"""Pictures for one question, where zones want different things."""

BARE = {"cold"}
"""Questions whose best class is left bare and the rest edged in ink: hollows are small, all other ground is well."""

INK = (43, 42, 39)


@dataclass(frozen=True)
class View:
    """One field of a question, as it is drawn.

    Parameters
    ----------
    reading : str
        Name of the field.
    title : str
        What is drawn, in words.
    zones : tuple of str
        The zones that judge by it so; none where nobody's marks are drawn.
    ranges : tuple of ClassRange
        Best first.
    picture : str
        A data address.
    is_best_bare : bool
        The best class is left bare.
    """

    reading: str
    title: str
    zones: tuple[str, ...]
    ranges: tuple[ClassRange, ...]
    picture: str
    is_best_bare: bool


def asked_here(table: "pd.DataFrame", profiles: Mapping[str, "ZoneProfile"]) -> tuple[Asked, ...]:
    """The questions that the zones of these plots ask, in their fixed order."""
    named = {c.question for zone in zones_here(table) if zone in profiles for c in profiles[zone].criteria}
    return tuple(one for one in ASKED if one.name in named)


def zones_here(table: "pd.DataFrame") -> list[str]:
    """The zones of the plots, the one with most plots first."""
    counted = Counter(zone for zone in table["zone"] if isinstance(zone, str) and zone)
    return sorted(counted, key=lambda zone: (-counted[zone], zone))


def question_marks(table: "pd.DataFrame", profiles: Mapping[str, "ZoneProfile"], question: str) -> NDArray[np.float64]:
    """Mark of each plot for one question: the weighted mean of its criteria, by the profile of the plot's zone.

    Returns
    -------
    float64 array, shape (n,)
        NaN where none of its marks is known, or the zone does not ask.
    """
    total, weights = np.zeros(len(table)), np.zeros(len(table))
    zone = table["zone"].to_numpy(dtype=object)
    for name, profile in profiles.items():
        for criterion in profile.criteria:
            column = f"mark_{criterion.name}"
            if criterion.question != question or column not in table:
                continue
            marks = table[column].to_numpy(dtype=np.float64)
            counts = (zone == name) & ~np.isnan(marks)
            total[counts] += criterion.weight * marks[counts]
            weights[counts] += criterion.weight
    with np.errstate(invalid="ignore"):
        return np.asarray(np.where(weights > 0, total / np.maximum(weights, 1e-12), np.nan))


def views(
    question: str,
    table: "pd.DataFrame",
    profiles: Mapping[str, "ZoneProfile"],
    fields: Mapping[str, Field],
    sheet: Sheet,
    water: NDArray[np.bool_],
) -> tuple[View, ...]:
    """The pictures of one question: for each way in which the zones of these plots judge it, its weightiest field.

    Parameters
    ----------
    question : str
    table : DataFrame
        The ranking.
    profiles : mapping of zone to ZoneProfile
    fields : mapping of name to Field
    sheet : Sheet
    water : bool array, shape (rows, cols)
        Left clear, so that the map shows it as water.
    """
    groups = by_quantity(fields)
    wanted: dict[tuple[str, tuple[tuple[float, float], ...]], list[tuple[str, str]]] = {}
    for zone in zones_here(table):
        asked = [c for c in profiles[zone].criteria if c.question == question] if zone in profiles else []
        drawn = [c for c in asked if c.column in groups and not c.kinds]
        if drawn:
            best = max(drawn, key=lambda c: c.weight)
            wanted.setdefault((best.column, tuple(best.curve)), []).append((zone, best.title))
    chosen: list[tuple[str, Curve, str, tuple[str, ...]]] = [
        (reading, curve, zones[0][1], tuple(zone for zone, _ in zones))
        for (reading, curve), zones in list(wanted.items())[:MOST_VIEWS]
    ]
    if not chosen:
        chosen += [(key, curve, title, ()) for key, curve, title in PLAIN.get(question, ()) if key in groups][:1]
    return tuple(_drawn(chosen, groups, sheet, water, question in BARE))


def _drawn(
    chosen: Sequence[tuple[str, Curve, str, tuple[str, ...]]],
    groups: Mapping[str, list[Field]],
    sheet: Sheet,
    water: NDArray[np.bool_],
    is_best_bare: bool,
) -> Iterator[View]:
    for reading, curve, title, zones in chosen:
        parts = [part for field in groups[reading] if (part := on_sheet(field, sheet)) is not None]
        if parts:
            address = webp(field_picture(parts, curve, sheet, water, is_best_bare), lossless=True)
            ranges = class_ranges(curve, _column(reading))
            yield View(reading, title[:1].upper() + title[1:], zones, ranges, address, is_best_bare)


def field_picture(
    parts: Sequence[Field], curve: Curve, sheet: Sheet, water: NDArray[np.bool_], is_best_bare: bool = False
) -> NDArray[np.uint8]:
    """A field in the five colours, shape (rows, cols, 4); clear where unknown and on water.

    With ``is_best_bare`` the best class is clear too, and an ink line edges the others.
    """
    is_coarser = all(sheet.pixel_m > 1.5 * part.grid.cell_size_m for part in parts)
    classes = class_of(marks_by(curve, warped(parts, sheet, exact=not is_coarser)))
    clear = np.isnan(classes) | water
    colours = np.array([[int(colour[i : i + 2], 16) for i in (1, 3, 5)] for colour in RAMP], dtype=np.uint8)
    picture = np.zeros((*classes.shape, 4), dtype=np.uint8)
    picture[..., :3] = colours[np.nan_to_num(classes).astype(np.intp)]
    picture[..., 3] = 255
    if is_best_bare:
        worse = ~clear & (classes < len(RAMP) - 1)
        edge = _rim(worse) & ~clear
        picture[edge] = (*INK, 255)
        clear |= ~worse & ~edge
    picture[clear] = 0
    return picture


def _rim(area: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """The pixels just outside an area."""
    grown = area.copy()
    grown[1:] |= area[:-1]
    grown[:-1] |= area[1:]
    grown[:, 1:] |= area[:, :-1]
    grown[:, :-1] |= area[:, 1:]
    return grown & ~area


def _column(reading: str) -> Column:
    known = BY_NAME.get(reading) or MORE.get(reading) or in_slot(reading) or _OTHER_COLUMNS.get(reading)
    return known or Column(reading, "number", 2, "", reading.replace("_", " "), "")
