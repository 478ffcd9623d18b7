"""The command line: help at once, one line for a mistake, whole results or none."""

import hashlib
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import geopandas as gpd
import numpy as np
import pytest
import rasterio
from affine import Affine
from click.testing import CliRunner, Result
from shapely.geometry import Point, box

from sitescreen.cli._show import show_notes, tame
from sitescreen.cli.main import run
from sitescreen.notes import Note

WEST, NORTH, CELL, N = 500_000.0, 500_000.0, 90.0, 60


def write_terrain(path: Path, values: np.ndarray, crs: str | None, transform: Affine) -> None:
    rows, cols = values.shape
    with rasterio.open(path, "w", "GTiff", cols, rows, 1, crs, transform, dtype="float32", nodata=-9999.0) as out:
        out.write(values.astype(np.float32), 1)


def rolling(n: int = N) -> np.ndarray:
    y, x = np.indices((n, n))
    return (300.0 + 30.0 * np.sin(x / 7.0) + 20.0 * np.cos(y / 5.0)).astype(np.float32)


METRIC = Affine(CELL, 0.0, WEST, 0.0, -CELL, NORTH)


def three_plots() -> gpd.GeoDataFrame:
    """Three squares of 400 m in the middle."""
    at = [(WEST + CELL * (20 + 10 * k), NORTH - CELL * 30) for k in range(3)]
    squares = [box(x - 200, y - 200, x + 200, y + 200) for x, y in at]
    return gpd.GeoDataFrame({"plot": ["A", "B", "C"]}, geometry=squares, crs="EPSG:32637")


BRIEF = '[terrain]\nfiles = ["terrain.tif"]\n[plots]\nfile = "plots.gpkg"\nid = "plot"\n[output]\nfolder = "out"\n'


@pytest.fixture
def good(tmp_path: Path) -> Path:
    """A folder with a brief that works; tests spoil one thing in it."""
    write_terrain(tmp_path / "terrain.tif", rolling(), "EPSG:32637", METRIC)
    three_plots().to_file(tmp_path / "plots.gpkg")
    (tmp_path / "brief.toml").write_text(BRIEF, encoding="utf-8")
    return tmp_path


def rank(folder: Path, *more: str) -> Result:
    return CliRunner().invoke(run, ["rank", str(folder / "brief.toml"), *more])


def prints(folder: Path) -> dict[str, str]:
    """Every file below a folder with its SHA-256."""
    files = sorted(path for path in folder.rglob("*") if path.is_file())
    return {str(path.relative_to(folder)): hashlib.sha256(path.read_bytes()).hexdigest() for path in files}


def missing_terrain(folder: Path) -> None:
    (folder / "terrain.tif").unlink()


def missing_plots(folder: Path) -> None:
    (folder / "plots.gpkg").unlink()


def truncated(folder: Path) -> None:
    path = folder / "terrain.tif"
    path.write_bytes(path.read_bytes()[: path.stat().st_size // 2])


def without_crs(folder: Path) -> None:
    write_terrain(folder / "terrain.tif", rolling(), None, METRIC)


def degrees_as_metres(folder: Path) -> None:
    write_terrain(folder / "terrain.tif", rolling(), "EPSG:32637", Affine(0.001, 0.0, 39.0, 0.0, -0.001, 4.5))


def all_void(folder: Path) -> None:
    write_terrain(folder / "terrain.tif", np.full((N, N), -9999.0), "EPSG:32637", METRIC)


def empty_layer(folder: Path) -> None:
    three_plots().iloc[:0].to_file(folder / "plots.gpkg")


def duplicate_ids(folder: Path) -> None:
    three_plots().assign(plot=["A", "B", "A"]).to_file(folder / "plots.gpkg")


def unknown_key(folder: Path) -> None:
    text = BRIEF.replace("[output]", "pointradius_m = 30\n[output]")
    (folder / "brief.toml").write_text(text, encoding="utf-8")


def broken_toml(folder: Path) -> None:
    (folder / "brief.toml").write_text(BRIEF.replace("]\n", "\n", 1), encoding="utf-8")


def plots_without_crs(folder: Path) -> None:
    with pytest.warns(UserWarning, match="crs"):
        three_plots().set_crs(None, allow_override=True).to_file(folder / "plots.gpkg")


def beside_the_terrain(folder: Path) -> None:
    """The latitude without its sign."""
    plots = three_plots().to_crs("EPSG:4326")
    plots.geometry = plots.geometry.affine_transform([1, 0, 0, -1, 0, 0])
    plots.to_file(folder / "plots.gpkg")


def unwritable(folder: Path) -> None:
    (folder / "out").write_text("a file where the folder should be", encoding="utf-8")


def no_brief(folder: Path) -> None:
    (folder / "brief.toml").unlink()


@pytest.mark.parametrize(
    ("spoil", "names"),
    [
        (no_brief, "brief.toml"),
        (broken_toml, "brief.toml"),
        (unknown_key, "point_radius_m"),  # the nearest key that exists
        (missing_terrain, "terrain.tif"),
        (truncated, "terrain.tif"),
        (without_crs, "terrain.tif"),
        (degrees_as_metres, "terrain.tif"),
        (all_void, "terrain.tif"),
        (missing_plots, "plots.gpkg"),
        (empty_layer, "plots.gpkg"),
        (plots_without_crs, "plots.gpkg"),
        (duplicate_ids, "A"),
        (beside_the_terrain, "latitude's sign changed 3 of 3"),
        (unwritable, "out"),
    ],
)
def test_a_mistake_is_one_line_that_names_it(good: Path, spoil: Callable[[Path], None], names: str) -> None:
    """Exit code 2, one line on stderr, nothing on stdout, and no half-made results."""
    spoil(good)
    result = rank(good)
    assert result.exit_code == 2, result.output
    assert result.stdout == ""
    lines = result.stderr.splitlines()
    (line,) = [line for line in lines if line.startswith("sitescreen: ")]
    assert lines[-1] == line
    assert names in line
    assert "Traceback" not in result.stderr
    assert not (good / "out").is_dir()


def test_a_good_brief_leaves_whole_results(good: Path) -> None:
    """What the README promises, and the head of the ranking on stdout."""
    result = rank(good)
    assert result.exit_code == 0, result.stderr
    assert {"map.html", "ranking.csv", "ranking.xlsx", "plots.gpkg", "record.json"} <= {
        path.name for path in (good / "out").iterdir()
    }
    assert list((good / "out" / "layers").glob("*.tif"))
    assert "3 plots" in result.stdout
    assert [path.name for path in good.iterdir() if path.name.startswith((".", "out"))] == ["out"]


def test_the_same_run_gives_the_same_bytes(good: Path) -> None:
    assert rank(good, "--out", str(good / "one")).exit_code == 0
    assert rank(good, "--out", str(good / "two")).exit_code == 0
    one, two = prints(good / "one"), prints(good / "two")
    assert one.keys() == two.keys()
    assert one["ranking.csv"] == two["ranking.csv"]
    layers = [name for name in one if name.startswith("layers")]
    assert layers
    assert all(one[name] == two[name] for name in layers)


@pytest.mark.parametrize("spoil", [truncated, duplicate_ids, unknown_key])
def test_a_mistake_leaves_the_previous_results_whole(good: Path, spoil: Callable[[Path], None]) -> None:
    assert rank(good).exit_code == 0
    before = prints(good / "out")
    spoil(good)
    assert rank(good).exit_code == 2
    assert prints(good / "out") == before


@pytest.mark.parametrize(("trouble", "code"), [(OSError(28, "No space left on device"), 2), (KeyboardInterrupt(), 1)])
def test_trouble_while_writing_leaves_the_previous_results_whole(
    good: Path, monkeypatch: pytest.MonkeyPatch, trouble: BaseException, code: int
) -> None:
    """The disk fills up, or somebody stops the run, when table and layers are written and the map is not."""
    assert rank(good).exit_code == 0
    before = prints(good / "out")
    write_terrain(good / "terrain.tif", rolling() + 5.0, "EPSG:32637", METRIC)

    def failing(*args: object) -> None:
        raise trouble

    monkeypatch.setattr("sitescreen.deliverables.map.write_map", failing)
    result = rank(good)
    assert result.exit_code == code, result.output
    assert prints(good / "out") == before
    assert [path.name for path in good.iterdir() if path.name.startswith((".", "out"))] == ["out"]
    monkeypatch.undo()
    assert rank(good).exit_code == 0
    assert prints(good / "out")["ranking.csv"] != before["ranking.csv"]


def test_a_plot_outside_the_terrain_is_told_and_not_dropped(good: Path) -> None:
    plots = three_plots()
    plots.loc[2, "geometry"] = Point(WEST - 50_000.0, NORTH).buffer(200.0)
    plots.to_file(good / "plots.gpkg")
    result = rank(good)
    assert result.exit_code == 0, result.stderr
    row = (good / "out" / "ranking.csv").read_text(encoding="utf-8-sig").splitlines()[-1]
    assert ",C," in row
    assert "outside" in row


def test_files_by_option_do_without_a_brief(good: Path) -> None:
    words = ["rank", "--terrain", str(good / "terrain.tif"), "--plots", str(good / "plots.gpkg"), "--zone", "upland"]
    result = CliRunner().invoke(run, [*words, "--out", str(good / "results")])
    assert result.exit_code == 0, result.stderr
    rows = (good / "results" / "ranking.csv").read_text(encoding="utf-8-sig").splitlines()
    assert len(rows) == 4
    assert all(",upland," in row for row in rows[1:])


def test_an_unknown_zone_is_refused(good: Path) -> None:
    result = rank(good, "--zone", "uplands")
    assert result.exit_code == 2
    assert "uplands" in result.stderr


def test_a_zone_may_be_given_by_its_title(good: Path) -> None:
    assert CliRunner().invoke(run, ["check", str(good / "brief.toml"), "--zone", "Hot humid coast"]).exit_code == 0
    assert "source:" in CliRunner().invoke(run, ["zones", "Hot humid coast"]).stdout


def check_refuses(folder: Path, says: str, *more: str) -> None:
    """Exit code 2 of ``check``, one line on stderr and nothing on stdout."""
    result = CliRunner().invoke(run, ["check", str(folder / "brief.toml"), *more])
    assert result.exit_code == 2, result.output
    assert result.stdout == ""
    assert says in result.stderr


def test_check_refuses_what_rank_would_refuse_later(good: Path) -> None:
    """A zone from the call, the brief and a plot; a comparison that is none; plots that lie elsewhere."""
    check_refuses(good, "--zone states the zone 'uplands'", "--zone", "uplands")
    brief = good / "brief.toml"
    brief.write_text(BRIEF + '[zones]\nforce = "tundra"\n', encoding="utf-8")
    check_refuses(good, "[zones] force states the zone 'tundra'")
    brief.write_text(BRIEF + '[judge]\npairs = ["breeze = 3"]\n', encoding="utf-8")
    check_refuses(good, "[judge] pairs 1 is 'breeze = 3'")
    brief.write_text(BRIEF.replace("[output]", 'zone = "zone"\n[output]'), encoding="utf-8")
    three_plots().assign(zone=["upland", "", "lakebasin"]).to_file(good / "plots.gpkg")
    check_refuses(good, "the plot C states the zone 'lakebasin'")
    brief.write_text(BRIEF, encoding="utf-8")
    beside_the_terrain(good)
    check_refuses(good, "latitude's sign")


def test_check_names_plots_near_the_edge(good: Path) -> None:
    """All three lie 2.7 km from the terrain's southern edge."""
    result = CliRunner().invoke(run, ["check", str(good / "brief.toml")])
    last = result.stdout.splitlines()[-1]
    assert "3 plots lie within 3 km of the terrain's edge (A, B, C)" in last, "warnings come last"


def test_check_names_plots_in_water(good: Path) -> None:
    """The lake ends in the middle between A and B."""
    west = box(WEST - 9_000.0, NORTH - 90_000.0, WEST + CELL * 25, NORTH + 90_000.0)
    gpd.GeoDataFrame(geometry=[west], crs="EPSG:32637").to_file(good / "shore.gpkg")
    (good / "brief.toml").write_text(BRIEF + '[shore]\nfile = "shore.gpkg"\nkind = "lake"\n', encoding="utf-8")
    said = CliRunner().invoke(run, ["check", str(good / "brief.toml")]).stdout
    assert "  mostly in mapped water: A\n" in said


def test_a_shore_by_option_says_what_it_holds(good: Path) -> None:
    west = box(WEST - 9_000.0, NORTH - 90_000.0, WEST + 900.0, NORTH + 90_000.0)
    gpd.GeoDataFrame(geometry=[west], crs="EPSG:32637").to_file(good / "shore.gpkg")
    files = ["--terrain", str(good / "terrain.tif"), "--plots", str(good / "plots.gpkg")]
    shore = ["--shore", str(good / "shore.gpkg")]
    refused = CliRunner().invoke(run, ["check", *files, *shore])
    assert refused.exit_code == 2
    assert "--shore-kind" in refused.stderr
    assert CliRunner().invoke(run, ["check", *files, *shore, "--shore-kind", "lake"]).exit_code == 0
    alone = CliRunner().invoke(run, ["check", *files, "--shore-kind", "lake"])
    assert alone.exit_code == 2
    assert "Add --shore" in alone.stderr


@pytest.mark.parametrize(("name", "says"), [("t.tif", "a raster"), ("p.csv", "a table or a map layer")])
def test_a_file_of_data_is_no_brief(tmp_path: Path, name: str, says: str) -> None:
    (tmp_path / name).write_bytes(b"II*\0")
    result = CliRunner().invoke(run, ["rank", str(tmp_path / name)])
    assert result.exit_code == 2
    assert says in result.stderr
    assert f"Did you mean {'--terrain' if name == 't.tif' else '--plots'} {name}?" in result.stderr


@pytest.mark.parametrize("command", ["rank", "check", "draft", "compare", "zones", "why"])
def test_help_keeps_examples_on_lines_of_their_own(command: str) -> None:
    """Click leaves lines alone after a backspace character, which it takes out itself."""
    said = CliRunner().invoke(run, [command, "--help"]).stdout
    assert "\\b" not in said
    assert "\b" not in said
    lines = [line.strip() for line in said.splitlines() if line.strip().startswith("sitescreen ")]
    assert lines
    assert all(line.startswith(f"sitescreen {command}") and line.count("sitescreen ") == 1 for line in lines)


def test_warnings_come_last_on_the_terminal(capsys: pytest.CaptureFixture[str]) -> None:
    show_notes((Note("warning", "plots", "Mind."), Note("assumed", "wind", "Even."), Note("info", "shore", "Read.")))
    assert capsys.readouterr().err.splitlines() == [
        "Assumed, because nobody gave it:",
        "  wind: Even.",
        "Warning (plots): Mind.",
    ]


def test_check_reads_everything_and_writes_nothing(good: Path) -> None:
    before = prints(good)
    result = CliRunner().invoke(run, ["check", str(good / "brief.toml")])
    assert result.exit_code == 0, result.stderr
    assert "3 read" in result.stdout
    assert prints(good) == before


def test_zones_prints_profiles_with_weights_and_sources() -> None:
    listed = CliRunner().invoke(run, ["zones"]).stdout
    for zone in ("hot_humid_coast", "hot_arid", "savannah", "lake_basin", "upland", "high_upland"):
        assert zone in listed
    assert "source:" in CliRunner().invoke(run, ["zones", "upland"]).stdout
    refused = CliRunner().invoke(run, ["zones", "tundra"])
    assert refused.exit_code == 2
    assert "tundra" in refused.stderr


def test_help_takes_under_four_tenths_of_a_second() -> None:
    """Of processor time, the best of five, so that a busy machine does not decide."""
    code = "import resource, sys; from sitescreen.cli.main import run\ntry: run(['--help'])\nexcept SystemExit: pass\n"
    code += "use = resource.getrusage(resource.RUSAGE_SELF); print(use.ru_utime + use.ru_stime, file=sys.stderr)"
    times = []
    for _ in range(5):
        done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
        assert "rank" in done.stdout
        times.append(float(done.stderr))
    assert min(times) < 0.4


def test_names_cannot_steer_the_terminal() -> None:
    assert tame("\x1b]0;owned\x07Up\u202e\nHill") == " ]0;owned Up  Hill"
    assert tame("Nyĩrĩ 山") == "Nyĩrĩ 山"


def test_the_package_can_be_run_as_a_module() -> None:
    told = subprocess.run([sys.executable, "-m", "sitescreen", "--help"], capture_output=True, text=True, check=True)
    assert told.stdout.startswith("Usage: sitescreen ")
