from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path

import pytest
from pypdf import PdfReader

from fem.case.read import load
from fem.result.report import write_report
from fem.run import run
from tests.result.chromium import PATH, Browser, outside

# Where tests are run for everybody the browser is installed: there its absence is a failure.
pytestmark = pytest.mark.skipif(
    PATH is None and os.environ.get("CI") != "true",
    reason="left out: no Chromium here to look at the report with (Debian: apt-get install chromium)",
)

PHONE, DESK = (390, 844), (1280, 900)


@pytest.fixture(scope="module")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    with Browser(tmp_path_factory.mktemp("profile")) as browser:
        yield browser


@pytest.fixture(scope="module")
def page(cases: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("runs") / "bar"
    run(load(cases / "workshop_bar.toml"), folder)
    return write_report(folder)


@pytest.mark.parametrize("window", [PHONE, DESK])
def test_the_page_opens_without_complaint_or_outside_request(
    browser: Browser, page: Path, window: tuple[int, int]
) -> None:
    browser.open(page, *window)
    assert browser.requests[0] == page.as_uri()
    assert outside(browser.requests, page) == []
    assert browser.complaints == []
    assert browser.ask("[...document.images].every(i => i.complete && i.naturalWidth > 0)") is True


@pytest.mark.parametrize(
    ("body", "requested", "complained"),
    [
        ('<img src="http://127.0.0.1:9/x.png">', "http://127.0.0.1:9/x.png", "ERR_"),
        ('<script>console.error("ink is out")</script>', None, "ink is out"),
        ("<script>nowhere()</script>", None, "Uncaught"),
    ],
)
def test_a_page_with_faults_would_be_caught(
    browser: Browser, tmp_path: Path, body: str, requested: str | None, complained: str
) -> None:
    faulty = tmp_path / "faulty.html"
    faulty.write_text(f"<!DOCTYPE html><link rel=icon href=data:,>{body}", encoding="utf-8")
    browser.open(faulty, *DESK)
    assert outside(browser.requests, faulty) == ([requested] if requested else [])
    assert any(complained in text for text in browser.complaints)


def test_an_outside_address_that_slipped_in_would_be_blocked(
    browser: Browser, page: Path, tmp_path: Path
) -> None:
    slipped = tmp_path / "slipped.html"
    slipped.write_text(page.read_text().replace("</main>", '<img src="http://127.0.0.1:9/x.png"></main>'))
    browser.open(slipped, *DESK)
    assert any("Content Security Policy" in text for text in browser.complaints)


@pytest.mark.parametrize("window", [PHONE, DESK])
def test_the_answer_is_on_the_first_screen(browser: Browser, page: Path, window: tuple[int, int]) -> None:
    browser.open(page, *window)
    edges = "(({x, y, right, bottom}) => [x, y, right, bottom])"
    box = browser.ask(f"{edges}(document.querySelector('h1').getBoundingClientRect())")
    assert box[0] >= 0
    assert box[1] >= 0
    assert box[2] <= window[0]
    assert box[3] <= window[1] / 2
    assert "reaches −12" in browser.ask("document.querySelector('h1').innerText")
    assert browser.ask("parseFloat(getComputedStyle(document.querySelector('h1')).fontSize)") >= 18


def test_a_phone_needs_no_scrolling_sideways(browser: Browser, page: Path, tmp_path: Path) -> None:
    width = "document.documentElement.scrollWidth"
    browser.open(page, *PHONE)
    assert browser.ask(width) == PHONE[0]
    wide = tmp_path / "wide.html"
    wide.write_text(page.read_text().replace("<main>", '<main><div style="width: 500px">x</div>'))
    browser.open(wide, *PHONE)
    assert browser.ask(width) > PHONE[0]


def test_letters_in_pictures_are_large_enough_on_a_phone(browser: Browser, page: Path) -> None:
    browser.open(page, *PHONE)
    scales = browser.ask("[...document.images].map(i => i.clientWidth / i.naturalWidth)")
    # Letters of 7.5 points are 10 pixels of a picture in its own size.
    assert min(scales) * 10.0 >= 6.5


def test_it_prints_on_two_sheets(browser: Browser, page: Path, tmp_path: Path) -> None:
    browser.open(page, *DESK)
    browser.paper(tmp_path / "report.pdf")
    sheets = PdfReader(tmp_path / "report.pdf").pages
    assert len(sheets) == 2
    assert (round(float(sheets[0].mediabox.width)), round(float(sheets[0].mediabox.height))) in {
        (595, 842),
        (596, 842),
    }
    assert "The slowest point, at (0.0, 0.0) mm" in sheets[0].extract_text().replace(
        "\N{NO-BREAK SPACE}", " "
    )
    assert "How it was made" in sheets[1].extract_text()
