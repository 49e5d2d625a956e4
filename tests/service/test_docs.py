"""The documentation: complete, on its own origin, without inline script or style."""

import re
from html import escape
from html.parser import HTMLParser

import pytest
from starlette.testclient import TestClient

from levels.findings import KINDS
from service.problems import TYPES
from service.routes import QUESTIONS

PAGES = ("/docs", "/problems", "/findings", *(row.uri for row in TYPES.values()))


class Page(HTMLParser):
    """What a page loads and how it is written."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.loaded: list[str] = []
        self.links: list[str] = []
        self.ids: list[str] = []
        self.inline: list[str] = []
        self.open: list[str] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        given = dict(attrs)
        self.ids += [given["id"] or ""] if "id" in given else []
        if tag in ("script", "link", "img"):
            self.loaded.append(given.get("src") or given.get("href") or "")
        if tag == "a":
            self.links.append(given.get("href") or "")
        if "style" in given or any(name.startswith("on") for name in given) or tag == "style":
            self.inline.append(tag)
        if tag == "script" and not given.get("src"):
            self.inline.append(tag)
        if tag not in ("meta", "link", "input", "br", "img"):
            self.open.append(tag)

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag


@pytest.mark.parametrize("path", PAGES)
def test_page_is_whole_and_its_own(client: TestClient, path: str) -> None:
    """Each page is well-formed, loads only from its own origin, and has nothing inline that its policy would stop."""
    response = client.get(path)
    assert response.headers["content-type"] == "text/html; charset=utf-8"
    assert "script-src 'self'" in response.headers["content-security-policy"]
    page = Page(response.text)
    assert (page.open, page.inline) == ([], [])
    assert len(set(page.ids)) == len(page.ids)
    for address in (*page.loaded, *page.links):
        assert re.match(r"/[a-z]", address), address
        assert client.get(address).status_code == 200


def test_every_question_is_on_the_page(client: TestClient) -> None:
    """Each question has its section with path, parameters and a form that holds its example."""
    text = client.get("/docs").text
    for question in QUESTIONS:
        assert f'id="{question.name}"' in text
        assert f"{question.method} {question.path}" in text
        assert f'data-path="{question.path}"' in text
        assert escape(question.summary) in text


def test_every_finding_is_on_its_page(client: TestClient) -> None:
    """The page of findings has each code with its severity and meaning, from the library's table, and the caution."""
    text = client.get("/findings").text
    for kind in KINDS:
        assert f'<tr id="{kind.code}"><td><code>{kind.code}</code></td><td>{kind.severity}</td>' in text
        assert escape(kind.meaning) in text
    assert "laser safety officer" in text


def test_members_of_nested_bodies_are_on_the_page(client: TestClient) -> None:
    """What a beam and an axis of a scan may hold stands beside the body that holds them."""
    text = client.get("/docs").text
    section = text[text.index('<section id="scan">') :]
    section = section[: section.index("</section>")]
    for name in ("polariser", "waist", "misalignment (deg)", "photons_before_loss: "):
        assert name in section


def test_pages_have_etags(client: TestClient) -> None:
    """A page that is known already is not sent again."""
    tag = client.get("/docs").headers["etag"]
    assert client.get("/docs", headers={"If-None-Match": tag}).status_code == 304
