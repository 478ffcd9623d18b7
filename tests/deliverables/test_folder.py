"""Old results stay whole until the new ones are; files that are not ours stay as they are."""

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import pytest

import sitescreen.deliverables.layers as layers_module
import sitescreen.deliverables.map as map_module
from sitescreen.deliverables import folder as folder_module
from sitescreen.deliverables import write_results
from sitescreen.deliverables.folder import check_writable, staged
from sitescreen.errors import OutputError


def contents(folder: Path) -> dict[str, bytes]:
    return {p.relative_to(folder).as_posix(): p.read_bytes() for p in folder.rglob("*") if p.is_file()}


def put(folder: Path, files: dict[str, str]) -> None:
    """Write as a run does, with a record of what was written."""
    with staged(folder) as stage:
        for name, text in files.items():
            (stage / name).parent.mkdir(exist_ok=True)
            (stage / name).write_text(text, encoding="utf-8")
        (stage / "record.json").write_text(json.dumps({"outputs": dict.fromkeys(files, 0)}), encoding="utf-8")


FIRST = {"ranking.csv": "first", "map.html": "first", "layers/a.tif": "first", "layers/b.tif": "first"}
SECOND = {"ranking.csv": "second", "map.html": "second", "layers/a.tif": "second", "layers/c.tif": "second"}


@pytest.fixture
def out(tmp_path: Path) -> Path:
    """A folder with the results of one run and two files of the user's own."""
    out = tmp_path / "out [1]"
    put(out, FIRST)
    (out / "mine.txt").write_text("mine", encoding="utf-8")
    (out / "layers" / "my_soil.tif").write_text("mine", encoding="utf-8")
    return out


def test_a_whole_run_writes_the_promised_files(screening: Any, tmp_path: Path) -> None:
    out = tmp_path / "deep" / "out"
    write_results(screening, out)
    names = set(contents(out))
    assert {"map.html", "ranking.csv", "ranking.xlsx", "plots.gpkg", "record.json", "layers/slope_deg.tif"} <= names
    record = json.loads((out / "record.json").read_text(encoding="utf-8"))
    assert set(record["outputs"]) == names - {"record.json"}
    assert record["notes"][0]["level"] == "assumed"
    assert [p.name for p in out.parent.iterdir()] == ["out"]  # no stage is left
    assert out.stat().st_mode & 0o777 == 0o777 & ~_umask()


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask


def test_layers_only_if_asked_for(screening: Any, tmp_path: Path) -> None:
    output = type(screening.brief)(layers=False, online_map=None)
    brief = type(screening.brief)(**{**vars(screening.brief), "output": output})
    write_results(screening, tmp_path / "out")
    write_results(screening.with_(brief=brief), tmp_path / "out")
    assert not (tmp_path / "out" / "layers").exists()


def test_what_is_no_longer_made_goes_and_what_is_not_ours_stays(out: Path) -> None:
    put(out, SECOND)
    got = contents(out)
    assert got.pop("record.json")
    assert {k: v.decode() for k, v in got.items()} == {**SECOND, "mine.txt": "mine", "layers/my_soil.tif": "mine"}


@pytest.mark.parametrize("fault", [RuntimeError("a fault of ours"), KeyboardInterrupt(), OSError(28, "No space left")])
def test_a_run_that_fails_while_writing_changes_nothing(out: Path, fault: BaseException) -> None:
    before = contents(out.parent)
    expected = OutputError if isinstance(fault, OSError) else type(fault)

    def fail_midway() -> None:
        with staged(out) as stage:
            (stage / "ranking.csv").write_text("half", encoding="utf-8")
            raise fault

    with pytest.raises(expected):
        fail_midway()
    assert contents(out.parent) == before


def test_a_writer_that_fails_midway_changes_nothing(screening: Any, out: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    before = contents(out.parent)
    real, written = layers_module.write_layer, []

    def failing(field: Any, path: Path) -> None:
        if len(written) == 3:
            raise OSError(28, "No space left on device", str(path))
        written.append(path)
        real(field, path)

    monkeypatch.setattr(layers_module, "write_layer", failing)
    with pytest.raises(OutputError, match="No space left on device"):
        write_results(screening, out)
    assert len(written) == 3
    assert contents(out.parent) == before


@pytest.mark.parametrize("nth", range(1, 6))
def test_a_move_that_fails_is_undone(out: Path, nth: int, monkeypatch: pytest.MonkeyPatch) -> None:
    before = contents(out.parent)
    real, moves = Path.replace, []

    def failing(self: Path, target: Path) -> Path:
        if f"/{folder_module.NEW}/" in self.as_posix():
            moves.append(target)
            if len(moves) == nth:
                raise PermissionError(13, "The file is open in another program", str(target))
        return real(self, target)

    monkeypatch.setattr(Path, "replace", failing)
    with pytest.raises(OutputError, match="open in another program"):
        put(out, SECOND)
    assert len(moves) == nth
    assert contents(out.parent) == before


KILLED = """
import os, signal, sys
from pathlib import Path
from sitescreen.deliverables.folder import staged
out, when, nth = Path(sys.argv[1]), sys.argv[2], int(sys.argv[3])
real, moves = Path.replace, []
def dying(self, target):
    moves.append(target)
    if len(moves) == nth:
        os.kill(os.getpid(), signal.SIGKILL)
    return real(self, target)
if when == "moving":
    Path.replace = dying
with staged(out) as stage:
    (stage / "layers").mkdir()
    for name in ("ranking.csv", "map.html", "layers/a.tif", "layers/c.tif", "record.json"):
        (stage / name).write_text("killed")
        if when == "writing" and name == "layers/a.tif":
            os.kill(os.getpid(), signal.SIGKILL)
"""


def killed(out: Path, when: str, nth: int = 0) -> None:
    done = subprocess.run([sys.executable, "-c", KILLED, str(out), when, str(nth)], check=False)
    assert done.returncode == -signal.SIGKILL


def test_a_run_killed_while_writing_leaves_old_results_whole_and_the_next_clears_up(out: Path) -> None:
    before = contents(out)
    killed(out, "writing")
    assert contents(out) == before
    assert len(list(out.parent.iterdir())) == 2
    put(out, SECOND)
    assert list(out.parent.iterdir()) == [out]
    assert contents(out)["mine.txt"] == b"mine"


@pytest.mark.parametrize("nth", [1, 3, 5])
def test_a_run_killed_while_moving_is_undone_by_the_next(out: Path, nth: int) -> None:
    before = contents(out)
    killed(out, "moving", nth)
    with pytest.raises(RuntimeError), staged(out):
        raise RuntimeError
    assert contents(out) == before
    assert list(out.parent.iterdir()) == [out]


def test_a_whole_run_killed_at_any_moment_leaves_old_or_new_results(screening: Any, out: Path, tmp_path: Path) -> None:
    """The real writers in a process of their own, killed early and late."""
    before = contents(out)
    code = (
        "import sys, importlib.util as u; from pathlib import Path\n"
        "spec = u.spec_from_file_location('invented', sys.argv[1]); m = u.module_from_spec(spec)\n"
        "sys.modules['invented'] = m; spec.loader.exec_module(m)\n"
        "from sitescreen.deliverables import write_results\n"
        "print('ready', flush=True); write_results(m.build(), Path(sys.argv[2]))\n"
    )
    for wait_s in (0.05, 0.6):
        process = subprocess.Popen(
            [sys.executable, "-c", code, str(Path(__file__).with_name("conftest.py")), str(out)],
            stdout=subprocess.PIPE,
            text=True,
        )
        assert process.stdout is not None
        assert process.stdout.readline() == "ready\n"
        time.sleep(wait_s)
        process.kill()
        process.stdout.close()
        ended = process.wait()
        got = contents(out)
        if ended == -signal.SIGKILL and not list(out.parent.glob(".*-part-*/moving.json")):
            assert got == before or "ranking.xlsx" in got
        before = got


@pytest.mark.parametrize("largest_bytes", [2_000, 9_000, 60_000, 150_000])
def test_a_disk_that_fills_up_changes_nothing(largest_bytes: int, out: Path) -> None:
    """No file may grow beyond a size, by which the table, the workbook, the plots or a layer fails in its own words."""
    before = contents(out)
    code = (
        "import resource, signal, sys, importlib.util as u; from pathlib import Path\n"
        "spec = u.spec_from_file_location('invented', sys.argv[1]); m = u.module_from_spec(spec)\n"
        "sys.modules['invented'] = m; spec.loader.exec_module(m)\n"
        "from sitescreen.deliverables import write_results; from sitescreen.errors import OutputError\n"
        "made = m.build(shape=(300, 400))\n"
        "signal.signal(signal.SIGXFSZ, signal.SIG_IGN)\n"
        "resource.setrlimit(resource.RLIMIT_FSIZE, (int(sys.argv[3]), int(sys.argv[3])))\n"
        "try:\n    write_results(made, Path(sys.argv[2]))\n"
        "except OutputError as error:\n    print(error); sys.exit(2)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code, str(Path(__file__).with_name("conftest.py")), str(out), str(largest_bytes)],
        capture_output=True, text=True, check=False,
    )  # fmt: skip
    assert done.returncode == 2, done.stderr
    print(done.stdout)
    assert "results cannot be written" in done.stdout
    assert contents(out) == before


def test_a_folder_that_is_a_file_is_refused(tmp_path: Path) -> None:
    (tmp_path / "out").write_text("a file", encoding="utf-8")
    for attempt in (lambda: check_writable(tmp_path / "out"), lambda: put(tmp_path / "out", FIRST)):
        with pytest.raises(OutputError, match="Not a directory") as caught:
            attempt()
        assert str(tmp_path / "out") in caught.value.given
        assert caught.value.needed
        assert "--out" in caught.value.way_out
    assert contents(tmp_path) == {"out": b"a file"}


def test_a_folder_without_permission_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def forbidden(*args: Any, **kwargs: Any) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(folder_module.tempfile, "mkdtemp", forbidden)
    monkeypatch.setattr(folder_module.tempfile, "TemporaryFile", forbidden)
    with pytest.raises(OutputError, match="Permission denied"):
        check_writable(tmp_path / "out")
    with pytest.raises(OutputError, match="Permission denied"):
        put(tmp_path / "out", FIRST)
    assert contents(tmp_path) == {}


def test_checking_leaves_nothing_behind(tmp_path: Path) -> None:
    check_writable(tmp_path / "a" / "b")
    assert list(tmp_path.iterdir()) == []


def test_where_only_the_folder_itself_can_be_written_the_stage_lies_inside(
    out: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    real = folder_module.tempfile.mkdtemp

    def picky(prefix: str, dir: Path) -> str:  # noqa: A002
        if dir == out.parent:
            raise PermissionError(13, "Permission denied")
        return str(real(prefix=prefix, dir=dir))

    monkeypatch.setattr(folder_module.tempfile, "mkdtemp", picky)
    put(out, SECOND)
    assert contents(out)["ranking.csv"] == b"second"
    assert not list(out.glob(".*"))


def test_a_record_cannot_make_us_remove_other_files(out: Path) -> None:
    outside = out.parent / "precious.txt"
    outside.write_text("x", encoding="utf-8")
    names = [*FIRST, "../precious.txt", "mine.txt", str(outside), "layers/../mine.txt"]
    (out / "record.json").write_text(json.dumps({"outputs": dict.fromkeys(names, 0)}), encoding="utf-8")
    put(out, SECOND)
    assert outside.exists()
    assert (out / "mine.txt").exists()


def test_the_map_is_part_of_the_stage(screening: Any, out: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def failing(*args: Any) -> None:
        raise ValueError("fault")

    monkeypatch.setattr(map_module, "write_map", failing)
    before = contents(out)
    with pytest.raises(ValueError, match="fault"):
        write_results(screening, out)
    assert contents(out) == before


@pytest.mark.parametrize("name", ["plots.gpkg", "map.html", "record.json"])
def test_a_file_of_the_users_own_is_refused_before_the_work(tmp_path: Path, name: str) -> None:
    """It has the name of a result, but no run of ours wrote it."""
    (tmp_path / name).write_text("{}", encoding="utf-8")
    with pytest.raises(OutputError, match="which no run of sitescreen wrote"):
        check_writable(tmp_path)
    assert contents(tmp_path) == {name: b"{}"}


def test_a_layer_of_the_users_own_is_never_replaced(out: Path) -> None:
    """Only when the new layers are there is it known that one has its name; then nothing at all is moved."""
    before = contents(out)
    with pytest.raises(OutputError, match=r"layers/my_soil\.tif, which no run"):
        put(out, SECOND | {"layers/my_soil.tif": "second"})
    assert contents(out) == before
