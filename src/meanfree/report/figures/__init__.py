"""The figures of a run, drawn without any global state, as SVG text and PNG bytes."""

from __future__ import annotations

from meanfree.integrate.run import Run
from meanfree.report.run_models import RunSummary


def draw(run: Run, summary: RunSummary) -> dict[str, tuple[str, bytes]]:
    """(SVG text, PNG bytes) of every figure by its name."""
    from meanfree.report.figures import half_lives, profiles, rates, style

    with style.drawing():
        drawn = {"profiles": profiles.figure(run, summary)}
        if run.consumed:
            drawn["half_lives"] = half_lives.figure(run, summary)
        if run.system.n_steps:
            drawn["rates"] = rates.figure(run)
        return {name: style.rendered(figure) for name, figure in drawn.items()}
