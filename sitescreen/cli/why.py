"""``sitescreen why``: one plot's place and reasons, from the results of a run."""

import csv
import difflib
import json
from collections.abc import Iterator, Mapping
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
    from sitescreen.errors import InputError

    record = _record(result)
    row = _row(result, plot)
    try:
        profile = record.get("profiles", {}).get(row["zone"], {})
        reasons = record.get("reasons", {}).get(row["plot"])
        lines = [*_place(row, record["plots"], record["certainty"]), *_marks(row, profile), *_reasons(row, reasons)]
    except (KeyError, TypeError, ValueError, AttributeError) as error:
        raise InputError(
            f"the results in {result} do not hold together ({error})",
            "ranking.csv and record.json of one run of this version are needed",
            "Run “sitescreen rank” again",
        ) from error
    for line in lines:
        click.echo(tame(line))


def _record(folder: Path) -> dict[str, Any]:
    from sitescreen.errors import InputError

    path = folder / "record.json"
    try:
        content = json.loads(path.read_text(encoding="utf-8"))
        if isinstance(content, dict):
            return content
        said = "it is no record"
    except OSError as error:
        said = str(error.strerror)
    except ValueError as error:
        said = str(error)
    raise InputError(
        f"{path} cannot be read ({said})",
        "a folder that “sitescreen rank” wrote is needed",
        "Name the folder of the results, such as demo_region/out",
    )


def _row(folder: Path, plot: str) -> dict[str, str]:
    """The plot's row of the ranking; by identifier, else by a name that only one plot has."""
    from sitescreen.errors import InputError

    path = folder / "ranking.csv"
    named: list[dict[str, str]] = []
    known: list[str] = []
    try:
        with path.open(encoding="utf-8", newline="") as file:
            for row in csv.DictReader(file):
                told = {column: _as_given(value or "") for column, value in row.items() if column is not None}
                if told["plot"] == plot:
                    return told
                known.append(told["plot"])
                if told["name"].casefold() == plot.casefold():
                    named.append(told)
    except (OSError, UnicodeDecodeError, csv.Error, KeyError) as error:
        raise InputError(
            f"{path} cannot be read as a ranking ({error})",
            "the table that “sitescreen rank” wrote is needed",
            "Run it again, or name another folder",
        ) from error
    if len(named) == 1:
        return named[0]
    if named:
        said = f"{len(named)} plots are called {plot!r}: {', '.join(one['plot'] for one in named[:8])}"
        raise InputError(said, "one plot is needed", "Give its identifier")
    near = difflib.get_close_matches(plot, known, n=1)
    raise InputError(
        f"{path} has no plot {plot!r}",
        f"one of its {len(known)} plots is needed: {', '.join(known[:8])}{' …' if len(known) > 8 else ''}",
        f"Perhaps {near[0]!r} was meant" if near else "Look it up in the table",
    )


def _as_given(text: str) -> str:
    """A cell without the apostrophe that keeps spreadsheets from running it."""
    from sitescreen.deliverables.table import STARTS_A_FORMULA

    return text[1:] if text.startswith("'") and text[1:].startswith(STARTS_A_FORMULA) else text


def _place(row: Mapping[str, str], plots: Mapping[str, Any], certainty: Mapping[str, Any]) -> Iterator[str]:
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
            f"Two zones share it: {row['zone']} ({100 * float(row['zone_share']):.0f} %) and {row['zone_2']} "
            f"({100 * float(row['zone_2_share']):.0f} %); what follows speaks of the first."
        )
    if row["rank_low"]:
        low, high = row["rank_low"], row["rank_high"]
        span = f"rank {low}" if low == high else f"rank {low} to {high}"
        yield (
            f"Under {certainty['trials']:,} other sets of weights mostly {span}, "
            f"first in {100 * float(row['chance_first']):.0f} of 100; the terrain's and the wind's error are not in it."
        )


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
