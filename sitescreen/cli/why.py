"""``sitescreen why``: one plot's place and reasons, from the results of a run."""

from collections.abc import Iterable, Iterator, Mapping
from pathlib import Path
from typing import Any

import click

from sitescreen.cli.options import EXISTING, examples, in_one_line


@click.command("why", epilog=examples("sitescreen why demo_region/out 5"))
@click.argument("result", type=EXISTING)
@click.argument("plot")
@in_one_line
def command(result: Path, plot: str) -> None:
    """Say why a PLOT stands where it does, from the folder RESULT that a run wrote.

    PLOT is the plot's identifier, or its name where only one plot has it.
    """
    from sitescreen.cli._show import tame
    from sitescreen.inputs.plot_named import plot_named
    from sitescreen.inputs.results import does_not_hold_together, read_result

    read = read_result(result)
    record, rows = read.record, read.rows
    found = plot_named(plot, [row["plot"] for row in rows], [row["name"] for row in rows], str(result / "ranking.csv"))
    row = rows[found]
    try:
        profile = record.get("profiles", {}).get(row["zone"], {})
        reasons = record.get("reasons", {}).get(row["plot"])
        lines = [
            *_place(row, record["plots"], record["certainty"]),
            *_marks(row, profile),
            *_reasons(row, reasons),
            *_siting(record.get("siting", {}).get(row["plot"], [])),
        ]
    except (KeyError, TypeError, ValueError, AttributeError) as error:
        raise does_not_hold_together(result, error) from error
    for line in lines:
        click.echo(tame(line))


def _place(row: Mapping[str, str], plots: Mapping[str, Any], certainty: Mapping[str, Any]) -> Iterator[str]:
    from sitescreen.deliverables.sureness import of_trials
    from sitescreen.deliverables.table import whole_mark

    yield f"Plot {row['plot']}, {row['name']}" if row["name"] else f"Plot {row['plot']}"
    if row["set_aside"]:
        yield f"Set aside: {row['set_aside']}."
    if row["rank"]:
        zone = f"; {row['rank_in_zone']} in {row['zone']}" if row["rank_in_zone"] else ""
        yield f"Rank {row['rank']} of {plots['ranked']}{zone}."
    if row["overall_mark"]:
        limits = ""
        if row["mark_low"] != row["mark_high"]:
            low, high = whole_mark(float(row["mark_low"])), whole_mark(float(row["mark_high"]))
            limits = f", {low} to {high} with what is unknown at its worst and best; the rank goes by the lower"
        yield f"Mark {whole_mark(float(row['overall_mark']))} of 100{limits}."
    if row.get("zone_2"):
        yield (
            f"Two zones share it: {_in_zone(row, 'zone', 'zone_share', 'mark_in_zone')} and "
            f"{_in_zone(row, 'zone_2', 'zone_2_share', 'mark_in_zone_2')}; what follows speaks of the first."
        )
    if row.get("zone_missing") and row["rank"]:
        yield f"Its rank is provisional: {row['zone_missing']} is missing to tell its zone."
    if row["rank_low"]:
        yield (
            f"In {certainty['trials']:,} trials, which vary {certainty['varies']}, nine in ten give it "
            f"{_span(row['rank_low'], row['rank_high'])}; first {of_trials(float(row['chance_first']))}."
        )
    if row.get("rank_low_data"):
        yield (
            f"By the weights alone {_span(row['rank_low_weights'], row['rank_high_weights'])}, by the data alone "
            f"{_span(row['rank_low_data'], row['rank_high_data'])}."
        )
    if float(row.get("chance_set_aside") or 0.0) > 0.0:
        yield f"Set aside in {100 * float(row['chance_set_aside']):.0f} of 100 draws of the data."
    if row.get("where_on_plot"):
        yield row["where_on_plot"]
    if row.get("mahoney_says"):
        yield f"Second opinion on the climate: {row['mahoney_says']} ({row['mahoney']})"


def _span(low: str, high: str) -> str:
    return f"rank {low}" if low == high else f"rank {low} to {high}"


def _in_zone(row: Mapping[str, str], zone: str, share: str, mark: str) -> str:
    from sitescreen.deliverables.table import whole_mark

    alone = f", {whole_mark(float(row[mark]))} of 100 by it alone" if row.get(mark) else ""
    return f"{row[zone]} ({100 * float(row[share]):.0f} %{alone})"


def _marks(row: Mapping[str, str], profile: Mapping[str, Any]) -> Iterator[str]:
    """What the plot earned on each criterion of its zone."""
    criteria = profile.get("criteria", [])
    total = sum(one["weight"] for one in criteria)
    if criteria:
        yield ""
        yield f"Marks, by the profile “{profile['title']}” (weights before any halving for assumed inputs):"
    for one in criteria:
        mark = row.get(f"mark_{one['name']}", "")
        share = 100.0 * one["weight"] / total
        yield f"  {mark or 'unknown':>7}  {one['title']} ({share:.0f} % of the mark)"


def _reasons(row: Mapping[str, str], reasons: Mapping[str, Any] | None) -> Iterator[str]:
    if reasons is None:
        yield ""
        if row["cautions"]:
            yield f"Cautions: {row['cautions']}"
        yield "The reasons are on the map page; the record keeps those of the first plots in rank only."
        return
    for title, key in (("For", "for"), ("Against", "against"), ("Cautions", "cautions"), ("Unknown", "unknown")):
        if reasons[key]:
            yield ""
            yield f"{title}:"
            yield from (f"  - {sentence}" for sentence in reasons[key])


def _siting(says: Iterable[str]) -> Iterator[str]:
    """The hint how to place a house; nothing for plots that have none."""
    for number, sentence in enumerate(says):
        if number == 0:
            yield ""
            yield "How to place a house here:"
        yield f"  - {sentence}"
