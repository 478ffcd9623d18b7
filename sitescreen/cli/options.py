"""Options that several commands share, and the one place where errors become lines."""

import sys
from collections.abc import Callable
from functools import wraps
from pathlib import Path
from typing import ParamSpec, TypeVar

import click

from sitescreen.errors import SitescreenError

P = ParamSpec("P")
R = TypeVar("R")

EXISTING = click.Path(path_type=Path)

brief_argument = click.argument("brief", type=EXISTING, required=False)
terrain_option = click.option(
    "--terrain", "terrain", type=EXISTING, multiple=True, help="Terrain raster; repeat for several tiles."
)
shore_option = click.option("--shore", type=EXISTING, help="Polygons of water or land, or shorelines.")
shore_kind_option = click.option(
    "--shore-kind", help="What the shore file holds: sea, lake or land; or the column that says it."
)
plots_option = click.option("--plots", type=EXISTING, help="The candidate plots: polygons or points.")
zone_option = click.option("--zone", help="Climate zone of all plots, where the ground should not decide it.")


def examples(*lines: str) -> str:
    """The end of a command's help: lines that click must not run together."""
    return "\n".join(("\b", "Examples:" if len(lines) > 1 else "Example:", *(f"  {line}" for line in lines)))


def in_one_line(command: Callable[P, R]) -> Callable[P, R]:
    """Print a SitescreenError as one line on stderr and end with code 2; our own faults keep their traceback."""

    @wraps(command)
    def wrapped(*args: P.args, **kwargs: P.kwargs) -> R:
        try:
            return command(*args, **kwargs)
        except SitescreenError as error:
            click.echo(f"sitescreen: {' '.join(str(error).split())}", err=True)
            sys.exit(2)

    return wrapped
