"""The page as text: nothing from outside, nothing of a user's gets in but as data."""

import base64
import hashlib
import io
import json
import re
from html.parser import HTMLParser
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import folium
import numpy as np
import pandas as pd
import pytest
import shapely
from PIL import Image

import sitescreen.deliverables.scaffold as scaffold
from sitescreen.deliverables.answer import answer, counted, trust
from sitescreen.deliverables.columns import columns_of
from sitescreen.deliverables.map import filled, json_for_html, map_page, write_map
from sitescreen.deliverables.table import mark_words
from sitescreen.errors import ConfigError
from sitescreen.notes import Note

HOSTILE = (
    "{{ 7*7 }}", "{% for x in y %}", "{# gone #}", "{{ cycler.__init__.__globals__ }}", "${7*7}", "#{7*7}",
    "<%= 7*7 %>",
    "<script>alert(1)</script>", "</script><script>alert(1)</script>", "<!--data-->", "<!-- <script>", "-->", "]]>",
    "<img src=x onerror=alert(1)>", "<svg/onload=alert(1)>", "</title><b>", "</noscript><b>", "</style><b>",
    "</textarea>",
    "\"'><b onmouseover=alert(1)>", "' onclick='alert(1)", "javascript:alert(1)", "&lt;b&gt;", "&amp;", "`${alert(1)}`",
    "\\u003cb\\u003e", "\\", "\\\"", "a\u2028b\u2029c", "\u202egnp.exe", "\ufeffx", "zero\u200bwidth",
    "line\nbreak\ttab",
    "\x00\x01", "é́̂ 東京 \U0001f33e", "=HYPERLINK(\"x\")", "%3Cscript%3E", "x" * 3000, "a b " * 500, "__proto__",
    "constructor", "null", "NaN", "0",
)  # fmt: skip


class Skeleton(HTMLParser):
    """Tags and attributes in their order, without text."""

    def __init__(self) -> None:
        super().__init__()
        self.tags: list[tuple[str, tuple[str, ...]]] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:  # noqa: D102
        self.tags.append((tag, tuple(name for name, _ in attrs)))

    def handle_endtag(self, tag: str) -> None:  # noqa: D102
        self.tags.append((f"/{tag}", ()))


def parsed(page: str) -> Skeleton:
    skeleton = Skeleton()
    skeleton.feed(page)
    return skeleton


def page_of(screening: Any) -> str:
    return map_page(screening, columns_of(screening.table, screening.profiles))


def data_of(page: str) -> Any:
    text = re.search(r'<script type="application/json" id="data">(.*?)</script>', page, re.S)
    assert text
    return json.loads(text.group(1))


@pytest.fixture(scope="module")
def page(screening: Any) -> str:
    """The usual page."""
    return page_of(screening)


def hostile_screening(invent: Any) -> Any:
    """Every text a user can write is hostile: names, ids, title, reasons, notes, zone titles."""
    made = invent(names=HOSTILE, ids=tuple(f"{i} {text[:60]}" for i, text in enumerate(HOSTILE)))
    reasons = {
        plot: SimpleNamespace(for_=[text], against=[text], cautions=[text], unknown=[text])
        for plot, text in zip(made.table["plot"], HOSTILE, strict=True)
    }
    table = made.table.copy()
    table.loc[table["set_aside"] != "", "set_aside"] = "</li><script>alert(1)</script>{{ 7*7 }}"
    profiles = {
        zone: profile.model_copy(update={"title": f"<b>{{{{ 7*7 }}}} {zone}", "wants": "</p><script>alert(1)</script>"})
        for zone, profile in made.profiles.items()
    }
    brief = SimpleNamespace(**{**vars(made.brief), "title": "</title><script>alert(1)</script>{{ 7*7 }}"})
    notes = tuple(Note("assumed", "wind", text) for text in HOSTILE)
    middle = made.table.geometry.iloc[0].centroid
    points = np.array([shapely.Point(middle.x + k * 2e-3, middle.y) for k in range(len(HOSTILE))], dtype=object)
    layers = tuple(SimpleNamespace(name=text, shapes=points[:1], labels=(text,)) for text in HOSTILE)
    return made.with_(table=table, reasons=reasons, brief=brief, notes=notes, profiles=profiles, context=layers)


def test_hostile_text_changes_no_tag(invent: Any) -> None:
    """The page's tags are those of the same page with tame words."""
    hostile = hostile_screening(invent)
    table = hostile.table.assign(name="tame", plot=[f"p{i}" for i in range(len(hostile.table))])
    table.loc[table["set_aside"] != "", "set_aside"] = "tame"
    tame_reasons = SimpleNamespace(for_=["tame"], against=["tame"], cautions=["tame"], unknown=["tame"])
    brief = SimpleNamespace(**{**vars(hostile.brief), "title": "tame"})
    tame = hostile.with_(
        table=table, brief=brief, reasons=dict.fromkeys(table["plot"], tame_reasons),
        notes=tuple(Note("assumed", "wind", "tame") for _ in HOSTILE),
        profiles=invent().profiles,
    )  # fmt: skip
    assert parsed(page_of(hostile)).tags == parsed(page_of(tame)).tags


def test_hostile_text_arrives_as_it_was_written(invent: Any) -> None:
    data = data_of(page_of(hostile_screening(invent)))
    assert sorted(name for name in data["plots"]["name"] if name) == sorted(HOSTILE)
    assert data["title"] == "</title><script>alert(1)</script>{{ 7*7 }}"
    assert {line for block in data["trust"] for line in block["lines"]} >= set(HOSTILE)


def test_lone_halves_of_signs_do_not_break_the_file(invent: Any, tmp_path: Path) -> None:
    made = invent(names=("half \ud83c", "b"))
    write_map(made, columns_of(made.table, made.profiles), tmp_path / "map.html")
    assert "half ?" in (tmp_path / "map.html").read_text(encoding="utf-8")


def test_the_page_names_no_address_to_fetch(page: str) -> None:
    outside = re.findall(
        r"""(?:src|href|action|data|poster|xlink:href)\s*=\s*["']?(?!data:)[^\s"'>]+""", _without_code(page)
    )
    assert outside == []
    styles = "".join(re.findall(r"<style>(.*?)</style>", page, re.S))
    assert "url(" not in styles
    assert "@import" not in styles
    assert "sourceMappingURL" not in page


def _without_code(page: str) -> str:
    return re.sub(r"<(script|style)[^>]*>.*?</\1>", "", page, flags=re.S)


def test_policy_allows_just_what_is_there(page: str) -> None:
    policy = re.search(r'Content-Security-Policy" content="([^"]*)"', page)
    assert policy
    assert policy.group(1).startswith("default-src 'none'; ")
    assert "unsafe" not in policy.group(1)
    blocks = re.findall(r"<script>(.*?)</script>", page, re.S) + re.findall(r"<style>(.*?)</style>", page, re.S)
    assert len(blocks) == 4
    for block in blocks:
        digest = base64.b64encode(hashlib.sha256(block.encode("utf-8")).digest()).decode("ascii")
        assert f"'sha256-{digest}'" in policy.group(1)
    assert not re.search(r"\son\w+=|\sstyle=", _without_code(page))


def test_same_screening_gives_the_same_page(screening: Any, page: str) -> None:
    assert page_of(screening) == page


def test_the_licence_of_the_map_library_is_kept(page: str) -> None:
    assert "(c) 2010-2023 Vladimir Agafonkin" in page


def test_slots_are_filled_once() -> None:
    assert filled("<!--a--> <!--b-->", {"a": "<!--b-->", "b": "x"}) == "<!--b--> x"


def test_json_cannot_leave_its_element() -> None:
    text = json_for_html({"a": "</script>&<!--\u2028\u2029", "n": float("nan")})
    assert not set("<>&\u2028\u2029") & set(text)
    assert json.loads(text) == {"a": "</script>&<!--\u2028\u2029", "n": None}


def test_without_scripts_there_is_a_table_and_a_picture(screening: Any, page: str) -> None:
    plain = "".join(re.findall(r"<noscript>(.*?)</noscript>", page, re.S))
    ranked = screening.table[screening.table["rank"].notna()]
    assert plain.count("<tr><td>") == len(ranked)
    assert plain.count("<rect") == len(screening.table)
    assert all(name in plain for name in screening.table["name"])
    assert re.search(r'<img id="relief" src="data:image/webp;base64,.{1000}', page)


def test_corners_come_back_to_the_metre(screening: Any, page: str) -> None:
    for rings, shape in zip(data_of(page)["shapes"], screening.table.geometry, strict=True):
        corners = np.cumsum(np.array(rings[0]).reshape(-1, 2), axis=0) / 1e5
        assert corners == pytest.approx(np.asarray(shape.exterior.coords)[:-1], abs=0.51e-5)


def test_readings_are_those_of_the_table(screening: Any, page: str) -> None:
    data = data_of(page)
    slope = next(one for one in data["readings"] if one["name"] == "slope_deg")
    assert slope["values"] == pytest.approx(screening.table["slope_deg"].round(1).tolist())
    assert "sun_year_h" not in [one["name"] for one in data["readings"]]  # nothing measured, nothing shown


def test_siting_hints_of_the_leading_plots_are_in_the_page(screening: Any, hint: Any) -> None:
    second = screening.table["plot"].iloc[1]
    found = data_of(page_of(screening.with_(siting={second: hint})))["siting"]
    assert found[0] is None
    assert found[1]["says"] == list(hint.says)
    assert found[1]["turns"][1]["turn_deg"] == 20
    assert found[1]["eaves"][1] == {"face_deg": 347.0, "projection_m": None}
    assert len(found[1]["cost_pct"]) == 36


@pytest.mark.parametrize("case", ["no fields", "no shapes", "none ranked", "one plot", "no reasons"])
def test_odd_screenings_have_a_page_too(case: str, invent: Any) -> None:
    made = invent(names=("Only one",)) if case == "one plot" else invent()
    table = made.table.copy()
    if case == "no fields":
        made = made.with_(fields={})
    elif case == "no shapes":
        table["geometry"] = None
        table[["lon", "lat", "elevation_m"]] = np.nan
    elif case == "none ranked":
        table["rank"] = table["rank"].mask(table["rank"].notna())
        table[["overall_mark", "mark_low", "mark_high"]] = np.nan
        table["set_aside"], table["zone"] = "outside the terrain", ""
    elif case == "no reasons":
        made = made.with_(reasons={})
    data = data_of(page_of(made.with_(table=table)))
    assert len(data["plots"]["plot"]) == len(table)


def test_answer_names_the_leaders_and_counts_the_shelf(screening: Any) -> None:
    first = screening.table.iloc[0]
    said = answer(screening.table).replace("\u00a0", " ")
    assert said.startswith(f"Of 12 plots, {first['name']} (plot {first['plot']}) comes first, with ")
    assert said.endswith("2 are set aside.")


def test_a_name_cannot_turn_the_answer_around(screening: Any) -> None:
    table = screening.table.copy()
    table.loc[0, "name"] = "\u202egnp.exe"
    assert "\u2068\u202egnp.exe\u2069 (plot" in answer(table)
    assert "\u2068" not in answer(screening.table)


def test_answer_shares_a_shared_first_place(screening: Any) -> None:
    table = screening.table.copy()
    table.loc[:1, "rank"] = 1
    assert "share the first place" in answer(table)


def test_trust_says_what_was_assumed_and_what_was_not_looked_at(screening: Any) -> None:
    blocks = {block["heading"]: block["lines"] for block in trust(screening)}
    assert any("No wind table" in line for line in blocks["Assumed, because nobody gave it"])
    assert "Flood levels" in blocks["Not checked: silence here does not mean safe"]
    assert "Hours of sun" in blocks["Not measured in this version"]


def test_another_leaflet_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    scaffold.leaflet.cache_clear()
    monkeypatch.setitem(scaffold.LEAFLET, "leaflet.js", "another")
    with pytest.raises(ConfigError, match=r"leaflet\.js is not that of Leaflet 1\.9\.4"):
        scaffold.leaflet("leaflet.js")
    scaffold.leaflet.cache_clear()


def test_anything_else_that_folium_brings_is_a_fault() -> None:
    figure = scaffold.BareFigure()
    plan = folium.Map(tiles=None)
    figure.add_child(plan)
    figure.header.add_child(folium.JavascriptLink("https://example.org/x.js"), name="something_new")
    with pytest.raises(RuntimeError, match="something_new"):
        figure.render()


def test_folium_sees_constants_only() -> None:
    """Its script is the same whatever the screening, and names no address."""
    assert scaffold.map_script() == scaffold.map_script()
    assert scaffold.map_script().startswith("var map_plan = L.map(")


def test_a_screening_over_two_utm_zones_has_one_map(invent: Any) -> None:
    """The fields of both zones are drawn on one sheet, and each question keeps one picture a view."""
    west, east = invent(), invent(zone=38)
    both = {f"{key}_utm37": field for key, field in west.fields.items()}
    both |= {f"{key}_utm38": field for key, field in east.fields.items()}
    table = pd.concat([west.table, east.table.assign(plot=lambda t: "e" + t["plot"])], ignore_index=True)
    data = data_of(page_of(west.with_(fields=both, table=table)))
    (south, west_deg), (north, east_deg) = data["bounds"]
    assert west_deg < west.table["lon"].min()
    assert east_deg > east.table["lon"].max()
    assert south < table["lat"].min() < table["lat"].max() < north
    wind = next(one for one in data["questions"] if one["name"] == "wind")
    assert len(wind["views"]) == 2
    picture = Image.open(io.BytesIO(base64.b64decode(wind["views"][0]["picture"].split(",")[1])))
    known = np.asarray(picture.convert("RGBA"))[..., 3].any(axis=0)
    assert known[: len(known) // 3].any()
    assert known[-len(known) // 3 :].any()


def test_how_sure_the_order_is_stands_under_the_answer(tried: Any, screening: Any) -> None:
    said = re.search(r'<p id="sure" class="lead">(.*?)</p>', page_of(tried))
    assert said
    assert said.group(1).startswith("First place is firm as far as the weights go (first in 97 of 100 trials); 2nd to")
    assert '<p id="sure" class="lead"></p>' in page_of(screening)  # nothing was tried, nothing is claimed


def test_ranks_on_the_static_picture_cannot_be_taken_for_plot_ids(page: str) -> None:
    plain = "".join(re.findall(r"<noscript>(.*?)</noscript>", page, re.S))
    assert sorted(re.findall(r"<text [^>]*>(.*?)</text>", plain)) == ["1st", "2nd", "3rd"]


def test_the_mark_that_ranks_go_by_is_shown_where_it_differs(tried: Any) -> None:
    plain = "".join(re.findall(r"<noscript>(.*?)</noscript>", page_of(tried), re.S))
    assert len(re.findall(r"<td>\d+ \(at worst \d+\)</td>", plain)) == 1
    assert mark_words(88.9, 66.3) == "89 (at worst 66)"
    assert mark_words(88.9, 88.0) == "89"
    assert mark_words(88.9, float("nan")) == "89"


def test_what_would_change_the_first_place_is_part_of_the_trust(screening: Any) -> None:
    says = "The smallest change takes the first place in the profile upland."
    record = screening.record | {"what_would_change": [{"among": "all", "says": says}, {"among": "x", "says": "no"}]}
    trials = Note("info", "judgement", "Rank ranges come from 2,000 trials.")
    made = screening.with_(record=record, notes=(*screening.notes, trials))
    lines = next(block["lines"] for block in trust(made) if block["heading"] == "How sure the order is")
    title = screening.profiles["upland"].title
    assert lines == [trials.text, says.replace("upland", f"“{title}”")]
    assert all(block["heading"] != "How sure the order is" for block in trust(screening))


def test_counts_are_written_as_people_do() -> None:
    assert counted("1 lake(s) under 1 km²") == "1 lake under 1 km²"
    assert counted("11 plot outline(s) mended") == "11 plot outlines mended"
    assert counted("1 plots, 21 plots, 0.1 plots") == "1 plot, 21 plots, 0.1 plots"


def test_no_question_claims_that_the_way_of_the_breeze_is_not_looked_at(page: str) -> None:
    breeze = next(one for one in data_of(page)["questions"] if one["name"] == "breeze")
    assert "not yet" not in breeze["method"]
    assert "the ground on its way" in breeze["method"]


def test_a_plot_of_two_zones_shows_the_mark_by_each(screening: Any) -> None:
    table = screening.table.assign(zone_2="", zone_2_share=np.nan, mark_in_zone=70.0, mark_in_zone_2=np.nan)
    table.loc[0, ["zone_2", "zone_2_share", "mark_in_zone_2"]] = ["upland", 0.4, 50.0]
    told = {one["name"]: one["values"] for one in data_of(page_of(screening.with_(table=table)))["readings"]}
    assert told["mark_in_zone_2"] == [50.0] + [None] * (len(table) - 1)
    assert told["mark_in_zone"] == [70.0] + [None] * (len(table) - 1)
