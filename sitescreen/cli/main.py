"""The command line: one file a command, each imported only when it is called."""

import importlib
import io
import sys

import click

_COMMANDS = {
    "draft": "Look at the files of a folder and write a starter brief.",
    "rank": "Rank candidate plots by the climate their ground gives them.",
    "check": "Read every input, compute nothing, say what was understood, assumed and missing.",
    "zones": "Print the climate zones, or one zone's profile with weights and sources.",
    "why": "Say why a plot stands where it does, from the results of a run.",
    "compare": "Say what moved between two runs, and which of their inputs moved it.",
}


class _LateGroup(click.Group):
    """A group that knows its commands by name and loads them when asked, so that --help answers at once."""

    def list_commands(self, ctx: click.Context) -> list[str]:  # noqa: ARG002  (click's signature)
        return list(_COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:  # noqa: ARG002
        if cmd_name not in _COMMANDS:
            return None
        command = importlib.import_module(f"sitescreen.cli.{cmd_name}").command
        assert isinstance(command, click.Command)
        return command

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:  # noqa: ARG002
        with formatter.section("Commands"):
            formatter.write_dl(list(_COMMANDS.items()))


@click.command(cls=_LateGroup, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="sitescreen")
def run() -> None:
    """Choose where to build by the climate that the ground gives.

    sitescreen reads a terrain model, a shoreline and candidate plots, measures each plot's ground (slope, breeze,
    wind, shelter, cold air, open sky), judges it against the profile of its climate zone, and writes a ranked table
    and one map page to hand to a client.

    Try it:  sitescreen rank demo_region/brief.toml
    """
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="replace")  # a name that the terminal cannot write must not end a finished run
