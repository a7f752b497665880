"""`report.html`: one file that opens anywhere, the answers first.

Everything that comes from a case is text until the template escapes it; only our own figures
and formulas go in as they are.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from html import escape

from jinja2 import Environment, PackageLoader, StrictUndefined, select_autoescape
from markupsafe import Markup

from meanfree.equations.typeset import equation_sheet
from meanfree.integrate.run import Run
from meanfree.report import sheets, wording
from meanfree.report.answers import answers
from meanfree.report.cautions import assumptions_of, grave_cautions
from meanfree.report.figures.profiles import drawn_gases
from meanfree.report.fill_sheet import fill
from meanfree.report.kinetics import RateConstant
from meanfree.report.record import CaseRecord, versions
from meanfree.report.run_models import RunSummary

_ID = re.compile(r'(\bid="|xlink:href="#|url\(#)')


def page(
    run: Run,
    summary: RunSummary,
    rows: Sequence[RateConstant],
    record: CaseRecord,
    figures: dict[str, str],
) -> str:
    """The page of a run as HTML; ``figures`` maps each figure's name to its SVG text."""
    environment = templates()
    title = wording.clean(run.experiment.title)
    captions = captions_of(run, summary)
    grave = list(grave_cautions(run, rows))
    text: str = environment.get_template("run.html.j2").render(
        title=title,
        purpose=wording.clean(run.experiment.purpose),
        file=wording.clean(record.file),
        version=record.version,
        answers=answers(run, summary),
        grave=grave,
        cautions=[caution for caution in summary.cautions if caution not in grave],
        notes=[wording.clean(note) for note in summary.notes],
        figures=[
            {"name": name, "svg": inlined(svg, name, captions[name]), "caption": captions[name]}
            for name, svg in figures.items()
        ],
        conversions=sheets.conversions(run, summary),
        half_lives=sheets.half_lives(run, summary),
        amounts=sheets.amounts(run, summary),
        asked=sheets.asked(run),
        fill=fill(run),
        constants=sheets.constants(rows),
        ceilings=sheets.ceilings(rows),
        convention=sheets.convention(rows),
        equations=equations_of(run),
        assumptions=list(assumptions_of(run.experiment)),
        inputs=sheets.inputs_in_use(run),
        gases=sheets.gases(run),
        solver=sheets.solver(summary),
        command=record.command_line("run"),
        sha256=record.sha256,
        versions=", ".join(f"{name} {version}" for name, version in versions().items()),
        settings=[f"{address} = {value}" for address, value in record.settings.items()],
        case_text=_lines(record.text),
    )
    return text


def templates() -> Environment:
    """Our templates; whatever goes into them is escaped."""
    return Environment(
        loader=PackageLoader("meanfree.report", "templates"),
        autoescape=select_autoescape(default=True, default_for_string=True),
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )


def inlined(svg: str, name: str, caption: str) -> Markup:
    """An SVG file as a part of a page: its ids made unique, metadata and comments left out."""
    start = svg.index("<svg")
    body = re.sub(r"<metadata>.*?</metadata>|<!--.*?-->", "", svg[start:], flags=re.DOTALL)
    body = _ID.sub(lambda match: f"{match.group(1)}{name}-", body)
    head = f'<svg role="img" aria-label="{escape(caption, quote=True)}"'
    return Markup(body.replace("<svg", head, 1))


@dataclass(frozen=True)
class Formula:
    """One equation: MathML, or text where there are too many to set."""

    mathml: Markup | None
    text: str
    remark: str


def equations_of(run: Run) -> list[tuple[str, list[Formula]]]:
    """The equations under their headings, and a remark where not all are shown."""
    sheet = equation_sheet(run.experiment)
    groups = [
        (
            wording.clean(group.heading),
            [
                Formula(
                    None if sheet.as_text_only else Markup(entry.mathml),
                    entry.text,
                    wording.clean(entry.remark),
                )
                for entry in group.entries
            ],
        )
        for group in sheet.groups
    ]
    return [*groups, (wording.clean(sheet.remark), [])] if sheet.remark else groups


def captions_of(run: Run, summary: RunSummary) -> dict[str, str]:
    """A caption for every figure."""
    experiment = run.experiment
    shown = set(drawn_gases(run))
    absent = [gas for gas in experiment.gases if gas.name not in shown]
    left_out = ""
    if absent:
        names = ", ".join(wording.chemical(gas) for gas in absent)
        left_out = f" Not drawn: {names}."
    watched = summary.watched_gas
    name = "" if watched is None else wording.chemical(experiment.gas_named[watched])
    marked = f" Dotted: half-lives of {name}." if _has_half_life(summary) else ""
    if not marked and watched is not None:
        gas = summary.gas(watched)
        if gas is not None and gas.time_to_half_of_equilibrium_s is not None:
            marked = f" Dotted: where {name} has gone half of the way to equilibrium."
    return {
        "profiles": f"Concentrations against time.{marked}{left_out}",
        "half_lives": (
            f"What is left of the reactants; half-lives of {name}, each from where the one "
            "before it ends."
            if _has_half_life(summary)
            else f"What is left of the reactants; {name} does not fall to half."
        ),
        "rates": "Rates of the steps, in events; a thin line is the reverse of the same colour.",
    }


def _has_half_life(summary: RunSummary) -> bool:
    watched = summary.gas(summary.watched_gas) if summary.watched_gas else None
    return watched is not None and watched.half_lives_s[:1] != [None]


def _lines(text: str) -> str:
    """The text of a case, line by line, control and direction characters made visible."""
    return "\n".join(
        wording.clean(line.expandtabs(4)) for line in text.replace("\r\n", "\n").split("\n")
    )
