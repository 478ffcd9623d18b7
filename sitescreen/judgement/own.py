"""Constraints and criteria of the planner's own, from the brief."""

import hashlib
import re
import unicodedata
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.brief import Brief, OwnConstraint, OwnCriterion
from sitescreen.errors import BriefError, InputError
from sitescreen.inputs.own_layers import read_own_layers
from sitescreen.inputs.stamps import FileStamp
from sitescreen.inputs.vector_files import column_named
from sitescreen.judgement.cautions import CautionRule, Condition
from sitescreen.judgement.profiles import RESERVED_NAMES, Criterion, ZoneProfile
from sitescreen.notes import Note

FloatArray = NDArray[np.float64]

HAZARD_WORDS: Mapping[str, tuple[str, ...]] = {
    "flood levels": ("flood",),
    "landslides": ("landslide", "landslip", "mudslide"),
    "protected land": ("protected", "nature reserve", "national park", "conservation"),
    "contaminated ground": ("contaminat", "pollut"),
    "land tenure": ("tenure", "land ownership", "title deed"),
}
"""Words in the name of a constraint that say which hazard it looks at."""

_MAY_BE_THOUSANDS = re.compile(r"^[+-]?[1-9]\d{0,2}(,\d{3})+$")


def short_name(name: str) -> str:
    """A name as columns can hold it: "Road, paved" → "road_paved".

    Letters outside the Latin alphabet cannot stand in a column's name; a mark made of the whole name takes their place,
    so that two such names stay two: "水" → "own_327b54".
    """
    folded = unicodedata.normalize("NFKD", name.casefold())
    short = re.sub(r"[^a-z0-9]+", "_", folded.encode("ascii", "ignore").decode()).strip("_")
    if any(sign.isalnum() and not sign.isascii() for sign in folded):
        short = f"{short or 'own'}_{hashlib.sha256(name.encode()).hexdigest()[:6]}"
    return short if short[:1].isalpha() else f"own_{short}".rstrip("_")


def criterion_column(one: OwnCriterion) -> str:
    """The reading that a criterion looks at."""
    return f"own_{short_name(one.name)}"


def constraint_column(one: OwnConstraint) -> str:
    """1 where a constraint speaks against a plot, else 0; with ``metres_to_`` before it the distance to its layer."""
    return f"constraint_{short_name(one.name)}"


@dataclass(frozen=True)
class OwnReadings:
    """Readings of the plots, in the order of the table of plots.

    ``values``: ``constraint_…``, ``metres_to_constraint_…`` and ``own_…``; ``why_unknown``: a sentence where one of
    ``own_…`` is missing, "" elsewhere; ``stamps`` and ``notes`` of the layers.
    """

    values: pd.DataFrame
    why_unknown: pd.DataFrame
    stamps: tuple[FileStamp, ...]
    notes: tuple[Note, ...]


def check_names(brief: Brief, profiles: Mapping[str, ZoneProfile]) -> None:
    """Refuse names that could not be told apart in the table.

    Raises
    ------
    BriefError
        If two entries have one name, or a criterion the name of one that the zones already have.
    """
    known = {one.name for profile in profiles.values() for one in profile.criteria}
    for section, names in (
        ("constraint", [one.name for one in brief.constraint]),
        ("criterion", [one.name for one in brief.criterion]),
    ):
        short = [short_name(name) for name in names]
        for number, name in enumerate(names, start=1):
            if short.index(short[number - 1]) < number - 1:
                said = "is called as an earlier one is"
            elif section == "criterion" and short[number - 1] in known:
                said = "is called as a criterion of the climate zones is"
            elif section == "criterion" and short[number - 1] in RESERVED_NAMES:
                said = "is called as a column of the overall mark is"
            else:
                continue
            raise BriefError(f"[[{section}]] {number}, {name!r}, {said}", "a name of its own is needed", "Rename it")


def with_own_criteria(
    profiles: Mapping[str, ZoneProfile], criteria: Sequence[OwnCriterion], spread_pct: float
) -> dict[str, ZoneProfile]:
    """The profiles of all zones with the planner's criteria added at the end, weighed beside the others."""
    added = tuple(
        Criterion(
            name=short_name(one.name),
            reading=criterion_column(one),
            question="own",
            title=one.name,
            unit="m" if one.file is not None else "1",
            weight=one.weight,
            weight_spread_pct=spread_pct,
            curve=tuple(one.curve),
            source="the brief",
            says=_sentence(one),
        )
        for one in criteria
    )
    return {
        zone: ZoneProfile(
            zone=profile.zone, title=profile.title, wants=profile.wants, criteria=(*profile.criteria, *added)
        )
        for zone, profile in profiles.items()
    }


def _sentence(one: OwnCriterion) -> str:
    name, column = _no_braces(one.name), criterion_column(one)
    mark = "a mark of {mark:.0f} out of 100."
    if one.file is not None:
        return f"{{{column}:,.0f}} m from the nearest {name}, {mark}"
    return f"{name[:1].upper()}{name[1:]}: {{{column}:,.6g}}, {mark}"


def own_rules(constraints: Sequence[OwnConstraint]) -> tuple[CautionRule, ...]:
    """The cautions that the planner's constraints raise."""
    rules = []
    for one in constraints:
        name = _no_braces(one.name)
        said = (
            _no_braces(one.say) if one.say else f"within {one.buffer_m:g} m of {name}" if one.buffer_m else f"in {name}"
        )
        rules.append(
            CautionRule(
                name=constraint_column(one),
                level=one.level,
                when=(Condition(reading=constraint_column(one), above=0.5),),
                say=(said.rstrip("."),),
                unknown_level="concern",
                say_unknown=f"the distance to {name} could not be measured",
                source="the brief",
            )
        )
    return tuple(rules)


def _no_braces(words: str) -> str:
    """Braces mean fields in our sentences, and a planner's words are not ours to fill in."""
    return words.replace("{", "(").replace("}", ")")


def own_readings(brief: Brief, plots: Any) -> OwnReadings:
    """Measure what the planner's constraints and criteria look at.

    Parameters
    ----------
    brief : Brief
    plots : GeoDataFrame, EPSG:4326
        The table of plots, with the file's own columns as ``own:<column>``.

    Raises
    ------
    InputError
        If a layer cannot be used, or a column that a criterion names is missing or holds no numbers.
    """
    named = [(one.file, "constraint") for one in brief.constraint]
    named += [(one.file, "criterion") for one in brief.criterion if one.file is not None]
    layers = read_own_layers(named)
    outlines, lon = list(plots.geometry), plots["lon"].to_numpy(dtype=np.float64)
    values: dict[str, Any] = {}
    why: dict[str, Any] = {}
    for one in brief.constraint:
        layer, name = layers[one.file], constraint_column(one)
        distance_m = layer.distance_m(outlines, lon)
        near = np.where(np.isnan(distance_m), np.nan, (distance_m <= one.buffer_m).astype(np.float64))
        # without a buffer, plots that only share a boundary with an area are not in it
        values[name] = near if one.buffer_m > 0.0 else layer.is_inside(outlines, lon)
        values[f"metres_to_{name}"] = distance_m
    for criterion in brief.criterion:
        name = criterion_column(criterion)
        if criterion.file is not None:
            values[name] = layers[criterion.file].distance_m(outlines, lon)
            why[name] = np.where(np.isnan(values[name]), f"the distance to {criterion.name} could not be measured", "")
        else:
            values[name], why[name] = _numbers(criterion, plots, brief.plots.file)
    return OwnReadings(
        pd.DataFrame(values, index=plots["plot"]),
        pd.DataFrame(why, index=plots["plot"]),
        tuple(layer.stamp for layer in layers.values()),
        tuple(note for layer in layers.values() for note in layer.notes),
    )


def _numbers(one: OwnCriterion, plots: Any, file: Path) -> tuple[FloatArray, NDArray[np.object_]]:
    """A column of the plots as numbers, and why it has gaps."""
    columns = [name.removeprefix("own:") for name in map(str, plots.columns) if name.startswith("own:")]
    column = column_named(str(one.column), columns, file, f"[[criterion]] {one.name}, column")
    given = plots[f"own:{column}"]
    numbers = np.array([_number(value) for value in given], dtype=np.float64)
    if np.isnan(numbers).all():
        raise InputError(
            f"the column “{column}” of {file.name}, which the criterion “{one.name}” looks at, holds no number",
            "a column of numbers is needed",
            "Name another column under [[criterion]] in the brief, or fill that one in",
        )
    empty = given.isna().to_numpy()
    said = [f"its “{column}” is empty" if gap else f"its “{column}” is no plain number" for gap in empty]
    return numbers, np.where(np.isnan(numbers), np.array(said, dtype=object), "")


def _number(value: Any) -> float:
    """A number as files hold it, also as text and with a decimal comma; NaN for anything else."""
    if isinstance(value, str):
        # “1,200” may mean either, and that is not for us to guess
        value = value.strip() if _MAY_BE_THOUSANDS.match(value.strip()) else value.strip().replace(",", ".")
    try:
        number = float(value)
    except (TypeError, ValueError):
        return float("nan")
    return number if np.isfinite(number) else float("nan")


def still_unchecked(
    hazards: Sequence[str], constraints: Sequence[OwnConstraint]
) -> tuple[tuple[str, ...], tuple[Note, ...]]:
    """The hazards that no constraint's name speaks of, and a note on those that one does."""
    seen: dict[str, list[str]] = {}
    for hazard in hazards:
        names = [
            one.name for one in constraints if any(word in one.name.casefold() for word in HAZARD_WORDS.get(hazard, ()))
        ]
        if names:
            seen[hazard] = names
    notes = tuple(
        Note(
            "info",
            "judgement",
            f"Of {hazard} only what your own layer shows was checked: {', '.join(f'“{name}”' for name in names)}.",
        )
        for hazard, names in seen.items()
    )
    return tuple(hazard for hazard in hazards if hazard not in seen), notes
