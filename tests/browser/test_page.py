"""The page in a real browser: it loads with the network cut, answers mouse, keys and search, and prints."""

from __future__ import annotations

import csv
import re
import shutil
import subprocess
from itertools import pairwise
from pathlib import Path
from typing import Any

import pytest

from hubdesign.cells import plain_text
from tests.browser.chrome import AXE, Chrome, needs_axe, needs_chromium
from tests.browser.conftest import Folders
from tests.exports.report.reading import shows

pytestmark = needs_chromium

#: Keys as WebDriver names them (W3C WebDriver, 17.4.2).
ENTER, ESCAPE = "\ue007", "\ue00c"
ARROWS = "\ue014", "\ue012", "\ue013", "\ue015"

READY_CASES = ("islands", "parcels", "us40")
ALL = (*READY_CASES, "large", "hostile", "solved", "compared")

#: What the script must find on the map: a line that nothing lies over, and a place on it.
_FIND_LINK = """
for (const k of document.querySelectorAll('.map .links .k')) {
  const path = document.querySelector(k.querySelector('use').getAttribute('href'));
  for (const share of [.5, .35, .65, .2, .8]) {
    const at = path.getPointAtLength(path.getTotalLength() * share);
    const on = new DOMPoint(at.x, at.y).matrixTransform(k.getScreenCTM());
    const hit = document.elementFromPoint(on.x, on.y);
    if (hit && hit.closest('.k') === k) return [Number(k.dataset.r), on.x, on.y];
  }
}
return null;
"""
_CARD = """
return Object.fromEntries([...document.querySelectorAll('.card dt')].map(
  dt => [dt.dataset.k, dt.nextElementSibling.textContent]));
"""
#: The texts of a table's rows, given its element.
_ROWS = """
return [...document.querySelector(arguments[0]).tBodies[0].rows].map(
  row => [...row.cells].map(cell => cell.textContent));
"""
_HEADS = "return [...document.querySelectorAll(arguments[0] + ' th')].map(h => h.dataset.k)"
_PLACES = """
return [...document.querySelectorAll('.map .stations .s')].map(s => {
  const at = new DOMPoint(0, 0).matrixTransform(s.getScreenCTM());
  return [Number(s.dataset.r), at.x, at.y];
});
"""
_LIT = "return [...document.querySelectorAll('.map .k.on')].map(k => Number(k.dataset.r))"
_SHOWN = (
    "return [...document.querySelectorAll('.map svg')].every(s => s.clientHeight > 150 || !s.clientWidth)"
)


def rows_of(path: Path) -> list[dict[str, str]]:
    """Return a CSV table as texts."""
    with open(path, encoding="utf-8", newline="") as file:
        rows = csv.DictReader(file)
        return [{name: plain_text(cell) for name, cell in row.items()} for row in rows]


def check_card(chrome: Chrome, row: dict[str, str]) -> None:
    """Check that the card shows the figures of a row of a CSV table."""
    card = chrome.run(_CARD)
    assert len(card) >= 6
    for title, shown in card.items():
        told = row[title]
        try:
            value = float(told)
        except ValueError:
            assert shown == told
            continue
        share = title.startswith("load_factor")
        assert shows(shown, 100.0 * value if share else value), (title, shown, told)


@pytest.mark.parametrize("name", ALL)
def test_it_loads_with_the_network_cut_and_without_a_complaint(
    chrome: Chrome, folders: Folders, name: str
) -> None:
    chrome.show(folders(name) / "report.html")
    assert chrome.complaints() == []
    assert chrome.run("return performance.getEntriesByType('resource').length") == 0
    assert chrome.run("return document.documentElement.classList.contains('scripted')")
    assert chrome.run(_SHOWN)


@pytest.mark.parametrize("name", ["islands", "hostile", "large", "compared"])
@pytest.mark.parametrize("script", [True, False])
def test_it_fits_a_phone(chrome: Chrome, folders: Folders, name: str, script: bool) -> None:
    chrome.show(folders(name) / "report.html", width=390, script=script)
    width = chrome.command("Page.getLayoutMetrics")["cssContentSize"]["width"]
    assert width <= 390


@pytest.mark.parametrize("name", ["islands", "us40", "large"])
def test_a_click_on_a_link_shows_its_figures(chrome: Chrome, folders: Folders, name: str) -> None:
    folder = folders(name)
    chrome.show(folder / "report.html")
    chrome.run("document.querySelector('.map').scrollIntoView({block: 'center'})")
    row, x, y = chrome.run(_FIND_LINK)
    chrome.click_at(x, y)
    told = rows_of(folder / "links.csv")[row]
    title = chrome.run("return document.querySelector('.card h3').textContent")
    assert title == f"{told['from']} – {told['to']}"
    check_card(chrome, told)
    chrome.press(ESCAPE)
    assert "Point at" in chrome.run("return document.querySelector('.card').textContent")


@pytest.mark.parametrize("name", ["islands", "parcels"])
def test_keys_go_from_station_to_station_and_through_links(
    chrome: Chrome, folders: Folders, name: str
) -> None:
    folder = folders(name)
    stations, links = rows_of(folder / "stations.csv"), rows_of(folder / "links.csv")
    chrome.show(folder / "report.html")
    chrome.run("document.querySelector('.map svg').focus()")
    seen = set()
    for key in ARROWS:
        chrome.press(key)
        row = chrome.run("return Number(document.activeElement.closest('.s').dataset.r)")
        seen.add(row)
        check_card(chrome, stations[row])
    assert len(seen) >= 2
    here = stations[row]["station"]
    chrome.press("l")
    link = chrome.run("return Number(document.activeElement.closest('.k').dataset.r)")
    assert here in (links[link]["from"], links[link]["to"])
    check_card(chrome, links[link])
    told = chrome.run("return document.activeElement.getAttribute('aria-label')")
    assert links[link]["from"] in told
    assert links[link]["to"] in told
    chrome.press(ENTER)
    assert "Let go" in chrome.run("return document.querySelector('.card').textContent")


def test_zoom_and_move_change_the_view_and_its_scale_bar(chrome: Chrome, folders: Folders) -> None:
    chrome.show(folders("us40") / "report.html")
    box = "return document.querySelector('.map svg').getAttribute('viewBox').split(' ').map(Number)"
    scale = "return document.querySelector('.scale').textContent"
    shown = "return document.querySelectorAll('.labels .l:not(.off)').length"
    whole, bar, labels = chrome.run(box), chrome.run(scale), chrome.run(shown)
    chrome.run("document.querySelector('.map svg').focus()")
    chrome.press("+", "+", "+", "+")
    wait(chrome)
    near = chrome.run(box)
    assert near[2] < whole[2] / 3.0
    assert chrome.run(scale) != bar
    chrome.press("0")
    wait(chrome)
    assert chrome.run(box) == whole
    assert chrome.run(shown) == labels
    chrome.run("document.querySelector('.zoom button').click()")
    wait(chrome)
    assert chrome.run(box)[2] < whole[2]


def wait(chrome: Chrome) -> None:
    """Wait until the page has drawn."""
    chrome.driver.execute_async_script(
        "const done = arguments[0]; requestAnimationFrame(() => requestAnimationFrame(done))"
    )


def test_the_scale_bar_is_as_long_as_it_says(chrome: Chrome, folders: Folders) -> None:
    from geographiclib.geodesic import Geodesic

    folder = folders("islands")
    chrome.show(folder / "report.html")
    places = chrome.run(_PLACES)
    bar = chrome.run("return document.querySelector('.scale').getBoundingClientRect().width")
    km = float(chrome.run("return document.querySelector('.scale').textContent").replace(",", "").split()[0])
    stations = rows_of(folder / "stations.csv")
    for row, x, y in places:
        for other, x2, y2 in places:
            if other <= row:
                continue
            a, b = stations[row], stations[other]
            true = Geodesic.WGS84.Inverse(*(float(s[c]) for s in (a, b) for c in ("lat", "lon")))["s12"] / 1e3
            drawn = ((x - x2) ** 2 + (y - y2) ** 2) ** 0.5 / bar * km
            assert drawn == pytest.approx(true, rel=0.02, abs=2.0)


@pytest.mark.parametrize("name", ["islands", "parcels", "large", "hostile"])
def test_the_od_search_shows_the_itineraries(chrome: Chrome, folders: Folders, name: str) -> None:
    folder = folders(name)
    itineraries, links = rows_of(folder / "itineraries.csv"), rows_of(folder / "links.csv")
    wanted = next(row for row in itineraries if row["transfers"] == "1")
    pair = wanted["origin"], wanted["destination"]
    chosen = [row for row in itineraries if (row["origin"], row["destination"]) == pair]
    chrome.show(folder / "report.html")
    for end, code in zip(("from", "to"), pair):
        chrome.driver.find_element("id", f"od-{end}").send_keys(code)
    chrome.press(ENTER)
    told, heads = chrome.run(_ROWS, ".found table"), chrome.run(_HEADS, "#t-itineraries")
    assert len(told) == len(chosen)
    legs = set()
    for shown, row in zip(told, chosen):
        cells = dict(zip(heads, shown))
        assert cells["stations"] == row["stations"]
        assert shows(cells["volume"], float(row["volume"]))
        legs |= {frozenset(leg) for leg in pairwise(row["stations"].split())}
    lit = set(chrome.run(_LIT))
    assert {frozenset((links[row]["from"], links[row]["to"])) for row in lit} == legs
    chrome.run("document.querySelector('.od .clear').click()")
    assert chrome.run(_LIT) == []


def test_choosing_an_od_row_of_a_comparison_lights_each_structures_own_way(
    chrome: Chrome, folders: Folders
) -> None:
    folder = folders("compared")
    chrome.show(folder / "report.html")
    chrome.run("document.querySelector('#t-od').tBodies[0].rows[0].cells[0].click()")
    pair = chrome.run("return ['od-from', 'od-to'].map(id => document.getElementById(id).value)")
    lit = chrome.run(
        "return [...document.querySelectorAll('.map svg')].filter(s => s.dataset.g !== 'difference')"
        ".map(s => [s.dataset.g, s.querySelectorAll('.k.on').length])"
    )
    assert len(lit) == 3
    for structure, count in lit:
        legs = set()
        for row in rows_of(folder / structure / "itineraries.csv"):
            if [row["origin"], row["destination"]] == pair:
                stops = row["stations"].split()
                legs |= {frozenset(leg) for leg in pairwise(stops)}
        assert count == len(legs), structure


def test_ninety_nine_hundred_rows_sort_and_filter(chrome: Chrome, folders: Folders) -> None:
    folder = folders("large")
    rows = rows_of(folder / "itineraries.csv")
    assert len(rows) == 9900
    chrome.show(folder / "report.html")
    heads = chrome.run(_HEADS, "#t-itineraries")
    place = heads.index("volume")

    def column() -> list[str]:
        return [row[place] for row in chrome.run(_ROWS, "#t-itineraries")]

    assert len(column()) == 100
    chrome.run("document.querySelectorAll('#t-itineraries th button')[arguments[0]].click()", place)
    volumes = sorted((float(row["volume"]) for row in rows), reverse=True)
    for shown, value in zip(column(), volumes):
        assert shows(shown, value)
    chrome.run("document.querySelectorAll('#t-itineraries th button')[arguments[0]].click()", place)
    assert shows(column()[0], volumes[-1])
    box = chrome.driver.find_element("css selector", "#itineraries input[type=search]")
    box.send_keys("S042 volume>500 transfers=1")
    pause = "const done = arguments[0]; setTimeout(done, 300)"
    chrome.driver.execute_async_script(pause)
    wanted = [
        row
        for row in rows
        if "S042" in row["stations"] and float(row["volume"]) > 500.0 and row["transfers"] == "1"
    ]
    assert wanted
    assert len(column()) == min(100, len(wanted))


def test_without_script_answer_maps_and_tables_are_seen(chrome: Chrome, folders: Folders) -> None:
    from selenium.webdriver.common.by import By

    for name in ("islands", "compared"):
        chrome.show(folders(name) / "report.html", script=False)
        find = chrome.driver.find_element
        assert find(By.CSS_SELECTOR, ".lead").text
        assert find(By.CSS_SELECTOR, ".map svg").size["height"] > 150
        assert find(By.CSS_SELECTOR, "table.data tbody tr").is_displayed()
        assert not find(By.CSS_SELECTOR, "form.od").is_displayed()
        assert not find(By.CSS_SELECTOR, ".help").is_displayed()
    chrome.command("Emulation.setScriptExecutionDisabled", value=False)


def test_hostile_names_are_shown_and_do_nothing(chrome: Chrome, folders: Folders) -> None:
    chrome.show(folders("hostile") / "report.html")
    assert chrome.complaints() == []
    assert chrome.run("return document.querySelectorAll('script').length") == 1
    assert chrome.run("return document.querySelector('h1').textContent") == "<script>alert('x')</script>"
    names = [row[1] for row in chrome.run(_ROWS, "#t-stations")]
    assert "<script>alert('x')</script>" in names
    assert "=1+1" in names
    chrome.run("document.querySelector('.map svg').focus()")
    for key in (*ARROWS, "l", "l"):
        chrome.press(key)
    assert chrome.run("return document.querySelectorAll('script').length") == 1


@pytest.mark.parametrize("name", ["islands", "large", "compared"])
def test_it_prints_on_sensible_pages(chrome: Chrome, folders: Folders, tmp_path: Path, name: str) -> None:
    chrome.show(folders(name) / "report.html")
    pdf = chrome.print_pdf()
    (tmp_path / "page.pdf").write_bytes(pdf)
    pages = re.findall(rb"/Type\s*/Page\b", pdf)
    assert 3 <= len(pages) <= 16
    # A4 is 210 by 297 mm: 595 by 842 points.
    sizes = {
        tuple(round(float(n)) for n in box.split()[2:])
        for box in re.findall(rb"/MediaBox\s*\[([^\]]+)\]", pdf)
    }
    assert all(abs(width - 595) <= 1 and abs(height - 842) <= 1 for width, height in sizes)
    if shutil.which("pdftotext") is None:
        pytest.skip("the text of the pages is not checked: pdftotext (poppler-utils) is not installed")
    told = subprocess.run(
        ["pdftotext", "-layout", tmp_path / "page.pdf", "-"], capture_output=True, check=True, text=True
    ).stdout
    assert "The answer" in told.split("\f")[0]
    for words in ("What this page does not say", "What it was worked out from", "Settings in force"):
        assert words in told
    assert all(page.strip() for page in told.split("\f")[: len(pages)])
    assert "Filter" not in told


@needs_axe
@pytest.mark.parametrize(
    ("name", "width", "dark"),
    [
        ("islands", 1280, False),
        ("parcels", 390, False),
        ("hostile", 390, True),
        ("compared", 1280, True),
        ("compared", 390, False),
    ],
)
def test_no_serious_finding_of_accessibility(
    chrome: Chrome, folders: Folders, name: str, width: int, dark: bool
) -> None:
    chrome.show(folders(name) / "report.html", width=width, dark=dark)
    chrome.run(Path(AXE).read_text("utf-8"))
    found: list[dict[str, Any]] = chrome.driver.execute_async_script(
        "const done = arguments[0]; axe.run().then(r => done(r.violations))"
    )
    grave = [
        (row["id"], row["impact"], node["html"][:160], node["failureSummary"])
        for row in found
        if row["impact"] in ("serious", "critical")
        for node in row["nodes"][:3]
    ]
    assert grave == []


@pytest.mark.parametrize("dark", [False, True])
def test_light_and_dark_follow_the_readers_wish(chrome: Chrome, folders: Folders, dark: bool) -> None:
    chrome.show(folders("islands") / "report.html", dark=dark)
    told = chrome.run("return getComputedStyle(document.body).backgroundColor")
    red, green, blue = (int(n) for n in re.findall(r"\d+", told)[:3])
    assert (red + green + blue < 200) == dark
