"""Sentences with numbers: filling templates with what is known of a plot, and never with what is not."""

import math
from collections.abc import Mapping, Sequence
from functools import cache
from string import Formatter
from typing import Any

COMPASS = ("north", "north-east", "east", "south-east", "south", "south-west", "west", "north-west")

LEVEL_WITH_M = 5.0
"""Heights within this of the surroundings are level with them: our choice, no source. [m]"""


SCREENED_SHARE = 0.1
"""From this share taken by the ground on its way a breeze is called screened: our choice, no source."""

SEEN_FROM_DEG = 1.5
"""A lower skyline is not worth naming: high ground in general holds the breeze back there. (our choice) [°]"""

NARROW_LAKE_KM = 20.0
"""A lake narrower than this makes too little of a breeze not to be said: our choice, no source."""

_WORDS = (
    "shore",
    "from_shore",
    "stands_high",
    "stands_low",
    "screened_by",
    "outcome",
    "weakest",
    "cautions",
    "cold_in_nights",
    "cold_in_none",
)
"""Facts that are words, beside those that end in ``_kind`` and ``_word``; no number format fits them."""

_CREST = ("crest_above_plot_m", "crest_distance_m", "crest_bearing_deg")


def compass_word(bearing_deg: float) -> str:
    """The nearest of the eight compass points, as in “from the south-east”."""
    return COMPASS[round(bearing_deg / 45.0) % 8]


def from_shore(distance_km: float) -> str:
    """A distance from the shore as people say it: "at the shore", "300 m from the shore", "4.2 km from the shore"."""
    if distance_km < 0.05:
        return "at the shore"
    if distance_km < 0.95:
        return f"{round(distance_km * 10) * 100} m from the shore"
    return f"{distance_km:.{1 if distance_km < 9.95 else 0}f} km from the shore"


def facts(row: Mapping[str, Any]) -> dict[str, Any]:
    """What templates may speak of: a plot's readings, and the same in a client's terms.

    Parameters
    ----------
    row : mapping
        Readings of one plot. Unknown ones may be NaN, None or "".

    Returns
    -------
    dict
        Known readings only, with shares also in per cent (``breeze_pct``), wind also as ``more_…_pct`` and
        ``less_…_pct`` than open level ground, bearings also as words.
    """
    known = {name: value for name, value in row.items() if is_known(value)}
    told = dict(known)
    for share, name in (
        ("breeze_reach", "breeze_pct"),
        ("buildable_share", "buildable_pct"),
        ("share_in_water", "water_pct"),
        ("wind_outside_share", "steep_wind_pct"),
        ("morning_sun_share", "morning_sun_pct"),
        ("known_weight_share", "known_pct"),
    ):
        if share in known:
            told[name] = 100.0 * known[share]
    if told.get("buildable_pct", 1.0) < 0.5:
        del told["buildable_pct"]  # "only 0 %" is no way to say none
    for ratio, name in (("ventilation", "air_pct"), ("ridge_exposure", "wind_pct"), ("driving_rain", "rain_pct")):
        if ratio in known:
            told[f"more_{name}"] = 100.0 * (known[ratio] - 1.0)
            told[f"less_{name}"] = 100.0 * (1.0 - known[ratio])
    if "morning_sun_share" in known:
        told["morning_lost_pct"] = 100.0 * (1.0 - known["morning_sun_share"])
    if "slope_deg" in known:
        told["slope_pct"] = 100.0 * math.tan(math.radians(known["slope_deg"]))
    if "cold_pool_kind" in known:
        told["cold_does"] = "flows through here" if known["cold_pool_kind"] == "moving" else "lies here"
    if known.get("cold_nights_of", 0.0) > 0:
        told.update(_nights(known))
    if {"sill_distance_m", "sill_bearing_deg"} <= known.keys():
        told["sill_away"] = _away(known["sill_distance_m"], known["sill_bearing_deg"])
    if "rise_m" in known:
        told["below_m"] = -known["rise_m"]
        if known["rise_m"] >= LEVEL_WITH_M:
            told["stands_high"] = f"Sits {known['rise_m']:.0f} m above the ground within 1 km"
        elif known["rise_m"] <= -LEVEL_WITH_M:
            told["stands_low"] = f"Lies {-known['rise_m']:.0f} m below the ground within 1 km"
    for bearing, name in (("aspect_deg", "aspect_word"), ("onshore_from_deg", "onshore_word")):
        if bearing in known:
            told[name] = compass_word(known[bearing])
    if known.get("shore_kind") in ("sea", "lake"):
        told["shore"] = known["shore_kind"]
    if known.get("shore_kind") == "lake" and known.get("lake_width_km", NARROW_LAKE_KM) < NARROW_LAKE_KM:
        told["narrow_lake_km"] = known["lake_width_km"]
    if "shore_distance_km" in known:
        told["from_shore"] = from_shore(known["shore_distance_km"])
    if known.get("breeze_screen", 0.0) >= SCREENED_SHARE:
        told["held_back_pct"] = 100.0 * known["breeze_screen"]
        if {*_CREST, "shore_skyline_deg"} <= known.keys() and known["shore_skyline_deg"] >= SEEN_FROM_DEG:
            above_m, away_m, bearing_deg = (known[name] for name in _CREST)
            told["screened_by"] = _ridge(above_m, away_m, bearing_deg, known["shore_skyline_deg"])
    return told


def _nights(known: Mapping[str, Any]) -> dict[str, str]:
    """How many of the simulated nights bring cold air, as in “in 22 of 25 simulated nights 30–45 m of cold air”."""
    cold, of = round(known.get("cold_nights", 0.0)), round(known["cold_nights_of"])
    if not cold:
        return {"cold_in_none": f"in none of {of} simulated nights"}
    often = f"in {cold} of {of} simulated nights"
    if not {"cold_depth_low_m", "cold_depth_high_m"} <= known.keys():
        return {"cold_in_nights": f"{often} cold air"}
    low, high = (round(known[name]) for name in ("cold_depth_low_m", "cold_depth_high_m"))
    return {"cold_in_nights": f"{often} {f'{low}–{high}' if low < high else max(low, 1)} m of cold air"}


def _ridge(above_m: float, away_m: float, bearing_deg: float, skyline_deg: float) -> str:
    return f"a {above_m:.0f} m ridge {_away(away_m, bearing_deg)} stands {skyline_deg:.0f}° above the plot"


def _away(away_m: float, bearing_deg: float) -> str:
    """Where something lies as people say it: "640 m to the east", "1.2 km to the south-west"."""
    away = f"{away_m / 1000.0:.1f} km" if away_m >= 950.0 else f"{max(round(away_m, -1), 10.0):.0f} m"
    return f"{away} to the {compass_word(bearing_deg)}"


def is_known(value: Any) -> bool:
    """Whether a reading holds anything: not NaN, None or ""."""
    if value is None or value == "":
        return False
    return not (isinstance(value, float) and math.isnan(value))


def is_word(name: str) -> bool:
    """Whether a fact of that name is a word, and not a number."""
    return name in _WORDS or name.endswith(("_kind", "_word"))


@cache
def _fields(template: str) -> frozenset[str]:
    return frozenset(name for _, name, _, _ in Formatter().parse(template) if name)


def check_template(template: str) -> str:
    """The template, if it can be filled in: plain field names, formats that fit a number or a word.

    Raises
    ------
    ValueError
        In the words of an error message's "needed" part.
    """
    try:
        for _, name, spec, conversion in Formatter().parse(template):
            if name is None:
                continue
            # attributes and indices could reach into the program, and numbers mean nothing here
            if not name.isidentifier() or conversion:
                raise ValueError
            format("word" if is_word(name) else 1.0, spec or "")
    except ValueError:
        raise ValueError("a sentence with fields such as {rise_m:.0f}") from None
    return template


def fill(templates: Sequence[str], told: Mapping[str, Any]) -> str:
    """The first template all of whose facts are known, filled in; "" if there is none.

    Parameters
    ----------
    templates : sequence of str
        Wordings of one thing, the fullest first, with fields such as ``{rise_m:.0f}``.
    told : mapping
        As :func:`facts` gives it.
    """
    for template in templates:
        if _fields(template) <= told.keys():
            # a rounded −0 is a 0
            return template.format(**told).replace(" -0 ", " 0 ")
    return ""
