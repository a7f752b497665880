"""`meanfree window CASE`: a map of the time to a goal over two numbers."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

import typer

from meanfree.cli._common import AsJson, Out, Quiet, Replace, Settings
from meanfree.cli.documents import carry_out
from meanfree.cli.each_case import Cases
from meanfree.errors import InputError, Problem

if TYPE_CHECKING:
    from meanfree.case import LoadedCase
    from meanfree.experiment.experiment import Experiment
    from meanfree.planning.window_reasons import Axis
    from meanfree.progress import Progress
    from meanfree.report.document import Document
    from meanfree.report.record import CaseRecord

MOST = 1000
SPAN = 0.15
"""Without a range a temperature is mapped so much up and down, anything else ten times."""


def window(
    cases: Cases,
    conversion: Annotated[
        str | None,
        typer.Option(metavar="X", help="Conversion of the watched gas; else 0.5, a half-life."),
    ] = None,
    across: Annotated[
        str | None, typer.Option(metavar="ADDRESS", help="To the right; else the temperature.")
    ] = None,
    across_range: Annotated[
        tuple[str, str] | None, typer.Option(metavar="LOW HIGH", help="Its range.")
    ] = None,
    up: Annotated[
        str | None, typer.Option(metavar="ADDRESS", help="Upwards; else the watched gas filled.")
    ] = None,
    up_range: Annotated[
        tuple[str, str] | None, typer.Option(metavar="LOW HIGH", help="Its range.")
    ] = None,
    points: Annotated[int, typer.Option(metavar="N", help="Points each way.")] = 100,
    settings: Settings = None,
    out: Out = None,
    replace: Replace = False,
    as_json: AsJson = False,
    quiet: Quiet = False,
) -> None:
    """Map the time to a conversion over two numbers of a case, and where a run is no use.

    Bounds come from the case: warm_up and patience under [plan], rated_pressure of the vessel.
    With several cases, --out names the folder that holds a folder for each.
    """
    problems = []
    if not 10 <= points <= MOST:
        problems.append(Problem("--points", f"{points}", f"a number from 10 to {MOST}"))
    for name, address, span in (("across", across, across_range), ("up", up, up_range)):
        if address is None and span is not None:
            problems.append(Problem(f"--{name}-range", "a range alone", f"--{name} beside it"))
    if problems:
        raise InputError(problems)
    arguments: list[str] = [] if conversion is None else ["--conversion", conversion]
    for name, address, span in (("across", across, across_range), ("up", up, up_range)):
        arguments += [] if address is None else [f"--{name}", address]
        arguments += [] if span is None else [f"--{name}-range", *span]
    arguments += [] if points == 100 else ["--points", str(points)]

    def work(case: LoadedCase, record: CaseRecord, progress: Progress) -> Document:
        from meanfree.planning.window import window as find
        from meanfree.report.planning.window import window_document

        experiment = case.experiment
        level = _level(conversion)
        x = _axis(experiment, across or _first(experiment), across_range, points, "across")
        y = _axis(experiment, up or _second(experiment, x.address), up_range, points, "up")
        if x.address == y.address:
            raise InputError.at("--up", f'"{y.address}" both ways', "two addresses")
        found = find(experiment, case.planning, level, x, y, progress)
        return window_document(found, experiment, record, arguments)

    carry_out(
        "window",
        cases,
        settings,
        work,
        out=out,
        replace=replace,
        as_json=as_json,
        quiet=quiet,
    )


def _level(text: str | None) -> float:
    from meanfree.units import QuantityError, read_number

    if text is None:
        return 0.5
    try:
        level = read_number(float(text) if _is_number(text) else text, "fraction").value
    except QuantityError as error:
        raise InputError.at("--conversion", error.found, error.expected) from None
    if not 0 < level < 1:
        raise InputError.at("--conversion", f"{level:g}", "a fraction between 0 and 1")
    return level


def _is_number(text: str) -> bool:
    try:
        float(text)
    except ValueError:
        return False
    return True


def _first(experiment: Experiment) -> str:
    from meanfree.experiment.inputs import inputs

    if "temperature.value" in inputs(experiment):
        return "temperature.value"
    raise InputError.at("--across", "nothing, and no one temperature", "an address")


def _second(experiment: Experiment, taken: str) -> str:
    from meanfree.experiment.inputs import inputs

    for address in (f"fill.gases.{experiment.watched}", "fill.total", "vessel.volume"):
        if address in inputs(experiment) and address != taken:
            return address
    raise InputError.at("--up", "nothing", "an address")


def _axis(
    experiment: Experiment, address: str, span: tuple[str, str] | None, points: int, name: str
) -> Axis:
    from meanfree.case.addresses import input_at, number_at
    from meanfree.planning.window import axis

    known = input_at(experiment, address, f"--{name}")
    if span is not None:
        low, high = (number_at(known, text, f"--{name}-range") for text in span)
    elif known.quantity.dimension == "temperature":
        kelvin = known.value - known.low
        low, high = known.low + (1 - SPAN) * kelvin, known.low + (1 + SPAN) * kelvin
    elif known.value > 0:
        low, high = known.value / 10, min(known.value * 10, known.high)
    else:
        raise InputError.at(f"--{name}-range", "nothing for a number of 0", "LOW HIGH")
    return axis(known, low, high, points)
