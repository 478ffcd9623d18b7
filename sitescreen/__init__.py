"""sitescreen: rank candidate plots by the climate that their ground gives them.

::

    from sitescreen import load_brief, screen

    screening = screen(load_brief("demo_region/brief.toml"))
    screening.table     # every plot with readings, marks and rank, a GeoDataFrame
    screening.fields    # what was measured, each a Field
"""

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
