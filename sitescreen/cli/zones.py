"""``sitescreen zones``: the profiles that plots are judged by."""

from pathlib import Path

import click

from sitescreen.cli.options import EXISTING, examples, in_one_line


@click.command("zones", epilog=examples("sitescreen zones", "sitescreen zones upland"))
@click.argument("zone", required=False)
@click.option("--profiles", type=EXISTING, help="Folder of your own profiles that replace or add to the built-in ones.")
@in_one_line
def command(zone: str | None, profiles: Path | None) -> None:
    """List the climate zones, or print one ZONE's criteria with weights, curves and sources."""
    from sitescreen.cli.rank import zone_named
    from sitescreen.judgement.profiles import load_profiles

    known = load_profiles(profiles)
    if zone is None:
        for name, profile in known.items():
            click.echo(f"{name}: {profile.title}. {profile.wants}")
        return
    zone = zone_named(zone, known, "the call")
    profile = known[zone]
    click.echo(f"{profile.title} ({zone})\n{profile.wants}\n")
    total = sum(criterion.weight for criterion in profile.criteria)
    for criterion in profile.criteria:
        share = 100.0 * criterion.weight / total
        click.echo(
            f"{criterion.name}: {share:.0f} % of the mark (± {criterion.weight_spread_pct:g} %), {criterion.question}"
        )
        click.echo(f"    curve: {criterion.curve_in_words()}")
        click.echo(f"    source: {criterion.source}")
