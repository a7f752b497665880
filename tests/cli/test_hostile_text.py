"""Text of a case is text wherever it comes out: page, drawing, table, LaTeX, JSON, screen, browser.

The hostile case names itself, its gases' source, its readings, their columns and its own file as
badly as the schema lets it; real commands write their folders, real parsers read them.
"""

from __future__ import annotations

import csv
import json
import re
import shutil
import subprocess
import sys
from html.parser import HTMLParser
from pathlib import Path
from xml.etree import ElementTree

import pytest
from attacked import Said, said
from damage_values import CANARY, HOSTILE_TEXTS

pytestmark = pytest.mark.skipif(sys.platform == "win32", reason="names that it cannot hold")

SCRIPT = f"<script>document.title='{CANARY}'</script>"
IMAGE = f"<img src=x onerror=\"document.title='{CANARY}'\">"
TITLE = f"</title></style>{SCRIPT}{IMAGE}{{{{7*7}}}} $x$ \\input{{/etc/passwd}} ]]> --> &lt;b&gt;"
FORMULA = '=HYPERLINK("http://127.0.0.1:9/x";"y")+cmd|\' /C calc\'!A0'
READINGS = "=cmd<img src=x onerror=alert(1)>'&.csv"
NAME = "<svg onload=alert(1)>"
CASE = f"""
title = {json.dumps(TITLE)}
purpose = {json.dumps(IMAGE + " @SUM(1) {0.__class__} %s")}
labels = ["[A]", "(B,'x')", "C-_^"]

[vessel]
holds = "volume"
volume = "1 L"

[temperature]
mode = "isothermal"
value = "500 K"

[fill]
gases = {{ "[A]" = "50 torr", "C-_^" = "10 torr" }}

[run]
report_at = ["1 min"]

[[steps]]
name = "(x)'+-*_^"
reaction = "[A] -> (B,'x') + C-_^"
law = "fixed"
k = "1e-3 1/s"
source = {json.dumps(FORMULA)}

[[data]]
name = {json.dumps("@" + SCRIPT)}
file = {json.dumps(READINGS)}
time = {{ column = "=1+1", unit = "min" }}
signal = {{ column = {json.dumps(IMAGE.replace('"', ""))}, unit = "torr", is = "total pressure" }}

[fit]
parameters = ["steps.(x)'+-*_^.k"]
"""
COMMANDS = ("run", "equations", "ceiling", "fit")


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    place = tmp_path_factory.mktemp("hostile")
    (place / f"{NAME}.toml").write_text(CASE, encoding="utf-8")
    heading = ["=1+1", IMAGE.replace('"', "")]
    rows = [[t, 60 + 50 * (1 - 2.718281828 ** (-0.06 * t)) + 0.1 * (-1) ** t] for t in range(12)]
    with (place / READINGS).open("w", newline="", encoding="utf-8") as file:
        csv.writer(file).writerows([heading, *rows])
    return place


@pytest.fixture(scope="module")
def answers(folder: Path) -> dict[str, Said]:
    """What each command prints; its folder is left under ``outputs``."""
    found = {}
    for command in COMMANDS:
        found[command] = said([command, f"{NAME}.toml"], folder)
        assert found[command].status == 0, found[command].err
    return found


class Tags(HTMLParser):
    """The elements of a page with their attributes, and the text of its title."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.found: list[tuple[str, dict[str, str | None]]] = []
        self.title = ""

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.found.append((tag, dict(attrs)))

    def handle_data(self, data: str) -> None:
        if self.found and self.found[-1][0] == "title":
            self.title += data

    def handle_endtag(self, tag: str) -> None:
        if tag == "title":
            self.found.append(("end of title", {}))


ACTIVE = {"script", "img", "iframe", "object", "embed", "link", "base", "form", "foreignobject"}


def quiet(found: list[tuple[str, dict[str, str | None]]]) -> bool:
    """Nothing that runs, and nothing that is fetched."""
    return not any(
        tag in ACTIVE
        or any(key.startswith("on") for key in attributes)
        or any(
            not (attributes[key] or "").startswith("#")
            for key in ("src", "href", "xlink:href", "data", "action")
            if key in attributes
        )
        for tag, attributes in found
    )


def written(folder: Path, ending: str) -> list[Path]:
    found = sorted((folder / "outputs").rglob(f"*{ending}"))
    assert found, f"no {ending}"
    return found


@pytest.mark.slow
def test_pages_hold_text_and_no_elements_of_the_case(
    folder: Path, answers: dict[str, Said]
) -> None:
    pages = written(folder, ".html")
    assert len(pages) == len(COMMANDS)
    for path in pages:
        text = path.read_text(encoding="utf-8")
        reader = Tags()
        reader.feed(text)
        assert quiet(reader.found), path
        assert "</title></style><script>" in reader.title, path
        assert "49" not in reader.title  # {{7*7}} stays as it is written
        assert "default-src 'none'" in text


def test_the_reader_of_pages_would_see_what_runs() -> None:
    for text in (SCRIPT, IMAGE, NAME, '<a href="http://127.0.0.1">x</a>'):
        reader = Tags()
        reader.feed(text)
        assert not quiet(reader.found)


@pytest.mark.slow
def test_drawings_are_whole_and_inert(folder: Path, answers: dict[str, Said]) -> None:
    for path in written(folder, ".svg"):
        root = ElementTree.fromstring(path.read_text(encoding="utf-8"))
        names = {element.tag.rpartition("}")[2].lower() for element in root.iter()}
        assert not names & ACTIVE
        for element in root.iter():
            for key, value in element.attrib.items():
                assert not key.lower().startswith("on")
                assert "href" not in key or value.startswith("#")


@pytest.mark.slow
def test_no_cell_is_a_formula(folder: Path, answers: dict[str, Said]) -> None:
    """A number may begin with its sign; nothing else begins as a spreadsheet's formula does."""
    seen = ""
    for path in written(folder, ".csv"):
        with path.open(newline="", encoding="utf-8") as file:
            rows = list(csv.reader(file))
        assert len({len(row) for row in rows}) <= 1, path
        for cell in (cell for row in rows for cell in row):
            seen += cell
            number = re.fullmatch(r"-?[0-9.]+(e[+-]?[0-9]+)?", cell)
            assert number or not cell.lstrip().startswith(("=", "+", "-", "@", "\t", "\r")), cell
    assert f"'{FORMULA}" in seen


@pytest.mark.slow
def test_latex_and_json_hold_it_as_text(folder: Path, answers: dict[str, Said]) -> None:
    (tex,) = written(folder, ".tex")
    plain = tex.read_text(encoding="utf-8")
    assert "\\input" not in plain
    assert "/etc/passwd" in plain
    for path in written(folder, ".json"):
        json.loads(path.read_text(encoding="utf-8"))
    summary = json.loads((folder / "outputs" / NAME / "run" / "summary.json").read_text())
    assert summary["title"] == TITLE


@pytest.mark.slow
def test_screens_show_it_and_are_not_moved_by_it(folder: Path, answers: dict[str, Said]) -> None:
    for command, answer in answers.items():
        shown = answer.out + answer.err
        assert {c for c in shown if not c.isprintable()} <= {"\n"}, command
        assert "{{7*7}}" in " ".join(shown.split())


@pytest.mark.parametrize("text", [t for t in HOSTILE_TEXTS if t.strip()])
def test_any_text_is_kept_to_the_letter_or_refused(text: str, tmp_path: Path) -> None:
    """In title, purpose and source; `check` prints all three."""
    from damage_tables import toml_text

    tables = {"title": text, "purpose": text, "labels": ["A", "B"]} | {
        "vessel": {"holds": "volume", "volume": "1 L"},
        "temperature": {"mode": "isothermal", "value": "500 K"},
        "fill": {"gases": {"A": "50 torr"}},
        "steps": [
            {"name": "s", "reaction": "A -> B", "law": "fixed", "k": "1 1/s", "source": text}
        ],
    }
    (tmp_path / "case.toml").write_text(toml_text(tables), encoding="utf-8")
    answer = said(["check", "case.toml", "--json"], tmp_path)
    if answer.status == 2:
        keys = {one["key"] for one in json.loads(answer.out)["errors"]}
        assert keys <= {"title", "purpose", "steps.s.source"}
    else:
        assert answer.status == 0
        assert json.loads(answer.out)["title"] == text.strip()
    plain = said(["check", "case.toml"], tmp_path)
    assert plain.status == answer.status
    assert {c for c in plain.out + plain.err if not c.isprintable()} <= {"\n"}


BROWSER = next(filter(None, map(shutil.which, ("chromium", "chromium-browser"))), None)


def opened(page: Path, home: Path) -> str:
    """The document as a browser has it once its scripts have run."""
    assert BROWSER is not None
    words = [BROWSER, "--headless", "--no-sandbox", "--disable-gpu", f"--user-data-dir={home}"]
    quoted = page.resolve().as_uri()
    done = subprocess.run(
        [*words, "--virtual-time-budget=2000", "--dump-dom", quoted],
        capture_output=True,
        text=True,
        check=True,
    )
    return done.stdout


@pytest.mark.slow
@pytest.mark.skipif(BROWSER is None, reason="needs Chromium")
def test_nothing_runs_in_a_browser(folder: Path, answers: dict[str, Said], tmp_path: Path) -> None:
    for path in written(folder, ".html"):
        reader = Tags()
        reader.feed(opened(path, tmp_path / "home"))
        assert quiet(reader.found)
        assert "</title></style><script>" in reader.title
    # The same words where they are not escaped do run, so that the test can fail.
    (tmp_path / "bare.html").write_text(f"<!DOCTYPE html><title>before</title>{SCRIPT}")
    reader = Tags()
    reader.feed(opened(tmp_path / "bare.html", tmp_path / "home"))
    assert reader.title == CANARY
