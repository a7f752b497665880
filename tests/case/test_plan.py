"""The table [plan]: what it means, and every mistake in one go."""

from __future__ import annotations

import math
from pathlib import Path

import pytest
from small_cases import GOOD, load_text

from meanfree.errors import InputError

PLAN = """
[plan]
warm_up = "4 min"
patience = "8 h"
detection = { NOCl = "0.5 torr", Cl2 = "10 ppm" }
narrowest = "4 mm"
conductance = "0.09 W/K"
correlations = [["steps.decomposition.A", "steps.decomposition.Ea", 0.98]]

[plan.tolerances]
"steps.decomposition.A" = "factor 1.5"
"steps.decomposition.Ea" = "2 kJ/mol"
"temperature.value" = "2 K"
"fill.gases.NOCl" = "1 %"

[plan.samples]
count = 6
signal = "partial pressure of NO"
sd = "0.2 torr"
dead_time = "2 min"
takes = 0.01
clock = "09:30"
parameters = ["steps.decomposition.A"]
"""

WRONG = """
[plan]
warm_up = "0 min"
patience = 8
detection = { NOC = "0.5 torr", Cl2 = "3 K" }
correlations = [["steps.decomposition.A", "temperature.value", 0.9]]

[plan.tolerances]
"steps.decomposition.B" = "1 %"
"steps.decomposition.Ea" = "factor 0.5"
"temperature.value" = "2 torr"

[plan.samples]
count = 0
signal = "pressure of NO"
clock = "25:00"
dead = "1 min"
"""


def test_what_it_means(tmp_path: Path) -> None:
    plan = load_text(tmp_path, GOOD + PLAN).planning
    assert plan.warm_up is not None
    assert plan.warm_up.value == 240.0
    assert plan.detection["Cl2"].kind == "fraction"
    assert plan.detection["NOCl"].quantity.value == pytest.approx(0.5 * 101325 / 760)
    sizes = {t.address: (t.spread, t.size) for t in plan.tolerances}
    assert sizes["steps.decomposition.A"] == ("factor", pytest.approx(math.log(1.5)))
    # in the unit of the file: kJ/mol and K
    assert sizes["steps.decomposition.Ea"] == ("absolute", pytest.approx(2.0))
    assert sizes["temperature.value"] == ("absolute", pytest.approx(2.0))
    assert sizes["fill.gases.NOCl"] == ("factor", pytest.approx(0.01))
    assert plan.correlations == (("steps.decomposition.A", "steps.decomposition.Ea", 0.98),)
    assert plan.samples.clock == 9.5 * 3600
    assert plan.samples.count == 6


def test_a_case_without_it_plans_nothing(tmp_path: Path) -> None:
    plan = load_text(tmp_path, GOOD).planning
    assert plan.warm_up is None
    assert plan.tolerances == ()
    assert plan.samples.count == 8


def test_every_mistake_in_one_go(tmp_path: Path) -> None:
    with pytest.raises(InputError) as caught:
        load_text(tmp_path, GOOD + WRONG)
    found = {problem.key: (problem.found, problem.expected) for problem in caught.value.problems}
    assert found == {
        "plan.patience": (
            "8, a bare number",
            'a time such as "10 min", in quotes and with its unit',
        ),
        "plan.warm_up": ("a time of 0", "a time above 0 s"),
        "plan.samples.count": ("0", "a number of at least 1 and at most 200"),
        "plan.samples.dead": (
            "an unknown key",
            "one of count, signal, sd, dead_time, takes, parameters, until, clock "
            '(did you mean "dead_time"?)',
        ),
        "plan.detection.NOC": ('"NOC"', 'a gas of the case (did you mean "NOCl"?)'),
        "plan.detection.Cl2": (
            '"3 K", a temperature',
            "a pressure, an amount, a number density, a concentration or a fraction, such as "
            '"50 torr"',
        ),
        "plan.tolerances.steps.decomposition.B": (
            "an unknown address",
            'one of "steps.decomposition.n", "steps.decomposition.A", "steps.decomposition.Ea"',
        ),
        "plan.tolerances.steps.decomposition.Ea": (
            '"factor 0.5"',
            '"1 %", "factor 1.5", or a factor above 1',
        ),
        "plan.tolerances.temperature.value": (
            '"2 torr", a pressure',
            '"1 %", "factor 1.5", or a temperature difference such as "5 K"',
        ),
        "plan.correlations.0": (
            '"steps.decomposition.A", "temperature.value", 0.9',
            "two addresses under plan.tolerances and a number between -1 and 1",
        ),
        "plan.samples.signal": (
            '"pressure of NO"',
            '"total pressure", "concentration of NO" or "partial pressure of NO", say',
        ),
        "plan.samples.clock": ('"25:00"', 'a time of day such as "09:00"'),
    }
