"""``python -m sitescreen``: the same as the command ``sitescreen``."""

from sitescreen.cli.main import run

if __name__ == "__main__":
    run(prog_name="sitescreen")
