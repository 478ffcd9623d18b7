"""The frame of the map page: folium sets up the map, Leaflet's files are inlined, nothing else gets in.

folium renders its own output a second time as a template, so a plot name such as ``{{ 7*7 }}`` would be evaluated on
the planner's machine. Only constants are ever handed to it; whatever a user wrote enters the page as data
(:mod:`sitescreen.deliverables.map`).
"""

import base64
import hashlib
import re
from functools import cache
from importlib.resources import files

import folium
from branca.element import Figure

from sitescreen.errors import ConfigError

MAP_NAME = "map_plan"
"""The variable, and the element's id, under which the page finds its map."""

# SHA-256 of the files of the Leaflet 1.9.4 release
LEAFLET = {
    "leaflet.js": "20nQCchB9co0qIjJZRGuk2/Z9VM+kNiyxNV1lvTlZBo=",
    "leaflet.css": "p4NxAoJBhIIN+hmNHrzRCf9tD/miZyoHS5obTRR9BMY=",
}

_KNOWN_HEADERS = {"meta_http"}
_DROPPED_LINKS = {
    "leaflet", "jquery", "bootstrap", "awesome_markers",
    "leaflet_css", "bootstrap_css", "glyphicons_css", "awesome_markers_font_css", "awesome_markers_css",
    "awesome_rotate_css",
}  # fmt: skip


@cache
def leaflet(name: str) -> str:
    """One of Leaflet's files, checked; images and source maps that it would fetch are left out.

    Raises
    ------
    ConfigError
        If the installed file is not the released one.
    """
    content = (files("js_lib_leaflet") / "static" / "js_lib_leaflet" / name).read_bytes()
    if base64.b64encode(hashlib.sha256(content).digest()).decode("ascii") != LEAFLET[name]:
        raise ConfigError(
            f"the installed {name} is not that of Leaflet 1.9.4",
            "the released file is needed, since it goes into the page as it is",
            "Reinstall it: pip install --force-reinstall django-js-lib-leaflet==1.9.4.1",
        )
    text = content.decode("utf-8").replace("\r\n", "\n")
    text = re.sub(r"(?m)^//# sourceMappingURL=.*$", "", text)
    # the stock layer button, marker and an old browser's shapes: none is used
    return re.sub(r"(?m)^.*url\((?:images/|#default).*$", "", text) if name.endswith(".css") else text


class BareFigure(Figure):
    """A folium page that keeps only the script of its map."""

    def render(self, **kwargs: object) -> str:
        """The script that sets up the map.

        Raises
        ------
        RuntimeError
            If folium wants to put something into the page that is not known and checked here.
        """
        for child in self._children.values():
            child.render(**kwargs)
        for name, element in self.header._children.items():
            link = hasattr(element, "url")
            known = name in _DROPPED_LINKS if link else name in _KNOWN_HEADERS or name.startswith(MAP_NAME)
            if not known:
                raise RuntimeError(f"folium adds {name!r} to the page, which is not known here")
        script = str(self.script.render(**kwargs)).strip()
        if re.search(r"https?:|//\w", script):
            raise RuntimeError("folium's script names an address")
        return script


def map_script() -> str:
    """The script that makes the map, without tiles, buttons or notices; the page places and fills it."""
    figure = BareFigure()
    plan = folium.Map(
        location=(0, 0),
        zoom_start=8,
        tiles=None,
        zoom_control=False,
        control_scale=False,
        attribution_control=False,
        zoom_animation=False,
        fade_animation=False,
        zoom_snap=0.25,
        zoom_delta=0.75,
        max_zoom=19,
        max_bounds_viscosity=0.6,
    )
    plan._id = MAP_NAME.removeprefix("map_")  # a fixed name: the same run gives the same page
    figure.add_child(plan)
    return figure.render()
