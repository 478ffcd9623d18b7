"""The page in a real browser, offline."""

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from sitescreen.grid import Field, Grid

pytestmark = [pytest.mark.browser, pytest.mark.filterwarnings("ignore::DeprecationWarning")]


def problems(browser: Any) -> list[str]:
    return [entry["message"] for entry in browser.get_log("browser")]


def texts(browser: Any, selector: str) -> list[str]:
    # textContent, so that line breaks in names do not matter
    script = "return [...document.querySelectorAll(arguments[0])].map((e) => e.textContent)"
    return list(browser.execute_script(script, selector))


def one(browser: Any, selector: str) -> Any:
    return browser.find_element("css selector", selector)


def leaf_name(browser: Any) -> str:
    return texts(browser, "#leaf .leaf-name")[0]


def ranked(screening: Any) -> Any:
    return screening.table[screening.table["rank"].notna()]


def test_opens_offline_without_a_request_or_a_complaint(opened: Any, screening: Any) -> None:
    """Through a choice of question and plot as well: no request but the file itself, nothing in the console."""
    page = opened(screening)
    one(page, "[data-question=wind]").click()
    one(page, "#rows tr:nth-child(3) button").click()
    events = [json.loads(entry["message"])["message"] for entry in page.get_log("performance")]
    sent = [e["params"] for e in events if e["method"] == "Network.requestWillBeSent"]
    # the browser's own first tab may still be loading its parts
    asked = [e["request"]["url"] for e in sent if e["documentURL"].startswith("file:")]
    fetched = [url for url in asked if not url.startswith(("data:", "blob:"))]
    assert len(fetched) == 1, fetched
    assert fetched[0].startswith("file://")
    assert problems(page) == []


def test_every_plot_is_in_the_table_or_on_the_shelf(opened: Any, screening: Any) -> None:
    page = opened(screening)
    assert len(texts(page, "#rows tr")) == len(ranked(screening)) == 10
    assert [text.split(" plot ")[0] for text in texts(page, "#rows td.plot")] == ranked(screening)["name"].tolist()
    aside = screening.table[screening.table["rank"].isna()]
    shelf = texts(page, "#shelf li")
    assert len(shelf) == len(aside) == 2
    assert all(name in line and "water could stand" in line for name, line in zip(aside["name"], shelf, strict=True))


def test_the_first_plot_lies_open_and_others_follow_a_choice(opened: Any, screening: Any) -> None:
    page = opened(screening)
    names = ranked(screening)["name"].tolist()
    assert leaf_name(page) == names[0]
    one(page, "#rows tr:nth-child(4) td.plot button").click()
    assert leaf_name(page) == names[3]
    assert texts(page, "#rows tr.chosen td.rank") == ["4"]
    one(page, "#leaf .turn button:last-child").click()
    assert leaf_name(page) == names[4]
    leaf = texts(page, "#leaf")[0]
    assert "Sea breeze: 0.82 of it gets here." in leaf
    assert "Little air moves: 0.71 times open ground." in leaf
    one(page, "#shelf button").click()
    assert "Why it is set aside" in texts(page, "#leaf")[0]


def test_a_plot_is_chosen_on_the_map(opened: Any, screening: Any) -> None:
    from selenium.webdriver import ActionChains

    page = opened(screening)
    ground = one(page, "#map_plan")
    for i in (6, 2):
        x, y = page.execute_script("return plan.screenOf(arguments[0])", i)
        size = ground.rect
        ActionChains(page).move_to_element_with_offset(
            ground, round(x - size["width"] / 2), round(y - size["height"] / 2)
        ).click().perform()
        assert leaf_name(page) == screening.table["name"][i]
        assert screening.table["name"][i] in texts(page, "#readout")[0]


def test_plots_are_drawn_in_the_class_of_their_mark(opened: Any, screening: Any) -> None:
    """The pixel at a plot's place has the ramp's colour for its overall mark."""
    page = opened(screening)
    ramp = ["f2ecde", "edc364", "b07a64", "6c6386", "282852"]
    script = (
        "const [x, y] = plan.screenOf(arguments[0]); const c = document.querySelector('#map_plan canvas.plots');"
        "return [...c.getContext('2d').getImageData(Math.round(x) + 2, Math.round(y) + 2, 1, 1).data].slice(0, 3)"
    )
    for i, mark in ranked(screening)["overall_mark"].items():
        expected = ramp[min(4, int(mark // 20))]
        got = "".join(f"{value:02x}" for value in page.execute_script(script, i))
        assert got == expected


def drawn_words(page: Any) -> list[str]:
    """What is written onto the map."""
    script = (
        "const out = [], pen = CanvasRenderingContext2D.prototype, before = pen.fillText;"
        "pen.fillText = function (text, ...at) { out.push(text); before.call(this, text, ...at); };"
        "map_plan.fire('viewreset'); pen.fillText = before; return out;"
    )
    return list(page.execute_script(script))


def test_ranks_on_the_map_cannot_be_taken_for_plot_ids(opened: Any, screening: Any) -> None:
    page = opened(screening)
    words = drawn_words(page)
    assert {"1st", "2nd", "3rd"} <= set(words)
    assert not set(words) & (set(screening.table["plot"]) | {str(n) for n in range(1, 13)})
    assert "1st, 2nd … on the map are ranks" in texts(page, "#legend")[0]


def test_a_plot_tells_its_name_under_the_pointer(opened: Any, screening: Any) -> None:
    from selenium.webdriver import ActionChains

    page = opened(screening)
    ground = one(page, "#map_plan")
    x, y = page.execute_script("return plan.screenOf(4)")
    at = (round(x - ground.rect["width"] / 2), round(y - ground.rect["height"] / 2))
    ActionChains(page).move_to_element_with_offset(ground, *at).perform()
    assert ground.get_attribute("title").startswith(
        f"{screening.table['name'][4]} (plot {screening.table['plot'][4]}): 5th"
    )


def test_a_phone_opens_with_all_plots_in_view_and_none_under_the_scale_bar(opened: Any, invent: Any) -> None:
    screening = invent(names=tuple(f"Field {i}" for i in range(120)))  # some lie in every corner
    grid = screening.fields["elevation_m"].grid
    west, north = grid.west_m + 3 * grid.cell_size_m, grid.north_m - 3 * grid.cell_size_m
    tight = Grid(grid.crs, west, north, grid.cell_size_m, 41, 50)  # the ground ends close beyond the plots
    fields = {name: Field(f.values[3:44, 3:53], tight, f.unit, "cut") for name, f in screening.fields.items()}
    screening = screening.with_(fields=fields)
    page = opened(screening, 390, 844)
    wide, high = page.execute_script("const s = map_plan.getSize(); return [s.x, s.y]")
    for i in range(len(screening.table)):
        x, y = page.execute_script("return plan.screenOf(arguments[0])", i)
        assert 20 < x < wide - 35
        assert 20 < y < high - 45


def test_a_click_anywhere_on_a_plot_set_aside_opens_its_leaf_in_sight(opened: Any, screening: Any) -> None:
    page = opened(screening, 390, 844)  # the leaf ends far above the shelf
    aside = screening.table[screening.table["rank"].isna()]
    page.execute_script("document.querySelector('#shelf li:nth-child(2)').scrollIntoView({ block: 'start' })")
    one(page, "#shelf li:nth-child(2) span").click()
    assert leaf_name(page) == aside["name"].iloc[1]
    assert texts(page, "#leaf .alerts li")[0] == aside["set_aside"].iloc[1]
    assert "slope" in texts(page, "#leaf .readings dt")
    top = page.execute_script("return document.querySelector('.leaf-name').getBoundingClientRect().top")
    assert 0 <= top < 700


def test_a_plot_set_aside_without_readings_says_so(opened: Any, screening: Any) -> None:
    table = screening.table.copy()
    last = table.index[-1]
    numbers = table.select_dtypes("float").columns.difference(["lon", "lat", "area_ha"])
    table.loc[last, numbers] = np.nan
    table.loc[last, ["shore_kind", "cold_pool_kind"]] = ""
    page = opened(screening.with_(table=table))
    one(page, "#shelf li:last-child button").click()
    assert "It has no readings." in texts(page, "#leaf")[0]
    assert texts(page, "#leaf .criteria") == []


def readings_of(page: Any, row: int) -> dict[str, str]:
    one(page, f"#rows tr:nth-child({row}) td.plot button").click()
    return dict(zip(texts(page, "#leaf .readings dt"), texts(page, "#leaf .readings dd"), strict=True))


def test_the_leaf_speaks_plainly_of_the_breeze(opened: Any, tried: Any) -> None:
    """Rank 1: nothing screens; 2: high ground in general; 3: the plot above the breeze; 4: a crest."""
    page = opened(tried)
    free, general, above, crest = (readings_of(page, row) for row in (1, 2, 3, 4))
    assert free["breeze arrives at"] == "about 10:20"
    assert free["breeze screened"] == "0 %"
    assert not {"screen lies", "screen at", "screen stands"} & set(free)
    assert general["screen lies"] == "none"
    assert "screen at" not in general
    assert above["breeze screened"] == "100 %: the plot itself lies above the breeze"
    assert "screen lies" not in above
    assert (crest["screen lies"], crest["screen at"], crest["screen stands"]) == ("92°", "1020 m", "42 m")
    assert crest["colder by"].endswith("°C")


def test_the_leaf_says_how_to_place_a_house(opened: Any, screening: Any, hint: Any) -> None:
    """Only on plots that have a hint; its signs stay signs."""
    page = opened(screening.with_(siting={screening.table["plot"].iloc[0]: hint}))
    assert "How to place a house here" in texts(page, "#leaf h3")
    assert texts(page, "#leaf ul.siting li") == list(hint.says)
    one(page, "#rows tr:nth-child(2) button").click()
    assert texts(page, "#leaf ul.siting li") == []
    assert problems(page) == []


def test_ties_ranges_and_marks_at_worst_are_shown(opened: Any, tried: Any) -> None:
    page = opened(tried)
    ranks = texts(page, "#rows td.rank")
    assert ranks[:5] == ["1", *(f"{n} alike: 2nd to 4th" for n in (2, 3, 4)), "5"]
    low = tried.table["mark_low"][2]
    marks = texts(page, "#rows td.mark")
    assert [("at worst" in mark) for mark in marks] == [n == 2 for n in range(10)]
    assert marks[2].endswith(f"(at worst {int(low + 0.5)})")
    assert "everything unknown about it at its worst" in texts(page, "#rank-rule")[0]
    one(page, "#rows tr:nth-child(3) td.plot button").click()
    leaf = texts(page, "#leaf")[0]
    assert f"(at worst {int(low + 0.5)})" in leaf
    assert "3rd; 2nd to 5th in 90 of 100 trials, which vary the weights only. 2nd to 4th cannot be told apart." in leaf
    assert problems(page) == []


def test_sort_turns_the_rows(opened: Any, screening: Any) -> None:
    page = opened(screening)
    names = sorted(ranked(screening)["name"])
    one(page, "th[data-key=plot] button").click()
    assert [text.split(" plot ")[0] for text in texts(page, "#rows td.plot")] == names
    assert one(page, "th[data-key=plot]").get_attribute("aria-sort") == "ascending"
    one(page, "th[data-key=plot] button").click()
    assert [text.split(" plot ")[0] for text in texts(page, "#rows td.plot")] == names[::-1]
    one(page, "th[data-key=overall] button").click()  # marks begin with the best
    assert texts(page, "#rows td.rank") == [str(n) for n in range(1, 11)]


def test_find_narrows_the_rows(opened: Any, screening: Any) -> None:
    page = opened(screening)
    name = ranked(screening)["name"].iloc[5]
    one(page, "#find").send_keys(name.upper())
    assert [text.split(" plot ")[0] for text in texts(page, "#rows td.plot")] == [name]
    assert texts(page, "#found") == ["1 of 10 ranked plots"]
    one(page, "#find").send_keys("no such plot")
    assert texts(page, "#rows tr") == []


def test_a_question_changes_map_legend_and_table_together(opened: Any, screening: Any) -> None:
    page = opened(screening)
    assert texts(page, "#map_plan .field") == []
    before = len(texts(page, "#heads th"))
    one(page, "[data-question=ground]").click()
    assert len(texts(page, "#map_plan .field")) == 1
    assert "Slope" in texts(page, "#legend")[0]
    assert len(texts(page, "#heads th")) == before + 1
    assert one(page, "[data-question=ground]").get_attribute("aria-pressed") == "true"
    one(page, "[data-question=overall]").click()
    assert texts(page, "#map_plan .field") == []


def test_unknown_is_said_not_hidden(opened: Any, screening: Any) -> None:
    """Plot 2 has no ventilation; where its zone asks for it the table says so, and the legend has a sign for it."""
    page = opened(screening)
    assert (screening.table.set_index("plot").loc["2", "zone"]) == "hot_humid_coast"
    one(page, "[data-question=wind]").click()
    place = screening.table.index[screening.table["plot"] == "2"][0]
    assert texts(page, f"#rows tr[data-plot='{place}'] td.asked") == ["unknown"]
    assert texts(page, "#rows td.asked").count("unknown") == 1
    assert "unknown" in texts(page, "#legend")[0]


def test_all_readings_open_the_rest_of_the_table(opened: Any, screening: Any) -> None:
    page = opened(screening)
    one(page, "#all-readings").click()
    heads = texts(page, "#heads th")
    assert any("elevation" in head for head in heads)
    assert page.execute_script("return document.documentElement.scrollWidth <= window.innerWidth")


@pytest.mark.parametrize(("width", "height"), [(390, 844), (1024, 768), (1440, 900)])
def test_no_sideways_scroll_at_any_width(opened: Any, screening: Any, width: int, height: int) -> None:
    page = opened(screening, width, height)
    for question in ("overall", "wind"):
        one(page, f"[data-question={question}]").click()
        assert page.execute_script("return document.documentElement.scrollWidth") <= width
    assert page.execute_script("return document.getElementById('map_plan').clientHeight") > 200


def test_hostile_text_stays_text(opened: Any, invent: Any) -> None:
    """Shown letter by letter as it was written; nothing of it runs or becomes an element."""
    from importlib.util import module_from_spec, spec_from_file_location

    spec = spec_from_file_location("map_tests", Path(__file__).with_name("test_map.py"))
    assert spec
    assert spec.loader
    tests = module_from_spec(spec)
    spec.loader.exec_module(tests)
    hostile = tests.hostile_screening(invent)
    page = opened(hostile)
    assert problems(page) == []
    names = dict(zip(hostile.table["plot"], hostile.table["name"], strict=True))
    shown = texts(page, "#rows td.plot button")
    assert shown == [names[plot] for plot in ranked(hostile)["plot"]]
    elements = "return document.querySelectorAll('#leaf :is(script, img, svg[onload], b b, p b, li *)').length"
    for row, plot in enumerate(ranked(hostile)["plot"], start=1):
        page.execute_script("arguments[0].click()", one(page, f"#rows tr:nth-child({row}) td.rank"))
        assert leaf_name(page) == names[plot]
        assert texts(page, "#leaf ul.for li") == list(hostile.reasons[plot].for_)
        assert page.execute_script(elements) == 0
    shelf = texts(page, "#shelf li span")
    assert shelf == ["</li><script>alert(1)</script>{{ 7*7 }}"] * len(shelf)
    assert "<b>{{ 7*7 }}" in texts(page, "#rows td.zone")[0]
    assert set(texts(page, "#legend .legend-item bdi")) == set(tests.HOSTILE)
    assert texts(page, "title") == ["</title><script>alert(1)</script>{{ 7*7 }}"]
    assert page.execute_script("return document.scripts.length") == 4
    assert page.execute_script("return document.documentElement.scrollWidth") <= 1440
    assert problems(page) == []


def test_many_plots_come_a_hundred_at_a_time(opened: Any, invent: Any) -> None:
    page = opened(invent(names=tuple(f"Field {i}" for i in range(230))))
    assert len(texts(page, "#rows tr")) == 100
    one(page, "#more").click()
    assert len(texts(page, "#rows tr")) == 200
    assert problems(page) == []


def test_prints(opened: Any, screening: Any) -> None:
    page = opened(screening)
    printed = page.execute_cdp_cmd("Page.printToPDF", {"preferCSSPageSize": True})
    assert len(printed["data"]) > 20_000
    assert problems(page) == []


def test_with_scripts_off_there_are_table_picture_and_reasons(opened: Any, screening: Any, browser: Any) -> None:
    opened(screening)
    browser.execute_cdp_cmd("Emulation.setScriptExecutionDisabled", {"value": True})
    try:
        browser.refresh()
        source = browser.page_source
        assert one(browser, "#relief").is_displayed()
        assert one(browser, "noscript table").is_displayed()
        assert len(browser.find_elements("css selector", "noscript table tbody tr")) == 10
        assert "local codes and licensed practice decide" in source
    finally:
        browser.execute_cdp_cmd("Emulation.setScriptExecutionDisabled", {"value": False})
