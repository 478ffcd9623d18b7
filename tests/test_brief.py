"""The brief: what may stand in it, what a mistake in it is called."""

import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

from sitescreen.brief import Brief, checked_brief, load_brief
from sitescreen.errors import BriefError

LEAST = '[terrain]\nfiles = ["tile.tif"]\n[plots]\nfile = "plots.gpkg"\n'

WHOLE = """
title = "Shortlist for a clinic programme"
[terrain]
files = ["tiles/a.tif", "/data/b.tif"]
vertical_unit = "ft"
surface = "canopy"
vertical_error_m = 2
error_range_m = 90
canopy_height = "canopy.tif"
[shore]
file = "shore.gpkg"
kind = "kind"
[plots]
file = "../plots.gpkg"
id = "plot"
name = "name"
zone = "zone"
crs = "EPSG:32737"
point_radius_m = 40
footprint_m2 = 300.5
[wind]
file = "wind.csv"
[climate]
stations = "normals.csv"
[cover]
file = "cover.tif"
[cover.classes]
10 = { roughness_m = 1.0, canopy_m = 18, cold_air_factor = 0.8 }
[sky]
file = "cloud.csv"
[zones]
force = "upland"
[judge]
profiles = "profiles"
shortlist = 7
seed = 3
pairs = ["breeze over ground = 3"]
[[constraint]]
name = "river reserve"
file = "rivers.gpkg"
buffer_m = 30
level = "stop"
say = "inside the river reserve"
[[criterion]]
name = "road"
file = "roads.gpkg"
curve = [[0, 100], [500, 80.5], [3000, 0]]
weight = 10
[[context]]
file = "roads.gpkg"
name = "name"
[output]
folder = "out"
layers = false
"""


def write(folder: Path, text: str) -> Path:
    path = folder / "brief.toml"
    path.write_text(text, encoding="utf-8")
    return path


def refusal(folder: Path, text: str) -> str:
    with pytest.raises(BriefError) as caught:
        load_brief(write(folder, text))
    return str(caught.value)


def test_two_keys_are_enough_and_the_rest_has_defaults(tmp_path: Path) -> None:
    brief = load_brief(write(tmp_path, LEAST))
    assert brief.terrain.files == [tmp_path / "tile.tif"]
    assert brief.plots.file == tmp_path / "plots.gpkg"
    assert brief.output.folder == tmp_path / "out"
    assert (brief.shore, brief.wind, brief.climate, brief.cover, brief.sky) == (None,) * 5
    assert (brief.plots.point_radius_m, brief.plots.footprint_m2, brief.judge.shortlist, brief.judge.seed) == (
        60.0,
        400.0,
        5,
        20,
    )
    assert brief.terrain.vertical_error_m is None
    assert brief.output.layers is True


def test_every_key_of_the_full_brief_arrives(tmp_path: Path) -> None:
    brief = load_brief(write(tmp_path, WHOLE))
    assert brief.terrain.files == [tmp_path / "tiles/a.tif", Path("/data/b.tif")]
    assert (brief.terrain.vertical_unit, brief.terrain.surface, brief.terrain.vertical_error_m) == ("ft", "canopy", 2.0)
    assert brief.shore is not None
    assert (brief.shore.file, brief.shore.kind) == (tmp_path / "shore.gpkg", "kind")
    assert brief.plots.crs == "EPSG:32737"
    assert brief.cover is not None
    assert brief.cover.classes["10"].canopy_m == 18.0
    assert brief.zones.force == "upland"
    assert brief.judge.profiles == tmp_path / "profiles"
    assert brief.constraint[0].level == "stop"
    assert brief.criterion[0].curve == [(0, 100), (500, 80.5), (3000, 0)]
    assert brief.context[0].name == "name"
    assert brief.output.layers is False


def test_paths_hang_on_the_brief_and_not_on_the_current_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    inner = tmp_path / "job"
    inner.mkdir()
    write(inner, LEAST)
    monkeypatch.chdir(tmp_path)
    assert load_brief(Path("job/brief.toml")).terrain.files == [inner / "tile.tif"]


def test_a_pattern_stands_for_the_files_that_match_in_order(tmp_path: Path) -> None:
    for name in ("b.tif", "a.tif", "c.txt"):
        (tmp_path / name).touch()
    text = LEAST.replace('["tile.tif"]', '"*.tif"')
    assert load_brief(write(tmp_path, text)).terrain.files == [tmp_path / "a.tif", tmp_path / "b.tif"]
    assert "nothing matches '*.hgt'" in refusal(tmp_path, LEAST.replace("tile.tif", "*.hgt"))


@pytest.mark.parametrize(
    ("text", "named", "way_out"),
    [
        (LEAST + "pointradius_m = 30\n", "[plots] pointradius_m", "“point_radius_m”"),
        (LEAST.replace("files", "file_s"), "[terrain] file_s", "“files”"),
        (LEAST + "[shores]\nfile = 'x'\n", "shores", "“shore”"),
        (LEAST + '[shore]\nfile = "s.gpkg"\npolygons = "s.gpkg"\n', "[shore] polygons", "“file” is what"),
        (LEAST + '[zones]\nzone = "upland"\n', "[zones] zone", "“force” is what it is called there"),
        (LEAST + "vertical_error_m = 3\n", "[plots] vertical_error_m", "It belongs under [terrain]"),
        (WHOLE.replace("buffer_m", "bufer_m"), "[[constraint]] 1, bufer_m", "“buffer_m”"),
        (WHOLE.replace("canopy_m", "canopy"), "[cover] classes, 10, canopy", "“canopy_m”"),
        (LEAST + "[whim]\nx = 1\n", "whim", "Remove it"),
    ],
)
def test_an_unknown_key_is_refused_with_the_nearest_known_one(
    tmp_path: Path, text: str, named: str, way_out: str
) -> None:
    message = refusal(tmp_path, text)
    assert f"unknown key {named};" in message
    assert way_out in message


@pytest.mark.parametrize(
    ("old", "new", "named", "needed"),
    [
        ("vertical_error_m = 2", 'vertical_error_m = "2"', "[terrain] vertical_error_m = '2'", "a number without"),
        ("vertical_error_m = 2", "vertical_error_m = true", "[terrain] vertical_error_m = True", "a number without"),
        ("vertical_error_m = 2", "vertical_error_m = nan", "[terrain] vertical_error_m = nan", "an ordinary number"),
        ("vertical_error_m = 2", "vertical_error_m = -1", "[terrain] vertical_error_m = -1", "a number from 0 up"),
        ('vertical_unit = "ft"', 'vertical_unit = "yd"', "[terrain] vertical_unit = 'yd'", "'m' or 'ft'"),
        ('files = ["tiles/a.tif", "/data/b.tif"]', "files = []", "[terrain] files = []", "at least one file"),
        ('files = ["tiles/a.tif", "/data/b.tif"]', "files = [3]", "[terrain] files = [3]", "a file name in quotes"),
        ('files = ["tiles/a.tif", "/data/b.tif"]', 'files = ["a", "a"]', "[terrain] files", "each file once"),
        ("shortlist = 7", "shortlist = 2.5", "[judge] shortlist = 2.5", "a whole number"),
        ("shortlist = 7", "shortlist = 0", "[judge] shortlist = 0", "a number from 1 up"),
        ("layers = false", 'layers = "no"', "[output] layers = 'no'", "true or false"),
        ('level = "stop"', 'level = "halt"', "[[constraint]] 1, level = 'halt'", "'note', 'concern' or 'stop'"),
        ("[500, 80.5]", "[500, 180]", "[[criterion]] 1, curve, 2, 2 = 180", "a number up to 100"),
        ("[500, 80.5]", "[0, 80]", "[[criterion]] 1, curve", "rise from point to point"),
        ("[500, 80.5]", "500", "[[criterion]] 1, curve, 2 = 500", "a pair of numbers"),
        ('force = "upland"', 'force = "upland"\npolygons = "z.gpkg"', "[zones]", "either force or polygons, not both"),
        ('name = "road"\nfile', 'name = "road"\ncolumn = "price"\nfile', "[[criterion]] 1", "one of file and column"),
        ('title = "Shortlist for a clinic programme"', "title = 3", "title = 3", "text in quotes"),
        ('[wind]\nfile = "wind.csv"', "[wind]\nfile = 5", "[wind] file = 5", "a file name in quotes"),
        ('"wind.csv"', '"~nobody-of-that-name/w.csv"', "[wind] file = '~nobody", "no such user here"),
        ('"wind.csv"', '"w\\u0000.csv"', "[wind] file = 'w\\x00.csv'", "without the character NUL"),
        ('"wind.csv"', f'"{"é" * 130}.csv"', "[wind] file = 'éé", "at most 255 bytes; this one has 264"),
    ],
)
def test_a_wrong_value_is_refused_with_its_key(tmp_path: Path, old: str, new: str, named: str, needed: str) -> None:
    assert old in WHOLE
    message = refusal(tmp_path, WHOLE.replace(old, new))
    assert named in message
    assert needed in message


def test_a_section_that_is_no_table_is_refused(tmp_path: Path) -> None:
    message = refusal(tmp_path, 'wind = "wind.csv"\n' + LEAST)
    assert "[wind] = 'wind.csv'; a table of keys is needed" in message


@pytest.mark.parametrize(
    ("text", "missing"),
    [
        ("[terrain]\nfiles = ['a']\n", "no [plots]"),
        ("[plots]\nfile = 'a'\n", "no [terrain]"),
        ("[terrain]\nsurface = 'bare'\n[plots]\nfile = 'a'\n", "no [terrain] files"),
        (LEAST + "[wind]\n", "no [wind] file"),
    ],
)
def test_a_missing_key_is_named(tmp_path: Path, text: str, missing: str) -> None:
    assert missing in refusal(tmp_path, text)


def test_a_brief_that_is_not_there_or_no_toml_is_refused(tmp_path: Path) -> None:
    with pytest.raises(BriefError, match=r"brief gone\.toml cannot be read \(No such file"):
        load_brief(tmp_path / "gone.toml")
    assert "not valid TOML" in refusal(tmp_path, LEAST.replace("]\n", "\n", 1))
    path = tmp_path / "latin.toml"
    path.write_bytes(b'title = "\xe9"\n')
    with pytest.raises(BriefError, match=r"latin\.toml is not valid TOML"):
        load_brief(path)


@pytest.mark.parametrize("name", ["~nobody-of-that-name/brief.toml", "b\0.toml", "b" * 300])
def test_a_path_of_the_call_that_no_file_could_have_is_refused(name: str) -> None:
    with pytest.raises(BriefError, match="the brief is '"):
        load_brief(Path(name))
    with pytest.raises(BriefError, match="--out is '"):
        Brief.from_files([Path("a.tif")], None, Path("p.gpkg")).with_choices(out=Path(name))


def test_a_brief_from_a_text_editor_with_a_byte_order_mark_is_read(tmp_path: Path) -> None:
    (tmp_path / "brief.toml").write_bytes(b"\xef\xbb\xbf" + LEAST.encode())
    assert load_brief(tmp_path / "brief.toml").title == "Candidate plots"


def test_files_of_the_call_hang_on_the_current_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    brief = Brief.from_files([Path("a.tif")], None, Path("p.gpkg"), zone="upland", out=Path("there"))
    assert brief.terrain.files == [tmp_path / "a.tif"]
    assert brief.shore is None
    assert brief.zones.force == "upland"
    assert brief.output.folder == tmp_path / "there"
    assert Brief.from_files([Path("a.tif")], Path("s.shp"), Path("p.gpkg")).output.folder == tmp_path / "out"


def test_choices_of_the_call_replace_those_of_the_brief(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    brief = load_brief(write(tmp_path, LEAST + "[output]\nlayers = false\n"))
    changed = brief.with_choices(zone="savannah", out=Path("else"))
    assert (changed.zones.force, changed.output.folder, changed.output.layers) == (
        "savannah",
        tmp_path / "else",
        False,
    )
    assert brief.with_choices() == brief
    assert brief.zones.force is None


def test_a_zone_of_the_call_takes_the_place_of_zone_polygons(tmp_path: Path) -> None:
    brief = load_brief(write(tmp_path, LEAST + '[zones]\npolygons = "zones.gpkg"\n'))
    assert brief.zones.polygons == tmp_path / "zones.gpkg"
    changed = brief.with_choices(zone="upland").zones
    assert (changed.force, changed.polygons) == ("upland", None)


def test_the_brief_cannot_be_changed() -> None:
    content: dict[str, Any] = {"terrain": {"files": ["a"]}, "plots": {"file": "b"}}
    brief = checked_brief(content, Path("/x"), "it")
    with pytest.raises(ValueError, match="frozen"):
        brief.title = "other"
    assert content == {"terrain": {"files": ["a"]}, "plots": {"file": "b"}}


def test_reading_a_brief_loads_no_slow_library() -> None:
    """The command line reads the brief before anything else."""
    slow = ("geopandas", "rasterio", "numba", "scipy", "pandas", "numpy")
    code = f"import sys, sitescreen.brief; print([name for name in {slow} if name in sys.modules])"
    assert subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout == "[]\n"


@pytest.mark.parametrize(
    "address",
    [
        "http://tiles.invalid/{z}/{x}/{y}.png",
        "https://tiles.invalid/{z}/{x}.png",
        "https://tiles.invalid; script-src *//{z}/{x}/{y}.png",
        "https://user@tiles.invalid/{z}/{x}/{y}.png",
        "https://tiles.invalid/{z}/{x}/{y}.png'",
        "https:///{z}/{x}/{y}",
    ],
)
def test_an_online_map_has_a_plain_safe_address(tmp_path: Path, address: str) -> None:
    message = refusal(tmp_path, LEAST + f'[output]\nonline_map = "{address}"\n')
    assert "[output] online_map" in message
    assert "begins with https://" in message


def test_an_online_map_is_off_unless_named(tmp_path: Path) -> None:
    assert load_brief(write(tmp_path, LEAST)).output.online_map is None
    address = "https://tiles.invalid:8443/{z}/{x}/{y}.png?key=a-b"
    brief = load_brief(write(tmp_path, LEAST + f'[output]\nonline_map = "{address}"\n'))
    assert brief.output.online_map == address
