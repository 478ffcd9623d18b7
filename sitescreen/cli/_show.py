"""What a command says on the terminal while it works: progress and notes, on stderr."""

import os
import sys
import time
from pathlib import Path

import click

from sitescreen.notes import Note
from sitescreen.progress import Progress

QUIET_S = 2.0
"""Runs shorter than this say nothing. [s]"""


class TerminalProgress(Progress):
    """A live line on a terminal; on a pipe one line a stage, once the run has lasted over two seconds."""

    def __init__(self) -> None:
        super().__init__()
        from rich.console import Console

        self._begun = time.perf_counter()
        self._console = Console(stderr=True, highlight=False)
        self._status = self._console.status("") if sys.stderr.isatty() else None

    def started(self, text: str) -> None:
        """Show the stage."""
        if self._status is not None:
            from rich.markup import escape

            self._status.update(escape(f"{text} …"))
            self._status.start()
        elif time.perf_counter() - self._begun > QUIET_S or text.startswith(("Compiling", "Reading the ground")):
            click.echo(f"{text} …", err=True)

    def goes_on(self, text: str) -> None:
        """Show how far the stage is, on a terminal only."""
        if self._status is not None:
            from rich.markup import escape

            self._status.update(escape(f"{text} …"))

    def ended(self, text: str) -> None:  # noqa: ARG002  (a subclass may want to know which)
        """Clear the live line."""
        if self._status is not None:
            self._status.stop()


def tame(text: str) -> str:
    """A text that came with somebody's file, without signs that would move the cursor or turn the line round."""
    return "".join(sign if sign.isprintable() else " " for sign in text)


def show_notes(notes: tuple[Note, ...]) -> None:
    """What was assumed in one block, then the warnings, where they are seen; plain information stays in the record."""
    assumed = [note for note in notes if note.level == "assumed"]
    if assumed:
        click.echo("Assumed, because nobody gave it:", err=True)
    for note in dict.fromkeys(assumed):
        click.echo(f"  {note.where}: {note.text}", err=True)
    for note in dict.fromkeys(note for note in notes if note.level == "warning"):
        click.echo(f"Warning ({note.where}): {note.text}", err=True)


def say_if_first_run() -> None:
    """Say that the first run takes longer: it compiles the measuring code, and keeps it for later runs.

    Numba keeps it beside the code; where that folder is read-only it goes to the user's cache, and nothing is said.
    """
    package = Path(__file__).parents[1]
    if os.access(package, os.W_OK) and not any(package.glob("terrain/__pycache__/*.nbi")):
        click.echo("First run: the measuring code is compiled once, which takes about a minute more.", err=True)
