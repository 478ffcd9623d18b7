"""``map.html``: one file, no request to anywhere, opens from a mail attachment.

What a user wrote (titles, names, reasons) reaches the page in two ways only: as JSON whose dangerous signs are
escaped, which the page's scripts show with ``textContent``, and HTML-escaped in the table for readers without scripts.
"""

import base64
import hashlib
import html
import json
import re
from collections.abc import Mapping, Sequence
from importlib.resources import files
from pathlib import Path
from typing import TYPE_CHECKING, Any

from sitescreen.deliverables.answer import CAUTION, answer, trust
from sitescreen.deliverables.budget import budget_bytes, fit_contours, fit_pictures
from sitescreen.deliverables.cold_contours import LEVELS_M, cold_contours
from sitescreen.deliverables.columns import Column
from sitescreen.deliverables.page_data import page_data
from sitescreen.deliverables.questions import asked_here, views
from sitescreen.deliverables.record import plain
from sitescreen.deliverables.relief import relief_picture, water_on, webp
from sitescreen.deliverables.scaffold import leaflet, map_script
from sitescreen.deliverables.sheet import Sheet, by_quantity, sheet_for
from sitescreen.deliverables.static_page import plot_signs, ranking_rows, shelf_rows, trust_blocks
from sitescreen.deliverables.sureness import sureness

if TYPE_CHECKING:
    from sitescreen.screening import Screening

SCRIPTS = (
    "start.js", "weigh.js", "words.js", "frame.js", "cold.js", "landmarks.js", "plan.js", "ladder.js", "leaf.js",
    "around.js", "section.js", "ranking.js", "asks.js", "paper.js", "page.js",
)  # fmt: skip

_DANGEROUS = {"&": "\\u0026", "<": "\\u003c", ">": "\\u003e", "\u2028": "\\u2028", "\u2029": "\\u2029"}
_BLANK_PICTURE = "data:image/gif;base64,R0lGODlhAQABAIAAAAAAAP///yH5BAEAAAAALAAAAAABAAEAAAIBRAA7"


def write_map(screening: "Screening", columns: Sequence[Column], path: Path) -> None:
    """Write the client's page.

    Parameters
    ----------
    screening : Screening
    columns : sequence of Column
    path : Path
    """
    path.write_text(map_page(screening, columns), encoding="utf-8", errors="replace", newline="\n")


def map_page(screening: "Screening", columns: Sequence[Column]) -> str:
    """The whole page as text; the same screening gives the same text."""
    table = screening.table
    groups = by_quantity(screening.fields)
    ground = groups.get("elevation_m", [])
    sheet = sheet_for(table, ground)
    water = water_on(groups.get("shore_distance_km", []), sheet)
    relief = relief_picture(ground, water, sheet)
    questions = asked_here(table, screening.profiles)
    pictures = {
        one.name: views(one.name, table, screening.profiles, screening.fields, sheet, water) for one in questions
    }
    data = page_data(screening, columns, sheet, questions, pictures)
    data["answer"] = answer(table)
    data["trust"] = trust(screening)
    relief_address = _BLANK_PICTURE if relief is None else webp(relief, lossless=False)
    is_cold_asked = any(one.name == "cold" for one in questions)
    contours = (
        cold_contours(groups.get("cold_depth_m", []), groups.get("cold_kind", []), sheet) if is_cold_asked else []
    )
    data["cold_levels_m"] = LEVELS_M
    data["cold"] = []
    over = len(_page(screening, sheet, relief_address, data).encode("utf-8", errors="replace"))
    over -= budget_bytes(len(table))
    data["cold"], said = fit_contours(contours, -over)
    data["left_out"] += said + fit_pictures(data["questions"], over)
    return _page(screening, sheet, relief_address, data)


def _page(screening: "Screening", sheet: Sheet, relief: str, data: Mapping[str, Any]) -> str:
    style = "\n".join([leaflet("leaflet.css"), _asset("page.css")])
    scripts = [leaflet("leaflet.js"), map_script(), "\n".join(_asset(name) for name in SCRIPTS)]
    title = screening.brief.title or "Plots ranked by their ground"
    parts = {
        "policy": _policy([style], scripts, screening.brief.output.online_map),
        "title": html.escape(title),
        "style": style,
        "answer": html.escape(str(data["answer"])),
        "sure": html.escape(sureness(screening.table, screening.brief.judge.shortlist, screening.record)),
        "caution": html.escape(CAUTION),
        "relief": relief,
        "width": str(sheet.cols),
        "height": str(sheet.rows),
        "signs": plot_signs(screening.table, sheet, screening.brief.judge.shortlist),
        "rows": ranking_rows(screening),
        "shelf": shelf_rows(screening.table),
        "trust": trust_blocks(data["trust"]),
        "data": json_for_html(data),
        "leaflet": scripts[0],
        "map": scripts[1],
        "script": scripts[2],
    }
    return filled(_asset("page.html"), parts)


def filled(template: str, parts: Mapping[str, str]) -> str:
    """The template with each ``<!--name-->`` replaced, in one pass: what was put in is never looked at again."""
    return re.sub(r"<!--([a-z]+)-->", lambda slot: parts[slot.group(1)], template)


def json_for_html(data: Any) -> str:
    """JSON that cannot end the script element it stands in, nor start a comment or an entity."""
    text = json.dumps(plain(data), allow_nan=False, ensure_ascii=False, separators=(",", ":"))
    return re.sub("[&<>\u2028\u2029]", lambda sign: _DANGEROUS[sign.group()], text)


def _asset(name: str) -> str:
    return (files("sitescreen.deliverables") / "page" / name).read_text(encoding="utf-8").replace("\r\n", "\n")


def _policy(styles: Sequence[str], scripts: Sequence[str], online_map: str | None = None) -> str:
    """What the browser may run: exactly these styles and scripts, and pictures that are in the page.

    Where the brief names an online map, pictures may come from its server too, and from nowhere else.
    """

    def hashes(texts: Sequence[str]) -> str:
        digests = (hashlib.sha256(text.encode("utf-8")).digest() for text in texts)
        return " ".join(f"'sha256-{base64.b64encode(digest).decode('ascii')}'" for digest in digests)

    server = "" if online_map is None else " " + "/".join(online_map.split("/")[:3])
    return (
        f"default-src 'none'; script-src {hashes(scripts)}; style-src {hashes(styles)}; img-src data: blob:{server}; "
        "base-uri 'none'; form-action 'none'"
    )
