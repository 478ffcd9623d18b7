"""``record.json``: what went in, how it was set, what came out."""

import hashlib
import json
import math
from collections.abc import Mapping
from dataclasses import asdict, is_dataclass
from pathlib import Path
from typing import Any

import numpy as np

NAME = "record.json"


def plain(value: Any) -> Any:
    """The value in the words of JSON: paths as text, arrays as lists, what is not a finite number as null.

    Raises
    ------
    TypeError
        If it holds something with no plain form; that would be a fault of ours.
    """
    if value is None or isinstance(value, str | bool):
        return value
    if isinstance(value, np.generic):
        return plain(value.item())
    if isinstance(value, int):
        return value
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, Path):
        return value.as_posix()
    if isinstance(value, Mapping):
        return {str(key): plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple | set | frozenset | np.ndarray):
        return [plain(item) for item in (sorted(value) if isinstance(value, set | frozenset) else value)]
    if is_dataclass(value) and not isinstance(value, type):
        return plain(asdict(value))
    raise TypeError(f"the record holds a {type(value).__name__}, which has no plain form")


def outputs(folder: Path) -> dict[str, dict[str, Any]]:
    """Size and SHA-256 of every file below a folder, by its path inside it."""
    stamps = {}
    for path in sorted(p for p in folder.rglob("*") if p.is_file()):
        with path.open("rb") as file:
            digest = hashlib.file_digest(file, "sha256").hexdigest()
        stamps[path.relative_to(folder).as_posix()] = {"bytes": path.stat().st_size, "sha256": digest}
    return stamps


def write_record(content: Mapping[str, Any], path: Path) -> None:
    """Write a record with its keys sorted; NaN never gets in.

    Parameters
    ----------
    content : mapping
    path : Path
    """
    text = json.dumps(plain(content), allow_nan=False, sort_keys=True, indent=1, ensure_ascii=False)
    path.write_text(text + "\n", encoding="utf-8", errors="backslashreplace", newline="\n")
