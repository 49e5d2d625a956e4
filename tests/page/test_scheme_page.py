"""The scheme page in a real browser."""

import json
from collections.abc import Iterator

import httpx2
import pytest
from playwright.sync_api import Browser, Page

from levels.findings import KINDS
from tests.page.conftest import settled
from tests.service.conftest import Server


@pytest.fixture
def scheme(browser: Browser, server: Server) -> Iterator[Page]:
    """A fresh tab on the scheme page, ready; errors and refused resources fail the test at its end."""
    opened = browser.new_page(viewport={"width": 1100, "height": 900})
    complaints: list[str] = []
    opened.on("pageerror", lambda error: complaints.append(str(error)))
    opened.on("console", lambda message: complaints.append(message.text) if message.type == "error" else None)
    opened.goto(f"{server.url}/scheme")
    settled(opened)
    yield opened
    opened.close()
    assert [text for text in complaints if "422" not in text and "404" not in text] == []


def check(page: Page) -> None:
    """Press the button and wait for the answer or the problem."""
    page.click("#check")
    page.wait_for_selector("body:not(.waiting)")


def severities(page: Page) -> list[str]:
    return page.locator("#findings .severity").all_inner_texts()


def test_first_sight_is_a_scheme_that_works(scheme: Page) -> None:
    """Without a click the page shows the ion's verdict, polarisations, populations, dark states and sources."""
    assert "No problem found" in scheme.inner_text("#verdict")
    assert "optical Bloch equations" in scheme.inner_text("#numbers")
    assert scheme.locator("#polarisations svg").count() == 6
    assert scheme.locator("#populations tbody tr").count() == 8
    assert "3/2,-3/2" in scheme.inner_text("#dark")
    assert "checked" in scheme.inner_text("#sources")


def test_numbers_are_those_of_the_service(scheme: Page, server: Server) -> None:
    """The request that the page shows, sent by hand, gives the shares that stand beside the bars."""
    body = json.loads(scheme.text_content("#request") or "")
    answer = httpx2.post(f"{server.url}/v1/scheme", json=body).json()
    shown = scheme.locator("#populations tbody tr td:last-child").all_inner_texts()
    assert shown == [f"{100 * share:.2f} %" for share in answer["populations"]["population"]]
    fractions = scheme.locator("#polarisations tbody tr td:nth-child(4)").all_inner_texts()
    assert fractions == [f"{100 * share:.2f} %" for share in answer["polarisations"]["fraction"]]


def test_field_along_the_polarisation_goes_dark_and_says_what_would_help(scheme: Page) -> None:
    """Light linear along the field: problems first, each with its word, its code and what would change it."""
    for axis, value in zip("xyz", ("0", "0", "1"), strict=True):
        scheme.fill(f"#field-{axis}", value)
    for angle in scheme.locator('[data-part="light-0"]').all():
        angle.fill("0")
    scheme.check("#remedies")
    check(scheme)
    assert "problems found" in scheme.inner_text("#verdict")
    words = severities(scheme)
    assert words[0] == "problem"
    assert words == sorted(words, key=["problem", "warning", "note"].index)
    shown = scheme.inner_text("#findings")
    assert "dark-state" in shown
    assert "What would change it: a field of" in shown
    codes = scheme.locator("#findings code").all_inner_texts()
    assert set(codes) <= {kind.code for kind in KINDS}


def test_presets_fill_the_form_and_answer(scheme: Page) -> None:
    """Each way to start fills atom, field and beams, and is answered; pumping reaches its target."""
    scheme.select_option("#preset", "pumping")
    settled(scheme)
    assert scheme.input_value("#target-sublevel") == "2,2"
    assert "100.00 %" in scheme.inner_text("#numbers")
    scheme.select_option("#preset", "cooling")
    settled(scheme)
    assert "unlit-level" in scheme.inner_text("#findings")
    assert scheme.locator("fieldset.beam").count() == 1


def test_beams_are_added_changed_and_removed(scheme: Page) -> None:
    """A repumper added by hand makes the cooling scheme of 87Rb work; removing it undoes that."""
    scheme.select_option("#preset", "cooling")
    settled(scheme)
    scheme.click("#add")
    repump = scheme.locator("fieldset.beam").nth(1)
    repump.locator('[data-part="line"]').select_option("780")
    repump.locator('[data-part="component"]').fill("1-2")
    repump.locator('[data-part="light"]').select_option("plates")
    repump.locator('[data-part="light-2"]').fill("30")
    repump.locator('[data-part="linewidth"]').fill("1")
    check(scheme)
    assert "unlit-level" not in scheme.inner_text("#findings")
    repump.get_by_role("button", name="Remove beam").click()
    check(scheme)
    assert "unlit-level" in scheme.inner_text("#findings")


def test_bad_beam_says_what_would_do(scheme: Page) -> None:
    """A direction of zero shows the service's own words; corrected, the page goes on."""
    first = scheme.locator('[data-part="direction-0"]').first
    first.fill("0")
    check(scheme)
    assert "beams.0.direction" in scheme.inner_text("#problem")
    first.fill("1")
    check(scheme)
    assert scheme.locator("#problem").is_hidden()


def test_another_atom_starts_anew(scheme: Page) -> None:
    """Choosing another atom offers its lines in a fresh beam."""
    scheme.select_option("#atom", "88Sr")
    scheme.wait_for_selector("body:not(.waiting)")
    assert scheme.locator("fieldset.beam").count() == 1
    assert "689" in scheme.inner_text('[data-part="line"]')


def test_caution_stands_beside_the_powers(scheme: Page) -> None:
    """The laser caution is on the page once beside the form and defers to the laser safety officer."""
    assert "laser safety officer" in scheme.inner_text(".caution")


def test_every_control_has_a_name(scheme: Page) -> None:
    """Selects and inputs are labelled, bars are decoration beside their numbers, and there is one main heading."""
    controls = "[...document.querySelectorAll('select,input')]"
    unnamed = scheme.evaluate(f"{controls}.filter(e => !e.labels.length && !e.ariaLabel).map(e => e.id)")
    assert unnamed == []
    assert scheme.locator("svg:not([aria-hidden])").count() == 0
    assert scheme.locator("h1").count() == 1


def test_works_from_the_keyboard(scheme: Page) -> None:
    """Enter in a field of the form checks the scheme."""
    scheme.fill("#field-z", "3")
    scheme.press("#field-z", "Enter")
    scheme.wait_for_selector("body:not(.waiting)")
    assert json.loads(scheme.text_content("#request") or "")["field"] == [1, 1, 3]


@pytest.mark.parametrize("width", [320, 700])
def test_narrow_windows_do_not_scroll_sideways(scheme: Page, width: int) -> None:
    """The page as a whole fits a phone; wide tables scroll in their own box."""
    scheme.set_viewport_size({"width": width, "height": 800})
    assert scheme.evaluate("document.documentElement.scrollWidth") <= width


def test_bench_and_findings_are_linked(scheme: Page, server: Server) -> None:
    """The page leads to the bench, the requests and the findings, and the bench leads here."""
    links = scheme.locator("nav a").evaluate_all("links => links.map(a => a.href)")
    assert links == [f"{server.url}/", f"{server.url}/docs#scheme", f"{server.url}/findings"]
    for link in links:
        assert httpx2.get(link).status_code == 200
    assert 'href="scheme"' in httpx2.get(server.url).text
