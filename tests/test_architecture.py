"""The shape of the package: one direction of imports, one place that reads, one that writes, light start-up."""

import ast
import json
import re
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

import sitescreen

PACKAGE = Path(sitescreen.__file__).parent
MODULES = sorted(PACKAGE.rglob("*.py"))
SLOW = ("geopandas", "pandas", "folium", "numba", "rasterio", "scipy", "pvlib", "shapely", "pyproj", "exactextract")


def stage(path: Path) -> str:
    """The room of the house that a module stands in: "inputs", "terrain", …, or its own name at the top."""
    return path.relative_to(PACKAGE).parts[0].removesuffix(".py")


def called_names(path: Path) -> Iterator[str]:
    """The last word of everything that a module calls: ``rasterio.open(x)`` gives "rasterio.open"."""
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Call):
            yield ast.unparse(node.func)


def test_imports_flow_one_way(repo: Path) -> None:
    """The contract in pyproject.toml, held by import-linter: nothing imports to its right."""
    lint = Path(sys.executable).with_name("lint-imports")
    done = subprocess.run([lint, "--no-cache"], cwd=repo, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout + done.stderr


def test_every_room_is_in_the_contract(repo: Path) -> None:
    """A new folder or module at the top must take its place in the flow."""
    contract = (repo / "pyproject.toml").read_text(encoding="utf-8")
    layers = set(re.findall(r'(?<=["| ])sitescreen\.(\w+)(?=[ "])', contract.partition("layers = [")[2]))
    rooms = {stage(path) for path in MODULES} - {"__init__", "__main__"}
    assert rooms == layers


def test_exported_names_are_what_they_say() -> None:
    """The public names, and each of them is there."""
    assert {"Brief", "screen"} <= set(sitescreen.__all__)
    for name in sitescreen.__all__:
        assert getattr(sitescreen, name) is not None


def test_only_inputs_open_data_files() -> None:
    opens = re.compile(r"(rasterio|fiona|pyogrio|gpd|geopandas|pd|pandas|np)\.(open|read_\w+|load|loadtxt|genfromtxt)$")
    openers = {
        str(path.relative_to(PACKAGE)): name
        for path in MODULES
        if stage(path) != "inputs"
        for name in called_names(path)
        if opens.search(name)
    }
    assert not openers


def test_only_deliverables_write_files() -> None:
    writes = re.compile(r"\.(to_file|to_csv|to_excel|to_parquet|write_text|write_bytes|write_dataframe|save|mkdir)$")
    writers = {
        str(path.relative_to(PACKAGE)): name
        for path in MODULES
        if stage(path) != "deliverables"
        for name in called_names(path)
        if writes.search(name)
    }
    assert not writers


def test_no_module_is_called_utils() -> None:
    """A module is named after its quantity."""
    assert not [path for path in MODULES if re.search(r"util|helper|misc|common", path.stem)]


@pytest.mark.parametrize("module", ["sitescreen", "sitescreen.cli.main", "sitescreen.brief", "sitescreen.settings"])
def test_start_up_leaves_the_slow_libraries_alone(module: str) -> None:
    """``--help`` and a mistake in the brief answer at once; the libraries come when there is work for them."""
    code = f"import json, sys, {module}; print(json.dumps(sorted(sys.modules)))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert not set(SLOW) & set(json.loads(done.stdout))


def test_nothing_names_a_path_of_somebody_s_machine(repo: Path) -> None:
    """Files that people read or run hold no absolute path below a home, a mount or a temporary folder."""
    home = re.compile(r"(?<![\w.])/(home|root|Users|work|tmp|mnt|opt)/\w")
    kinds = {".py", ".toml", ".md", ".js", ".css", ".html", ".txt", ".csv", ".json", ".jinja", ""}
    skipped = {".git", ".venv", ".real_terrain", "out", "build", "dist", "__pycache__", ".hypothesis"}
    named = []
    for path in repo.rglob("*"):
        parts = path.relative_to(repo).parts
        if path.is_file() and path.suffix in kinds and not any(p in skipped or p.endswith("_cache") for p in parts):
            text = path.read_text(encoding="utf-8", errors="ignore")
            named += [f"{path.relative_to(repo)}: {hit.group()}" for hit in home.finditer(text)]
    assert not named
