"""``sitescreen check``: what the inputs amount to, before any computing."""

from pathlib import Path

import click

from sitescreen.cli.options import (
    brief_argument,
    in_one_line,
    plots_option,
    shore_option,
    terrain_option,
    zone_option,
)


@click.command("check")
@brief_argument
@terrain_option
@shore_option
@plots_option
@zone_option
@in_one_line
def command(
    brief: Path | None, terrain: tuple[Path, ...], shore: Path | None, plots: Path | None, zone: str | None
) -> None:
    r"""Read every input of a BRIEF, compute nothing, and say what was understood, assumed and missing.

    \b
    sitescreen check demo_region/brief.toml
    """
    from sitescreen.cli.rank import asked
    from sitescreen.inputs import read_inputs
    from sitescreen.judgement.own import own_readings
    from sitescreen.lattice import blocks_of
    from sitescreen.screening import profiles_of
    from sitescreen.settings import load_defaults

    the_brief = asked(brief, terrain, shore, plots, zone, None)
    inputs = read_inputs(the_brief)
    _, compared = profiles_of(the_brief, load_defaults())
    own = own_readings(the_brief, inputs.plots.table)
    table = inputs.plots.table
    fit = table[table["outcome"] == ""]
    click.echo(f"Terrain: {len(inputs.terrain.stamps)} file(s), read at {inputs.terrain.cell_size_m:g} m cells.")
    click.echo(f"Plots: {len(table)} read, {len(fit)} can be judged.")
    for outcome, group in table[table["outcome"] != ""].groupby("outcome", sort=True):
        click.echo(f"  {outcome}: {', '.join(group['plot'].head(8))}{' …' if len(group) > 8 else ''}")
    blocks = set(blocks_of(fit["lon"].to_numpy(), fit["lat"].to_numpy(), inputs.terrain.cell_size_m))
    click.echo(f"Blocks of ground to compute: {len(blocks)}.")
    for note in (*inputs.notes, *own.notes, *(compared.notes() if compared else ())):
        word = {"info": "Understood", "assumed": "Assumed", "warning": "Warning"}[note.level]
        click.echo(f"{word} ({note.where}): {note.text}")
