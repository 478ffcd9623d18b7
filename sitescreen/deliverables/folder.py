"""The output folder: new results take the place of the old ones all together, or not at all.

Results are written into a stage, a hidden folder beside the target, and moved in by renaming once all of them are
there. Before the first move everything that will be replaced is kept in the stage, so a failing move is undone at
once, and one that was killed half-way (it lasts some thousandths of a second) is undone by the next run.
"""

import json
import os
import re
import shutil
import socket
import tempfile
from collections.abc import Iterable, Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from sitescreen.deliverables.record import NAME as RECORD
from sitescreen.errors import OutputError

OURS = re.compile(
    r"(map\.html|ranking\.csv|ranking\.xlsx|plots\.gpkg|shortlist\.gpx|shortlist\.kml|record\.json|layers/[A-Za-z0-9_-]+\.tif)"
)
"""Paths that a run may have written and a later one may therefore remove."""

NAMES = ("map.html", "ranking.csv", "ranking.xlsx", "plots.gpkg", "shortlist.gpx", "shortlist.kml", RECORD)
"""What a run writes beside the layers."""

NEW, OLD, MOVING, OWNER = "new", "old", "moving.json", "owner.json"


def check_writable(folder: Path) -> None:
    """Refuse a folder that results cannot be written to, before the work is done; leaves nothing behind.

    Raises
    ------
    OutputError
        If it, or the folder it would be made in, cannot be written to; or if it holds a file that has the name of a
        result and that no earlier run wrote, such as the user's own plots.gpkg.
    """
    _refuse_to_replace(folder, NAMES)
    try:
        place = folder.resolve()
        while not (place.exists() or place.is_symlink()):
            place = place.parent
        if not place.is_dir():
            raise NotADirectoryError(20, "Not a directory", str(place))
        with tempfile.TemporaryFile(dir=place):
            pass
    except OSError as error:
        raise _cannot_write(folder, error) from error


@contextmanager
def staged(folder: Path) -> Iterator[Path]:
    """An empty folder to write results into; when the block ends well they take their place in the target.

    Parameters
    ----------
    folder : Path
        The target; made if it is not there. Files in it that are not results of ours stay as they are.

    Yields
    ------
    Path
        Where to write. What an earlier run wrote into the target and this one did not is removed.

    Raises
    ------
    OutputError
        If something cannot be written or moved; the target is then as it was.
    """
    stage: Path | None = None
    try:
        target = folder.resolve()
        target.parent.mkdir(parents=True, exist_ok=True)
        if target.exists() and not target.is_dir():
            raise NotADirectoryError(20, "Not a directory", str(target))
        _clear_up_after_killed_runs(target)
        stage = _new_stage(target)
        yield stage / NEW
        _move_in(stage, target)
    except OutputError:
        raise
    except OSError as error:
        raise _cannot_write(folder, error) from error
    finally:
        if stage is not None and not (stage / MOVING).exists():
            shutil.rmtree(stage, ignore_errors=True)


def _cannot_write(folder: Path, error: OSError) -> OutputError:
    reason = error.strerror or str(error)
    where = f" ({error.filename})" if error.filename else ""
    return OutputError(
        f"results cannot be written to {folder}: {reason}{where}",
        "a folder that can be written to, with room for the results, is needed; earlier results are as they were",
        "Name another folder with --out or [output] folder, close programs that use its files, or free some space",
    )


def _new_stage(target: Path) -> Path:
    """Beside the target, or inside it where only that can be written or renamed from (a mounted folder)."""
    stage: Path | None = None
    try:
        stage = Path(tempfile.mkdtemp(prefix=f".{target.name}-part-", dir=target.parent))
        if target.exists() and stage.stat().st_dev != target.stat().st_dev:
            stage.rmdir()
            stage = None
    except PermissionError:
        if not target.exists():
            raise
    if stage is None:
        stage = Path(tempfile.mkdtemp(prefix=f".{target.name}-part-", dir=target))
    (stage / NEW).mkdir()
    (stage / OWNER).write_text(json.dumps({"host": socket.gethostname(), "process": os.getpid()}), encoding="utf-8")
    return stage


def _files(folder: Path) -> list[str]:
    """Paths below a folder, the record last: where it is new, everything is."""
    paths = [path.relative_to(folder).as_posix() for path in folder.rglob("*") if path.is_file()]
    return sorted(paths, key=lambda path: (path == RECORD, path))


def _earlier_results(target: Path) -> set[str]:
    """What the record in the target says it wrote; nothing where there is no readable record."""
    try:
        named = json.loads((target / RECORD).read_text(encoding="utf-8"))["outputs"]
        return {path for path in named if OURS.fullmatch(path) and (target / path).is_file()}
    except (OSError, ValueError, KeyError, TypeError):
        return set()


def _refuse_to_replace(target: Path, names: Iterable[str]) -> None:
    """Refuse if one of the names is there and stands in no record of ours: then it is the user's own file."""
    ours = _earlier_results(target)
    if ours:
        ours.add(RECORD)
    foreign = [name for name in names if name not in ours and (target / name).exists()]
    if foreign:
        raise OutputError(
            f"the folder {target} holds {', '.join(foreign[:4])}{' and more' if len(foreign) > 4 else ''}, "
            "which no run of sitescreen wrote there",
            "a folder where results replace nothing of yours is needed",
            "Name another folder with --out or [output] folder, or move those files away",
        )


def _move_in(stage: Path, target: Path) -> None:
    new = _files(stage / NEW)
    if not target.exists():
        (stage / NEW).rename(target)
        return
    _refuse_to_replace(target, new)
    stale = _earlier_results(target) - set(new)
    for path in [*new, *stale]:
        _keep(target / path, stage / OLD / path)
    (stage / MOVING).write_text(json.dumps({"target": str(target), "new": new}), encoding="utf-8")
    try:
        for path in stale:
            (target / path).unlink()
        for path in new:
            (target / path).parent.mkdir(exist_ok=True)
            (stage / NEW / path).replace(target / path)
    except BaseException:
        _put_back(stage, target)
        raise
    (stage / MOVING).unlink()
    with suppress(OSError):
        (target / "layers").rmdir()  # only if it is empty


def _keep(path: Path, kept: Path) -> None:
    """A second name for a file, so that it survives being replaced; a copy where links are not to be had."""
    if not path.is_file():
        return
    kept.parent.mkdir(parents=True, exist_ok=True)
    try:
        os.link(path, kept)
    except OSError:
        shutil.copy2(path, kept)


def _put_back(stage: Path, target: Path) -> None:
    """Undo a move that did not end: what was kept goes back, what had no forerunner goes."""
    moved = json.loads((stage / MOVING).read_text(encoding="utf-8"))["new"]
    for path in moved:
        if not (stage / NEW / path).exists() and not (stage / OLD / path).exists():
            (target / path).unlink(missing_ok=True)
    if (stage / OLD).is_dir():
        for path in _files(stage / OLD):
            (target / path).parent.mkdir(parents=True, exist_ok=True)
            (stage / OLD / path).replace(target / path)
    (stage / MOVING).unlink()


def _clear_up_after_killed_runs(target: Path) -> None:
    """Finish what a killed run left: undo its half-done move, remove its stage. Runs that are alive are let be."""
    for place in (target.parent, target):
        for stage in place.glob(f".{_glob_safe(target.name)}-part-*") if place.is_dir() else ():
            if _is_dead(stage):
                if (stage / MOVING).exists():
                    _put_back(stage, target)
                shutil.rmtree(stage, ignore_errors=True)


def _glob_safe(name: str) -> str:
    """The name with the signs that mean something in a glob pattern made literal."""
    return re.sub(r"([*?\[])", r"[\1]", name)


def _is_dead(stage: Path) -> bool:
    """Whether the process that made a stage is known to be gone; one on another machine may be alive."""
    try:
        owner = json.loads((stage / OWNER).read_text(encoding="utf-8"))
        if os.name != "posix" or owner["host"] != socket.gethostname() or owner["process"] == os.getpid():
            return False
        os.kill(int(owner["process"]), 0)  # asks, harms nothing
    except ProcessLookupError:
        return True
    except (OSError, ValueError, KeyError, TypeError):
        return False
    return False
