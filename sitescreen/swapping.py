"""Which input moved a ranking: the first run repeated with one part at a time taken from the second."""

from collections.abc import Callable, Iterator, Mapping
from pathlib import Path
from typing import Any, NamedTuple

import pandas as pd

from sitescreen.brief import Brief
from sitescreen.errors import SitescreenError
from sitescreen.inputs.brief_record import brief_from_record
from sitescreen.judgement.comparison import standing
from sitescreen.judgement.profiles import ZoneProfile
from sitescreen.progress import Progress
from sitescreen.screening import screen
from sitescreen.settings import Defaults, checked

SECTIONS: Mapping[str, tuple[str, ...]] = {
    "terrain": ("terrain",),
    "shore": ("shore",),
    "wind": ("wind",),
    "climate": ("climate", "sky"),
    "cover": ("cover",),
    "zones": ("zones",),
    "plots": ("plots",),
    "constraints": ("constraint",),
    "weights": ("criterion",),
    "settings": (),
}
"""The parts of a run and the sections of the brief that they hold. Weights also hold the profiles, which the record
keeps whole, and settings the numbers of ``config/defaults.toml``."""


class Swap(NamedTuple):
    """The standing of the first run with one part of the second, or why it could not be had."""

    part: str
    table: pd.DataFrame | None
    refused: str = ""


def parts_that_differ(first: Mapping[str, Any], second: Mapping[str, Any]) -> tuple[str, ...]:
    """The parts in which two records differ; a file counts by its content, not by its place.

    Parameters
    ----------
    first, second : mapping
        Records of this version.

    Raises
    ------
    KeyError
        If one of them keeps no brief.
    """
    one, two = _told(first), _told(second)
    return tuple(part for part in SECTIONS if one[part] != two[part])


def _told(record: Mapping[str, Any]) -> dict[str, Any]:
    """What each part of a run went by, with fingerprints in place of paths."""
    content, files = record["brief"]["content"], record["brief"]["files"]

    def printed(value: Any) -> Any:
        if isinstance(value, str):
            return files.get(value, value)
        if isinstance(value, Mapping):
            return {key: printed(item) for key, item in value.items()}
        return [printed(item) for item in value] if isinstance(value, list) else value

    told = {part: [printed(content.get(name)) for name in names] for part, names in SECTIONS.items()}
    told["weights"].append(record["profiles"])
    told["settings"].append(record["settings"])
    return told


def swaps(
    first: Mapping[str, Any],
    first_folder: Path,
    second: Mapping[str, Any],
    second_folder: Path,
    parts: tuple[str, ...],
    progress: Callable[[], Progress] = Progress,
) -> Iterator[Swap]:
    """Repeat the first run as it was, then with each part taken from the second alone.

    Parameters
    ----------
    first, second : mapping
        Records of the two runs.
    first_folder, second_folder : Path
        Where they lie.
    parts : tuple of str
        Which to swap.
    progress : callable
        Makes the progress of each run.

    Yields
    ------
    Swap
        First the part "" : nothing swapped. What the first run itself wrote may differ from that, if another version
        of the program wrote it.

    Raises
    ------
    InputError
        If the inputs of one of the runs are gone or have changed.
    """
    one, two = brief_from_record(first, first_folder), brief_from_record(second, second_folder)
    for part in ("", *parts):
        taken = {name: getattr(two, name) for name in SECTIONS.get(part, ())}
        brief: Brief = one.model_copy(update=taken)
        profiles = (second if part == "weights" else first)["profiles"]
        settings = (second if part == "settings" else first)["settings"]
        try:
            told = screen(brief, progress(), _settings(settings), _profiles(profiles))
        except SitescreenError as error:
            if not part:
                raise
            yield Swap(part, None, str(error))
            continue
        columns = [name for name in told.table.columns if name != "geometry"]
        yield Swap(part, standing(told.table[columns].to_dict("records")))


def _settings(recorded: Mapping[str, Any]) -> Defaults:
    return checked(recorded, Defaults, "the settings in the record")


def _profiles(recorded: Mapping[str, Any]) -> dict[str, ZoneProfile]:
    return {zone: checked(one, ZoneProfile, "a profile in the record") for zone, one in recorded.items()}
