"""``sitescreen check``: what the inputs amount to, before any computing."""

from pathlib import Path
from typing import TYPE_CHECKING

import click

from sitescreen.cli.options import (
    brief_argument,
    examples,
    in_one_line,
    plots_option,
    shore_kind_option,
    shore_option,
    terrain_option,
    zone_option,
)

if TYPE_CHECKING:
    from collections.abc import Mapping

    from sitescreen.brief import Brief
    from sitescreen.inputs import Inputs
    from sitescreen.judgement.profiles import ZoneProfile

IN_WATER_SHARE = 0.5
"""As the caution ``in_water`` has it."""

# roughly, from the demo on two busy cores (4.2 million cells, its nights simulated); memory also from a 1° tile at 30 m
START_S, S_A_CELL = 10.0, 1.0e-5
START_GB, GB_A_CELL = 0.6, 0.1e-6


@click.command("check", epilog=examples("sitescreen check demo_region/brief.toml"))
@brief_argument
@terrain_option
@shore_option
@shore_kind_option
@plots_option
@zone_option
@in_one_line
def command(
    brief: Path | None,
    terrain: tuple[Path, ...],
    shore: Path | None,
    shore_kind: str | None,
    plots: Path | None,
    zone: str | None,
) -> None:
    """Read every input of a BRIEF, compute nothing, and say what was understood, assumed and missing."""
    from sitescreen.cli.rank import asked
    from sitescreen.inputs import read_inputs
    from sitescreen.judgement.own import own_readings
    from sitescreen.lattice import blocks_of
    from sitescreen.measuring import BLOCK_MARGIN_M
    from sitescreen.screening import profiles_of
    from sitescreen.settings import load_defaults

    the_brief = asked(brief, terrain, shore, shore_kind, plots, zone, None)
    inputs = read_inputs(the_brief)
    profiles, compared = profiles_of(the_brief, load_defaults())
    _refuse_unknown_zones(the_brief, inputs, profiles)
    own = own_readings(the_brief, inputs.plots.table)
    table = inputs.plots.table
    fit = table[table["outcome"] == ""]
    click.echo(f"Terrain: {len(inputs.terrain.stamps)} file(s), read at {inputs.terrain.cell_size_m:g} m cells.")
    click.echo(f"Plots: {len(table)} read, {len(fit)} can be judged.")
    for outcome, group in table[table["outcome"] != ""].groupby("outcome", sort=True):
        click.echo(f"  {outcome}: {', '.join(group['plot'].head(8))}{' …' if len(group) > 8 else ''}")
    if inputs.shore is not None:
        named = fit["plot"][inputs.shore.share_in_water(fit.geometry) > IN_WATER_SHARE]
        if len(named):
            click.echo(f"  mostly in mapped water: {', '.join(named.head(8))}{' …' if len(named) > 8 else ''}")
    blocks = set(blocks_of(fit["lon"].to_numpy(), fit["lat"].to_numpy(), inputs.terrain.cell_size_m))
    grids = [block.window(BLOCK_MARGIN_M, inputs.terrain.data_bounds(block.crs)) for block in blocks]
    cells = [grid.rows * grid.cols for grid in grids]
    click.echo(
        f"Ground to compute: {sum(cells) / 1e6:.1f} million cells in {len(blocks)} block(s). On two processors expect "
        f"{START_S + sum(cells) * S_A_CELL:.0f} s and {START_GB + max(cells, default=0) * GB_A_CELL:.1f} GB of memory."
    )
    notes = (*inputs.notes, *own.notes, *(compared.notes() if compared else ()))
    for level, word in (("info", "Understood"), ("assumed", "Assumed"), ("warning", "Warning")):
        for note in notes:
            if note.level == level:
                click.echo(f"{word} ({note.where}): {note.text}")


def _refuse_unknown_zones(brief: "Brief", inputs: "Inputs", profiles: "Mapping[str, ZoneProfile]") -> None:
    """Refuse a zone without a profile that a plot, or the map of zones under it, states."""
    from sitescreen.climate.zones import check_zone
    from sitescreen.inputs.zone_map import zone_at

    if brief.zones.force:
        return  # checked with the call; it goes before the others
    table = inputs.plots.table
    for plot, zone in zip(table["plot"], table["zone_given"], strict=True):
        if zone:
            check_zone(zone, profiles, f"the plot {plot}")
    if inputs.zone_map is not None:
        for plot, zone in zip(table["plot"], zone_at(inputs.zone_map, table["lon"], table["lat"]), strict=True):
            if zone:
                check_zone(zone, profiles, f"the map of zones, for the plot {plot},")
