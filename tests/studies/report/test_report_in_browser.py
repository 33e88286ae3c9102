"""The report in a real browser: quiet, offline, linked, filtered, reachable by keyboard."""

from __future__ import annotations

import json
import time
from pathlib import Path
from typing import Any

import pytest

FILES = ("file:", "data:", "blob:", "about:", "chrome:")
SLOWEST_S = 60.0  # of a busy machine until the page is complete


def wait_for(browser: Any, script: str) -> Any:
    """Value of `script` once it is true."""
    end = time.monotonic() + SLOWEST_S
    while time.monotonic() < end:
        value = browser.execute_script(script)
        if value:
            return value
        time.sleep(0.02)
    pytest.fail(f"never true: {script}")


@pytest.fixture
def opened(browser: Any, page: Path) -> Any:
    """The report freshly loaded, its cards unpacked."""
    browser.get_log("browser")
    browser.get_log("performance")
    browser.get(page.as_uri())
    wait_for(browser, "return document.documentElement.dataset.ready === 'cards'")
    return browser


def front(browser: Any, expression: str) -> Any:
    """Something of the front's source, `s`, in the document `d`."""
    return browser.execute_script(
        "const d = Bokeh.documents[0]; const s = d.get_model_by_name('front'); "
        f"return {expression};"
    )


def place_of(browser: Any, plot: str, x: float, y: float) -> tuple[float, float]:
    """Point of the window at data coordinates of a plot, scrolled into view."""
    found = browser.execute_script(
        """
        const [name, x, y] = arguments;
        const view = Bokeh.index.find_one(Bokeh.documents[0].get_model_by_name(name));
        view.el.scrollIntoView({block: "center"});
        const box = view.el.getBoundingClientRect();
        return [box.left + view.frame.x_scale.compute(x), box.top + view.frame.y_scale.compute(y)];
        """,
        plot,
        x,
        y,
    )
    return float(found[0]), float(found[1])


def mouse(browser: Any, kind: str, place: tuple[float, float], pressed: bool) -> None:
    browser.execute_cdp_cmd(
        "Input.dispatchMouseEvent",
        {
            "type": kind,
            "x": place[0],
            "y": place[1],
            "button": "left" if pressed or kind != "mouseMoved" else "none",
            "buttons": int(pressed),
            "clickCount": 1,
        },
    )


def click(browser: Any, place: tuple[float, float]) -> None:
    mouse(browser, "mouseMoved", place, False)
    mouse(browser, "mousePressed", place, True)
    mouse(browser, "mouseReleased", place, False)


def drag(browser: Any, start: tuple[float, float], end: tuple[float, float]) -> None:
    mouse(browser, "mouseMoved", start, False)
    mouse(browser, "mousePressed", start, True)
    for share in (0.2, 0.5, 0.8, 1.0):
        between = tuple(a + share * (b - a) for a, b in zip(start, end, strict=True))
        mouse(browser, "mouseMoved", between, True)  # type: ignore[arg-type]
    mouse(browser, "mouseReleased", end, False)


def test_console_is_quiet_and_nothing_leaves_the_file(opened: Any) -> None:
    said = [entry for entry in opened.get_log("browser") if entry["level"] != "INFO"]
    assert not said
    events = [json.loads(entry["message"])["message"] for entry in opened.get_log("performance")]
    asked = [
        event["params"]["request"]["url"]
        for event in events
        if event["method"] == "Network.requestWillBeSent"
    ]
    assert asked  # the page itself
    assert [url for url in asked if not url.startswith(FILES)] == []


def test_markup_in_names_stays_text(opened: Any) -> None:
    assert "<b>bold</b>" in opened.execute_script("return document.body.innerText")
    assert opened.execute_script("return document.querySelectorAll('header b, main b').length") == 0


def test_clicking_a_mark_shows_its_card_everywhere(opened: Any) -> None:
    # The design with the smallest loss lies at the edge of the cloud, where nothing covers it.
    x, y, design, row = front(
        opened,
        "(i => [s.data.x[i], s.data.y[i], s.data.design[i], i])"
        "(s.data.x.indexOf(Math.min(...s.data.x)))",
    )
    click(opened, place_of(opened, "front-plot", x, y))
    wait_for(opened, f"return document.getElementById('card').dataset.design === '{design}'")
    # Marks that lie on each other are selected together.
    assert row in front(opened, "Array.from(s.selected.indices)")
    assert design in opened.execute_script("return document.getElementById('card-title').innerText")
    drawn = opened.execute_script(
        "return document.querySelector('#card-section svg').getAttribute('aria-label')"
    )
    assert design in drawn
    torque = opened.execute_script(
        "const c = Bokeh.documents[0].get_model_by_name('curve-torque').data;"
        "return Array.from(c.y0)"
    )
    assert len(torque) > 50
    assert abs(sum(torque)) < 1e-6 * max(map(abs, torque)) * len(torque) + 1e-9  # less its mean
    assert opened.execute_script("return document.querySelectorAll('#card-limits td').length") > 0


def test_table_selects_in_the_plots(opened: Any) -> None:
    design = opened.execute_script(
        "const b = document.querySelectorAll('#table button.design')[3]; b.click();"
        "return b.textContent"
    )
    assert front(opened, "s.selected.indices.map(i => s.data.design[i])") == [design]
    assert opened.execute_script("return document.getElementById('card').dataset.design") == design
    marked = opened.execute_script(
        "return Array.from(document.querySelectorAll('#table tr[aria-selected=true] .design'),"
        " b => b.textContent)"
    )
    assert marked == [design]


def test_headings_sort_the_table(opened: Any) -> None:
    script = """
        const head = () => document.querySelectorAll('#table thead button')[1];
        const cells = () => Array.from(document.querySelectorAll('#table tbody tr'),
          row => Number(row.cells[1].textContent));
        head().click(); const first = cells(); head().click();
        return [first, cells()];
    """
    falling, rising = opened.execute_script(script)
    assert falling == sorted(falling, reverse=True)
    assert rising == sorted(rising)
    assert falling != rising


def test_slider_moved_by_keyboard_greys_out_what_fails(opened: Any) -> None:
    from selenium.webdriver.common.keys import Keys

    before = front(opened, "[s.data.x.length, d.get_model_by_name('failing').indices.length]")
    assert before[1] == 0
    bar = opened.find_element(
        "css selector", "#sliders input[aria-label^='total loss'][type=range]"
    )
    for _ in range(6):
        bar.send_keys(Keys.PAGE_DOWN)  # a tenth of the range each
    wait_for(opened, "return Bokeh.documents[0].get_model_by_name('failing').indices.length > 0")
    limit = float(
        opened.execute_script(
            'return document.querySelector(\'#sliders input[aria-label^="total loss"]'
            "[type=number]').value"
        )
    )
    passing, failing, losses = front(
        opened,
        "[Array.from(d.get_model_by_name('passing').indices),"
        " Array.from(d.get_model_by_name('failing').indices), Array.from(s.data.x)]",
    )
    assert sorted(passing + failing) == list(range(before[0]))
    rounding = 1e-4 * limit  # the box shows five digits
    assert all(losses[i] <= limit + rounding for i in passing)
    assert all(losses[i] >= limit - rounding for i in failing)
    said = opened.execute_script("return document.getElementById('tally').textContent")
    assert said == f"{len(passing)} of {before[0]} designs pass."


def test_families_are_switched_off(opened: Any) -> None:
    opened.execute_script("document.querySelector('[data-family=\"0\"]').click()")
    shown = front(opened, "[...d.get_model_by_name('passing').indices].map(i => s.data.family[i])")
    assert set(shown) == {"f1"}
    rows = opened.execute_script(
        "return Array.from(document.querySelectorAll('#table .design'), b => b.textContent)"
    )
    assert rows
    assert all(row.startswith("Q12p4s5") for row in rows)


def test_box_over_an_axis_selects_the_lines_through_it(opened: Any) -> None:
    start = place_of(opened, "axes-plot", 0.8, 0.5)
    end = place_of(opened, "axes-plot", 1.2, 1.02)
    drag(opened, start, end)
    wait_for(
        opened, "return Bokeh.documents[0].get_model_by_name('front').selected.indices.length > 1"
    )
    selected, heights = front(
        opened, "[Array.from(s.selected.indices), s.data.ys.map(line => line[1])]"
    )
    slack = 0.03  # the drag ends within a pixel or two of where it was aimed
    inside = {i for i, height in enumerate(heights) if height >= 0.5}
    assert {i for i in selected if heights[i] < 0.5 - slack} == set()
    assert {i for i in inside if heights[i] > 0.5 + slack} <= set(selected)


def test_axes_can_be_chosen(opened: Any) -> None:
    opened.execute_script(
        "const c = document.getElementById('pick-x');"
        "c.value = Array.from(c.options).find(o => o.text.startsWith('rotor radius')).value;"
        "c.dispatchEvent(new Event('change'))"
    )
    radius = front(opened, "Array.from(s.data.x)")
    assert min(radius) >= 12.0  # the bounds of the study
    assert max(radius) <= 24.0
    label = opened.execute_script(
        "return Bokeh.documents[0].get_model_by_name('front-x-axis').axis_label"
    )
    assert label == "rotor radius, mm"


def test_keyboard_reaches_every_control(opened: Any) -> None:
    from selenium.webdriver.common.action_chains import ActionChains
    from selenium.webdriver.common.keys import Keys

    wanted = opened.execute_script(
        """
        const all = document.querySelectorAll('a[href], select, input, button, summary');
        const seen = Array.from(all).filter(e => !e.disabled && e.checkVisibility());
        seen.forEach((e, i) => { e.dataset.stop = i; });
        window.stops = [];
        document.addEventListener('focusin', e => window.stops.push(e.target.dataset.stop));
        return seen.length;
        """
    )
    assert wanted > 40
    keys = ActionChains(opened)
    for _ in range(wanted + 60):  # scrolling tables and the plots' tool bars are stops as well
        keys.send_keys(Keys.TAB)
    keys.perform()
    reached = {int(stop) for stop in opened.execute_script("return window.stops") if stop}
    assert reached == set(range(wanted))


@pytest.mark.parametrize("width", [390, 1366, 1920])
def test_page_never_scrolls_sideways(opened: Any, width: int) -> None:
    screen = {"width": width, "height": 900, "deviceScaleFactor": 1, "mobile": width < 600}
    opened.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", screen)
    try:
        opened.refresh()
        wait_for(opened, "return document.documentElement.dataset.ready === 'cards'")
        assert opened.execute_script("return document.documentElement.scrollWidth") <= width
    finally:
        opened.execute_cdp_cmd("Emulation.clearDeviceMetricsOverride", {})


def test_printing_puts_pictures_of_the_plots_on_paper(opened: Any) -> None:
    opened.execute_script("window.dispatchEvent(new Event('beforeprint'))")
    found = opened.execute_script(
        "return Array.from(document.querySelectorAll('canvas.printed'), c => c.width * c.height)"
    )
    # Front, axes, five of the card, progress and distributions.
    assert len(found) == 9
    assert min(found) > 0
    opened.execute_script("window.dispatchEvent(new Event('afterprint'))")
    assert opened.execute_script("return document.querySelector('canvas.printed')") is None
