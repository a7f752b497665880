"""Walls, pseudo-first-order, relative and initial rates: each a line, its numbers, and words."""

from __future__ import annotations

import math
from collections.abc import Sequence

from meanfree.measured.analyses import Findings
from meanfree.measured.initial_rates import InitialRates
from meanfree.measured.pseudo_first_order import PseudoFirstOrder
from meanfree.measured.relative_rates import RelativeRate
from meanfree.measured.straight_lines import Line
from meanfree.measured.walls import WallTest
from meanfree.report import wording
from meanfree.report.document import Drawing, Section
from meanfree.report.figures import straight, style
from meanfree.report.measured import numbers
from meanfree.report.rows import Sheet

NUMBERS = "The line (95 % intervals)"


def plots(found: Findings) -> list[Section]:
    """A section for each analysis that was asked for."""
    sections = [_wall(one, n) for n, one in enumerate(found.walls)]
    sections += [_pseudo(one, n) for n, one in enumerate(found.pseudo)]
    sections += [
        _relative(one, wanted.reference_unit, n) for n, (wanted, one) in enumerate(found.relative)
    ]
    return sections + [_initial(one, n) for n, one in enumerate(found.initial)]


def _drawn(
    name: str, n: int, line: Line, labels: tuple[str, str], caption: str, *, from_zero: bool = True
) -> tuple[Drawing, ...]:
    with style.drawing():
        figure = straight.line_figure(line, *labels, from_zero=from_zero)
        svg, png = style.rendered(figure)
    return (Drawing(name if n == 0 else f"{name}_{n + 1}", svg, png, caption),)


def _rows(heading: Sequence[str], rows: Sequence[Sequence[str]], words: tuple[int, ...]) -> Sheet:
    return Sheet(list(heading), [list(row) for row in rows], words)


def _wall(one: WallTest, n: int) -> Section:
    drawing = _drawn("walls", n, one.line, ("S/V (1/m)", "k per event (1/s)"), "k against S/V.")
    line = _rows(
        ("Quantity", "Value", "Of"),
        (
            ("k of the gas", numbers.of_interval(one.gas, 1.0, "1/s"), "intercept"),
            ("wall", numbers.of_interval(one.wall, 1.0, "m/s"), "slope: k of the wall over S/V"),
            ("chance", wording.number(one.probability, 2), "probability of such a slope by chance"),
        ),
        (0, 2),
    )
    runs = _rows(
        ("Run", "S/V (1/m)", "k per event (1/s)", "wall"),
        [
            (
                wording.clean(run),
                wording.number(x, 4),
                _with_bar(one.line, i),
                wording.percent(s, 2),
            )
            for i, (run, x, s) in enumerate(zip(one.runs, one.line.x, one.shares, strict=True))
        ],
        (0,),
    )
    heading = f"Wall test of {wording.clean(one.step)}"
    return Section(heading, (one.words,), drawing, ((line, NUMBERS), (runs, "Run by run")))


def _with_bar(line: Line, i: int) -> str:
    error = math.nan if line.sd is None else float(line.sd[i])
    return numbers.with_error(float(line.y[i]), error)


def _pseudo(one: PseudoFirstOrder, n: int) -> Section:
    gas, partner = wording.clean(one.gas), wording.clean(one.partner)
    caption = f"k\u2032 of {gas} against the concentration of {partner}."
    drawing = _drawn("pseudo", n, one.line, (f"[{partner}] (mol/m³)", "k\u2032 (1/s)"), caption)
    loss = numbers.of_interval(one.slope, 1e3, "L/mol/s")
    event = numbers.of_interval(one.slope, 1e3 / one.per_event, "L/mol/s")
    line = _rows(
        ("Quantity", "Value", "Of"),
        (
            ("k", loss, f"slope: loss of {gas}"),
            ("k", event, "per event"),
            ("intercept", numbers.of_interval(one.intercept, 1.0, "1/s"), f"without {partner}"),
        ),
        (0, 2),
    )
    runs = _rows(
        ("Run", f"[{partner}] (mol/m³)", "k\u2032 (1/s)", f"{partner} over {gas}"),
        [
            (
                wording.clean(decay.run),
                wording.number(decay.partner, 4),
                numbers.with_error(decay.rate, decay.error),
                wording.number(decay.excess),
            )
            for decay in one.decays
        ],
        (0,),
    )
    texts = tuple(wording.clean(text) for text in one.words)
    return Section("Pseudo-first-order", texts, drawing, ((line, NUMBERS), (runs, "Run by run")))


def _relative(one: RelativeRate, unit: str, n: int) -> Section:
    gas, reference = wording.clean(one.gas), wording.clean(one.reference)
    labels = f"ln(c0/c) of {reference}", f"ln(c0/c) of {gas}"
    caption = f"Loss of {gas} against that of {reference}; the slope is the ratio of k."
    rows = [
        (f"k({gas})/k({reference})", numbers.of_interval(one.ratio), "line through the origin"),
        ("with an intercept", numbers.of_interval(one.free.slope_interval), "slope"),
        ("with an intercept", numbers.of_interval(one.free.intercept_interval), "intercept"),
    ]
    if one.k is not None:
        rows.append((f"k({gas})", numbers.of_interval(one.k, 1.0, unit), "ratio times reference"))
    sheet = _rows(("Quantity", "Value", "Of"), rows, (0, 2))
    drawing = _drawn("relative", n, one.line, labels, caption)
    texts = tuple(wording.clean(text) for text in one.words)
    return Section("Relative rate", texts, drawing, ((sheet, NUMBERS),))


def _initial(one: InitialRates, n: int) -> Section:
    gas = wording.clean(one.gas)
    labels = f"ln([{gas}]/(mol/m³))", "ln(rate/(mol/m³/s))"
    caption = f"Initial rate of loss of {gas} against its concentration."
    drawing = _drawn("initial_rates", n, one.line, labels, caption, from_zero=False)
    rows = _rows(
        ("Run", f"[{gas}] (mol/m³)", "Initial rate (mol/m³/s)", "Readings"),
        [
            (
                wording.clean(rate.run),
                wording.number(rate.concentration, 4),
                numbers.with_error(rate.rate, rate.error),
                f"{rate.count}",
            )
            for rate in one.rates
        ],
        (0,),
    )
    texts = tuple(wording.clean(text) for text in one.words)
    return Section("Initial rates", texts, drawing, ((rows, "Run by run"),))
