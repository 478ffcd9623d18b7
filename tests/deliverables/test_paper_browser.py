"""On paper: sizes, pages, and what stands on them, read back from the printed file."""

import base64
import io
import subprocess
from collections.abc import Callable
from types import SimpleNamespace
from typing import Any

import pytest

pytestmark = [pytest.mark.browser, pytest.mark.filterwarnings("ignore::DeprecationWarning")]


@pytest.fixture
def printed(read: Any, outside_program: Callable[[str], str], tmp_path: Any) -> Callable[..., list[str]]:
    """Prints a screening's page on a paper; the text of each page."""
    to_text = outside_program("pdftotext")

    def pages(screening: Any, paper: str, before: str = "") -> list[str]:
        page = read(screening)
        page.run(f"paper.choose('{paper}'); {before}")
        made = page.browser.execute_cdp_cmd("Page.printToPDF", {"preferCSSPageSize": True})["data"]
        path = tmp_path / "page.pdf"
        path.write_bytes(base64.b64decode(made))
        assert page.problems() == []
        assert "on-paper" not in page.run("return document.body.className")  # back to the screen as it was
        assert page.run("return document.querySelector('main > .aside').previousElementSibling.id") == "leaf"
        text = subprocess.run([to_text, "-layout", str(path), "-"], capture_output=True, check=True).stdout
        return io.BytesIO(text).read().decode("utf-8").split("\f")[:-1]

    return pages


def test_a4_has_answer_and_shelf_then_the_leaf_on_one_page_then_twelve_rows(
    printed: Callable[..., list[str]], with_drawings: Any
) -> None:
    pages = printed(with_drawings, "a4")
    first, leaf, table = pages[:3]
    assert "comes first, with" in " ".join(first.split())
    assert "Set aside" in first
    assert "For it" in leaf
    assert "Sun through the year" in leaf
    assert "For it" not in first + table
    assert "All ranked plots" in table


def test_each_leaf_of_the_shortlist_fills_one_page(printed: Callable[..., list[str]], with_drawings: Any) -> None:
    """Long leaves are set smaller until they fit; every page names its plot, the title and the caution."""
    cautions = [f"Concern number {k}: something about this plot that takes a line or two." for k in range(25)]
    wordy = {p: SimpleNamespace(**{**vars(why), "cautions": cautions}) for p, why in with_drawings.reasons.items()}
    pages = printed(with_drawings.with_(reasons=wordy), "leaves")
    assert len(pages) == 3
    for text, name in zip(pages, with_drawings.table["name"][:3], strict=True):
        assert name in text
        assert "Sun through the year" in text
        assert "Sites for three small clinics" in text
        assert "not a survey" in text


def test_a3_is_one_sheet_and_says_changed_weights_in_a_sentence(printed: Callable[..., list[str]], invent: Any) -> None:
    made = invent(names=tuple(f"Field {i}" for i in range(40)))
    pages = printed(made, "a3", "document.querySelector('input[name=weight-breeze][value=\"3\"]').click()")
    assert len(pages) == 1
    text = " ".join(pages[0].split())
    assert "With breeze counting double, Field" in text
    assert "Set aside" in text
    rows = [line for line in pages[0].splitlines() if "plot" in line and "Sea breeze" in line]
    assert len(rows) == 12
