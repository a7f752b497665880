"""What `collide` leaves where a folder is named: page, figure, summary and manifest."""

from __future__ import annotations

import json
import shlex
from collections.abc import Sequence
from pathlib import Path

from meanfree.files import MANIFEST, OWNER_KEY
from meanfree.report import wording
from meanfree.report.figures import arrhenius, style
from meanfree.report.folder import leave
from meanfree.report.page import inlined, templates
from meanfree.report.pair import sheets
from meanfree.report.pair.cautions import CONVENTIONS, ON_SURFACE
from meanfree.report.pair.question import PairQuestion
from meanfree.report.pair.summary import CollideSummary
from meanfree.report.record import versions


def owner_of_pair(question: PairQuestion) -> str:
    """The name under which a folder belongs to two gases, whatever the conditions."""
    return "collide " + " ".join(gas.name for gas in question.gases)


def write_pair(
    question: PairQuestion,
    summary: CollideSummary,
    folder: Path,
    *,
    arguments: Sequence[str],
    replace: bool,
) -> list[Path]:
    """Write everything and return the paths, the page first.

    ``arguments`` are those of the command, as they must be given to repeat it. Raises `InputError`
    where the folder cannot be used, `ComputationError` for a full disk.
    """
    with style.drawing():
        svg, png = style.rendered(arrhenius.figure(question))
    command = shlex.join(["meanfree", "collide", *arguments])
    owner = owner_of_pair(question)
    manifest = {OWNER_KEY: owner, "command": command, "versions": versions()}
    texts = {
        "summary.json": summary.to_json(),
        "report.html": page(question, summary, svg, command),
        "arrhenius.svg": svg,
        MANIFEST: json.dumps(manifest, indent=2, ensure_ascii=False) + "\n",
    }
    return leave(folder, texts, {"arrhenius.png": png}, owner=owner, replace=replace)


def page(question: PairQuestion, summary: CollideSummary, svg: str, command: str) -> str:
    """The page as HTML; ``svg`` is the text of the figure."""
    said = caption(question)
    environment = templates()
    text: str = environment.get_template("collide.html.j2").render(
        title=sheets.title(question),
        version=summary.version,
        answers=sheets.answers(question, summary),
        cautions=summary.cautions,
        figure=inlined(svg, "arrhenius", said),
        caption=said,
        pair=sheets.pair_sheet(question, summary),
        gases=sheets.gases_sheet(question, summary),
        amounts=sheets.amount_in_words(question),
        conventions=[*CONVENTIONS, *([ON_SURFACE] if question.in_plane else [])],
        sources=sheets.sources_sheet(question, summary),
        command=wording.clean(command),
        versions=", ".join(f"{name} {version}" for name, version in versions().items()),
    )
    return text


def caption(question: PairQuestion) -> str:
    """What the figure shows."""
    names = " + ".join(wording.chemical(gas) for gas in question.gases)
    at = wording.temperature(question.temperature.value)
    if not question.has_threshold:
        return f"The ceiling Z of {names} against temperature; the dot is {at}."
    return (
        f"The rate constant k of {names} against temperature under its ceiling Z, which it would "
        f"reach if every encounter reacted; the dots are {at}."
    )
