"""sitescreen: rank candidate plots by the climate that their ground gives them.

::

    from sitescreen import load_brief, screen

    screening = screen(load_brief("demo_region/brief.toml"))
    screening.table     # every plot with readings, marks and rank, a GeoDataFrame
    screening.fields    # what was measured, each a Field
"""

import os
import tempfile
from pathlib import Path
from typing import Any

__all__ = ["Brief", "Screening", "load_brief", "screen"]

_HOME = {
    "Brief": "sitescreen.brief",
    "load_brief": "sitescreen.brief",
    "Screening": "sitescreen.screening",
    "screen": "sitescreen.screening",
}


def __getattr__(name: str) -> Any:
    """Load the public names when they are asked for: the command line must answer before geopandas has loaded."""
    if name not in _HOME:
        raise AttributeError(f"module 'sitescreen' has no attribute {name!r}")
    import importlib

    return getattr(importlib.import_module(_HOME[name]), name)


def _give_compiled_code_a_place() -> None:
    """Let numba keep compiled code in the temporary folder where neither the package nor the home can hold it.

    Without any place numba refuses to compile at all, as in a container with a read-only image and no home.
    """
    home = Path(os.environ.get("XDG_CACHE_HOME") or os.path.expanduser("~"))  # noqa: PTH111  (Path.home() may raise)
    if "NUMBA_CACHE_DIR" in os.environ or os.access(Path(__file__).parent, os.W_OK) or os.access(home, os.W_OK):
        return
    user = os.getuid() if hasattr(os, "getuid") else 0
    os.environ["NUMBA_CACHE_DIR"] = str(Path(tempfile.gettempdir()) / f"sitescreen-compiled-{user}")


_give_compiled_code_a_place()
