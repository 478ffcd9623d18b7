"""``sitescreen compare``: what moved between two runs, and which input moved it."""

from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from sitescreen.cli.options import EXISTING, examples, in_one_line

if TYPE_CHECKING:
    import pandas as pd

    from sitescreen.inputs.results import Result
    from sitescreen.judgement.comparison import Comparison

MOVES_SHOWN = 20


@click.command("compare", epilog=examples("sitescreen compare demo_region/out what_if"))
@click.argument("first", metavar="RESULT", type=EXISTING)
@click.argument("second", metavar="RESULT", type=EXISTING)
@click.option("--no-split", is_flag=True, help="Do not repeat the first run to find out which input moved the ranking.")
@in_one_line
def command(first: Path, second: Path, no_split: bool) -> None:
    """Say what moved from one run to another: ranks, shortlist, and which of the inputs moved them.

    Each RESULT is a folder that “sitescreen rank” wrote. Where several inputs differ, the first run is repeated once
    for each of them, with that one taken from the second run.
    """
    from sitescreen.cli._show import tame
    from sitescreen.inputs.results import does_not_hold_together, read_result
    from sitescreen.judgement.comparison import compare, standing
    from sitescreen.swapping import parts_that_differ

    before, after = read_result(first), read_result(second)
    try:
        parts = parts_that_differ(before.record, after.record)
        shortlist = int(after.record["brief"]["content"]["judge"]["shortlist"])
        tables = standing(before.rows), standing(after.rows)
        lines = list(_compared(compare(*tables, shortlist), *tables, before.record, after.record))
    except (KeyError, TypeError, ValueError, AttributeError) as error:
        raise does_not_hold_together(second if "brief" not in after.record else first, error) from error
    for line in lines:
        click.echo(tame(line))
    for line in _split(before, after, parts, *tables, shortlist, no_split):
        click.echo(tame(line))


def _compared(
    found: "Comparison",
    before: "pd.DataFrame",
    after: "pd.DataFrame",
    record_before: Mapping[str, Any],
    record_after: Mapping[str, Any],
) -> Iterator[str]:
    from sitescreen.judgement.comparison import why_moved

    def why(plot: str) -> str:
        return why_moved(plot, before, after, record_before["profiles"], record_after["profiles"])

    yield (
        f"Plots ranked: {int(before['rank'].notna().sum())} in the first run, {int(after['rank'].notna().sum())} in "
        f"the second, {found.common} in both."
    )
    if found.tau_b == found.tau_b:  # not NaN
        yield f"Agreement of their order: Kendall's τ_b {found.tau_b:.2f}, Spearman's ρ {found.rho:.2f} (1: the same)."
    size = max(len(found.kept) + len(found.entered), len(found.kept) + len(found.left))
    yield f"The first {found.shortlist}: {len(found.kept)} of {size} plots stay, {', '.join(found.kept) or 'none'}."
    for plot in found.entered:
        yield f"  in: {_called(plot, after)}, since {why(plot)}."
    for plot in found.left:
        yield f"  out: {_called(plot, before)}, since {why(plot)}."
    moved = found.moves[(found.moves["rank_before"] != found.moves["rank_after"])]
    moved = moved[moved["rank_before"].notna() | moved["rank_after"].notna()]
    yield ""
    yield f"Ranks that moved: {len(moved)}." if len(moved) else "No rank moved."
    for plot, row in moved.head(MOVES_SHOWN).iterrows():
        yield f"  {plot}: {_rank(row['rank_before'])} to {_rank(row['rank_after'])}; {why(str(plot))}."
    if len(moved) > MOVES_SHOWN:
        yield f"  … and {len(moved) - MOVES_SHOWN} more, further down."


def _called(plot: str, table: "pd.DataFrame") -> str:
    name = table.at[plot, "name"]
    return f"plot {plot}, {name}" if name else f"plot {plot}"


def _rank(rank: float) -> str:
    return f"rank {rank:.0f}" if rank == rank else "no rank"


def _split(
    first: "Result",
    second: "Result",
    parts: tuple[str, ...],
    before: "pd.DataFrame",
    after: "pd.DataFrame",
    shortlist: int,
    no_split: bool,
) -> Iterator[str]:
    """The change by parts; the first run is repeated only where more than one part differs."""
    from sitescreen.cli._show import TerminalProgress
    from sitescreen.errors import SitescreenError
    from sitescreen.judgement.comparison import compare
    from sitescreen.swapping import swaps

    versions = [str(one.record.get("versions", {}).get("sitescreen", "?")) for one in (first, second)]
    yield ""
    if versions[0] != versions[1]:
        yield f"The program differs: version {versions[0]}, then {versions[1]}."
    yield f"Inputs that differ: {', '.join(parts)}." if parts else "No input that moves a rank differs."
    if len(parts) < 2:
        if parts and versions[0] == versions[1]:
            yield f"So all of the change is that of the {parts[0]}."
        return
    if no_split:
        return
    base = before
    yield f"One at a time in the first run (all together: {_amount(compare(before, after, shortlist))}):"
    try:
        for swap in swaps(first.record, first.folder, second.record, second.folder, parts, TerminalProgress):
            if swap.table is None:
                yield f"  {swap.part}: cannot be swapped alone, since {swap.refused}"
            elif swap.part:
                yield f"  {swap.part}: {_amount(compare(base, swap.table, shortlist))}"
            else:
                base = swap.table
                same = compare(before, base, shortlist)
                if same.mean_change > 0.05 or same.entered or same.left:  # the table has one decimal
                    yield f"  the program, which gives the first run other marks today: {_amount(same)}"
    except SitescreenError as error:
        yield f"  cannot be told: {error}"
        return
    yield "Parts act on each other, so that these need not add up to the whole."


def _amount(found: "Comparison") -> str:
    if found.most_changed is None and not found.entered and not found.left:
        return "nothing moves"
    said = []
    if found.most_changed is not None:
        plot, change = found.most_changed
        said.append(f"marks move by {found.mean_change:.1f} points on average, most plot {plot} by {change:+.1f}")
    if found.tau_b == found.tau_b:
        said.append(f"τ_b {found.tau_b:.2f}")
    if found.entered or found.left:
        said.append(f"onto the first {found.shortlist}: {', '.join(found.entered) or 'none'}")
        said.append(f"off it: {', '.join(found.left) or 'none'}")
    else:
        said.append(f"the first {found.shortlist} stay")
    return "; ".join(said)
