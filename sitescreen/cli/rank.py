"""``sitescreen rank``: the main job."""

from pathlib import Path
from typing import TYPE_CHECKING

import click

from sitescreen.cli.options import (
    EXISTING,
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
    from sitescreen.judgement.profiles import ZoneProfile
    from sitescreen.screening import Screening


@click.command(
    "rank",
    epilog=examples(
        "sitescreen rank demo_region/brief.toml",
        "sitescreen rank demo_region/brief.toml --without 5 --out what_if",
        "sitescreen rank --terrain tile.tif --shore shore.gpkg --shore-kind sea --plots plots.gpkg --out results",
    ),
)
@brief_argument
@terrain_option
@shore_option
@shore_kind_option
@plots_option
@zone_option
@click.option("--out", type=EXISTING, help="Folder for the results. Default: the brief's, else “out”.")
@click.option(
    "--without", metavar="PLOT", multiple=True, help="What if this plot were not there? It stays listed; repeatable."
)
@click.option("--seed", type=click.IntRange(0, 2**63 - 1), help="Start of the drawn trials. Default: the brief's.")
@in_one_line
def command(
    brief: Path | None,
    terrain: tuple[Path, ...],
    shore: Path | None,
    shore_kind: str | None,
    plots: Path | None,
    zone: str | None,
    out: Path | None,
    without: tuple[str, ...],
    seed: int | None,
) -> None:
    """Rank the plots of a BRIEF, or of files named by options.

    Writes map.html, ranking.csv, ranking.xlsx, plots.gpkg, shortlist.gpx, shortlist.kml, layers/*.tif and record.json
    into the output folder; results of an earlier run stay whole until the new ones are complete.
    """
    from sitescreen.cli._show import TerminalProgress, say_if_first_run, show_notes
    from sitescreen.deliverables import write_results
    from sitescreen.deliverables.folder import check_writable
    from sitescreen.screening import screen

    the_brief = asked(brief, terrain, shore, shore_kind, plots, zone, out)
    the_brief = the_brief.with_choices(without=without, seed=seed)
    folder = the_brief.output.folder
    check_writable(folder)  # before the work, not after it
    say_if_first_run()
    progress = TerminalProgress()
    screening = screen(the_brief, progress)
    with progress.step("Writing the results"):
        write_results(screening, folder)
    show_notes(screening.notes)
    _summary(screening, folder)


def asked(
    brief: Path | None,
    terrain: tuple[Path, ...],
    shore: Path | None,
    shore_kind: str | None,
    plots: Path | None,
    zone: str | None,
    out: Path | None,
) -> "Brief":
    """The brief that the words of the call amount to; options replace what the file says."""
    from sitescreen.brief import Brief, load_brief
    from sitescreen.errors import BriefError

    if brief is not None:
        if terrain or shore or shore_kind or plots:
            raise BriefError(
                f"both the brief {brief} and files by option were given",
                "one of the two is needed",
                "Name the files in the brief, or leave the brief out",
            )
        return _with_zone(load_brief(brief).with_choices(out=out), zone)
    if not terrain or plots is None:
        raise BriefError(
            "no brief was given, and not both --terrain and --plots",
            "a brief, or at least a terrain raster and a file of plots, is needed",
            "Try: sitescreen rank demo_region/brief.toml",
        )
    if shore_kind is not None and shore is None:
        raise BriefError(
            f"--shore-kind {shore_kind} was given without a shore",
            "the file it speaks of is needed",
            "Add --shore FILE",
        )
    return _with_zone(Brief.from_files(list(terrain), shore, plots, out=out, shore_kind=shore_kind), zone)


def _with_zone(brief: "Brief", zone: str | None) -> "Brief":
    """The brief with the zone for all plots by its name: refused here if unknown, before any work."""
    stated = zone if zone is not None else brief.zones.force
    if stated is None:
        return brief
    from sitescreen.judgement.profiles import load_profiles

    known = load_profiles(brief.judge.profiles)
    return brief.with_choices(zone=zone_named(stated, known, "--zone" if zone is not None else "[zones] force"))


def zone_named(stated: str, profiles: "Mapping[str, ZoneProfile]", where: str) -> str:
    """A zone by its name or by its title, such as “Hot humid coast”.

    Raises
    ------
    BriefError
        If there is no such zone; ``where`` says who asked for it.
    """
    from sitescreen.climate.zones import check_zone

    titles = {profile.title.casefold(): name for name, profile in profiles.items()}
    return titles.get(stated.strip().casefold()) or check_zone(stated, profiles, where)


def _summary(screening: "Screening", folder: Path) -> None:
    """The head of the ranking on stdout, and where the rest is."""
    from sitescreen.cli._show import tame
    from sitescreen.deliverables.table import whole_mark

    table = screening.table
    ranked = table[table["rank"].notna()]
    click.echo(f"{len(table)} plots: {len(ranked)} ranked, {len(table) - len(ranked)} set aside.")
    for row in ranked.head(screening.brief.judge.shortlist).itertuples():
        called = f"{row.name} (plot {row.plot})" if row.name else f"Plot {row.plot}"
        zone = screening.profiles[row.zone].title
        reason = next(iter(screening.reasons[row.plot].for_), "")
        click.echo(
            tame(f"{int(row.rank):>4}. {called}, {zone}: {whole_mark(row.overall_mark)} of 100. {reason}".rstrip())
        )
    click.echo(f"Map: {folder / 'map.html'}")
    click.echo(f"Table: {folder / 'ranking.csv'}")
    click.echo("A screening, not a survey: local codes and licensed practice decide.")
