"""Small experiments for what is written out: one plain, one with nearly everything."""

from __future__ import annotations

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Fill, Portion
from meanfree.experiment.mechanism import Bath, GivenEquilibrium, Step
from meanfree.experiment.temperature import Isothermal, Program
from meanfree.experiment.vessel import DeadSpace, Vessel
from meanfree.gases.formula import parse_formula
from meanfree.gases.gas import Gas
from meanfree.rates.arrhenius import Arrhenius
from meanfree.rates.fixed import Fixed
from meanfree.sourced import Sourced as S


def simple(*names: str, holds: str = "volume") -> Experiment:
    """The first gas becomes the others, one of each."""
    gases = tuple(Gas.label(name) for name in names)
    step = Step(names[0], ((names[0], 1.0),), tuple((n, 1.0) for n in names[1:]), Fixed(S(0.5)))
    fill = Fill({names[0]: Portion(S(1e4), "pressure")})
    return Experiment(names[0], gases, (step,), Vessel(holds, S(1e-3)), Isothermal(S(400.0)), fill)


def dinitrogen_tetroxide() -> Experiment:
    """N2O4 = 2 NO2 in a piston with dead space, a given K_c and a bath."""
    gases = tuple(Gas(name, parse_formula(name)) for name in ("N2O4", "NO2", "Ar"))
    reverse = GivenEquilibrium("Kc", S(100.0, source="a table"), S(340.0), S(57e3))
    step = Step(
        "dissociation",
        (("N2O4", 1.0),),
        (("NO2", 2.0),),
        Arrhenius(S(2e6), S(54e3), S(1.5), S(300.0)),
        bath=Bath({"Ar": 0.6}),
        reverse=reverse,
    )
    vessel = Vessel("pressure", S(1e-3), dead_space=DeadSpace(S(2e-5), S(296.0)))
    fill = Fill({"N2O4": Portion(S(5e4), "pressure"), "Ar": Portion(S(5e4), "pressure")})
    program = Program(((S(0.0), S(300.0)), (S(60.0), S(360.0)), (S(90.0), S(345.0))))
    return Experiment("N2O4", gases, (step,), vessel, program, fill)
