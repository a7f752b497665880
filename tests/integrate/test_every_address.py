"""Every number of every case varied: how much is built for it, and what comes out.

Work is counted in Systems built, not in time: that is what a condition must not cost.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from random_experiments import random_experiment
from rare_experiments import RARE, rare_experiment

from meanfree.case.loader import load_case
from meanfree.errors import ComputationError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import _replaced, _walk, inputs, with_inputs
from meanfree.integrate.conditions import Conditions, as_table
from meanfree.integrate.many import Runs
from meanfree.integrate.numbers import numbers_of
from meanfree.integrate.observables import At
from meanfree.integrate.single import integrate
from meanfree.sourced import Sourced

CASES = {path.stem: path for path in (Path(__file__).parents[2] / "cases").glob("*.toml")}
VALUES, RANDOM = 64, 24
NAMES = [
    *sorted(CASES),
    *(f"random {index}" for index in range(RANDOM)),
    *(f"rare {index}" for index in range(RARE)),
]

MOST_BUILT = 60
"""Systems for 64 values of an address: 16 or so where a short formula serves, 60 for a series."""


def experiment_of(name: str) -> Experiment:
    if name in CASES:
        return load_case(CASES[name]).experiment
    kind, index = name.split()
    made = (random_experiment if kind == "random" else rare_experiment)(int(index))
    for address, (path, quantity) in _walk(made).items():
        # The others may be what they are there: numbers without a unit.
        if address.endswith(".diameter"):
            made = _replaced(made, path, replace(quantity, unit="m"))
        if address.endswith((".Ea", ".enthalpy", ".heat")):
            energy = replace(quantity, unit="J/mol", dimension="molar energy")
            made = _replaced(made, path, energy)
    return made


def columns(experiment: Experiment) -> Iterator[tuple[str, np.ndarray]]:
    """Each address, from a tenth below to a tenth above its value."""
    for address, known in inputs(experiment).items():
        low, high = sorted((0.9 * known.value, 1.1 * known.value))
        if known.value == 0:
            high = min(1.0, known.high)
        yield address, np.linspace(max(low, known.low), min(high, known.high), VALUES)


@pytest.mark.parametrize("name", NAMES)
def test_no_system_is_built_for_each_condition(name: str) -> None:
    """All 64 conditions of an address follow together, with the numbers of Systems built singly."""
    experiment = experiment_of(name)
    for address, column in columns(experiment):
        conditions = Conditions(experiment)
        table, count = as_table({address: column})
        blocks = conditions.blocks(table, count)
        assert conditions.built <= MOST_BUILT, address
        assert len({block.structure for block in blocks}) <= 2, address
        for block in blocks:
            for row in {0, len(block.rows) - 1}:
                value = float(column[block.rows[row]])
                built = numbers_of(with_inputs(experiment, {address: value}))
                got = [block.variation.get(*name) for name in built.names[:-1]]
                found = np.array([g[min(row, len(g) - 1)] for g in got])
                # what a series is held to, and the rounding of its evaluation
                np.testing.assert_allclose(
                    found, built.values[:-1], rtol=2e-11, atol=0, err_msg=address
                )


@pytest.mark.slow
@pytest.mark.parametrize("name", NAMES)
def test_two_of_many_are_those_of_single_runs(name: str, size: str) -> None:
    """Every address (in "small", some of three cases) varied over 64 values in one call.

    What a made-up value makes impossible for the single run has nothing to compare.
    """
    if size == "small" and name not in ("nocl-bulb", "dimer-piston", "iodide-sweep"):
        pytest.skip("single runs of some experiments take minutes")
    experiment = experiment_of(name)
    if any(s.volume is not None for s in experiment.samples) and not experiment.vessel.is_rigid:
        pytest.skip("what a volume takes of a piston differs from run to run")
    found = list(columns(experiment))
    start, compared = NAMES.index(name), 0
    for address, column in found if size == "full" else found[start % 10 :: 10]:
        ends = Sourced(0.3 * _own_end(experiment), "s", dimension="time")
        timed = replace(experiment, plan=replace(experiment.plan, until=ends, report_at=()))
        if address == "run.until":
            column = ends.value * column / column[0]
        gases = [gas.name for gas in experiment.gases]
        runs = Runs(timed, [At("amount", gas) for gas in gases])
        values, _ = runs.arrays({address: column})
        for row in (7, 50):
            try:
                single = integrate(with_inputs(timed, {address: float(column[row])}))
            except ComputationError:
                continue
            compared += 1
            amounts = single.amounts(single.end)[:, 0]
            # both at the case's rtol, 1e-8, which each reaches within some tens of tolerances
            np.testing.assert_allclose(
                values[:, row], amounts, rtol=1e-6, atol=1e-12 * amounts.sum(), err_msg=address
            )
    assert compared > 0


def _own_end(experiment: Experiment) -> float:
    until = experiment.plan.until
    return 100.0 if until is None else until.value
