"""`fit` as a document: answers, figures, tables and cautions."""

from __future__ import annotations

from collections.abc import Sequence

from meanfree.measured.analyses import Findings, pair_diameter
from meanfree.measured.arrhenius_lines import TemperatureSeries
from meanfree.measured.evidence import Candidate, evidence
from meanfree.measured.fits import Fit
from meanfree.measured.orders import in_words
from meanfree.report import wording
from meanfree.report.document import Document, Drawing, Section
from meanfree.report.figures import fitted, of_parameters, straight, style
from meanfree.report.figures.fitted import rate_unit
from meanfree.report.measured import sheets
from meanfree.report.measured.answering import SHOWN, answers
from meanfree.report.measured.plots import plots
from meanfree.report.measured.summarising import collisions, order_of_step, summarise
from meanfree.report.measured.tables import tables
from meanfree.report.planning.naming import with_formulas
from meanfree.report.record import CaseRecord
from meanfree.report.rows import Sheet

CONVENTION = (
    "k per event: the rate of a step is k times the concentrations, and a gas with net number ν "
    "changes at ν times that. For 2 A → …, −d[A]/dt = 2 k [A]², so that k for the loss of A is "
    "twice that per event. Estimates are in the unit and counting of the case file."
)
HOW = (
    "Least squares of the readings as they were read, all runs at once; rate constants and other "
    "positive numbers by their logarithms. Intervals are 95 %, from profile likelihoods: the "
    "others are fitted anew at every value."
)
DIAMETERS = (
    "Intervals of P and A over Z hold the uncertainty of the diameters as well (×÷ 1.1 unless the "
    "case says otherwise; common practice, no source)."
)


def fit_document(
    found: Findings,
    record: CaseRecord,
    ranking: Sequence[Candidate] = (),
    arguments: tuple[str, ...] = (),
) -> Document:
    """Everything that `fit` says."""
    experiment = found.plan.request.runs[0].experiment
    title = f"Fit: {wording.clean(experiment.title)}"
    sections = [*_fit_sections(found), *_order(found, ranking)]
    sections += [_series(found, one) for one in found.series]
    sections += plots(found)
    many = found.fit is not None and len(found.fit.estimates) > SHOWN
    screen = sheets.parameters(found.fit) if found.fit is not None and many else None
    notes = [HOW, CONVENTION] if found.fit is not None else [CONVENTION]
    if any(one.centres is not None for one in found.series):
        notes.append(DIAMETERS)
    return Document(
        command="fit",
        title=title,
        subtitle=wording.clean(experiment.purpose),
        answers=answers(found, ranking),
        summary=summarise(found, record, experiment.title, ranking).to_json(),
        grave=tuple(wording.clean(text) for text in _grave(found)),
        sections=tuple(sections),
        notes=tuple(notes),
        arguments=arguments,
        screen=screen,
        tables=tables(found),
        work={} if found.fit is None else {"evaluations": found.fit.solution.evaluations},
    )


def _grave(found: Findings) -> list[str]:
    """What a reader must see first: everything that makes a number less than it looks."""
    said = [] if found.fit is None else list(found.fit.findings)
    said += found.notes
    for one in found.series:
        said += [text for text in one.words if not text.startswith("The points show no")]
    for initial in found.initial:
        said += initial.words[1:]
    return said


def _fit_sections(found: Findings) -> list[Section]:
    fit = found.fit
    if fit is None:
        return [Section("Readings", sheets=((sheets.runs(found), "The runs"),))]
    named: list[tuple[Sheet | None, str]] = [
        (sheets.parameters(fit), "What was fitted (parameters.csv)"),
        (sheets.conventions(fit), "The same rate constants in every way of counting"),
        (sheets.collisions(collisions(fit)), "Against the collision limit"),
        (sheets.lines(found), "The textbook's straight line, for comparison"),
        (sheets.runs(found), "The runs (residuals.csv has every reading)"),
    ]
    texts = []
    if found.lines:
        texts.append(
            "The straight line weights the readings by what its transformation does to them: with "
            "1/c the smallest concentrations rule. It is here so that old values can be matched; "
            "the fit of the signal is the better one."
        )
    whole = tuple((sheet, caption) for sheet, caption in named if sheet is not None)
    first = Section("The fit", tuple(texts), _fit_drawings(fit), whole)
    return [first, *_parameter_section(fit)]


def _fit_drawings(fit: Fit) -> tuple[Drawing, ...]:
    drawings = []
    groups = fitted.groups(fit)
    for n, (words, places) in enumerate(groups):
        name = "fit" if len(groups) == 1 else f"fit_{n + 1}"
        caption = (
            f"{wording.clean(words[:1].upper() + words[1:])}: readings with their standard "
            "deviation, the fitted curve with its 95 % band, and residuals below."
        )
        with style.drawing():
            svg, png = style.rendered(fitted.figure(fit, places))
        drawings.append(Drawing(name, svg, png, caption))
    return tuple(drawings)


def _parameter_section(fit: Fit) -> list[Section]:
    with style.drawing():
        figures = {
            "profiles": of_parameters.profiles(fit),
            "correlations": of_parameters.correlations(fit),
        }
        captions = {
            "profiles": "Square root of the excess of the sum of squares against each parameter, "
            "the others fitted anew; dashed: where the 95 % interval ends. A straight V: the "
            "standard error tells it all.",
            "correlations": "Correlations of the estimates (positive numbers by their logarithms).",
        }
        drawings = tuple(
            Drawing(name, *style.rendered(figure), captions[name])
            for name, figure in figures.items()
            if figure is not None
        )
    return [Section("How well each is known", drawings=drawings)] if drawings else []


def _order(found: Findings, ranking: Sequence[Candidate]) -> list[Section]:
    sections = []
    test = found.order
    if test is not None:
        experiment = found.plan.request.runs[0].experiment
        texts = tuple(
            with_formulas(wording.clean(text[:1].upper() + text[1:]), experiment)
            for text in (in_words(test), test.words)
            if text
        )
        sheet = sheets.ranking(test.candidates)
        caption = f"Orders of {wording.clean(test.step)} in {wording.clean(test.gas)} by AICc"
        sections.append(Section("Which order", texts, sheets=((sheet, caption),)))
    if ranking:
        text = wording.clean(evidence(ranking))
        sheet = sheets.ranking(ranking)
        sections.append(Section("Which description", (text,), sheets=((sheet, "By AICc"),)))
    return sections


def _series(found: Findings, one: TemperatureSeries) -> Section:
    experiment = found.plan.request.runs[0].experiment
    step = next(step for step in experiment.steps if step.name == one.step)
    order = order_of_step(found, one.step)
    counted = step.law.inputs().get(step.law.counted)
    unit = rate_unit(order, "" if counted is None else counted.unit)
    partners = tuple(experiment.gas_named[gas] for gas in step.partners) if order == 2 else ()
    drawn = straight.arrhenius_figure
    with style.drawing():
        figure = drawn(one, order, unit, partners, pair_diameter(experiment, one.step))
        svg, png = style.rendered(figure)
    caption = (
        f"k of {wording.clean(one.step)} against 1/T: points, Arrhenius' law with its 95 % band"
        + (
            ", collision theory with P = 1 and the fitted E0, and the ceiling."
            if one.centres
            else "."
        )
    )
    name = f"arrhenius_{_safe(one.step)}" if len(found.series) > 1 else "arrhenius"
    return Section(
        f"Temperature series of {wording.clean(one.step)}",
        tuple(wording.clean(text) for text in one.words),
        (Drawing(name, svg, png, caption),),
        (
            (sheets.series(one, order, unit), "Arrhenius and line of centres"),
            (sheets.points(one, order, unit), "Rate constants, run by run"),
        ),
    )


def _safe(name: str) -> str:
    return "".join(c if c.isascii() and c.isalnum() else "_" for c in name)[:40]
