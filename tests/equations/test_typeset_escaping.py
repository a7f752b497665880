"""Whatever a case calls its gases, it stays text in every output."""

from __future__ import annotations

import re
import shutil
import subprocess
from dataclasses import replace
from pathlib import Path
from xml.etree import ElementTree

import pytest
from random_experiments import random_experiment
from written_cases import dinitrogen_tetroxide, simple

from meanfree.equations.typeset import equation_sheet

MATH = "{http://www.w3.org/1998/Math/MathML}"
HOSTILE = (
    "<script>alert(1)</script>",
    "a&b",
    "$x$",
    "\\input{secret}",
    "lump_1",
    "100%",
    "{#}~^",
    '"quoted"',
    "`tick'",
    "\u202ebackwards",
    "two\nlines",
    "α-pinene",
)


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_names_are_text_in_every_output(name: str) -> None:
    sheet = equation_sheet(replace(simple("A", name), title=name))
    for group in sheet.groups:
        for entry in group.entries:
            root = ElementTree.fromstring(entry.mathml)
            assert all(e.tag.startswith(f"{MATH}m") for e in root.iter())
            assert "\u202e" not in entry.text + entry.mathml + entry.latex
            assert "\n" not in entry.text
            unescaped = re.sub(r"\\[$&#_%{}]", "", entry.latex)
            assert not re.search(r"[$#%]|\\input", unescaped)
            assert "&" not in unescaped
    mathml = "".join(e.mathml for g in sheet.groups for e in g.entries)
    if name.isprintable():
        shown = "".join(ElementTree.fromstring(f"<x>{mathml}</x>").itertext())
        assert name in shown


def test_latex_of_hostile_names_compiles_and_reads_no_file(tmp_path: Path) -> None:
    if shutil.which("pdflatex") is None:
        pytest.skip("needs pdflatex")
    from meanfree.report.equation_files import latex

    names = [*HOSTILE, "N2O4", "c-C3H6"]
    sheets = [
        replace(equation_sheet(replace(simple("A", *names), title=HOSTILE[0]))),
        *(equation_sheet(random_experiment(i)) for i in (7, 19, 36)),
        equation_sheet(dinitrogen_tetroxide()),
    ]
    for place, sheet in enumerate(sheets):
        (tmp_path / f"sheet{place}.tex").write_text(latex(sheet), encoding="utf-8")
        done = subprocess.run(
            ["pdflatex", "-interaction=nonstopmode", "-halt-on-error", f"sheet{place}.tex"],
            cwd=tmp_path,
            capture_output=True,
            check=False,
        )
        assert done.returncode == 0, done.stdout.decode(errors="replace")[-800:]
        assert b"secret" not in done.stdout
        assert b"Missing character" not in done.stdout
