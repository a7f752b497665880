"""Two small experiments, built without a case file so that only the report is tested."""

from __future__ import annotations

from meanfree.constants import TORR
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Fill, Portion
from meanfree.experiment.mechanism import Step
from meanfree.experiment.plan import RunPlan
from meanfree.experiment.temperature import Isothermal
from meanfree.experiment.vessel import Vessel
from meanfree.gases.energies import thermochemistry_of
from meanfree.gases.gas import Gas
from meanfree.gases.identity import find_gas
from meanfree.rates.arrhenius import Arrhenius
from meanfree.rates.fixed import Fixed
from meanfree.sourced import Sourced


def with_energies(name: str) -> Gas:
    """A gas of the library with its thermochemistry."""
    from dataclasses import replace

    gas = find_gas(name)
    return replace(gas, thermochemistry=thermochemistry_of(gas))


def nitrosyl_chloride(title: str = "Nitrosyl chloride in a rigid bulb") -> Experiment:
    """50 torr NOCl and 135 torr Ar filled at 296 K, brought to 480 K, reversible."""
    step = Step(
        "decomposition",
        (("NOCl", 2.0),),
        (("NO", 2.0), ("Cl2", 1.0)),
        Arrhenius(
            Sourced(9.4e6, "L/mol/s", "a table", "rate constant of order 2"),
            Sourced(102e3, "kJ/mol", "a table", "molar energy"),
        ),
        reverse="thermochemistry",
    )
    return Experiment(
        title,
        tuple(with_energies(name) for name in ("NOCl", "Ar", "NO", "Cl2")),
        (step,),
        Vessel(
            "volume",
            Sourced(1.8e-3, "L", dimension="volume"),
            rated_pressure=Sourced(2e5, "bar", dimension="pressure"),
        ),
        Isothermal(Sourced(480.0, "K", dimension="temperature")),
        Fill(
            {
                name: Portion(Sourced(p * TORR, "torr", dimension="pressure"), "pressure")
                for name, p in (("NOCl", 50.0), ("Ar", 135.0))
            },
            at=Sourced(296.0, "K", dimension="temperature"),
        ),
        RunPlan(),
        purpose="How long to 25 %, and how far does it go",
    )


def dimerisation(holds: str = "pressure", names: tuple[str, str] = ("A", "A2")) -> Experiment:
    """A at 599 K and 1 bar; k for the loss of A is 0.866 L/mol/min."""
    monomer, dimer = names
    k = Sourced(0.433e-3 / 60, "L/mol/min", "a handbook", "rate constant of order 2", per=2.0)
    return Experiment(
        "A dimerisation",
        (Gas.label(monomer), Gas.label(dimer)),
        (
            Step(
                "dimerisation",
                ((monomer, 2.0),),
                ((dimer, 1.0),),
                Fixed(k),
                counts=f"loss of {monomer}",
            ),
        ),
        Vessel(holds, Sourced(1e-3, "L", dimension="volume")),  # type: ignore[arg-type]
        Isothermal(Sourced(599.0, "K", dimension="temperature")),
        Fill({monomer: Portion(Sourced(1e5, "bar", dimension="pressure"), "pressure")}),
    )
