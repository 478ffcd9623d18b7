"""Paths as a brief writes them: made absolute, and refused with a plain word where no file system could hold them."""

from pathlib import Path
from typing import Annotated, Any

from pydantic import BeforeValidator, ValidationInfo

_LONGEST_NAME_BYTES = 255
"""More than this no usual file system takes as one file's name."""


def absolute(given: Any, info: ValidationInfo) -> Path:
    """A path as the brief writes it, made absolute against the brief's folder."""
    if not isinstance(given, str | Path) or not str(given).strip():
        raise ValueError("a file name in quotes")
    folder = (info.context or {}).get("folder", Path.cwd())
    return Path(folder, at_home(given)).absolute()


def at_home(given: str | Path) -> Path:
    """A path with ``~`` written out.

    Raises
    ------
    ValueError
        If no file could have that path; the message says what is needed.
    """
    if "\0" in str(given):
        raise ValueError("a file name without the character NUL")
    longest = max((len(part.encode("utf-8", "surrogateescape")) for part in Path(given).parts), default=0)
    if longest > _LONGEST_NAME_BYTES:
        raise ValueError(f"a file name of at most {_LONGEST_NAME_BYTES} bytes; this one has {longest}")
    try:
        return Path(given).expanduser()
    except RuntimeError as error:  # ~somebody, and there is no such user
        raise ValueError(f"a path without “{Path(given).parts[0]}”, since there is no such user here") from error


def _files(given: Any, info: ValidationInfo) -> list[Path]:
    """File names as a list; one name may stand alone, and ``*`` and ``?`` stand for the files that match."""
    listed = [given] if isinstance(given, str | Path) else given
    if not isinstance(listed, list | tuple):
        raise ValueError('a list of file names, such as ["tile.tif"]')
    found: list[Path] = []
    for one in listed:
        path = absolute(one, info)
        if any(sign in path.name for sign in "*?") and not path.exists():
            matching = sorted(path.parent.glob(path.name))
            if not matching:
                raise ValueError(f"file names; nothing matches {one!r}")
            found += matching
        else:
            found.append(path)
    if not found:
        raise ValueError("at least one file")
    if len(set(found)) < len(found):
        raise ValueError("each file once")
    return found


FilePath = Annotated[Path, BeforeValidator(absolute)]
FilePaths = Annotated[list[Path], BeforeValidator(_files)]
