"""The page: valid, whole in one file, and everything hostile in it is only text."""

from __future__ import annotations

import re
from html.parser import HTMLParser

import pytest
from small_runs import dimerisation, nitrosyl_chloride

from meanfree.integrate.run import Run
from meanfree.integrate.single import integrate
from meanfree.report.figures import draw
from meanfree.report.kinetics import rate_constants
from meanfree.report.page import page
from meanfree.report.record import CaseRecord
from meanfree.report.summary import summarise

VOID = {"meta", "br", "hr", "img", "link", "input"}


class Reader(HTMLParser):
    """Collects tags, ids and everything that a browser would load; checks that tags close."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.open: list[str] = []
        self.ids: list[str] = []
        self.tags: set[str] = set()
        self.loads: list[str] = []
        self.handlers: list[str] = []
        self.references: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.add(tag)
        if tag not in VOID:
            self.open.append(tag)
        for key, value in attrs:
            if key == "id":
                self.ids.append(value or "")
            elif key.startswith("on"):
                self.handlers.append(key)
            elif key in {"src", "href", "xlink:href", "data", "action", "poster", "srcset"}:
                (self.references if (value or "").startswith("#") else self.loads).append(
                    value or ""
                )

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.handle_starttag(tag, attrs)
        if tag not in VOID:
            self.open.pop()

    def handle_endtag(self, tag: str) -> None:
        assert self.open, f"</{tag}> closes nothing"
        assert self.open.pop() == tag


def page_of(run: Run, text: str = "title = 'x'\n") -> str:
    record = CaseRecord("case", "case.toml", text, "0" * 64, {"temperature.value": "480 K"})
    summary = summarise(run, case=record.file, case_sha256=record.sha256, version="0")
    figures = {name: svg for name, (svg, _) in draw(run, summary).items()}
    return page(run, summary, rate_constants(run), record, figures)


def read(html: str) -> Reader:
    reader = Reader()
    reader.feed(html)
    reader.close()
    assert reader.open == []
    return reader


@pytest.fixture(scope="module")
def bulb(nocl_run: Run) -> str:
    return page_of(nocl_run)


def test_tags_close_and_ids_are_unique(bulb: str) -> None:
    reader = read(bulb)
    assert bulb.startswith("<!DOCTYPE html>")
    assert len(reader.ids) == len(set(reader.ids))
    assert {reference[1:] for reference in reader.references} <= set(reader.ids)


def test_nothing_is_loaded_and_nothing_runs(bulb: str) -> None:
    reader = read(bulb)
    assert reader.loads == []
    assert reader.handlers == []
    assert not reader.tags & {"script", "iframe", "object", "embed", "link", "base", "form"}
    styles = "".join(re.findall(r"<style.*?</style>", bulb, re.DOTALL))
    assert "@import" not in styles
    assert re.findall(r"url\((?!#)", bulb) == []
    assert "default-src 'none'" in bulb


def test_the_answers_come_before_the_figures(bulb: str) -> None:
    places = [
        bulb.index(words)
        for words in (
            "10 % of NOCl converted",
            "<svg",
            "Fill sheet",
            "collision limit",
            "<math",
            "Assumptions",
            "Cautions",
            "and their sources",
            "how to repeat it",
        )
    ]
    assert places == sorted(places)


def test_what_a_reader_needs_is_there(bulb: str) -> None:
    for words in (
        "after 14.4 min",
        "equilibrium stops it at 39.3 %",
        "filled to 185.0 torr at 296 K",
        "2 NOCl → 2 NO + Cl₂",
        "k per event",
        "steric factor",
        "local codes and licensed practice decide",
        "meanfree run case.toml --set &#39;temperature.value=480 K&#39;",
        "Active Thermochemical Tables",
        "0" * 64,
    ):
        assert words.lower() in bulb.lower(), words
    assert "np.float64" not in bulb
    assert "nan" not in re.findall(r"<td[^>]*>([^<]*)</td>", bulb)


HOSTILE = ("<script>alert(1)</script>", '"><img src=x onerror=alert(1)>', "$x^2$", "\x1b[31mred")


@pytest.mark.parametrize("text", HOSTILE)
def test_hostile_text_is_only_text(text: str) -> None:
    run = integrate(dimerisation(names=(text, "D")))
    html = page_of(run, text=f"title = '{text}'\n")
    reader = read(html)
    assert "script" not in reader.tags
    assert "img" not in reader.tags
    assert reader.handlers == []
    assert reader.loads == []
    assert "\x1b" not in html
    # the text itself is still to be read
    shown = text.replace("\x1b", "\\u001b")
    assert shown in _words(html)


def test_a_hostile_title_is_only_text() -> None:
    run = integrate(nitrosyl_chloride(title="</title><script>x</script>\u202eevil"))
    html = page_of(run)
    assert "script" not in read(html).tags
    assert "</title><script>x</script>\\u202eevil" in _words(html)


def _words(html: str) -> str:
    class Words(HTMLParser):
        def __init__(self) -> None:
            super().__init__(convert_charrefs=True)
            self.found: list[str] = []

        def handle_data(self, data: str) -> None:
            self.found.append(data)

    words = Words()
    words.feed(html)
    return "".join(words.found)
