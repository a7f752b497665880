"""[[data]] and [fit] in a case: what they may say, and each refusal by its whole text."""

from __future__ import annotations

import pytest
from measured_runs import DATA, case_text, csv, measured

from meanfree.errors import InputError

RUN = {"run.csv": csv({"t": [0, 10, 20, 30], "p": [632.0, 592.0, 558.0, 533.0]})}
FIT = '[fit]\nparameters = ["steps.d.k", "fill.gases.A"]\n'


def refused(tmp_path, data=DATA, fit=FIT):
    """Every problem as text."""
    with pytest.raises(InputError) as caught:
        measured(tmp_path, case_text() + data + fit, RUN)
    return [f"{p.key}: {p.found}; {p.expected}" for p in caught.value.problems]


def test_bounds_and_priors_in_the_units_of_the_case(tmp_path):
    fit = FIT + (
        'bounds = { "steps.d.k" = ["1e-3 L/mol/s", "1 L/mol/s"] }\n'
        'priors = { "fill.gases.A" = { value = "84.0 kPa", sd = "100 Pa" }, '
        '"steps.d.k" = { value = "1 L/mol/min", factor = 1.5 } }\n'
    )
    k, p = measured(tmp_path, case_text() + DATA + fit, RUN).request.asked
    assert (k.low, k.high) == (pytest.approx(0.06), pytest.approx(60))
    assert k.prior is not None
    assert (k.prior.value, k.prior.sd) == (pytest.approx(1.0), pytest.approx(0.5 * (1.5 - 1 / 1.5)))
    assert p.prior is not None
    assert p.prior.value == pytest.approx(84e3 / 133.322387415)
    assert p.prior.sd == pytest.approx(100 / 133.322387415)


def test_conditions_dotted_or_nested_mean_the_same(tmp_path):
    for text in ('"temperature.value" = "700 K"', 'temperature.value = "700 K"'):
        data = DATA + f"[data.conditions]\n{text}\n"
        run = measured(tmp_path, case_text() + data + FIT, RUN).runs[0]
        assert run.conditions == {"temperature.value": "700 K"}
        assert run.experiment.temperature.initial == 700.0


def test_a_whole_table_may_be_a_condition(tmp_path):
    text = case_text().replace('"0.5 L"', '"0.5 L"\nshape = { form = "sphere" }')
    data = DATA + '[data.conditions]\n"vessel.shape" = { surface = "300 cm^2" }\n'
    run = measured(tmp_path, text + data + FIT, RUN).runs[0]
    assert run.experiment.vessel.shape is not None
    assert run.experiment.vessel.shape.form == "stated"
    assert run.experiment.vessel.surface_to_volume == pytest.approx(60.0)


@pytest.mark.parametrize(
    ("more", "expected"),
    [
        (
            'bounds = { "steps.d.k" = ["1 L/mol/s"] }\n',
            "fit.bounds.steps.d.k: a list; a list of two: the lowest and the highest value",
        ),
        (
            'bounds = { "steps.d.k" = ["1 L/mol/min", "0.1 L/mol/min"] }\n',
            "fit.bounds.steps.d.k: 1 and 0.1; a lowest value below the highest",
        ),
        (
            'bounds = { "steps.d.k" = ["1 L/mol/min", "2 L/mol/min"] }\n',
            "fit.parameters.0: steps.d.k starting at 0.5 L/mol/min; "
            "a start from 1 to 2, its bounds",
        ),
        (
            'bounds = { "steps.d.k" = ["1 bar", "2 L/mol/min"] }\n',
            'fit.bounds.steps.d.k.0: "1 bar", a pressure; a rate constant of order 2 such as '
            '"1e3 L/mol/s"',
        ),
        (
            'bounds = { "vessel.volume" = ["1 L", "2 L"] }\n',
            'fit.bounds.vessel.volume: no parameter of the fit; one of "steps.d.k", "fill.gases.A"',
        ),
        (
            'priors = { "steps.d.k" = { value = "1 L/mol/s" } }\n',
            "fit.priors.steps.d.k: neither of sd and factor; one of them",
        ),
        (
            'priors = { "steps.d.k" = { value = "1 L/mol/s", sd = "0 L/mol/s" } }\n',
            'fit.priors.steps.d.k.sd: "0 L/mol/s"; a standard deviation above 0',
        ),
        (
            'loss = "soft"\n',
            'fit.loss: "soft"; one of "linear", "soft_l1", "huber", "cauchy" '
            '(did you mean "soft_l1"?)',
        ),
        (
            'order = { step = "e" }\n',
            'fit.order.step: "e", no step of the case; "d"',
        ),
        (
            'order = { step = "d", gas = "B" }\n',
            'fit.order.gas: "B", which d does not use up; "A"',
        ),
        (
            '[[fit.analyses]]\nkind = "wall"\n',
            'fit.analyses.0.step: nothing; "d"',
        ),
        (
            '[[fit.analyses]]\nkind = "wall"\nstep = "d"\ngas = "A"\n',
            'fit.analyses.0.gas: gas with kind = "wall"; step',
        ),
        (
            '[[fit.analyses]]\nkind = "pseudo-first-order"\ngas = "A"\npartner = "D"\n',
            'fit.analyses.0.partner: "D", no gas of the case; one of "A", "B"',
        ),
        (
            '[[fit.analyses]]\nkind = "relative rate"\ngas = "A"\nreference = "B"\n'
            'reference_k = "1 torr"\n',
            'fit.analyses.0.reference_k: "1 torr", a pressure; a rate constant of order 2 or a '
            'rate constant of order 1, such as "1e3 L/mol/s"',
        ),
    ],
)
def test_refusals_of_fit(tmp_path, more, expected):
    assert refused(tmp_path, fit=FIT + more) == [expected]


@pytest.mark.parametrize(
    ("old", "new", "expected"),
    [
        (
            'time = { column = "t", unit = "min" }',
            "",
            'data.0.time: nothing; time = { column = "t", unit = "min" }, say',
        ),
        (
            'unit = "min" }',
            'unit = "min" }\ntemperature = { column = "t", unit = "K" }',
            "data.0.temperature: temperature of a total pressure; time = … in its place",
        ),
        (
            'column = "p", unit = "mmHg", is',
            'column = 0, unit = "mmHg", is',
            "data.0.signal.column: 0; a name in the heading, or a number from 1",
        ),
        (
            ', unit = "mmHg", is = "total pressure"',
            ', is = "total pressure"',
            'data.0.signal.unit: nothing; the unit of the column, of a pressure such as "50 torr"',
        ),
        (
            'is = "total pressure"',
            'path = "1 cm", is = "total pressure"',
            "data.0.signal.path: path of a total pressure; this key with an absorbance only",
        ),
        (
            'unit = "mmHg", is = "total pressure"',
            'is = "absorbance"',
            'data.0.signal.path: nothing; the length of the light\'s way, such as "10 cm"|'
            "data.0.signal.coefficients: nothing; the gases that absorb, such as "
            '{ NO2 = "85 L/mol/cm" }',
        ),
        (
            'is = "total pressure" }',
            'is = "total pressure" }\nsd = "-1 torr"',
            'data.0.sd: "-1 torr"; a pressure of at least 0 Pa, "2 %", or { column = "s" }',
        ),
        (
            'is = "total pressure" }',
            'is = "total pressure" }\nsd = { column = "s", unit = "torr" }',
            'data.0.sd: a table; a table { column = "s" } and nothing else',
        ),
        (
            'is = "total pressure" }',
            'is = "total pressure" }\ndecimal = ","\ndelimiter = "comma"',
            "data.0.delimiter: the comma, which is the decimal mark too; another delimiter",
        ),
        (
            'is = "total pressure" }',
            'is = "conversion of B" }',
            "data.0.signal.is: conversion of what is not filled (B); a filled gas",
        ),
    ],
)
def test_refusals_of_data(tmp_path, old, new, expected):
    assert DATA.count(old) == 1
    assert refused(tmp_path, data=DATA.replace(old, new)) == expected.split("|")
