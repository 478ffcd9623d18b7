"""The whole run on one page."""

import platform
from collections.abc import Mapping
from dataclasses import asdict, dataclass
from importlib.metadata import version
from typing import Any

import numpy as np
import pandas as pd

from sitescreen.brief import Brief
from sitescreen.climate.breeze_onset import onset_notes
from sitescreen.climate.breeze_section import Section
from sitescreen.climate.cold_strength import plot_strength_k
from sitescreen.climate.drawn_sun import PlotSun, drawn_suns
from sitescreen.climate.mahoney import second_opinion
from sitescreen.climate.normals import climate_notes, plot_climate
from sitescreen.climate.sector_winds import SectorWinds
from sitescreen.climate.sector_winds import together as winds_together
from sitescreen.climate.zones import ZoneShares, memberships, zone_shares
from sitescreen.grid import Field, joined
from sitescreen.inputs import Inputs, read_inputs
from sitescreen.inputs.brief_record import brief_for_record
from sitescreen.inputs.context import Landmarks
from sitescreen.inputs.zone_map import zone_at
from sitescreen.judgement.cautions import load_cautions
from sitescreen.judgement.certainty import TERRAIN, Certainty, Varied, certainty, take_part
from sitescreen.judgement.cold_map import with_cold_deficit
from sitescreen.judgement.cold_readings import night_notes, with_nights
from sitescreen.judgement.doubts import AllWinds, all_swings, data_draws
from sitescreen.judgement.draws import draws_for, terrain_in_words, with_chance
from sitescreen.judgement.overall import Judged, judge
from sitescreen.judgement.own import (
    OwnReadings,
    check_names,
    own_readings,
    own_rules,
    still_unchecked,
    with_own_criteria,
)
from sitescreen.judgement.pairs import Compared, compare_for, with_weights
from sitescreen.judgement.profiles import ZoneProfile, load_profiles, wind_slots
from sitescreen.judgement.readings import Readings, stack
from sitescreen.judgement.reasons import Reasons, reasons
from sitescreen.judgement.siting import PlotSiting
from sitescreen.judgement.siting_readings import BlockSuns, Sites, first_sitings, with_siting
from sitescreen.judgement.sun_readings import sun_notes
from sitescreen.judgement.sway import sway_notes, sways
from sitescreen.judgement.swings import swing_notes, swung
from sitescreen.judgement.waters import waters_disagree
from sitescreen.judgement.wind_notes import method_note, place_notes
from sitescreen.judgement.wind_readings import assumed_columns
from sitescreen.judgement.within_plot import within_plots
from sitescreen.measuring import BlockResult, measure, plots_by_block
from sitescreen.notes import Note
from sitescreen.progress import Progress
from sitescreen.settings import Defaults, load_defaults
from sitescreen.terrain.flat_water import together

NOT_MEASURED: tuple[str, ...] = ()

NOT_CHECKED = (
    "flood levels",
    "landslides",
    "protected land",
    "contaminated ground",
    "land tenure",
    "roads, water and power",
)

SUNS_DRAWN = 200
"""The sun's arcs are kept for so many plots, the first in rank: what a page can draw."""

REASONS_RECORDED = 2000
"""The record keeps the reasons and siting of so many plots, the first in rank; more would be too large to mail."""


def screen(
    brief: Brief,
    progress: Progress | None = None,
    settings: Defaults | None = None,
    profiles: Mapping[str, ZoneProfile] | None = None,
) -> "Screening":
    """Read a brief's inputs, measure every plot's ground, judge and rank it.

    Parameters
    ----------
    brief : Brief
    progress : Progress, optional
        Told when each stage begins and ends.
    settings : Defaults, optional
        Other than those of ``config/``, such as an earlier run's.
    profiles : mapping of zone to ZoneProfile, optional
        Other than those that the brief asks for.

    Returns
    -------
    Screening
        Every plot that went in, ranked or set aside with its reason.

    Raises
    ------
    SitescreenError
        If an input cannot be used.
    """
    progress = progress or Progress()
    settings = settings or load_defaults()
    with progress.step("Reading the inputs"):
        inputs = read_inputs(brief)
        asked_for, compared = profiles_of(brief, settings)
        profiles = dict(profiles or asked_for)
        own = own_readings(brief, inputs.plots.table)
    measured = [
        measure(block, rows, inputs, settings, progress, wind_slots(profiles)) for block, rows in plots_by_block(inputs)
    ]
    with progress.step("Judging the plots"):
        readings = stack([one.readings for one in measured], list(inputs.plots.table["plot"]))
        return _judged(brief, inputs, measured, readings, own, profiles, compared, settings, progress)


@dataclass(frozen=True)
class Screening:
    """One finished screening.

    ``table``: GeoDataFrame in EPSG:4326 with every plot that went in, by rank, those set aside last. ``fields``: what
    was measured, by name (with several UTM zones the zone is added: ``slope_deg_utm41``). ``reasons``: by plot id.
    ``siting``: how to place a house, by plot id, of the first plots in rank whose long axis is known.
    ``winds``: what the ground makes of the wind from each sector, rows in the order of the table.
    ``judged`` and ``zones``: the marks and zone shares behind the table, in the order of the plots as they came.
    ``sections``: by plot id, the ground to the shore that the breeze comes from; none without a shore.
    ``suns``: by plot id, the sun's arcs past its skyline; of the first 200 plots of the table.
    ``patches``: GeoDataFrame, the best square inside each plot that has room for one.
    ``context``: landmarks to draw.
    """

    brief: Brief
    table: Any
    fields: Mapping[str, Field]
    reasons: Mapping[str, Reasons]
    siting: Mapping[str, PlotSiting]
    winds: SectorWinds
    sections: Mapping[str, Section]
    suns: Mapping[str, PlotSun]
    profiles: Mapping[str, ZoneProfile]
    notes: tuple[Note, ...]
    not_measured: tuple[str, ...]
    not_checked: tuple[str, ...]
    record: dict[str, Any]
    judged: Judged
    zones: ZoneShares
    patches: Any
    context: tuple[Landmarks, ...]


def _judged(
    brief: Brief,
    inputs: Inputs,
    measured: list[BlockResult],
    readings: Readings,
    own: OwnReadings,
    profiles: dict[str, ZoneProfile],
    compared: Compared | None,
    settings: Defaults,
    progress: Progress,
) -> Screening:
    plots = inputs.plots.table
    values = readings.values
    values[own.values.columns] = own.values
    why_unknown = readings.why_unknown.join(own.why_unknown)
    values["area_ha"] = plots["area_ha"].to_numpy()
    values["outcome"] = _outcomes(plots["outcome"].to_numpy(dtype=object), values)
    values["share_in_water"] = inputs.shore.share_in_water(plots.geometry) if inputs.shore else np.nan
    values["water_disagrees"] = waters_disagree(values, inputs.terrain.vertical_error_m)
    lon, lat, height = plots["lon"].to_numpy(), plots["lat"].to_numpy(), values["elevation_m"].to_numpy()
    climate = plot_climate(inputs.normals, lon, lat, height, settings.zones) if inputs.normals else None
    fits = memberships(
        values["elevation_m"], values["sea_km"], values["lake_km"], values["lake_width_km"], climate, settings.zones
    )
    zones = zone_shares(fits, _stated_zones(brief, inputs), settings.zones, profiles)
    if inputs.normals is not None and climate is not None:
        opinion = second_opinion(inputs.normals, climate, zones.zone)
        values[opinion.columns] = opinion.to_numpy()
    strength = plot_strength_k(zones, climate, settings.cold_air)
    values, why_unknown = with_nights(Readings(values, why_unknown), strength, climate, settings.cold_air)
    sites = Sites(
        [BlockSuns(tuple(one.readings.values.index), one.suns, one.winds) for one in measured],
        plots.set_index("plot")[["lon", "lat"]],
        inputs.wind,
        zones.shares.set_axis(values.index),
        settings.sun.ground_albedo,
        settings.siting,
    )
    values, why_unknown = with_siting(Readings(values, why_unknown), sites)
    halved = assumed_columns(inputs.wind, profiles)
    rules = (*load_cautions(), *own_rules(brief.constraint))
    # judged once without the chance of cold air, to draw the ground and the nights of those plots only that take part
    judged = judge(values, zones, profiles, rules, settings.judgement, halved)
    rows = take_part(judged, brief.judge.shortlist, settings.judgement)
    with progress.step("Drawing the terrain's error and nights"):
        blocks = [one.drawable for one in measured]
        ground, nights = draws_for(rows, blocks, values, strength, brief.judge.seed, settings, progress.goes_on)
    values = with_chance(values, nights)
    judged = judge(values, zones, profiles, rules, settings.judgement, halved)
    air = AllWinds(
        winds_together([one.winds for one in measured], tuple(plots["plot"]), settings.wind.sectors),
        inputs.wind,
        lon,
        lat,
    )
    in_words = terrain_in_words(inputs.terrain.vertical_error_m, inputs.terrain.error_range_m, settings)
    of_ground = (Varied(TERRAIN, in_words),) if ground.count else ()
    draws, varied = data_draws(
        ground, of_ground, air, judged, profiles, brief.judge.seed, brief.judge.shortlist, settings
    )
    sure = certainty(
        judged, zones, profiles, brief.judge.seed, brief.judge.shortlist, settings.judgement, draws, rules, varied
    )
    found = sways(judged, zones, profiles)
    swings = swung(
        all_swings(values, draws, air, profiles, settings),
        judged,
        zones,
        profiles,
        rules,
        brief.judge.shortlist,
        settings.judgement,
    )
    notes = inputs.notes + inputs.terrain.findings
    notes += climate_notes(climate, settings.zones) if climate is not None else ()
    notes += (method_note(values, settings.wind), *place_notes(inputs.wind, lon, lat, height, settings.wind))
    notes += onset_notes(inputs.normals, inputs.wind) if inputs.normals and inputs.shore else ()
    notes += (compared.notes() if compared else ()) + sure.notes() + sway_notes(found) + swing_notes(swings)
    notes += sun_notes([one.suns for one in measured], lat, inputs.sky, inputs.sun_choices)
    notes += night_notes(climate, settings.cold_air)
    waters = together([one.disagreement for one in measured])
    if inputs.shore and len(inputs.shore.waters) and not waters.agrees:
        notes += (Note("warning", "shore", waters.sentence),)
    unchecked, checked = still_unchecked(NOT_CHECKED, brief.constraint)
    notes += own.notes + checked
    inside = within_plots(
        [one.cells for one in measured],
        values,
        lon,
        lat,
        zones,
        profiles,
        halved,
        brief.plots.footprint_m2,
        settings.readings,
        settings.judgement,
    )
    table = _table(plots, values, fits, judged, sure, inside.table, unchecked)
    why = reasons(judged, why_unknown, profiles, settings.judgement)
    siting = first_sitings(table["plot"].head(REASONS_RECORDED).tolist(), values, sites)
    return Screening(
        brief=brief,
        table=table,
        fields=with_cold_deficit(_fields(measured), inputs, brief.zones.force, profiles, settings),
        reasons=why,
        sections={plot: section for one in measured for plot, section in one.sections.items()},
        suns=drawn_suns(
            [(list(one.readings.values.index), one.suns) for one in measured],
            list(table["plot"].head(SUNS_DRAWN)),
            settings.sun,
            inputs.sun_choices.utc_offset_h is None,
        ),
        siting=siting,
        winds=winds_together([one.winds for one in measured], tuple(table["plot"]), settings.wind.sectors),
        profiles=profiles,
        notes=notes,
        not_measured=NOT_MEASURED,
        not_checked=unchecked,
        patches=inside.patches,
        record=_record(brief, inputs, own, measured, table, settings, progress)
        | {"profiles": {zone: profile.model_dump(mode="json") for zone, profile in profiles.items()}}
        | {"reasons": _recorded(table, why), "siting": {plot: one.says for plot, one in siting.items()}}
        | {"certainty": sure.for_record(), "what_would_change": [one.for_record() for one in found]}
        | {"swings": [one.for_record() for one in swings]}
        | {"simulated_nights": nights.for_record()}
        | ({"pairs": compared.for_record()} if compared else {}),
        judged=judged,
        zones=zones,
        context=inputs.context,
    )


def profiles_of(brief: Brief, settings: Defaults) -> tuple[dict[str, ZoneProfile], Compared | None]:
    """What each zone and the planner want, and the weights that the brief's comparisons amount to, if it has any.

    Raises
    ------
    SitescreenError
        If a profile, a criterion of the brief or a comparison cannot be used.
    """
    profiles = load_profiles(brief.judge.profiles)
    check_names(brief, profiles)
    if brief.criterion:
        profiles = with_own_criteria(profiles, brief.criterion, settings.judgement.own_weight_spread_pct)
    if not brief.judge.pairs:
        return profiles, None
    compared = compare_for(profiles, brief.judge.pairs)
    return with_weights(profiles, compared), compared


def _outcomes(told: Any, values: pd.DataFrame) -> list[str]:
    """Why a plot cannot be judged: what its reading said, else that there is no ground under it."""
    no_ground = "the terrain model has no data there"
    return [
        said or (no_ground if np.isnan(height) else "")
        for said, height in zip(told, values["elevation_m"], strict=True)
    ]


def _stated_zones(brief: Brief, inputs: Inputs) -> list[str]:
    """The zone that somebody stated for each plot: for all plots, else for the plot, else by a map of zones."""
    plots = inputs.plots.table
    if brief.zones.force:
        return [brief.zones.force] * len(plots)
    stated = list(plots["zone_given"])
    if inputs.zone_map is None:
        return stated
    mapped = zone_at(inputs.zone_map, plots["lon"].to_numpy(), plots["lat"].to_numpy())
    return [own or zone for own, zone in zip(stated, mapped, strict=True)]


def _table(
    plots: Any,
    values: pd.DataFrame,
    fits: pd.DataFrame,
    judged: Judged,
    sure: Certainty,
    inside: pd.DataFrame,
    unchecked: tuple[str, ...],
) -> Any:
    """Every plot with its identity, readings, marks and geometry; by rank, those set aside last."""
    import geopandas as gpd

    known_zones = [name for name in fits.columns if name not in ("undecided", "missing")]
    parts = [
        plots[["plot", "name", "lon", "lat", "remarks"]].reset_index(drop=True),
        values.reset_index(drop=True),
        fits[known_zones].add_prefix("membership_").reset_index(drop=True),
        judged.table.reset_index(drop=True),
        sure.table.reset_index(drop=True),
        inside.reset_index(drop=True),
    ]
    table = pd.concat(parts, axis=1)
    table["not_checked"] = ", ".join(unchecked)  # on every row, since silence reads as safe wherever the row goes
    table = gpd.GeoDataFrame(table, geometry=plots.geometry.to_numpy(), crs="EPSG:4326")
    order = np.argsort(table["rank"].astype("Float64").fillna(np.inf).to_numpy(dtype=np.float64), kind="stable")
    return table.iloc[order].reset_index(drop=True)


def _recorded(table: Any, why: Mapping[str, Reasons]) -> dict[str, dict[str, Any]]:
    """The reasons of the first plots, as ``sitescreen why`` reads them."""
    return {
        plot: {"for": one.for_, "against": one.against, "cautions": one.cautions, "unknown": one.unknown}
        for plot in table["plot"].head(REASONS_RECORDED)
        for one in (why[plot],)
    }


def _fields(measured: list[BlockResult]) -> dict[str, Field]:
    """The blocks' fields, joined to one a UTM zone."""
    by_zone: dict[int, list[BlockResult]] = {}
    for one in measured:
        by_zone.setdefault(one.block.zone, []).append(one)
    out: dict[str, Field] = {}
    for zone, blocks in by_zone.items():
        names = sorted({name for one in blocks for name in one.fields}, key=list(blocks[0].fields).index)
        for name in names:
            key = name if len(by_zone) == 1 else f"{name}_utm{zone:02d}"
            out[key] = joined([one.fields[name] for one in blocks])
    return out


def _record(
    brief: Brief,
    inputs: Inputs,
    own: OwnReadings,
    measured: list[BlockResult],
    table: Any,
    settings: Defaults,
    progress: Progress,
) -> dict[str, Any]:
    """What the run went by, so that somebody else can repeat and question it."""
    packages = ("sitescreen", "numpy", "numba", "rasterio", "geopandas", "shapely", "pyproj", "exactextract", "pvlib")
    return {
        "title": brief.title,
        "versions": {"python": platform.python_version(), **{name: version(name) for name in packages}},
        "brief": brief_for_record(brief, (*inputs.stamps, *own.stamps)),
        "inputs": [asdict(stamp) for stamp in (*inputs.stamps, *own.stamps)],
        "terrain": {
            "cell_size_m": inputs.terrain.cell_size_m,
            "surface": inputs.terrain.surface,
            "vertical_error_m": inputs.terrain.vertical_error_m,
            "error_range_m": inputs.terrain.error_range_m,
        },
        "water_disagreement": asdict(together([one.disagreement for one in measured])),
        "blocks": [
            {**asdict(one.block), "crs": one.block.crs, "water_disagreement": asdict(one.disagreement)}
            | {"night_air_m3": [{**run._asdict(), "relative_error": run.error} for run in one.night_balances]}
            for one in measured
        ],
        "plots": {
            "read": len(table),
            "ranked": int(table["rank"].notna().sum()),
            "set_aside": {row.plot: row.set_aside for row in table[table["rank"].isna()].itertuples()},
        },
        "settings": settings.model_dump(mode="json"),
        "seconds": {name: round(seconds, 2) for name, seconds in progress.seconds.items()},
    }
