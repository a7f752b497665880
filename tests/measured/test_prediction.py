"""What fits compare readings with, held against the checked integrator."""

from __future__ import annotations

import numpy as np
import pytest
from measured_runs import case_text, loaded

from meanfree.experiment.inputs import with_inputs
from meanfree.integrate.single import integrate
from meanfree.measured.prediction import is_exact, predict
from meanfree.measured.predictor import Predictor
from meanfree.measured.signals import Signal, changed, predicted

T = np.array([0.0, 40.0, 400.0, 4000.0])
PISTON = ('holds = "volume"', 'holds = "pressure"')
GAUGE = 'dead_space = { volume = "50 mL", temperature = "300 K" }'
DEAD = ('volume = "0.5 L"', f'volume = "0.5 L"\n{GAUGE}')
WARMING = (
    'mode = "isothermal"\nvalue = "599.15 K"',
    'mode = "program"\npoints = [["0 s", "500 K"], ["100 s", "600 K"]]',
)
SECOND = 'law = "fixed"\nk = "0.5 L/mol/s"'
ARRHENIUS = 'law = "arrhenius"\nA = "1e6 L/mol/s"\nEa = "60 kJ/mol"'


@pytest.mark.parametrize(
    ("reaction", "law", "edits", "exact"),
    [
        ("2 A -> B", SECOND, (), True),
        ("2 A -> B", SECOND, (DEAD,), True),
        ("2 A -> B", SECOND, (PISTON,), True),
        ("2 A -> B", SECOND, (PISTON, DEAD), False),
        ("A -> 2 B + C", 'law = "fixed"\nk = "1e-3 1/s"', (PISTON,), True),
        ("A -> B", 'law = "fixed"\nk = "1e-3 mol/L/s"\norders = { A = 0 }', (), True),
        ("A -> B", 'law = "fixed"\nk = "1e-3 L^-0.5*mol^0.5/s"\norders = { A = 0.5 }', (), True),
        ("2 A -> B", ARRHENIUS, (WARMING,), False),
        ("2 A -> B", SECOND + '\nreverse = { Kc = "50 L/mol", at = "599.15 K" }', (), True),
    ],
)
def test_beside_a_run(tmp_path, reaction, law, edits, exact):
    text = case_text(reaction, law)
    for old, new in edits:
        assert old in text
        text = text.replace(old, new)
    text += '\n[run]\nuntil = "4000 s"\n'
    experiment = loaded(tmp_path, text, {}).experiment
    ours, run = predict(experiment, T), integrate(experiment)
    # Radau at rtol 1e-8 reaches 1e-8 or so of the most there was
    assert ours.pressure == pytest.approx(run.pressure(T), rel=1e-7)
    assert ours.temperature == pytest.approx(run.temperature(T), rel=1e-9)
    most = run.concentrations(T).max()
    for i, gas in enumerate(run.system.gases):
        assert ours.concentration(gas) == pytest.approx(run.concentrations(T)[i], abs=2e-8 * most)
    assert is_exact(experiment) is exact
    # in any order, and at one time only
    assert predict(experiment, T[::-1]).pressure == pytest.approx(ours.pressure[::-1], rel=1e-12)
    assert predict(experiment, np.zeros(1)).pressure == pytest.approx(ours.pressure[:1], rel=1e-12)


def test_consecutive_steps_beside_a_run(tmp_path):
    text = case_text("A -> 2 B", 'law = "fixed"\nk = "1e-3 1/s"').replace(
        '"A", "B"', '"A", "B", "C"'
    )
    text += '[[steps]]\nname = "e"\nreaction = "B -> 3 C"\nlaw = "fixed"\nk = "4e-3 1/s"\n'
    text += '[run]\nuntil = "4000 s"\n'
    experiment = loaded(tmp_path, text, {}).experiment
    ours, run = predict(experiment, T), integrate(experiment)
    assert is_exact(experiment)
    most = run.concentrations(T).max()
    for i, gas in enumerate(run.system.gases):
        assert ours.concentration(gas) == pytest.approx(run.concentrations(T)[i], abs=2e-8 * most)


@pytest.mark.parametrize("edits", [(), (PISTON, DEAD), (WARMING,), (DEAD,)])
def test_many_predictions_at_once_are_those_one_by_one(tmp_path, edits):
    text = case_text("2 A -> B", ARRHENIUS)
    for old, new in edits:
        text = text.replace(old, new)
    text = text.replace('"A", "B"', '"A", "B", "C"')
    text += '[[steps]]\nname = "e"\nreaction = "B -> 3 C"\nlaw = "fixed"\nk = "4e-3 1/s"\n'
    experiment = loaded(tmp_path, text, {}).experiment
    rows = [
        {"steps.d.A": A, "vessel.volume": V, "fill.gases.A": p}
        for A, V, p in ((1e6, 0.5, 632.0), (1.001e6, 0.5, 632.0), (1e6, 0.6, 500.0))
    ]
    times = [T, T + 3.0, T[::-1]]
    predictions = Predictor(experiment, tuple(rows[0])).many(rows, times)
    for row, t, ours in zip(rows, times, predictions, strict=True):
        alone = predict(with_inputs(experiment, row), t)
        # both at rtol 1e-10, by methods of their own
        assert ours.pressure == pytest.approx(alone.pressure, rel=1e-8)
        assert ours.temperature == pytest.approx(alone.temperature, rel=1e-12)
        assert ours.spread == pytest.approx(alone.spread, rel=1e-8)
        assert ours.x == pytest.approx(alone.x, abs=1e-8 * alone.x.max())


SIGNALS = (
    Signal("total pressure"),
    Signal("partial pressure", ("A", "B")),
    Signal("concentration", ("C",)),
    Signal("number density", ("B",)),
    Signal("mole fraction", ("B",)),
    Signal("conversion", ("A",)),
)


@pytest.mark.parametrize("edits", [(), (PISTON, DEAD), (WARMING,)])
def test_derivatives_are_those_of_predictions_one_by_one(tmp_path, edits):
    text = case_text("2 A -> B", ARRHENIUS)
    for old, new in edits:
        text = text.replace(old, new)
    text = text.replace('"A", "B"', '"A", "B", "C"')
    text += '[[steps]]\nname = "e"\nreaction = "B -> 3 C"\nlaw = "fixed"\nk = "4e-3 1/s"\n'
    experiment = loaded(tmp_path, text, {}).experiment
    row = {"steps.d.A": 1.1e6, "steps.d.Ea": 60.5, "vessel.volume": 0.5, "fill.gases.A": 600.0}
    times = np.array([0.0, 40.0, 150.0, 400.0])
    found = Predictor(experiment, tuple(row)).differentiated(row, times)
    for signal in SIGNALS:
        scale = np.abs(predicted(signal, found.prediction)).max()

        def shown(key, value, t=times, signal=signal):
            return predicted(signal, predict(with_inputs(experiment, {**row, key: value}), t))

        # LSODA reaches 1e-9 or so; over a step of 3e-3 that leaves 1e-6 of a relative change
        for key, value in row.items():
            h = 3e-3 * value if key != "steps.d.Ea" else 0.02
            expected = (shown(key, value + h) - shown(key, value - h)) / (2 * h)
            ours = changed(signal, found.prediction, found.by_input[key])
            assert ours * h == pytest.approx(expected * h, abs=1e-7 * scale), (signal, key)
        later = times[1:] + 0.1
        moved = shown("steps.d.A", row["steps.d.A"], later)
        moved -= shown("steps.d.A", row["steps.d.A"], later - 0.2)
        rate = changed(signal, found.prediction, found.by_time)[1:]
        assert rate * 0.2 == pytest.approx(moved, abs=2e-7 * scale), signal
