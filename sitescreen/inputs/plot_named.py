"""The plot that somebody means by an identifier or a name."""

import difflib
from collections.abc import Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from sitescreen.errors import InputError

if TYPE_CHECKING:
    from sitescreen.inputs.plots import Plots


def plot_named(wanted: str, plots: Sequence[str], names: Sequence[str], where: str) -> int:
    """The place of a plot in a list: by its identifier, else by a name that only one plot has.

    Parameters
    ----------
    wanted : str
    plots, names : sequences of str, equally long
    where : str
        What messages call the list.

    Raises
    ------
    InputError
        If no plot, or more than one, is meant.
    """
    if wanted in plots:
        return list(plots).index(wanted)
    named = [row for row, name in enumerate(names) if name.casefold() == wanted.casefold()]
    if len(named) == 1:
        return named[0]
    if named:
        said = f"{len(named)} plots are called {wanted!r}: {', '.join(plots[row] for row in named[:8])}"
        raise InputError(said, "one plot is needed", "Give its identifier")
    near = difflib.get_close_matches(wanted, plots, n=1)
    raise InputError(
        f"{where} has no plot {wanted!r}",
        f"one of its {len(plots)} plots is needed: {', '.join(plots[:8])}{' …' if len(plots) > 8 else ''}",
        f"Perhaps {near[0]!r} was meant" if near else "Look it up in the table",
    )


def without_plots(plots: "Plots", left_out: Sequence[str], file: str) -> "Plots":
    """The plots with some of them left out of the judgement, as a what-if; they keep a place and say why.

    Raises
    ------
    InputError
        If one that is to be left out is not there.
    """
    if not left_out:
        return plots
    table = plots.table.copy()
    rows = [plot_named(one, list(table["plot"]), list(table["name"]), file) for one in left_out]
    outcome = table["outcome"].to_numpy(dtype=object).copy()
    outcome[np.array(rows)] = "left out of this run, as asked"
    table["outcome"] = outcome
    return replace(plots, table=table)
