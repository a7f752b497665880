"""`meanfree collide GAS GAS`: how often two gases meet, and how fast they could react."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from meanfree.cli._common import AsJson, Quiet, Replace

if TYPE_CHECKING:
    from meanfree.report.pair.question import PairQuestion
    from meanfree.report.pair.summary import CollideSummary

First = Annotated[str, typer.Argument(metavar="GAS", help="A gas by name, as in a case.")]
Second = Annotated[
    str, typer.Argument(metavar="GAS", help="The other; the same once more for like partners.")
]
At = Annotated[str | None, typer.Option("--at", metavar="T", help="Temperature; else 298.15 K.")]
Pressure = Annotated[
    str | None, typer.Option("--pressure", metavar="p", help="Of both together; else 1 bar.")
]
Plane = Annotated[bool, typer.Option("--plane", help="Molecules that move freely on a surface.")]
Coverage = Annotated[
    str | None,
    typer.Option("--coverage", metavar="c", help="Of both together on the surface, with --plane."),
]
Threshold = Annotated[
    str | None,
    typer.Option("--threshold", metavar="E0", help="Least energy along the line of centres."),
]
Slope = Annotated[
    str | None, typer.Option("--Ea", metavar="E", help="Activation energy, instead of E0.")
]
MoleFraction = Annotated[
    list[str] | None,
    typer.Option("--mole-fraction", metavar="GAS=x", help="Of the mixture; else half and half."),
]
Diameter = Annotated[
    list[str] | None,
    typer.Option("--diameter", metavar="GAS=d", help="Instead of the library's. May be repeated."),
]
Cas = Annotated[
    list[str] | None,
    typer.Option("--cas", metavar="GAS=NUMBER", help="Which compound a name means; or none."),
]
FormulaOf = Annotated[
    list[str] | None,
    typer.Option("--formula", metavar="GAS=FORMULA", help="What a name is made of."),
]
Into = Annotated[
    Path | None,
    typer.Option("--out", metavar="FOLDER", help="Leave page, figure and summary there."),
]


def collide(
    first: First,
    second: Second,
    at: At = None,
    pressure: Pressure = None,
    threshold: Threshold = None,
    Ea: Slope = None,
    plane: Plane = False,
    coverage: Coverage = None,
    mole_fraction: MoleFraction = None,
    diameter: Diameter = None,
    cas: Cas = None,
    formula: FormulaOf = None,
    out: Into = None,
    replace: Replace = False,
    as_json: AsJson = False,
    quiet: Quiet = False,
) -> None:
    """Say how often two gases collide and how fast they could react at most; no case is needed.

    Nothing is written unless --out names a folder.
    """
    from meanfree.cli.pair_reading import PairArguments, question_of
    from meanfree.report.pair.summary import summarise_pair

    arguments = PairArguments(
        (first, second),
        at,
        pressure,
        coverage,
        plane,
        threshold,
        Ea,
        mole_fraction or (),
        diameter or (),
        cas or (),
        formula or (),
    )
    question = question_of(arguments)
    summary = summarise_pair(question)
    paths: list[str] = []
    if out is not None:
        from meanfree.report.pair.page import write_pair

        written = write_pair(question, summary, out, arguments=arguments.words(), replace=replace)
        paths = [str(path) for path in written]
    if as_json:
        typer.echo(summary.to_json().rstrip())
    elif quiet:
        typer.echo("\n".join(paths), nl=bool(paths))
    else:
        typer.echo(_told(question, summary, paths))


def _told(question: PairQuestion, summary: CollideSummary, paths: list[str]) -> str:
    """The answer as text for this screen."""
    from rich.console import RenderableType
    from rich.text import Text

    from meanfree.cli.screen import answers_grid, as_text, hanging, sheet_grid
    from meanfree.report.pair import sheets

    parts: list[RenderableType] = [
        Text(sheets.title(question), style="bold"),
        "",
        answers_grid(sheets.answers(question, summary)),
    ]
    for caution in summary.cautions:
        parts += ["", hanging("Caution:", caution)]
    parts += [
        "",
        sheet_grid(sheets.pair_sheet(question, summary)),
        "",
        Text(sheets.amount_in_words(question)),
        sheet_grid(sheets.gases_sheet(question, summary)),
        "",
        sheet_grid(sheets.sources_sheet(question, summary)),
    ]
    if paths:
        parts += ["", Text(f"{paths[0]} has the figure and everything above.")]
    return as_text(parts)
