"""The bench page in a real browser."""

import httpx2
import pytest
from playwright.sync_api import Page

from tests.page.conftest import settled
from tests.service.conftest import Server


def shown(page: Page, selector: str) -> str:
    return page.inner_text(selector)


def test_first_sight_answers_a_question(page: Page) -> None:
    """Without a click the page shows the stretched D2 component of 87Rb with uncertainty, curves and sources."""
    assert "384.22811968" in shown(page, "#one dd.first")
    assert "THz" in shown(page, "#one dd.first")
    assert page.locator("#sticks line[stroke-width='2']").count() > 20
    assert page.locator("#curves canvas").count() == 1
    assert "checked" in shown(page, "#sources")
    assert shown(page, "#release").startswith("data 20")


def test_unknown_uncertainties_are_short_here_and_explained_once(page: Page) -> None:
    """A number without uncertainty says so in two words, with the reason on pointing at it and one line below."""
    assert "4.47877189 MHz (uncertainty unknown)" in shown(page, "#one")
    assert "could outweigh" in (page.get_attribute("#one dd span[title*=outweigh]", "title") or "")
    assert "No uncertainty is stated for g_J(5p_2P3/2)" in shown(page, "#one .help")
    assert "Hz/G\u00b2" in shown(page, "#one")


def test_numbers_are_those_of_the_service(page: Page, server: Server) -> None:
    """The slope on the page has the digits that the request has."""
    query = {"line": "780", "lower": "2,2", "upper": "3,3", "field": "3.2 G"}
    slope = httpx2.get(f"{server.url}/v1/atoms/87Rb/shift", params=query).json()["slope"]["value"]
    assert f"{slope:.9g}" in shown(page, "#one")


def test_another_atom_line_and_field(page: Page) -> None:
    """Choosing 40Ca+, 729 nm and a field in millitesla shows quadrupole components."""
    page.select_option("#atom", "40Ca+")
    settled(page)
    page.select_option("#line", "729")
    settled(page)
    page.fill("#field", "0.4 mT")
    page.press("#field", "Tab")
    settled(page)
    assert "411.0421" in shown(page, "#one dd.first")
    page.click("summary")
    assert "5/2,5/2" in shown(page, "#components")


def test_insensitive_pairs_of_the_clock(page: Page) -> None:
    """The pair at 3.2289 G stands in the table of the ground level."""
    assert "3.22891" in shown(page, "#insensitive")


def test_wrong_field_says_what_would_do(page: Page) -> None:
    """A field without sense shows the service's own words and leaves the page usable."""
    page.fill("#field", "3 parsec")
    page.press("#field", "Tab")
    page.wait_for_selector("#problem:not([hidden])")
    assert "field" in shown(page, "#problem")
    page.fill("#field", "1 G")
    page.press("#field", "Tab")
    page.wait_for_selector("#problem", state="hidden")
    settled(page)


def test_every_control_has_a_name(page: Page) -> None:
    """Selects and inputs are labelled, figures have a caption, and the page has one main heading."""
    controls = "[...document.querySelectorAll('select,input')]"
    unnamed = page.evaluate(f"{controls}.filter(e => !e.labels.length).map(e => e.id)")
    assert unnamed == []
    assert page.locator("figure").count() == page.locator("figure > figcaption").count() == 2
    assert page.locator("h1").count() == 1


def test_works_from_the_keyboard(page: Page) -> None:
    """Tab reaches the first control after the links, and typing in a select changes the answer."""
    page.focus("#lower")
    page.keyboard.type("1,-1")
    page.keyboard.press("Tab")
    settled(page)
    assert page.input_value("#lower") == "1,-1"


@pytest.mark.parametrize("width", [320, 700])
def test_narrow_windows_do_not_scroll_sideways(page: Page, width: int) -> None:
    """The page as a whole fits a phone; wide tables scroll in their own box."""
    page.set_viewport_size({"width": width, "height": 800})
    page.reload()
    settled(page)
    assert page.evaluate("document.documentElement.scrollWidth") <= width


def test_cautions_are_on_the_page(page: Page) -> None:
    """Laser light and magnets: the page says so and defers to local rules."""
    assert "laser\u00a0safety officer" in shown(page, "footer") or "laser safety officer" in shown(page, "footer")


def test_documentation_opens_without_complaint(page: Page, server: Server) -> None:
    """The documentation renders offline under its content security policy."""
    page.goto(f"{server.url}/docs")
    assert "shift" in page.inner_text("body")
    assert page.evaluate("performance.getEntriesByType('resource').every(e => e.name.startsWith(location.origin))")
