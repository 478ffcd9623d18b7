"""What a file was when it was read: its name, size and fingerprint, for the record."""

import hashlib
from dataclasses import dataclass
from pathlib import Path

from sitescreen.errors import InputError

CHUNK_BYTES = 1 << 20


@dataclass(frozen=True)
class FileStamp:
    """One input file as it was.

    Parameters
    ----------
    name : str
        File name without its folder, so that the record tells nothing of the machine.
    size_bytes : int
    sha256 : str
        Hexadecimal SHA-256 of the content.
    crs : str
        Coordinate system as the file states it; "" where there is none.
    """

    name: str
    size_bytes: int
    sha256: str
    crs: str


def stamp(path: Path, crs: str = "") -> FileStamp:
    """The stamp of a file, read in chunks.

    Parameters
    ----------
    path : Path
        A file, or a folder that serves as one; a folder's files count by name and content.
    crs : str
        Coordinate system to note beside it.

    Raises
    ------
    InputError
        If it cannot be read.
    """
    digest, size = hashlib.sha256(), 0
    try:
        files = sorted(one for one in path.rglob("*") if one.is_file()) if path.is_dir() else [path]
        for one in files:
            if path.is_dir():
                digest.update(one.relative_to(path).as_posix().encode() + b"\0")
            with one.open("rb") as source:
                while chunk := source.read(CHUNK_BYTES):
                    digest.update(chunk)
                    size += len(chunk)
    except OSError as error:
        raise InputError(
            f"the file {path.name} cannot be read ({error.strerror})",
            "a readable file is needed",
            "Check the path and the permissions",
        ) from error
    return FileStamp(path.name, size, digest.hexdigest(), crs)
