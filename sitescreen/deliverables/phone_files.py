"""``shortlist.gpx`` and ``shortlist.kml``: the shortlist for the phone, to find the plots on the ground."""

import html
import re
import xml.etree.ElementTree as ET
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any, NamedTuple

from sitescreen.deliverables.answer import CAUTION
from sitescreen.deliverables.columns import BY_NAME
from sitescreen.deliverables.sureness import ordinal
from sitescreen.deliverables.table import mark_words, value_of

if TYPE_CHECKING:
    from sitescreen.screening import Screening

GPX, KML = "shortlist.gpx", "shortlist.kml"

_GPX = "http://www.topografix.com/GPX/1/1"
_KML = "http://www.opengis.net/kml/2.2"
# signs that XML 1.0 cannot hold, and those that turn the direction of the text around them
_UNPRINTABLE = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\ud800-\udfff\ufffe\uffff\u202a-\u202e\u2066-\u2069]")
_DECIMALS = 6  # of a degree: a decimetre


class _Stop(NamedTuple):
    """One plot to visit: what it is called, what is said of it, where it is, and its outline (rings of lon, lat)."""

    called: str
    says: str
    lon: float
    lat: float
    rings: list[list[tuple[float, float]]]


def write_phone_files(screening: "Screening", folder: Path) -> None:
    """Write both files; a shortlist without a plot gives files without one.

    Parameters
    ----------
    screening : Screening
    folder : Path
    """
    stops = list(_stops(screening))
    title = _clean(screening.brief.title or "Shortlist")
    _write(_gpx(title, stops), folder / GPX)
    _write(_kml(title, stops), folder / KML)


def _stops(screening: "Screening") -> Iterator[_Stop]:
    table = screening.table
    near = table[table["rank"].notna() & (table["rank"].astype("Float64") <= screening.brief.judge.shortlist)]
    for (_, row), shape in zip(near.iterrows(), near.geometry, strict=True):
        name, plot = value_of(BY_NAME["name"], row.get("name")), str(row["plot"])
        called = f"{ordinal(int(row['rank']))} {f'{name} (plot {plot})' if name else f'plot {plot}'}"
        zone = screening.profiles.get(row["zone"])
        why: Any = screening.reasons.get(row["plot"])
        lines = [f"{zone.title if zone else row['zone']}: {mark_words(row['overall_mark'], row['mark_low'])} of 100."]
        if why is not None:
            lines += [f"+ {text}" for text in why.for_] + [f"− {text}" for text in why.against]
            lines += [f"! {text}" for text in why.cautions]
        yield _Stop(_clean(called), _clean("\n".join([*lines, CAUTION])), row["lon"], row["lat"], _rings(shape))


def _rings(shape: Any) -> list[list[tuple[float, float]]]:
    """Outer rings of a shape."""
    if shape is None or shape.is_empty:
        return []
    parts = getattr(shape, "geoms", [shape])
    return [[(x, y) for x, y, *_ in part.exterior.coords] for part in parts if hasattr(part, "exterior")]


def _gpx(title: str, stops: list[_Stop]) -> ET.Element:
    root = ET.Element("gpx", {"version": "1.1", "creator": "sitescreen", "xmlns": _GPX})
    _add(_add(root, "metadata"), "name", title)
    for stop in stops:
        point = _add(root, "wpt", at={"lat": _degrees(stop.lat), "lon": _degrees(stop.lon)})
        _add(point, "name", stop.called)
        _add(point, "desc", stop.says)
    return root


def _kml(title: str, stops: list[_Stop]) -> ET.Element:
    root = ET.Element("kml", {"xmlns": _KML})
    document = _add(root, "Document")
    _add(document, "name", title)
    for stop in stops:
        place = _add(document, "Placemark")
        _add(place, "name", stop.called)
        # a viewer shows a description as HTML and fills in $[…]: neither may come from a user's text
        _add(place, "description", html.escape(stop.says).replace("$[", "$&#91;").replace("\n", "<br>"))
        shapes = _add(place, "MultiGeometry")
        _add(_add(shapes, "Point"), "coordinates", f"{_degrees(stop.lon)},{_degrees(stop.lat)}")
        for ring in stop.rings:
            line = _add(shapes, "LineString")
            _add(line, "tessellate", "1")
            _add(line, "coordinates", " ".join(f"{_degrees(x)},{_degrees(y)}" for x, y in ring))
    return root


def _add(parent: ET.Element, tag: str, text: str | None = None, at: Mapping[str, str] | None = None) -> ET.Element:
    child = ET.SubElement(parent, tag, dict(at or {}))
    child.text = text
    return child


def _degrees(value: float) -> str:
    return f"{value:.{_DECIMALS}f}"


def _clean(text: str) -> str:
    return _UNPRINTABLE.sub("\ufffd", text)


def _write(root: ET.Element, path: Path) -> None:
    ET.indent(root, " ")
    content = ET.tostring(root, encoding="unicode")
    path.write_text(f'<?xml version="1.0" encoding="UTF-8"?>\n{content}\n', encoding="utf-8", newline="\n")
