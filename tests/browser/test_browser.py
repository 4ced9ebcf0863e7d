"""What only a browser can tell: nothing runs off the page, logging with and without scripts."""

from pathlib import Path
from typing import Any

import pytest

PATHS = (
    "/",
    "/?standing=late",
    "/fields/field-10",
    "/fields/field-4",
    "/fields/field-3?season=whole",
    "/fields/field-7",
    "/fields/field-10/days/2026-07-13",
    "/stations",
    "/stations/bench?span=year",
    "/stations/north",
    "/stations/bench/days/2026-07-13",
    "/intake",
    "/methods",
    "/nowhere",
)


@pytest.mark.parametrize("width", [1280, 360])
def test_no_page_runs_off_its_side_or_breaks_the_policy(
    browser: Any, sheet: str, width: int
) -> None:
    page = browser.new_page(viewport={"width": width, "height": 800})
    said: list[str] = []
    page.on("console", lambda message: said.append(message.text))
    page.on("pageerror", lambda error: said.append(str(error)))
    for path in PATHS:
        page.goto(sheet + path)
        wide = page.evaluate("document.documentElement.scrollWidth")
        assert wide <= width, (path, wide)
    page.close()
    assert [text for text in said if "404" not in text] == []


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_ink_stands_out_from_paper(browser: Any, sheet: str, scheme: str) -> None:
    """Contrast of text and its ground: 4.5 (Web Content Accessibility Guidelines 2.2, 1.4.3)."""
    page = browser.new_page(color_scheme=scheme)
    page.goto(f"{sheet}/fields/field-10")
    worst = page.evaluate(CONTRAST)
    page.close()
    assert worst["ratio"] >= 4.5, worst


CONTRAST = """() => {
  const rgb = (text) => (text.match(/[\\d.]+/g) || []).map(Number);
  const light = (c) => { const f = c.slice(0, 3).map((v) => { v /= 255;
    return v <= 0.03928 ? v / 12.92 : ((v + 0.055) / 1.055) ** 2.4; });
    return 0.2126 * f[0] + 0.7152 * f[1] + 0.0722 * f[2]; };
  const ground = (node) => { for (let n = node; n; n = n.parentElement) {
    const c = rgb(getComputedStyle(n).backgroundColor); if (c.length < 4 || c[3] > 0.9) return c; }
    return [255, 255, 255]; };
  let worst = { ratio: 99 };
  for (const node of document.querySelectorAll("body *:not(svg *)")) {
    if (![...node.childNodes].some((c) => c.nodeType === 3 && c.data.trim())) continue;
    if (!node.checkVisibility()) continue;
    const a = light(rgb(getComputedStyle(node).color)), b = light(ground(node));
    const ratio = (Math.max(a, b) + 0.05) / (Math.min(a, b) + 0.05);
    if (ratio < worst.ratio) worst = { ratio, text: node.textContent.trim().slice(0, 40) };
  }
  return worst;
}"""


def test_logging_with_scripts_keeps_the_place(browser: Any, valley: str) -> None:
    page = browser.new_page(viewport={"width": 360, "height": 700})
    page.goto(valley)
    page.evaluate("document.documentElement.dataset.stayed = 'yes'")
    page.get_by_label("Long Piece").fill("2.5")
    page.get_by_label("Long Piece").press("Enter")
    page.wait_for_selector("#said:has-text('Logged for 1 field.')")
    assert page.evaluate("document.documentElement.dataset.stayed") == "yes"
    row = page.locator("#long-piece")
    assert "2.5 h yesterday" in row.inner_text()
    assert page.get_by_label("Long Piece").input_value() == ""
    page.get_by_label("Long Piece").fill("many")
    page.get_by_role("button", name="Log hours").click()
    page.wait_for_selector("#long-piece [role=alert]")
    assert "which is no number" in row.inner_text()
    assert page.get_by_label("Long Piece").input_value() == "many"
    page.close()


def test_logging_without_scripts(browser: Any, valley: str) -> None:
    context = browser.new_context(java_script_enabled=False)
    page = context.new_page()
    page.goto(valley)
    page.get_by_label("Long Piece").fill("2.5")
    page.get_by_label("Two Halves").fill("3")
    page.get_by_role("button", name="Log hours").click()
    assert "Logged for 2 fields." in page.inner_text("#said")
    assert "2.5 h yesterday" in page.inner_text("#long-piece")
    page.get_by_role("link", name="Long Piece").click()
    page.get_by_text("correct or delete").first.click()
    page.get_by_label("Delete the entry of Tue 30 Jun").click()
    assert "2.5 h" not in page.inner_text("#events")
    context.close()


def test_a_lost_connection_loses_no_hours(browser: Any, valley: str) -> None:
    page = browser.new_page()
    page.goto(valley)
    page.route("**/rounds/log", lambda route: route.abort())
    page.get_by_label("Long Piece").fill("2.5")
    page.get_by_label("Long Piece").press("Enter")
    page.wait_for_selector("#said:has-text('No connection')")
    assert page.get_by_label("Long Piece").input_value() == "2.5"
    page.close()


def test_a_file_goes_in_and_out_without_scripts(browser: Any, valley: str, tmp_path: Path) -> None:
    file = tmp_path / "found.csv"
    file.write_text("date,tmax (degC),tmin (degC)\n01/06/2026,41,11\n02/06/2026,42,12\n")
    context = browser.new_context(java_script_enabled=False)
    page = context.new_page()
    page.goto(f"{valley}/intake")
    page.get_by_label("Station").select_option(label="Bench")
    page.get_by_label("File, chosen or dropped here").set_input_files(file)
    page.get_by_role("button", name="Look at it").click()
    page.get_by_role("radio", name="day, month, year").check()
    page.get_by_role("button", name="Answer, and look again").click()
    assert "2 rows" in page.inner_text(".order")
    page.get_by_role("button", name="Take it in").click()
    assert "2 rows taken in" in page.inner_text(".order")
    page.get_by_role("button", name="Undo").click()
    assert "Undone" in page.inner_text(".order")
    context.close()


def test_the_keyboard_reaches_the_rows_and_skips_the_frame(browser: Any, valley: str) -> None:
    page = browser.new_page()
    page.goto(valley)
    page.keyboard.press("Tab")
    assert page.evaluate("document.activeElement.className") == "skip"
    page.keyboard.press("Enter")
    seen = []
    for _ in range(30):
        page.keyboard.press("Tab")
        seen.append(page.evaluate("document.activeElement.getAttribute('aria-label')"))
    assert "Long Piece, hours" in seen
    page.close()


@pytest.mark.parametrize("scripts", [True, False])
def test_a_span_is_marked_and_taken_back_at_360_px(
    browser: Any, valley: str, scripts: bool
) -> None:
    context = browser.new_context(
        viewport={"width": 360, "height": 800}, java_script_enabled=scripts
    )
    page = context.new_page()
    page.goto(f"{valley}/stations/bench")
    form = page.get_by_role("form", name="Mark a span of readings")
    form.get_by_label("Quantity").select_option("shortwave_down")
    form.get_by_label("First day").fill("2026-06-20")
    form.get_by_label("Last day").fill("2026-06-21")
    form.get_by_label("Why").fill("a rag lay on it")
    form.get_by_role("button", name="Mark").click()
    page.get_by_text("a rag lay on it").wait_for()
    assert page.url.endswith("/stations/bench#words")
    page.get_by_role("button", name="Take back the mark of").click()
    page.get_by_text("No span is marked.").wait_for()
    context.close()
