"""Refuse a wheel that lacks the settings or the page's files, or that carries what does not belong in it.

python .ci/wheel_is_whole.py WHEEL
"""

import sys
import zipfile
from pathlib import Path

REPO = Path(__file__).parent.parent


def main(wheel: Path) -> None:
    """Compare the wheel's list of files with the repository."""
    with zipfile.ZipFile(wheel) as inside:
        carried = {name for name in inside.namelist() if ".dist-info/" not in name}
    wanted = {f"sitescreen/{path.relative_to(REPO)}" for path in (REPO / "config").rglob("*.toml")}
    wanted |= {str(path.relative_to(REPO)) for path in (REPO / "sitescreen").rglob("*") if path.is_file()}
    wanted = {name for name in wanted if "__pycache__" not in name}
    if not any(name.startswith("sitescreen/config/zones/") for name in wanted):
        raise SystemExit("config/zones holds no zone profile")
    if wanted != carried:
        raise SystemExit(f"not in the wheel: {sorted(wanted - carried)}; in the wheel only: {sorted(carried - wanted)}")
    print(f"{wheel.name}: {len(carried)} files")


if __name__ == "__main__":
    main(Path(sys.argv[1]))
