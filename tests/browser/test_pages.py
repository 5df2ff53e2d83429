"""Report and live pages as a person uses them: sort, filter, open, turn, compare, print; at both widths."""

from __future__ import annotations

import re

import pytest
from axe_playwright_python.sync_playwright import Axe

from ..demo import FORMULA, IMAGE, SCRIPT

WIDTHS = [360, 1440]
BOTH = ["report", "live"]


@pytest.fixture
def address(request):
    return request.getfixturevalue(request.param)


def column(page, at):
    return [text.strip() for text in page.locator(f"#rows tbody tr td:nth-child({at})").all_inner_texts()]


def peaks(page):
    """The first number of the cells of the absorption maximum."""
    texts = page.locator('#rows td[data-label^="absorption maximum"]').all_inner_texts()
    return [float(re.match(r"[\d.]+", text).group()) for text in texts if text.strip()]


def settle(page, action):
    """Do something that makes the table anew, and wait for it."""
    page.evaluate("document.querySelector('#rows tbody').firstChild.dataset.old = 'yes'")
    action()
    page.wait_for_function("!document.querySelector('#rows tbody [data-old]')")


@pytest.mark.parametrize("address", BOTH, indirect=True)
def test_sort_filter_and_reset(opened, address):
    page = opened(address)
    assert page.locator("#found").inner_text() == "12 candidates"
    head = page.locator("#rows thead button", has_text="absorption maximum")
    settle(page, head.click)
    assert peaks(page) == sorted(peaks(page))
    assert page.locator("#rows th[aria-sort=ascending]").count() == 1
    settle(page, page.locator("#rows thead button", has_text="absorption maximum").click)
    assert peaks(page) == sorted(peaks(page), reverse=True)
    settle(page, lambda: page.select_option("#f-only", "failed"))
    assert page.locator("#found").inner_text() == "1 candidates"
    assert "bad_input" in page.locator("#rows tbody").inner_text()
    settle(page, page.get_by_role("button", name="Reset").click)
    assert page.locator("#found").inner_text() == "12 candidates"
    page.select_option("#f-quantity", "absorption_max_nm")
    settle(page, lambda: page.fill("#f-low", "500"))
    assert peaks(page)
    assert min(peaks(page)) >= 500


@pytest.mark.parametrize("address", BOTH, indirect=True)
def test_hostile_names_stay_text(opened, address):
    page = opened(address)
    texts = page.locator("#rows .open").all_inner_texts()
    assert {SCRIPT, FORMULA, IMAGE} <= set(texts)
    for name in (SCRIPT, IMAGE):
        settle(page, lambda name=name: page.fill("#f-text", name.split()[0]))
        page.locator("#rows input[type=checkbox]").first.check()
    assert SCRIPT in page.locator("#compare-table").inner_text()
    assert page.evaluate("window.broken") is None
    assert page.locator("main img").count() == 0


def test_a_candidate_opens_as_a_section_or_a_card(opened, report):
    page = opened(report)
    picked = page.locator("#rows a.open").first
    name = picked.inner_text()
    picked.click()
    assert page.url.partition("#")[2].startswith("candidate-")
    assert name in page.locator(f"#{page.url.partition('#')[2]} h3").first.inner_text()
    card = page.locator("#rows button.open").first
    name = card.inner_text()
    card.click()
    assert page.locator("#card-h").inner_text() == name
    assert page.locator("#card-body tr").count() > 4
    page.keyboard.press("Escape")
    assert not page.locator("#card").is_visible()


def test_a_candidate_has_a_live_page(opened, live):
    page = opened(live)
    name = page.locator("#rows a.open").first.inner_text()
    page.locator("#rows a.open").first.click()
    page.wait_for_selector("article canvas")
    assert name in page.locator("article h2").first.inner_text()
    assert page.locator("[data-panel=spectrum] svg").count() == 1
    page.get_by_role("link", name="All candidates").click()
    page.wait_for_selector("#rows tbody tr")


def test_the_structure_turns_by_mouse_keys_and_buttons(opened, report):
    page = opened(report)
    canvas = page.locator("article .scene canvas").first
    canvas.scroll_into_view_if_needed()

    def turned():
        return canvas.get_attribute("data-turned")

    seen = [turned()]
    canvas.focus()
    for act in (
        lambda: page.keyboard.press("ArrowRight"),
        lambda: page.keyboard.press("ArrowUp"),
        lambda: page.locator("article .scene").first.get_by_role("button", name="Left").click(),
        lambda: drag(page, canvas),
    ):
        act()
        assert turned() not in seen
        seen.append(turned())
    page.keyboard.press("0")
    page.locator("article .scene").first.get_by_role("button", name="Turn back").click()
    assert turned() == seen[0]
    # Something is drawn: atoms, bonds and the arrow leave many colours on the canvas.
    colours = canvas.evaluate(
        """(one) => { const d = one.getContext('2d').getImageData(0, 0, one.width, one.height).data;
        const seen = new Set();
        for (let i = 0; i < d.length; i += 4) if (d[i + 3]) seen.add(d[i] * 65536 + d[i + 1] * 256 + d[i + 2]);
        return [seen.size, seen.has(0xb3420a)]; }"""
    )
    assert colours[0] > 20
    assert colours[1], "the arrow of the transition dipole is not there"


def drag(page, canvas):
    box = canvas.bounding_box()
    page.mouse.move(box["x"] + box["width"] / 2, box["y"] + box["height"] / 2)
    page.mouse.down()
    page.mouse.move(box["x"] + box["width"] / 2 + 60, box["y"] + box["height"] / 2 + 25)
    page.mouse.up()


@pytest.mark.parametrize("address", BOTH, indirect=True)
def test_three_side_by_side_and_no_fifth(opened, address):
    page = opened(address)
    boxes = page.locator("#rows input[type=checkbox]")
    for at in range(3):
        boxes.nth(at).check()
    heads = page.locator("#compare-table thead th").all_inner_texts()
    assert len(heads) == 4
    assert page.locator("#compare-table thead svg").count() == 3
    assert page.locator("#compare-table tbody").get_by_text("absorption maximum / nm", exact=True).count() == 1
    boxes.nth(3).check()
    boxes.nth(4).click()
    assert not boxes.nth(4).is_checked()
    assert "untick one first" in page.locator("#compare-hint").inner_text()


@pytest.mark.parametrize("address", BOTH, indirect=True)
def test_any_two_quantities_can_be_plotted(opened, address):
    page = opened(address)
    page.locator("#plot").scroll_into_view_if_needed()
    page.wait_for_selector("#plot-chart svg")
    page.select_option("#plot-x", "heavy_atoms")
    page.wait_for_function("document.getElementById('plot-words').textContent.includes('heavy atoms')")
    page.wait_for_function("document.querySelector('#plot-chart svg').textContent.includes('heavy atoms')")
    text = page.locator("#plot-chart svg").text_content()
    assert "molar absorptivity / M⁻¹ cm⁻¹" in text
    assert "Pareto front 1" in text


def test_it_prints_with_every_pick_on_a_sheet_of_its_own(opened, report):
    page = opened(report)
    printed = page.pdf(format="A4")
    sheets = len(re.findall(rb"/Type\s*/Page\b", printed))
    assert printed.startswith(b"%PDF")
    assert sheets > page.locator("article.candidate").count()
    page.emulate_media(media="print")
    assert not page.locator("#filters").is_visible()
    assert page.locator("article svg").first.is_visible()


@pytest.mark.parametrize("width", WIDTHS)
@pytest.mark.parametrize("address", BOTH, indirect=True)
def test_nothing_is_wider_than_the_window(opened, address, width):
    page = opened(address, width=width)
    assert page.evaluate("document.documentElement.scrollWidth") <= width
    spilling = "[...document.querySelectorAll('#rows td')].filter((one) => one.scrollWidth > one.clientWidth + 1)"
    assert page.evaluate(f"{spilling}.map((one) => one.textContent)") == []
    if "#" not in address and "file:" not in address:
        page.goto(page.locator("#rows a.open").first.evaluate("(one) => one.href"))
        assert page.evaluate("document.documentElement.scrollWidth") <= width


@pytest.mark.parametrize("width", WIDTHS)
@pytest.mark.parametrize("address", BOTH, indirect=True)
def test_no_serious_fault_of_accessibility(opened, address, width):
    page = opened(address, width=width)
    page.locator("#rows input[type=checkbox]").first.check()
    page.locator("#plot").scroll_into_view_if_needed()
    page.wait_for_selector("#plot-chart svg")
    faults = [
        f"{one['id']}: {one['nodes'][0]['html'][:200]}"
        for one in Axe().run(page).response["violations"]
        if one["impact"] in {"serious", "critical"}
    ]
    assert faults == []


def test_everything_can_be_reached_with_the_keyboard(opened, report):
    page = opened(report)
    page.keyboard.press("Tab")
    assert page.evaluate("document.activeElement.className") == "skip"
    reached = set()
    for _ in range(60):
        page.keyboard.press("Tab")
        reached.add(page.evaluate("document.activeElement.id || document.activeElement.className"))
    assert {"f-text", "f-only", "f-sort", "open"} <= reached
