"""The review page: well-formed, closed in itself, escaped, honest. Read back with the standard library's parser."""

from __future__ import annotations

from html.parser import HTMLParser
from pathlib import Path

import pytest

from viewer.errors import ExportError
from viewer.export.index_page import DEFERENCE, EXAGGERATED, PageLoop, PageSection, PageTable, write_index

VOID = {"meta", "img", "source", "br", "link", "input", "hr"}
HOSTILE = '<script>alert("x")</script> & \'q\' "q" \x07'


class Page(HTMLParser):
    """Collects what a browser would see, and fails on tags that do not nest."""

    def __init__(self, text: str) -> None:
        super().__init__(convert_charrefs=True)
        self.open: list[str] = []
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.words = ""
        self.feed(text)
        self.close()
        assert self.open == []

    def handle_starttag(self, tag, attrs):
        self.tags.append((tag, dict(attrs)))
        if tag not in VOID:
            self.open.append(tag)

    def handle_endtag(self, tag):
        assert self.open.pop() == tag

    def handle_data(self, data):
        self.words += data

    def all(self, tag: str, key: str) -> list[str | None]:
        return [attrs[key] for name, attrs in self.tags if name == tag and key in attrs]


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    for name in ("a.gif", "a.png", "mode 2 # ü.gif", "tables/modes.csv"):
        (tmp_path / name).parent.mkdir(exist_ok=True)
        (tmp_path / name).write_bytes(b"x")
    return tmp_path


def sections(title: str = "baseline") -> list[PageSection]:
    rows = [{"design": title, "mode": 1, "frequency_hz": 84.64999}]
    return [
        PageSection(
            title,
            loops=(PageLoop(title, "a.gif", "a.png", caption=title, alt=title),),
            tables=(PageTable(title, rows, csv="tables/modes.csv"),),
        ),
        PageSection("What the redesign did", loops=(PageLoop("both", "mode 2 # ü.gif"),), comparison=True),
    ]


def test_comparisons_come_first_and_honest_words_are_there(folder):
    page = Page(
        write_index(folder, "Boom", sections(), condition="clamped root", cautions=["closure 7 %"]).read_text("utf-8")
    )
    assert page.words.index("What the redesign did", page.words.index(EXAGGERATED)) < page.words.index(
        "baseline", page.words.index(EXAGGERATED)
    )
    assert EXAGGERATED in page.words
    assert DEFERENCE in page.words
    assert "closure 7 %" in page.words
    assert "84.65" in page.words
    assert "Hz" in page.words


def test_names_are_escaped_everywhere(folder):
    text = write_index(folder, HOSTILE, sections(HOSTILE), condition=HOSTILE, cautions=[HOSTILE]).read_text("utf-8")
    page = Page(text)
    assert not [tag for tag, _ in page.tags if tag == "script"]
    assert page.words.count('<script>alert("x")</script>') >= 6  # shown as words, not run
    assert HOSTILE.rstrip("\x07") in page.all("img", "alt")
    assert "\x07" not in text


def test_nothing_is_fetched_from_elsewhere_and_links_resolve(folder):
    page = Page(write_index(folder, "Boom", sections()).read_text("utf-8"))
    from urllib.parse import unquote

    links = page.all("img", "src") + page.all("source", "srcset") + page.all("a", "href")
    assert links
    ids = set(page.all("section", "id"))
    for link in links:
        if link.startswith("#"):
            assert link[1:] in ids
        else:
            assert link.startswith("./")
            assert (folder / unquote(link)).is_file()
    assert not {tag for tag, _ in page.tags} & {"script", "link", "iframe", "object"}
    assert all(page.all("img", "alt"))


@pytest.mark.parametrize("path", ["../a.gif", "/a.gif", "https://example.org/a.gif", "missing.gif", "x\\a.gif"])
def test_links_that_leave_the_folder_or_lead_nowhere_are_refused(folder, path):
    with pytest.raises(ExportError):
        write_index(folder, "Boom", [PageSection("s", loops=(PageLoop("bad loop", path),))])
    assert not (folder / "index.html").exists()
