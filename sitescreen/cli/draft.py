"""``sitescreen draft``: a starter brief for the files of a folder."""

from pathlib import Path

import click

from sitescreen.cli.options import EXISTING, examples, in_one_line


@click.command("draft", epilog=examples("sitescreen draft myproject"))
@click.argument("folder", type=EXISTING)
@in_one_line
def command(folder: Path) -> None:
    """Look at the files in a FOLDER and write a starter brief.toml beside them.

    Each guess stands in the brief with its grounds, to be read and corrected; nothing is computed.
    """
    import tomllib

    from sitescreen.brief import checked_brief
    from sitescreen.cli._show import tame
    from sitescreen.deliverables.drafted import draft_text, write_draft
    from sitescreen.inputs.recognised import recognise
    from sitescreen.judgement.profiles import load_profiles

    found = recognise(folder, load_profiles())
    text = draft_text(found, f"Screening of {folder.absolute().name}")
    checked_brief(tomllib.loads(text), folder.absolute(), "the draft")  # a draft that rank would refuse helps nobody
    path = write_draft(folder, text)
    for one in found:
        click.echo(tame(f"{one.file.name}: {one.role or 'not used'}, since {one.why}"))
    click.echo(f"Wrote {path}. Read it, correct it, then: sitescreen check {path}")
