"""Sensitivities and uncertainties as answers, tables, figures and records."""

from __future__ import annotations

import math

import numpy as np
from pydantic import BaseModel, ConfigDict

from meanfree.experiment.experiment import Experiment
from meanfree.integrate.run import Run
from meanfree.planning.readings import Reading
from meanfree.planning.sensitivity import Knob, Sensitivities
from meanfree.planning.uncertainty import BAND, Uncertainty
from meanfree.report import wording
from meanfree.report.document import Drawing, Section
from meanfree.report.figures import spread as figures
from meanfree.report.figures import style
from meanfree.report.planning.naming import in_words
from meanfree.report.rows import Answer, Sheet
from meanfree.report.tables import Cell, to_csv

MOST_NAMED = 3


class _Record(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class SensitivityAnswer(_Record):
    """d ln(answer)/d ln(input); null: the answer is not reached."""

    answer: str
    gas: str | None
    level: float | None
    time_s: float | None
    input: str
    addresses: list[str]
    value: float | None

    @classmethod
    def all_of(cls, found: Sensitivities) -> list[SensitivityAnswer]:
        """Every sensitivity, answer by answer."""
        return [
            cls(
                answer=reading.kind,
                gas=reading.gas or None,
                level=reading.level or None,
                time_s=reading.times[column] if reading.times else None,
                input=knob.name,
                addresses=list(knob.addresses),
                value=_finite(values[row, column]),
            )
            for reading, values in zip(found.readings, found.values, strict=True)
            for column in range(reading.columns)
            for row, knob in enumerate(found.knobs)
        ]


class InputAnswer(_Record):
    """One uncertain input and its Sobol indices for the first answer."""

    name: str
    addresses: list[str]
    spread: str
    size: float
    first_order: float | None
    first_order_error: float | None
    total: float | None
    total_error: float | None


class UncertaintyAnswer(_Record):
    """Quantiles of the time to the goal [s] (null: not reached in that share of runs)."""

    runs: int
    levels: list[float]
    time_quantiles_s: list[float | None]
    reached_share: float
    convergence_runs: list[int]
    convergence_median_s: list[float | None]
    inputs: list[InputAnswer]

    @classmethod
    def of(cls, found: Uncertainty) -> UncertaintyAnswer:
        """The record of the first reading."""
        indices = found.indices
        return cls(
            runs=found.runs,
            levels=list(BAND),
            time_quantiles_s=[_finite(value) for value in found.quantiles[0][:, 0]],
            reached_share=float(found.reached[0][0]),
            convergence_runs=list(found.counts),
            convergence_median_s=[_finite(entry[2, 0]) for entry in found.growing[0]],
            inputs=[
                InputAnswer(
                    name=entry.name,
                    addresses=list(entry.addresses),
                    spread=entry.spread,
                    size=entry.size,
                    first_order=None if indices is None else _finite(indices.first[i, 0]),
                    first_order_error=None
                    if indices is None
                    else _finite(indices.first_error[i, 0]),
                    total=None if indices is None else _finite(indices.total[i, 0]),
                    total_error=None if indices is None else _finite(indices.total_error[i, 0]),
                )
                for i, entry in enumerate(found.inputs)
            ],
        )


def _finite(value: float) -> float | None:
    return float(value) if math.isfinite(value) else None


def knob_words(knob: Knob, experiment: Experiment) -> str:
    """``k of decomposition``, ``NOCl filled``, ``temperature``."""
    if knob.kind == "k":
        return f"k of {wording.clean(knob.name)}"
    return in_words(knob.name, experiment)


def reading_words(reading: Reading, experiment: Experiment) -> str:
    """What a reading is, as a heading."""
    gas = wording.chemical(experiment.gas_named[reading.gas]) if reading.gas else ""
    if reading.kind == "reaction time":
        return f"time to {wording.percent(reading.level)} of {gas}"
    if reading.kind == "yield time":
        return f"time to a yield of {wording.number(reading.level)} {gas}"
    return f"{reading.kind} of {gas}" if gas else reading.kind


def sensitivity_answers(found: Sensitivities, experiment: Experiment) -> list[Answer]:
    """The inputs that the first reading follows most."""
    values = found.values[0][:, 0]
    order = [i for i in np.argsort(-np.abs(values)) if np.isfinite(values[i])]
    if not order:
        return [Answer("What it follows", "nothing: the goal is not reached")]
    texts = [
        f"{knob_words(found.knobs[i], experiment)} {wording.number(float(values[i]))}"
        for i in order[:MOST_NAMED]
    ]
    note = "d ln(answer)/d ln(input): per cent for each per cent"
    return [Answer(f"What the {found.readings[0].kind} follows", " · ".join(texts), note)]


def sensitivity_section(
    found: Sensitivities, experiment: Experiment, goal: str
) -> tuple[Section, str]:
    """The section of the page, and the table as CSV."""
    names = [knob_words(knob, experiment) for knob in found.knobs]
    with style.drawing():
        ranked = style.rendered(figures.ranked(found, names, experiment))
        over = style.rendered(figures.against_time(found, names, experiment))
    single = [r for r, reading in enumerate(found.readings) if not reading.times]
    heading = ["Input", *(reading_words(found.readings[r], experiment) for r in single)]
    rows = [
        [names[i], *(_shown(found.values[r][i, 0]) for r in single)]
        for i in range(len(found.knobs))
    ]
    drawings = (
        Drawing("sensitivities", *ranked, f"What the time to {goal} follows, the most on top."),
        Drawing(
            "sensitivities_time",
            *over,
            "The same for what is reached, against time: where a curve is 1, a per cent more of "
            "the input gives a per cent more.",
        ),
    )
    text = (
        "d ln(answer)/d ln(input): by how many per cent the answer grows when the input grows by "
        "one per cent. A temperature is turned on the kelvin scale."
    )
    table = to_csv(
        ("answer", "gas", "level", "time_s", "input", "value"),
        [
            (e.answer, e.gas, e.level, e.time_s, e.input, e.value)
            for e in SensitivityAnswer.all_of(found)
        ],
    )
    sheets = ((Sheet(heading, rows, words=(0,)), "Sensitivities (sensitivities.csv)"),)
    return Section("Sensitivity", (text,), drawings, sheets), table


def _shown(value: float) -> str:
    if not math.isfinite(value):
        return "–"
    return "0" if abs(value) < 1e-6 else wording.number(float(value))


def uncertainty_answers(found: Uncertainty, goal: str, experiment: Experiment) -> list[Answer]:
    """The interval of the time to the goal, and what it comes from."""
    low, _, middle, _, high = found.quantiles[0][:, 0]
    reached = float(found.reached[0][0])
    note = f"19 times in 20; median {wording.duration(_finite(middle))}"
    if reached < 1:
        note += f"; reached in {wording.percent(reached)} of the runs"
    interval = f"{wording.duration(_finite(low))} to {wording.duration(_finite(high))}"
    answers = [Answer(f"Under uncertainty: {goal}", interval, note)]
    if found.indices is not None:
        total = found.indices.total[:, 0]
        most = int(np.argmax(total))
        share = wording.percent(min(float(total[most]), 1.0), 2)
        name = in_words(found.inputs[most].name, experiment)
        answers.append(Answer("Mostly from", name, f"{share} of the variance of its logarithm"))
    return answers


def uncertainty_section(found: Uncertainty, run: Run, goal: str) -> tuple[Section, dict[str, str]]:
    """The section of the page, and its tables as CSV."""
    with style.drawing():
        bands = style.rendered(figures.bands(found, run))
        growth = style.rendered(figures.convergence(found))
    drawings = [
        Drawing(
            "bands",
            *bands,
            "What is reached, with its median and the bands that hold two runs in three (dark) "
            "and 19 in 20 (light).",
        ),
        Drawing(
            "convergence",
            *growth,
            f"Convergence: quantiles of the time to {goal} against the number of runs.",
        ),
    ]
    heading = ["Input", "one standard deviation"]
    heading += ["first order", "total"] if found.indices is not None else []
    rows = []
    for i, entry in enumerate(found.inputs):
        row = [in_words(entry.name, run.experiment), wording.clean(entry.origin)]
        if found.indices is not None:
            row.append(_with_error(found.indices.first[i, 0], found.indices.first_error[i, 0]))
            row.append(_with_error(found.indices.total[i, 0], found.indices.total_error[i, 0]))
        rows.append(row)
    levels = ["2.5 %", "16 %", "median", "84 %", "97.5 %"]
    quantiles = [wording.duration(_finite(value)) for value in found.quantiles[0][:, 0]]
    sheets = (
        (Sheet(levels, [quantiles], words=()), f"Time to {goal}: quantiles"),
        (Sheet(heading, rows, words=(0, 1)), "Uncertain inputs, and Sobol indices of ln(time)"),
    )
    if found.indices is None:
        sheets = (sheets[0], (sheets[1][0], "Uncertain inputs"))
    text = (
        f"{found.runs} runs with inputs drawn together by a scrambled Sobol sequence. A Sobol "
        "index is the share of the variance that an input makes alone (first order), or alone and "
        "together with others (total)."
    )
    return Section("Uncertainty", (text,), tuple(drawings), sheets), _tables(found)


def _with_error(value: float, error: float) -> str:
    if not math.isfinite(value):
        return "–"
    return f"{value:.3f} ± {error:.3f}".replace("-", "−")


def _tables(found: Uncertainty) -> dict[str, str]:
    times = found.readings[1].times
    rows: list[list[Cell]] = [
        [time, *(_finite(v) for v in found.quantiles[1][:, column])]
        for column, time in enumerate(times)
    ]
    header = ["time_s", *(f"{found.readings[1].kind}_q{level:g}" for level in BAND)]
    return {"bands.csv": to_csv(header, rows)}
