"""Every column of the ranking: place, unit, decimals, meaning. Table, workbook, plots layer and map read them here.

The order is a contract: columns may be added at the end, none is renamed or moved without a line in the changelog.
"""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

from sitescreen.judgement.wind_slots import IN_WORDS, slot_of_column

if TYPE_CHECKING:
    import pandas as pd

    from sitescreen.judgement.profiles import ZoneProfile

Kind = Literal["text", "whole", "number"]


@dataclass(frozen=True)
class Column:
    """One column.

    Parameters
    ----------
    name : str
        As in the files.
    kind : "text", "whole" or "number"
    decimals : int
        Written with so many, always; 0 for text and whole numbers.
    unit : str
        "m", "°" …; "0–1" for shares, "0–100" for marks, "" for text and counts.
    title : str
        In a few plain words, for the map.
    says : str
        What it means, in one sentence for a planner.
    """

    name: str
    kind: Kind
    decimals: int
    unit: str
    title: str
    says: str


def _text(name: str, title: str, says: str) -> Column:
    return Column(name, "text", 0, "", title, says)


def _whole(name: str, title: str, says: str) -> Column:
    return Column(name, "whole", 0, "", title, says)


def _number(name: str, decimals: int, unit: str, title: str, says: str) -> Column:
    return Column(name, "number", decimals, unit, title, says)


CONTRACT: tuple[Column, ...] = (
    _whole("rank", "rank", "Place among all ranked plots, 1 is best; empty for a plot set aside."),
    _text("plot", "plot", "The plot's identifier, as in the file of plots."),
    _text("name", "name", "The plot's name, as in the file of plots."),
    _number(
        "overall_mark", 1, "0–100", "overall mark", "Weighted mean of the plot's marks for its zone; high is good."
    ),
    _number(
        "mark_low", 1, "0–100", "lowest mark", "The overall mark if everything unknown were at its worst; ranks use it."
    ),
    _number("mark_high", 1, "0–100", "highest mark", "The overall mark if everything unknown were at its best."),
    _text("zone", "zone", "The climate zone the plot is judged by."),
    _number(
        "zone_share",
        2,
        "0–1",
        "share of the zone",
        "How much of the judgement comes from that zone; the rest from others.",
    ),
    _whole("rank_in_zone", "rank in zone", "Place among the ranked plots of the same zone, 1 is best."),
    _text("cautions", "cautions", "Named alerts: a note, a concern, or a stop that sets the plot aside."),
    _text("set_aside", "set aside", "Why the plot is not ranked; empty for ranked plots."),
    _whole(
        "rank_low",
        "best rank",
        "The best rank of the range that holds 90 of 100 trials, so the smaller number; the record says what varies.",
    ),
    _whole("rank_high", "worst rank", "The worst rank of that range, so the larger number."),
    _number("chance_first", 2, "0–1", "chance of first", "Share of the trials in which the plot is first."),
    _number(
        "chance_top_quarter",
        2,
        "0–1",
        "chance of top quarter",
        "Share of the trials in which it is in the best quarter.",
    ),
    _text("weakest", "weakest", "The criterion with the plot's lowest mark."),
    _number("elevation_m", 1, "m", "elevation", "Mean height of the ground above the terrain model's zero."),
    _number("slope_deg", 1, "°", "slope", "Mean steepness; 0 is level, 8.5° is 15 %."),
    _number(
        "aspect_deg", 0, "° from true north", "faces", "Bearing the ground falls to, clockwise; empty on level ground."
    ),
    _number(
        "buildable_share",
        2,
        "0–1",
        "level enough",
        "Share of the plot likely to be less steep than the limit for building.",
    ),
    _number(
        "rise_m",
        1,
        "m",
        "height above surroundings within 1 km",
        "Height above the mean of the ground within 1 km; negative in a hollow.",
    ),
    _text("shore_kind", "shore", "Whether the breeze that reaches the plot most is of the sea or of a lake."),
    _number("shore_distance_km", 2, "km", "to the shore", "Distance to its nearest shore on open water."),
    _number(
        "onshore_from_deg", 0, "° from true north", "onshore breeze from", "Bearing the daytime breeze comes from."
    ),
    _number(
        "breeze_reach", 2, "0–1", "breeze reach", "How much of the daytime breeze of sea or lake gets to the plot."
    ),
    _number("shore_skyline_deg", 1, "°", "skyline to the shore", "Skyline on the way to the shore, from 10 m up."),
    _number(
        "ventilation",
        2,
        "× open ground",
        "ventilation",
        "Mean wind of hot-season afternoons compared with open level ground.",
    ),
    _number("ridge_exposure", 2, "× open ground", "exposure", "Strong wind of the year compared with open ground."),
    _number("sheltered_fraction", 2, "0–1", "sheltered", "How much of the wind the ground upwind holds off."),
    _text(
        "cold_pool_kind",
        "cold air",
        "Cold air on calm clear nights: none, closed (a hollow), leaky (held back), moving, unknown.",
    ),
    _number("cold_pool_depth_m", 1, "m", "cold air depth", "Depth of the cold air; to the lip of a closed hollow."),
    _number(
        "cold_pool_chance",
        2,
        "0–1",
        "cold air chance",
        "Share of simulated nights, each with its own error of the terrain, over 1 °C colder than level ground.",
    ),
    _number(
        "cold_deficit_k", 1, "°C", "colder by", "How much colder than level ground the air is on a calm clear night."
    ),
    _number(
        "smallest_pool_seen_m",
        1,
        "m",
        "smallest seen",
        "Hollows shallower than this cannot be seen in this terrain model.",
    ),
    _number("night_minimum_c", 1, "°C", "night minimum", "Expected minimum of a calm clear night in the cool season."),
    _number(
        "floor_height_m", 1, "m", "above the watercourse", "Height above the watercourse that its ground drains to."
    ),
    _number("sky_view", 3, "0–1", "open sky", "Share of the sky that the ground around leaves open."),
    _number(
        "sun_cool_morning_h",
        1,
        "h a day",
        "morning sun",
        "Hours of sun before its highest, a day of the cool season; under clear skies unless clouds were given.",
    ),
    _number(
        "sun_year_h",
        0,
        "h a year",
        "sun",
        "Hours of sun past the ground around; under clear skies unless clouds were given.",
    ),
    _number("west_load_kwh_m2", 2, "kWh/m²", "west wall load", "Light on a free west wall, a hot-season afternoon."),
    _number("pond_depth_m", 1, "m", "ponding", "Depth to which water could stand, by the terrain model."),
    _number(
        "long_axis_deg",
        0,
        "° from true north",
        "long axis",
        "Bearing, 0–179, of a house's long axis that serves sun and wind best there: a siting hint, not a design.",
    ),
    _number(
        "wind_incidence_deg",
        0,
        "°",
        "wind on long wall",
        "How far off square the wind or breeze that counts there meets the long wall: 0 square on, 90 along it.",
    ),
    _number("area_ha", 2, "ha", "area", "Area of the plot."),
    _number("lon", 6, "°", "longitude", "Longitude of a point inside the plot, WGS 84."),
    _number("lat", 6, "°", "latitude", "Latitude of that point, WGS 84."),
    _number(
        "offshore_from_deg",
        0,
        "° from true north",
        "night breeze from",
        "Bearing the offshore breeze of the night comes from.",
    ),
    _number("breeze_arrival_h", 1, "h", "breeze arrives at", "Hour of the day, by the sun, when the breeze arrives."),
    _number("night_flow_m2_s", 2, "m²/s", "night air flow", "Cold air that passes each metre of width at night."),
    _number("night_flow_speed_m_s", 2, "m/s", "night air speed", "Speed of that air."),
    _number(
        "clear_calm_nights",
        1,
        "nights a month",
        "calm clear nights",
        "Nights a month in the cool season that are clear and calm; 10 is assumed where the normals do not say.",
    ),
    _number(
        "driving_rain", 2, "× open ground", "driving rain", "Strong wind of the rainy season compared with open ground."
    ),
    _number(
        "cool_gain_kwh_m2", 2, "kWh/m²", "cool-season sun", "Sun on the plot's ground on a day of the cool season."
    ),
    _number(
        "sun_first_cool_h",
        1,
        "h",
        "first sun",
        "Clock hour at which the sun first reaches it, cool season, clouds aside.",
    ),
    _number("sun_last_cool_h", 1, "h", "last sun", "Clock hour at which the sun last leaves it, cool season."),
)
"""The columns that every table has, in this order. Ones this version cannot fill stay empty."""

BY_NAME: Mapping[str, Column] = {column.name: column for column in CONTRACT}

MORE: Mapping[str, Column] = {
    column.name: column
    for column in (
        _number("cells", 1, "cells", "terrain cells", "How many cells of the terrain grid the plot covers."),
        _number(
            "share_in_water", 2, "0–1", "in mapped water", "Share of the plot that lies in water by the shore layer."
        ),
        _number(
            "share_flat_water", 2, "0–1", "on flat water", "Share that looks like a water surface in the terrain model."
        ),
        _text(
            "cold_pool_sure",
            "cold air is",
            "likely (eight or more of ten simulated nights leave the plot over 1 °C colder than level ground), "
            "possible (two to eight of ten), or none.",
        ),
        _number("cold_nights", 0, "nights", "cold nights", "So many of the simulated nights were cold."),
        _number(
            "cold_nights_of",
            0,
            "nights",
            "of nights",
            "How many calm clear nights were simulated, each with its own error of the terrain; empty where cold air "
            "is far from mattering.",
        ),
        _number(
            "cold_depth_low_m", 0, "m", "at least deep", "Depth of the air in all but the shallowest tenth of them."
        ),
        _number("cold_depth_high_m", 0, "m", "at most deep", "Depth of the air in all but the deepest tenth of them."),
        _number(
            "cold_deficit_least_k",
            1,
            "°C",
            "colder by at least",
            "As “colder by”; where that is unknown, the least that ground beyond the terrain model leaves open.",
        ),
        _number("cold_deficit_most_k", 1, "°C", "colder by at most", "The most that it leaves open."),
        _number("cold_strength_k", 1, "°C", "coldest pools", "How cold a deep pool of its climate can grow."),
        _number(
            "still_air", 2, "0–1", "still air", "How far the night’s air stands in a hollow or behind narrows; 0 moves."
        ),
        _number(
            "watercourse_km2",
            1,
            "km²",
            "drains past it",
            "Ground that drains through the largest watercourse, dry or wet, on the plot or within some 90 m of it; at "
            "least, since the terrain may go on. 0 where there is none.",
        ),
        _number("sill_distance_m", 0, "m", "hollow spills at", "Distance to where the plot’s closed hollow spills."),
        _number("sill_bearing_deg", 0, "° from true north", "hollow spills to", "Bearing of that place."),
        _whole("may_be_trees", "may be trees", "1 where the hollow may be a clearing between trees shown as ground."),
        _number("pool_catchment_ha", 1, "ha", "hollow’s catchment", "Ground that drains into that hollow."),
        _number("pool_fill_h", 2, "h", "hollow fills in", "How long that ground’s cold air takes to fill it."),
        _text("zone_2", "second zone", "A second zone that shares the plot."),
        _number(
            "zone_2_share", 2, "0–1", "share of the second", "How much of the judgement comes from the second zone."
        ),
        _number("mark_in_zone", 1, "0–100", "mark in its zone", "The overall mark by the profile of its zone alone."),
        _number(
            "mark_in_zone_2", 1, "0–100", "mark in the second", "The overall mark by the second zone's profile alone."
        ),
        _number("known_weight_share", 2, "0–1", "weight known", "Part of the weights whose readings are known."),
        _text("zone_missing", "zone lacks", "The figure that is missing to tell the zone firmly."),
        _number("over_water_m", 1, "m", "above the water", "Height above the nearest water, where it could be told."),
        _number(
            "shore_bearing_deg", 1, "° from true north", "shore lies", "Bearing of the nearest point of that shore."
        ),
        _number("breeze_screen", 2, "0–1", "breeze screened", "Share of the breeze that the ground on its way takes."),
        _number("crest_bearing_deg", 0, "° from true north", "screen lies", "Bearing of the ground that screens most."),
        _number("crest_distance_m", 0, "m", "screen at", "Distance to that ground."),
        _number(
            "crest_above_plot_m",
            0,
            "m",
            "screen stands",
            "How high that ground stands above the plot; empty where none does.",
        ),
        _number("worst_sector_exposure", 2, "× open ground", "worst wind", "Wind from the most exposed side."),
        _number("worst_sector_from_deg", 0, "° from true north", "worst wind from", "Bearing that wind comes from."),
        _number(
            "slow_wind_share", 2, "0–1", "slow wind", "Share of the windy time with under 0.7 of the open-ground wind."
        ),
        _number(
            "wind_outside_share", 2, "0–1", "too steep for wind", "Share steeper than 17°, where wind figures are weak."
        ),
        _number("sea_km", 2, "km", "to the sea", "Distance to the nearest sea shore, creeks included."),
        _number("lake_km", 2, "km", "to a lake", "Distance to the lake whose breeze reaches the plot most."),
        _number("lake_width_km", 1, "km", "width of the lake", "Width of that lake."),
        _number(
            "morning_sun_share",
            2,
            "0–1",
            "share of morning sun",
            "How much of the cool season's morning sun on open level ground gets past the hills.",
        ),
        _text("sun_first_by_month", "first sun by month", "Clock times of the first sun, January to December."),
        _text("sun_last_by_month", "last sun by month", "Clock times of the last sun, January to December."),
        _text("cool_months", "cool season", "The months counted as its cool season."),
        _text("hot_months", "hot season", "The months counted as its hot season."),
        _text("outcome", "outcome", "Why the plot could not be judged; empty where it could."),
        _whole("water_disagrees", "waters disagree", "1 where the map of water and the terrain model disagree."),
        _text("zone_provisional", "zone provisional", "“yes” where a figure is missing to tell the zone firmly."),
        _text("remarks", "remarks", "What was mended in the plot's outline."),
        _number(
            "chance_shortlist",
            2,
            "0–1",
            "chance of shortlist",
            "Share of the trials in which it is on the shortlist.",
        ),
        _number(
            "chance_first_in_zone",
            2,
            "0–1",
            "chance of first in zone",
            "Share of those trials in which it is first in its zone.",
        ),
        _number(
            "chance_first_any_weights",
            2,
            "0–1",
            "chance of first, any weights",
            "The chance of being first if nothing at all were known of the weights.",
        ),
        _number(
            "chance_beats_next",
            2,
            "0–1",
            "beats the next",
            "Share of those trials in which it has a higher mark than the plot next in rank; below 0.8 they are alike.",
        ),
        _number(
            "best_patch_mark",
            1,
            "0–100",
            "mark of its best square",
            "The overall mark of the best square inside the plot that holds the footprint; being the best of many it "
            "is a little flattered.",
        ),
        _number("worst_patch_mark", 1, "0–100", "mark of its poorest square", "The same of the poorest square."),
        _number("mean_patch_mark", 1, "0–100", "mean mark of its squares", "The mean over all such squares."),
        _number("best_patch_lon", 6, "°", "best square: longitude", "Longitude of the middle of that best square."),
        _number("best_patch_lat", 6, "°", "best square: latitude", "Latitude of the middle of that best square."),
        _number("patch_side_m", 0, "m", "side of the squares", "How large the squares are that were looked at."),
        _text("where_on_plot", "where on the plot", "Where on the plot the ground is best, in a sentence."),
        _number(
            "chance_set_aside",
            2,
            "0–1",
            "chance of being set aside",
            "Share of the draws of the data in which a stop sets the plot aside; empty where the data were not drawn.",
        ),
        _whole("rank_low_weights", "best rank, weights", "The best rank of the range if the weights alone vary."),
        _whole("rank_high_weights", "worst rank, weights", "The worst rank of that range."),
        _whole("rank_low_data", "best rank, data", "The best rank of the range if the data alone vary."),
        _whole("rank_high_data", "worst rank, data", "The worst rank of that range."),
        _number(
            "drawn_mark_low",
            1,
            "0–100",
            "mark in the trials, from",
            "The mark that ranks go by is below this in 5 of 100 trials; empty where it is set aside in so many.",
        ),
        _number("drawn_mark_high", 1, "0–100", "mark in the trials, to", "It is above this in 5 of 100 trials."),
        _text("not_checked", "not checked", "What nobody has looked at here: its absence from this row means nothing."),
        _text(
            "mahoney",
            "Mahoney indicators",
            "Months a year: H1 air movement needed, H2 wanted, H3 heavy rain, A1 thermal mass, A2 sleeping outdoors, "
            "A3 cold.",
        ),
        _text(
            "mahoney_says",
            "second opinion",
            "What the Mahoney tables (UN 1971) ask for by the climate normals alone; the plot's marks do not use it.",
        ),
        _whole(
            "group",
            "group",
            "Plots with the same number cannot be told apart: the best of them beats each other one in under 8 of 10.",
        ),
    )
}
"""Columns that may follow at the end."""


def columns_of(table: "pd.DataFrame", profiles: Mapping[str, "ZoneProfile"]) -> tuple[Column, ...]:
    """The columns a ranking is written with: the contract's, then memberships, then marks, then whatever else it holds.

    Parameters
    ----------
    table : DataFrame
        One row a plot; a contract column that it lacks is written empty.
    profiles : mapping of zone name to ZoneProfile
        For the explanations of memberships and marks.
    """
    rest = [name for name in table.columns if name not in BY_NAME and name != "geometry"]
    memberships = [name for name in rest if name.startswith("membership_")]
    marks = [name for name in rest if name.startswith("mark_")]
    others = [name for name in rest if name not in memberships and name not in marks]
    return (
        *CONTRACT,
        *(_membership(name, profiles) for name in memberships),
        *(MORE.get(name) or _mark(name, profiles.values()) for name in marks),
        *(
            MORE.get(name) or in_slot(name) or _own(name, profiles) or _unknown_to_us(name, table[name])
            for name in others
        ),
    )


def _membership(name: str, profiles: Mapping[str, "ZoneProfile"]) -> Column:
    zone = name.removeprefix("membership_")
    title = profiles[zone].title if zone in profiles else zone.replace("_", " ")
    return _number(
        name, 2, "0–1", f"fits {title}", f"How well the plot fits the zone “{title}”; below 0.3 it does not."
    )


def _mark(name: str, profiles: Iterable["ZoneProfile"]) -> Column:
    criterion = name.removeprefix("mark_")
    titles = [c.title for profile in profiles for c in profile.criteria if c.name == criterion]
    title = titles[0] if titles else criterion.replace("_", " ")
    return _number(
        name, 1, "0–100", f"mark: {title}", f"How well the plot does on “{title}” for its zone; high is good."
    )


def in_slot(name: str) -> Column | None:
    """A reading of the wind in another slot than its own, which some profile asks for."""
    found = slot_of_column(name)
    if found is None:
        return None
    reading, slot = found
    own = BY_NAME.get(reading) or MORE[reading]
    when = IN_WORDS[slot]
    return _number(name, own.decimals, own.unit, f"{own.title}, {when}", f"As “{own.title}”, for the {when}.")


def _own(name: str, profiles: Mapping[str, "ZoneProfile"]) -> Column | None:
    """The columns of a planner's own constraints and criteria, whose names the brief gives."""
    if name.startswith("metres_to_constraint_"):
        title = name.removeprefix("metres_to_constraint_").replace("_", " ")
        return _number(name, 0, "m", f"to: {title}", f"Distance from the plot's edge to your layer “{title}”.")
    if name.startswith("constraint_"):
        title = name.removeprefix("constraint_").replace("_", " ")
        return _whole(name, f"own: {title}", f"1 where your constraint “{title}” speaks against the plot.")
    if name.startswith("own_"):
        titles = (c.title for profile in profiles.values() for c in profile.criteria if c.reading == name)
        title = next(titles, name.removeprefix("own_").replace("_", " "))
        return _number(name, 2, "", f"own: {title}", f"What your criterion “{title}” looks at: a column, or metres.")
    return None


def _unknown_to_us(name: str, values: Any) -> Column:
    title = name.replace("_", " ")
    if values.dtype.kind == "f":
        return _number(name, 3, "", title, "")
    return _whole(name, title, "") if values.dtype.kind in "iu" else _text(name, title, "")
