"""The page in a real browser: quiet, offline, no sideways scroll, links open what they lead to."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest
from browser.chromium_pipe import Browser, browser, find_chromium
from report.invented_facts import invented_facts

from drystone.report.page import render_page

pytestmark = pytest.mark.skipif(find_chromium() is None, reason="chromium is not installed")
OPEN_ALL = "document.querySelectorAll('details').forEach(d => { d.open = true })"


@pytest.fixture(scope="module")
def pages(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    folder = tmp_path_factory.mktemp("pages")
    made = {
        "small": invented_facts(12, refuse_main=True),
        "hostile": invented_facts(40, hostile=True),
        "large": invented_facts(600, analyses=1),
    }
    for name, facts in made.items():
        (folder / f"{name}.html").write_text(render_page(facts), encoding="utf-8")
    return {name: folder / f"{name}.html" for name in made}


@pytest.fixture(scope="module")
def window(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    with browser(tmp_path_factory.mktemp("profile")) as opened:
        yield opened


@pytest.mark.parametrize("name", ["small", "hostile", "large"])
@pytest.mark.parametrize("width", [360, 390, 800, 1600])
def test_page_is_quiet_offline_and_fits(
    window: Browser, pages: dict[str, Path], name: str, width: int
) -> None:
    window.open(pages[name], width)
    window.evaluate(OPEN_ALL)
    assert window.evaluate("document.documentElement.scrollWidth") <= width
    assert window.requested() == [pages[name].resolve().as_uri()]
    assert window.complaints() == []


def test_a_link_to_a_row_opens_its_study(window: Browser, pages: dict[str, Path]) -> None:
    window.open(pages["large"], 1400)
    place = window.evaluate(
        "document.querySelector('#findings a[href^=\"#analysis-1-row\"]').getAttribute('href')"
    )
    window.evaluate(f"location.hash = '{place}'")
    assert window.evaluate(f"document.querySelector('{place}').closest('details').open")


def test_scripts_in_the_page_are_forbidden(
    window: Browser, pages: dict[str, Path], tmp_path: Path
) -> None:
    text = pages["small"].read_text(encoding="utf-8")
    spoilt = tmp_path / "spoilt.html"
    spoilt.write_text(text.replace("</body>", "<script>window.ran = 1</script></body>"), "utf-8")
    window.open(spoilt, 800)
    assert window.evaluate("window.ran") is None
    assert window.complaints()


def test_everything_can_be_reached_by_keyboard(window: Browser, pages: dict[str, Path]) -> None:
    window.open(pages["small"], 390)
    unreachable = window.evaluate(
        "[...document.querySelectorAll('.box, .scrolls')]"
        ".filter(e => e.scrollWidth > e.clientWidth && e.tabIndex < 0).length"
    )
    assert unreachable == 0


def test_closed_groups_are_printed(window: Browser, pages: dict[str, Path]) -> None:
    window.open(pages["small"], 800)
    visible = "document.querySelector('#ledger .group table').checkVisibility()"
    assert not window.evaluate(visible)
    window.call("Emulation.setEmulatedMedia", media="print")
    printed = window.evaluate(visible)
    window.call("Emulation.setEmulatedMedia", media="")
    assert printed
