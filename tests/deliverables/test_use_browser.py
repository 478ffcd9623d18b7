"""Using the page: choosing, downloading, the keyboard alone, and what a screen reader is told."""

import csv
import io
import json
import math
import os
from pathlib import Path
from typing import Any

import pytest

pytestmark = [pytest.mark.browser, pytest.mark.filterwarnings("ignore::DeprecationWarning")]


def test_a_plot_is_chosen_on_the_ladder(read: Any, screening: Any) -> None:
    page = read(screening)
    assert page.texts("#ladder-list b") == ["1st", "2nd", "3rd"]
    page.one("#ladder-list li:nth-child(3) button").click()
    assert page.text("#leaf .leaf-name") == screening.table["name"][2]
    assert page.texts("#rows tr.chosen td.rank") == ["3"]
    page.one("#rows tr:nth-child(9) td.plot button").click()  # one that is not on the shortlist joins it
    assert page.texts("#ladder-list li.chosen b") == ["9th"]


def test_each_tick_stands_at_its_mark_and_leads_to_its_ground(read: Any, screening: Any) -> None:
    """Ticks by the ruler's own 0 and 100; the leader begins at the plot and ends at the tick's height."""
    page = read(screening)
    numerals = page.run(
        "return [...document.querySelectorAll('#ladder-lines text')]"
        ".map((t) => [t.textContent, parseFloat(t.getAttribute('y'))])"
    )
    ends = dict(numerals)
    places = page.run("return ladder.rungs().map((r) => [r.i, r.mark, ladder.places().get(r.i).y])")
    assert len(places) == 3
    for _, mark, y in places:
        assert y == pytest.approx(ends["0"] - 3.5 + mark / 100 * (ends["100"] - ends["0"]), abs=0.01)
    lines = page.run(
        "const out = [], pen = CanvasRenderingContext2D.prototype, from = pen.moveTo, to = pen.lineTo;"
        "const isOurs = (one) => one.canvas.className.includes('leaders');"
        "pen.moveTo = function (x, y) { if (isOurs(this)) out.push([x, y]); from.call(this, x, y); };"
        "pen.lineTo = function (x, y) { if (isOurs(this)) out[out.length - 1].push(x, y); to.call(this, x, y); };"
        "ladder.show(false); pen.moveTo = from; pen.lineTo = to;"
        "return [out, map_plan.getSize().x, ladder.rungs().map((r) => plan.screenOf(r.i))]"
    )
    drawn, wide, grounds = lines
    assert len(drawn) == 3
    for x0, y0, x1, y1 in drawn:
        assert x1 == wide
        long = math.hypot(x1 - x0, y1 - y0)  # the line, drawn on beyond the plot's edge, meets its middle
        assert min(abs((x1 - x0) * (y0 - y) - (x0 - x) * (y1 - y0)) / long for x, y in grounds) < 0.5


def test_the_table_is_downloaded_as_shown(read: Any, invent: Any) -> None:
    """Ranks as weighed, every row, formulas made safe, and the weights said."""
    made = invent(names=("=1+1", *(f"Field {k}" for k in range(120))))
    page = read(made)
    page.press("input[name=weight-wind][value='4']")
    rows = list(csv.reader(io.StringIO(page.run("return ranking.csv()"))))
    marks = page.run("return weigh.marks({ wind: 4 })")
    assert [row[0] for row in rows[1:-1]] == [made.table["plot"][i] for i in marks["order"]]
    assert [int(row[1]) for row in rows[1:-1]] == [marks["rank"][i] for i in marks["order"]]
    assert rows[-1] == ["weighed with wind counting four times"]
    assert "'=1+1" in [row[2] for row in rows[1:-1]]


def test_of_many_plots_what_is_out_of_sight_waits(read: Any, invent: Any) -> None:
    """The table below the map is laid out once it comes into view; of few plots it always is."""
    shown = (
        "const done = arguments[0], seen = () => document.querySelector('#rows tr:nth-child(90)')"
        ".checkVisibility({ contentVisibilityAuto: true }), before = seen();"
        "document.querySelector('#rows tr:nth-child(90)').scrollIntoView();"
        "requestAnimationFrame(() => requestAnimationFrame(() => setTimeout(() => done([before, seen()]), 100)))"
    )
    page = read(invent(names=tuple(f"Field {k}" for k in range(450))), height=400)
    assert page.browser.execute_async_script(shown) == [False, True]
    page = read(invent(names=tuple(f"Field {k}" for k in range(100))), height=400)
    assert page.browser.execute_async_script(shown) == [True, True]


def test_a_file_comes_of_the_download(read: Any, screening: Any, tmp_path: Path) -> None:
    page = read(screening)
    page.browser.execute_cdp_cmd("Browser.setDownloadBehavior", {"behavior": "allow", "downloadPath": str(tmp_path)})
    page.press("#download")
    page.wait(lambda: any(path.suffix == ".csv" for path in tmp_path.iterdir()))
    (file,) = tmp_path.glob("*.csv")
    assert screening.table["name"][0] in file.read_text(encoding="utf-8-sig")


def test_the_keyboard_alone_reaches_everything(read: Any, screening: Any) -> None:
    """Tab from the top: print, each question and its weight, the ladder, the leaf, the table; arrows set a weight."""
    from selenium.webdriver import ActionChains, Keys

    page = read(screening)
    seen = []
    for _ in range(45):
        ActionChains(page.browser).send_keys(Keys.TAB).perform()
        seen.append(
            page.run(
                "const e = document.activeElement;"
                " return e.dataset.paper || e.dataset.question || e.name || e.id || (e.closest('[id]') || {}).id"
            )
        )
    for wanted in (
        "a4",
        "overall",
        "breeze",
        "weight-breeze",
        "map_plan",
        "ladder-list",
        "leaf",
        "shelf",
        "find",
        "download",
    ):
        assert wanted in seen, wanted
    assert seen.count("weight-wind") == 1  # five stops are one stop of the keyboard
    page.run("document.querySelector('input[name=weight-wind]:checked').focus()")
    ActionChains(page.browser).send_keys(Keys.ARROW_RIGHT).perform()
    assert page.text("#change").startswith("Wind counts double: ")
    assert page.one("#change").get_attribute("role") == "status"


def test_landmarks_and_headings_tell_the_page(read: Any, screening: Any) -> None:
    page = read(screening)
    assert page.run("return document.documentElement.lang") == "en"
    assert len(page.texts("main, header, footer")) == 3
    assert len(page.texts("h1")) == 1
    labels = page.run(
        "return [...document.querySelectorAll('section')]"
        ".map((s) => s.getAttribute('aria-label') || s.getAttribute('aria-labelledby'))"
    )
    assert all(labels)
    assert page.run("return document.querySelector('#ladder-list').tagName") == "OL"


@pytest.mark.parametrize("width", [1440, 390])
def test_the_accessibility_checker_finds_nothing(read: Any, with_drawings: Any, width: int) -> None:
    """axe-core, WCAG 2.2 A and AA, with changed weights and all readings open as well."""
    script = os.environ.get("SITESCREEN_AXE")
    if not script:
        pytest.skip("SITESCREEN_AXE does not name axe.min.js (.ci/run fetches it from npm)")
    page = read(with_drawings, width, 900)
    page.browser.execute_cdp_cmd("Runtime.evaluate", {"expression": Path(script).read_text(encoding="utf-8")})
    run = (
        "const done = arguments[0];"
        "axe.run(document, { runOnly: ['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa'] })"
        ".then((r) => done(JSON.stringify(r.violations.map((v) => [v.id, v.nodes.map((n) => n.html.slice(0, 160))]))));"
    )
    assert json.loads(page.browser.execute_async_script(run)) == []
    page.press("input[name=weight-wind][value='3']")
    page.press("#all-readings")
    page.wait(lambda: page.run("return ladder.isStill()"))
    assert json.loads(page.browser.execute_async_script(run)) == []
