"""Landmarks in the page: names that keep clear of each other and of the plots; an online map only when asked for."""

from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest
from shapely.geometry import LineString, Point

pytestmark = [pytest.mark.browser, pytest.mark.filterwarnings("ignore::DeprecationWarning")]

WRITTEN = (
    "const out = [], pen = CanvasRenderingContext2D.prototype, write = pen.fillText;"
    "pen.fillText = function (text, x, y, ...rest) {"
    " const m = this.getTransform(), w = this.measureText(text).width, "
    " h = parseFloat(this.font.match(/([0-9.]+)px/)[1]);"
    " const left = this.textAlign === 'center' ? -w / 2 : 0, at = m.transformPoint(new DOMPoint(x + left, y));"
    " out.push({ text, x: at.x, y: at.y, w, h, isTurned: Math.abs(m.b) > 1e-6,"
    " isName: this.canvas.classList.contains('landmarks') });"
    " write.call(this, text, x, y, ...rest); };"
    "map_plan.fire('viewreset'); pen.fillText = write; return out;"
)


def with_landmarks(screening: Any) -> Any:
    """A road across, and villages: one alone, many crowded on one spot, one below a plot."""
    west, south, east, north = screening.table.total_bounds
    middle = ((west + east) / 2, (south + north) / 2)
    plot = screening.table.geometry.iloc[0].centroid
    places = [Point(west, south), *(Point(middle[0] + k * 2e-4, middle[1]) for k in range(9)), plot]
    names = ["Lonely", *(f"Crowded {k}" for k in range(9)), "Under"]
    road = LineString([(west, middle[1]), (east, north)])
    layers = (
        SimpleNamespace(name="ways", shapes=np.array([road, None], dtype=object)[:1], labels=("Slanting road",)),
        SimpleNamespace(name="places", shapes=np.array(places, dtype=object), labels=tuple(names)),
    )
    return screening.with_(context=layers)


def test_names_keep_clear_of_each_other_and_of_ranks(read: Any, screening: Any) -> None:
    page = read(with_landmarks(screening))
    level = [one for one in page.run(WRITTEN) if not one["isTurned"]]
    names = [one for one in level if one["isName"]]
    assert "Lonely" in [one["text"] for one in names]
    assert 1 <= sum(one["text"].startswith("Crowded") for one in names) <= 4
    ranks = [one for one in level if one["text"][-2:] in ("st", "nd", "rd", "th")]
    assert ranks
    for k, one in enumerate(names):
        for other in [*names[k + 1 :], *ranks]:
            apart_x = one["x"] + one["w"] <= other["x"] or other["x"] + other["w"] <= one["x"]
            apart_y = abs(one["y"] - other["y"]) >= 0.7 * min(one["h"], other["h"])
            assert apart_x or apart_y, (one["text"], other["text"])
    assert {"ways", "places"} <= set(page.texts("#legend .legend-item bdi"))
    assert page.problems() == []


def test_no_online_map_unless_the_brief_names_one_and_the_reader_asks(read: Any, screening: Any) -> None:
    assert read(screening).texts("#online") == []
    output = SimpleNamespace(layers=True, online_map="https://tiles.invalid/{z}/{x}/{y}.png", online_credit="<b>Us</b>")
    page = read(screening.with_(brief=SimpleNamespace(**{**vars(screening.brief), "output": output})))
    asked = (
        "return performance.getEntriesByType('resource').map((e) => e.name).filter((n) => n.startsWith('http')).length"
    )
    tiles = "return [...document.querySelectorAll('#map_plan img')].filter((i) => i.src.startsWith('https://tiles.invalid/')).length"
    policy = page.one("meta[http-equiv]").get_attribute("content")
    assert "img-src data: blob: https://tiles.invalid; " in policy
    assert (page.run(asked), page.run(tiles)) == (0, 0)
    page.press("#online")
    assert page.run(tiles) > 0
    assert page.text(".credit") in ("<b>Us</b>", "tiles.invalid does not answer")
    page.press("#online")
    assert page.run(tiles) == 0
