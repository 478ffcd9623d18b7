"""The brief in the record: kept so that a run can be repeated, and read back only where its files are unchanged."""

import os
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from sitescreen.brief import Brief, checked_brief
from sitescreen.errors import InputError, SitescreenError
from sitescreen.inputs.stamps import FileStamp, stamp


def brief_for_record(brief: Brief, stamps: Sequence[FileStamp]) -> dict[str, Any]:
    """A brief as plain text and numbers, with the fingerprint of every file that it names.

    Parameters
    ----------
    brief : Brief
    stamps : sequence of FileStamp
        Of files that the run has read already.

    Returns
    -------
    dict
        ``content``: as the TOML file would hold it, paths relative to the folder of the results, so that a folder
        with inputs and results can be moved as one. ``files``: SHA-256 by those paths.
    """
    folder = brief.output.folder
    content = brief.model_dump(mode="python", exclude_none=True)
    del content["output"]["folder"]  # the record lies in it
    known = _unambiguous(stamps)
    files: dict[str, str] = {}

    def written(value: Any) -> Any:
        if isinstance(value, Path):
            path = _relative(value, folder)
            if path not in files:
                files[path] = known.get(value.name) or stamp(value).sha256
            return path
        if isinstance(value, Mapping):
            return {key: written(item) for key, item in value.items()}
        if isinstance(value, list | tuple):
            return [written(item) for item in value]
        return value

    return {"content": written(content), "files": files}


def _unambiguous(stamps: Sequence[FileStamp]) -> dict[str, str]:
    """SHA-256 by file name, where one file only has that name."""
    found: dict[str, set[str]] = {}
    for one in stamps:
        found.setdefault(one.name, set()).add(one.sha256)
    names = [one.name for one in stamps]
    return {name: next(iter(prints)) for name, prints in found.items() if names.count(name) == 1}


def _relative(path: Path, folder: Path) -> str:
    try:
        return Path(os.path.relpath(path, folder)).as_posix()
    except ValueError:  # on another drive: its name alone, which a later run will not find
        return path.name


def brief_from_record(record: Mapping[str, Any], folder: Path) -> Brief:
    """The brief of an earlier run, if everything that it read is still there and unchanged.

    Parameters
    ----------
    record : mapping
        The content of ``record.json``.
    folder : Path
        Where the record lies.

    Raises
    ------
    InputError
        If the record keeps no brief, or a file is gone or has changed since; the message names it.
    """
    kept = record.get("brief")
    if not isinstance(kept, Mapping) or not {"content", "files"} <= set(kept):
        raise InputError(
            f"the record in {folder} keeps no brief", "a run of this version is needed", "Run “sitescreen rank” again"
        )
    for path, sha256 in kept["files"].items():
        place = folder.absolute() / path
        if not place.exists():
            raise _not_as_it_was(path, folder, "is not there any more")
        if stamp(place).sha256 != sha256:
            raise _not_as_it_was(path, folder, "has changed since")
    try:
        return checked_brief(kept["content"], folder.absolute(), f"the record in {folder}")
    except (SitescreenError, TypeError, AttributeError) as error:
        raise InputError(
            f"the brief kept in {folder} cannot be used ({error})",
            "a run of this version is needed",
            "Run “sitescreen rank” again",
        ) from error


def _not_as_it_was(path: str, folder: Path, what: str) -> InputError:
    return InputError(
        f"{path}, which the run in {folder} read, {what}",
        "the inputs as they were are needed to repeat the run",
        "Put the file back where it was, seen from the folder of the results",
    )
