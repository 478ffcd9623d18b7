"""Everything that comes in: the only place where data files are opened.

Coordinate systems, orientation, vertical units and no-data are settled here, so that no later stage asks about them.
"""

from dataclasses import dataclass
from pathlib import Path
from typing import Any

from sitescreen.brief import Brief
from sitescreen.inputs.agreement import (
    check_sea_level,
    edge_notes,
    refuse_both_sides_of_180,
    refuse_without_plots,
)
from sitescreen.inputs.context import Landmarks, read_context
from sitescreen.inputs.cover import Cover, read_cover
from sitescreen.inputs.normals import Normals, read_normals
from sitescreen.inputs.plot_named import without_plots
from sitescreen.inputs.plots import Plots, read_plots
from sitescreen.inputs.shore import Shore, read_shore
from sitescreen.inputs.shore_kinds import kind_of
from sitescreen.inputs.sky import ClearSky, SunChoices, read_sky, sun_choices
from sitescreen.inputs.stamps import FileStamp
from sitescreen.inputs.terrain import Terrain, open_terrain
from sitescreen.inputs.wind import WindTable, assumed_wind, read_wind
from sitescreen.inputs.zone_map import read_zone_map
from sitescreen.notes import Note
from sitescreen.settings import load_defaults


@dataclass(frozen=True)
class Inputs:
    """What one screening works from. Everything but terrain and plots may be missing."""

    terrain: Terrain
    plots: Plots
    shore: Shore | None
    wind: WindTable
    normals: Normals | None
    cover: Cover | None
    sky: ClearSky | None
    sun_choices: SunChoices
    zone_map: Any | None
    context: tuple[Landmarks, ...]
    notes: tuple[Note, ...]

    @property
    def stamps(self) -> tuple[FileStamp, ...]:
        """Name, size and SHA-256 of every file read."""
        singles = (self.plots, self.shore, self.wind, self.normals, self.cover, self.sky, *self.context)
        found = [stamp for one in singles if one is not None and (stamp := one.stamp) is not None]
        return (*self.terrain.stamps, *found)


def read_inputs(brief: Brief) -> Inputs:
    """Open and check every input that the brief names.

    Raises
    ------
    InputError
        If one of them cannot be used; the message names the file, what is needed and the way out.
    """
    terrain = open_terrain(brief.terrain)
    outline = terrain.data_outline()
    refuse_both_sides_of_180(outline)
    settings = load_defaults()
    smallest_km2 = settings.shore.smallest_lake_km2
    shore = read_shore(brief.shore.file, brief.shore.kind, outline, smallest_km2) if brief.shore else None
    plots = read_plots(
        brief.plots.file,
        id_column=brief.plots.id,
        name_column=brief.plots.name,
        zone_column=brief.plots.zone,
        crs=brief.plots.crs,
        point_radius_m=brief.plots.point_radius_m,
        outline=outline,
    )
    refuse_without_plots(plots, outline)
    plots = without_plots(plots, brief.plots.without, brief.plots.file.name)
    sea_notes: tuple[Note, ...] = ()
    if shore is not None and brief.shore is not None:
        sea_notes = check_sea_level(shore, terrain, outline, kind_of(brief.shore.kind or "") == "land")
    wind = read_wind(brief.wind.file, brief.wind.places == "inverse_distance") if brief.wind else assumed_wind()
    normals = read_normals(brief.climate.stations) if brief.climate and brief.climate.stations else None
    sky = read_sky(brief.sky.file) if brief.sky and brief.sky.file else None
    cover = read_cover(brief.cover) if brief.cover else None
    zone_map = read_zone_map(Path(brief.zones.polygons)) if brief.zones.polygons else None
    context = read_context(brief.context, outline)
    notes: list[Note] = list(sea_notes)
    for read in (terrain, shore, plots, wind, normals, cover, sky, *context):
        if read is not None:
            notes.extend(read.notes)
    notes.extend(edge_notes(plots, outline, settings.wind.shelter_reach_m))
    if shore is None:
        notes.append(
            Note(
                "assumed",
                "shore",
                "No shoreline was given, so breeze and distance to water are unknown for every plot.",
            )
        )
    if normals is None:
        notes.append(
            Note(
                "assumed", "climate", "No climate normals were given: zones follow from altitude and distance to water."
            )
        )
    return Inputs(terrain, plots, shore, wind, normals, cover, sky, sun_choices(brief), zone_map, context, tuple(notes))
