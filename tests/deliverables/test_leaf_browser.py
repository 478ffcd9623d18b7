"""The drawings of the leaf: each thing stands at its bearing, and what is not known is not drawn."""

import re
from typing import Any

import pytest

pytestmark = [pytest.mark.browser, pytest.mark.filterwarnings("ignore::DeprecationWarning")]

AXIS = (
    "const letters = [...document.querySelectorAll('.around text')].filter((t) => /^[NESW]$/.test(t.textContent));"
    "return letters.map((t) => [t.textContent, parseFloat(t.getAttribute('x'))])"
)


def at(axis: list[list[Any]], bearing: float) -> float:
    """Where a bearing stands, by the letters E (90°) and W (270°) of the axis."""
    east, west = (next(x for letter, x in axis if letter == which) for which in "EW")
    return float(east + (bearing - 90.0) / 180.0 * (west - east))


def test_each_thing_stands_at_its_bearing(read: Any, with_drawings: Any) -> None:
    """The wall of 30° from 45° to 90°, the tallest and shortest wind, the breeze by day and by night."""
    page = read(with_drawings)
    axis = page.run(AXIS)
    ground = page.run("return [...document.querySelectorAll('.around path')].pop().getAttribute('d')")
    corners = [(float(x), float(y)) for x, y in re.findall(r"L([0-9.]+) ([0-9.]+)", ground)]
    top = min(y for _, y in corners)
    wall = [x for x, y in corners if y == top]
    assert min(wall) == pytest.approx(at(axis, 45), abs=0.2)
    assert max(wall) == pytest.approx(at(axis, 85), abs=0.2)
    bars = page.run(
        "return [...document.querySelectorAll('.around rect[fill=\"#6a6457\"]')].map((r) =>"
        "[parseFloat(r.getAttribute('x')) + r.getAttribute('width') / 2, parseFloat(r.getAttribute('height'))])"
    )
    tallest = max(bars, key=lambda bar: bar[1])
    shortest = min(bars, key=lambda bar: bar[1])
    assert tallest[0] == pytest.approx(at(axis, 90), abs=0.5)
    assert shortest[0] == pytest.approx(at(axis, 270), abs=0.5)
    assert shortest[1] == pytest.approx(0.5 * 36)  # half of the outline, which is open level ground
    told = page.texts(".around text")
    assert "onshore, by day, 92°" in told
    assert "offshore, at night, 272°" in told
    assert page.one(".around").get_attribute("aria-label").count("°") >= 2
    assert page.problems() == []


def test_shaded_stretches_are_hatched_and_only_those(read: Any, with_drawings: Any) -> None:
    """The sun rises behind the wall in every month, and stands free in the west all year."""
    page = read(with_drawings)
    axis = page.run(AXIS)
    shaded = page.run(
        "return [...document.querySelectorAll('.around path[stroke-dasharray]')].map((p) => {"
        "const b = p.getBBox(); return [b.x, b.x + b.width]; })"
    )
    assert len(shaded) >= 12
    in_the_east = [x for x in shaded if x[1] <= at(axis, 95)]
    assert len(in_the_east) >= 12
    assert all(x0 >= at(axis, 40) for x0, _ in in_the_east)


def test_the_section_names_its_crest_and_says_how_heights_are_drawn(read: Any, with_drawings: Any) -> None:
    page = read(with_drawings)
    words = page.texts("svg.section text")
    assert "crest 240 m, 1.5 km away" in words
    assert "shore, 6.0 km" in words
    note = page.texts(".pair .strip-note")[0]
    assert "dotted" in note
    assert re.search(r"Heights are drawn (about true to scale|[0-9.]+ times too tall)", note)


def test_the_year_strip_says_its_clock_and_seasons(read: Any, with_drawings: Any) -> None:
    page = read(with_drawings)
    words = page.texts("svg.year text")
    assert words.count("cool") == 3
    assert words.count("hot") == 3
    assert "+3 h to universal time, assumed from the longitude" in " ".join(page.texts(".strip-note"))


def test_nothing_is_drawn_where_nothing_is_known(read: Any, screening: Any) -> None:
    table = screening.table.drop(columns="onshore_from_deg")
    page = read(screening.with_(table=table))
    assert page.texts("svg.around, svg.section, svg.year") == []
    assert page.problems() == []


def test_drawings_fit_a_phone(read: Any, with_drawings: Any) -> None:
    page = read(with_drawings, 390, 844)
    assert page.run("return document.documentElement.scrollWidth") <= 390
    widths = page.run(
        "return [...document.querySelectorAll('#leaf svg[role=img]')].map((s) => s.getBoundingClientRect().width)"
    )
    assert len(widths) == 3
    assert all(250 < wide <= 360 for wide in widths)
