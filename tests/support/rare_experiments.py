"""Experiments of what the random ones leave out: exact walls, ions, lamps.

Apart from those, so that the sequence of the random ones stays as it is.
"""

from __future__ import annotations

import numpy as np
from random_experiments import FRAMES, gas, temperature

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Fill, Portion
from meanfree.experiment.mechanism import Step
from meanfree.experiment.vessel import DeadSpace, Shape, Vessel
from meanfree.rates.capture import Capture
from meanfree.rates.photolysis import Photolysis
from meanfree.rates.wall import Wall
from meanfree.sourced import Sourced as S


def rare_experiment(index: int) -> Experiment:
    """Exact walls of spheres and finite cylinders, captured ions, lamps switched by the clock.

    ``index`` from 0 to `RARE` - 1 goes round vessels and temperatures; `random_experiment` keeps
    its own sequence.
    """
    rng = np.random.default_rng(40_000 + index)
    holds, dead, mode = FRAMES[(7 * index + 3) % len(FRAMES)]
    round_ = index % 3 == 0
    volume = rng.uniform(0.5e-3, 3e-3)
    shape = Shape("sphere") if round_ else Shape("cylinder", length=S(rng.uniform(0.05, 0.3)))
    D = {"diffusion": S(2e-5), "diffusion_at": S(300.0), "diffusion_pressure": S(1e5)}
    uptake = float(10 ** rng.uniform(-5, 0))
    wall = Wall(S(uptake), "quick" if index % 3 == 1 else "exact", **D)  # type: ignore[arg-type]
    lamp = Photolysis(S(rng.uniform(1e-3, 1e-1)), on=(S(20.0),), off=(S(45.0 + index),))
    size = S(rng.uniform(1e-30, 4e-30))
    # From 1e-30 to 8e-30 C m: the reduced dipole lies on both sides of 2.
    pull = S(float(10 ** rng.uniform(-30, -29.1)))
    dipole = Capture("ion and permanent dipole", polarisability={"NO2": size}, dipole=pull)
    induced = Capture("ion and induced dipole", polarisability={"NO": S(1.7e-30)})
    steps = (
        Step("wall", (("O3", 1.0),), (("O2", 1.5),), wall),
        Step("lamp", (("NO2", 1.0),), (("NO", 1.0), ("O2", 0.5)), lamp),
        Step("first", (("NO+", 1.0), ("NO2", 1.0)), (("NO", 1.0), ("NO2+", 1.0)), dipole),
        Step("second", (("NO2+", 1.0), ("NO", 1.0)), (("NO2", 1.0), ("NO+", 1.0)), induced),
    )
    names = list(dict.fromkeys([*(name for step in steps for name in step.net), "Ar"]))
    vessel = Vessel(
        holds,  # type: ignore[arg-type]
        S(volume),
        shape=shape,
        dead_space=DeadSpace(S(1e-4), S(296.0)) if dead else None,
    )
    fill = Fill(
        {name: Portion(S(rng.uniform(1e3, 3e4)), "pressure") for name in names}, at=S(300.0)
    )
    gases = tuple(gas(name) for name in names)
    return Experiment(f"rare {index}", gases, steps, vessel, temperature(rng, mode), fill)


RARE = 12
"""How many of them: each form of wall with each vessel, and most temperatures."""
