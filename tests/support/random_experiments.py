"""Random experiments that between them use every part of the equations.

The reactions are balanced and of real gases; their numbers are made up, so that nothing
cancels by luck.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import cache
from itertools import product

import numpy as np

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Fill, Portion
from meanfree.experiment.mechanism import Bath, GivenEquilibrium, Step
from meanfree.experiment.temperature import Adiabatic, Exchange, Isothermal, Program, Temperature
from meanfree.experiment.vessel import DeadSpace, Shape, Vessel
from meanfree.gases.formula import parse_formula
from meanfree.gases.gas import Gas
from meanfree.gases.thermochemistry import from_values
from meanfree.rates import cross_section
from meanfree.rates.arrhenius import Arrhenius
from meanfree.rates.capture import Capture
from meanfree.rates.collision import Collision
from meanfree.rates.cross_section import Beyond, CrossSection, EnergyPoint
from meanfree.rates.falloff import Centre, CentreTerm, Falloff
from meanfree.rates.fixed import Fixed
from meanfree.rates.law import Law
from meanfree.rates.limits import PowerLaw
from meanfree.rates.photolysis import Photolysis
from meanfree.rates.registry import LAWS
from meanfree.rates.source import Source
from meanfree.rates.table import Table, TablePoint
from meanfree.rates.termolecular import Termolecular
from meanfree.rates.wall import Wall
from meanfree.sourced import Sourced as S

# Enthalpy of formation [kJ/mol] and entropy [J/mol/K] near those of the tables, Cp [J/mol/K]
# at 200 and 1500 K, diameter [angstrom]: made up, of the right size.
_GASES = {
    "NO2": (33.1, 240.0, 34.0, 56.0, 3.8),
    "N2O4": (9.1, 304.3, 66.0, 128.0, 4.6),
    "NO": (90.3, 210.8, 29.3, 35.5, 3.5),
    "O2": (0.0, 205.1, 28.9, 36.5, 3.47),
    "O3": (142.7, 238.9, 35.0, 57.0, 3.9),
    "NO3": (73.7, 258.0, 38.0, 79.0, 4.1),
    "N2O5": (13.3, 353.5, 78.0, 150.0, 5.0),
    "N2O3": (86.6, 314.7, 57.0, 103.0, 4.7),
    "Ar": (0.0, 154.8, 20.786, 20.786, 3.54),
    "NO+": (989.0, 198.2, 29.1, 35.0, 3.2),
    "NO2+": (974.0, 214.0, 34.0, 56.0, 3.5),
}

_REACTIONS: tuple[tuple[dict[str, float], dict[str, float]], ...] = (
    ({"N2O4": 1}, {"NO2": 2}),
    ({"NO2": 2}, {"N2O4": 1}),
    ({"NO": 1, "NO2": 1}, {"N2O3": 1}),
    ({"NO": 1, "O3": 1}, {"NO2": 1, "O2": 1}),
    ({"NO2": 1, "NO3": 1}, {"N2O5": 1}),
    ({"N2O5": 1}, {"NO2": 1, "NO3": 1}),
    ({"NO2": 2}, {"NO": 2, "O2": 1}),
    ({"NO": 2, "O2": 1}, {"NO2": 2}),
    ({"NO3": 1, "O3": 1}, {"NO2": 1, "O2": 2}),
    # a gas on both sides, with and without a net change
    ({"NO2": 1, "NO3": 1}, {"NO2": 1, "NO": 1, "O2": 1}),
    ({"N2O4": 1, "NO2": 1}, {"NO2": 3}),
    ({"O3": 1, "O2": 1}, {"O2": 2.5}),
)

MODES = ("isothermal", "program", "adiabatic", "exchange", "exchange with wall")
FRAMES = tuple(product(("volume", "pressure"), (False, True), MODES))
"""Vessel, dead space or none, temperature: each is visited with several mechanisms."""


@cache
def gas(name: str) -> Gas:
    """One of the gases above with everything a law may ask."""
    enthalpy, entropy, cold, hot, diameter = _GASES[name]
    formula = parse_formula(name)
    return Gas(
        name,
        formula,
        molar_mass=formula.molar_mass,
        diameter=S(diameter * 1e-10),
        thermochemistry=from_values(
            enthalpy_298=S(1e3 * enthalpy),
            entropy_298=S(entropy),
            heat_capacity=[(200.0, cold), (600.0, 0.4 * cold + 0.6 * hot), (1500.0, hot)],
        ),
    )


def _fixed(rng: np.random.Generator, step: Step) -> Law:
    return Fixed(S(_size(rng, step)))


def _arrhenius(rng: np.random.Generator, step: Step) -> Law:
    E = rng.uniform(5e3, 9e4)
    A = _size(rng, step) * float(np.exp(E / (8.314 * 480)))
    if rng.random() < 0.5:
        return Arrhenius(S(A), S(E))
    return Arrhenius(S(A), S(E), S(rng.uniform(-2, 2)), S(rng.uniform(250, 400)))


def _collision(rng: np.random.Generator, step: Step) -> Law:
    diameter = S(rng.uniform(3e-10, 6e-10)) if rng.random() < 0.3 else None
    if rng.random() < 0.5:
        return Collision(
            threshold=S(rng.uniform(2e4, 8e4)), steric=S(rng.uniform(0.01, 1)), diameter=diameter
        )
    return Collision(
        Ea=S(rng.uniform(2e4, 8e4)), Ea_at=S(450.0), A_over_Z=S(0.1), diameter=diameter
    )


def _cross_section(rng: np.random.Generator, step: Step) -> Law:
    shapes: tuple[cross_section.Shape, ...] = (
        "line of centres",
        "constant above threshold",
        "points",
    )
    shape = shapes[int(rng.integers(3))]
    if shape != "points":
        return CrossSection(shape, S(rng.uniform(1e-20, 6e-19)), S(rng.uniform(3e4, 7e4)))
    beyonds: tuple[Beyond, ...] = ("constant", "zero", "linear", "falling as 1/E")
    energies = np.cumsum(rng.uniform(8e3, 3e4, 2)) + 2e4
    areas = np.cumsum(rng.uniform(1e-20, 2e-19, 2))
    points = tuple(
        EnergyPoint(S(float(energy)), S(float(area)))
        for energy, area in zip(energies, areas, strict=True)
    )
    return CrossSection(shape, points=points, beyond=beyonds[int(rng.integers(4))])


def _table(rng: np.random.Generator, step: Step) -> Law:
    hot = np.sort(rng.choice([300.0, 400.0, 500.0, 650.0, 800.0, 1000.0], 3, replace=False))
    k = _size(rng, step) * np.exp(np.cumsum(rng.uniform(0.2, 1.5, 3)))
    points = (TablePoint(S(float(T)), S(float(v))) for T, v in zip(hot, k, strict=True))
    return Table(tuple(points), extrapolate=True)


def _termolecular(rng: np.random.Generator, step: Step) -> Law:
    return Termolecular(S(_size(rng, step)), S(-2e3), S(rng.uniform(-2, 0)), S(300.0))


def _falloff(rng: np.random.Generator, step: Step) -> Law:
    """Limits that meet near 30 mol/m^3, with each of the broadened forms."""
    E = rng.uniform(0.0, 4e4)
    high = _size(rng, replace(step, bath=None)) * float(np.exp(E / (8.314 * 480)))
    k0 = PowerLaw(S(high / 30.0), S(rng.uniform(-3, 0)), S(480.0), S(0.8 * E))
    kinf = PowerLaw(S(high), Ea=S(E))
    kind = int(rng.integers(3))
    if kind == 0:
        return Falloff(k0, kinf)
    terms = (CentreTerm(S(0.3), S(600.0)), CentreTerm(S(0.2), S(900.0), rises=True))
    centre = Centre(S(0.4), terms if rng.random() < 0.5 else ())
    return Falloff(k0, kinf, "unit width" if kind == 1 else "width from Fc", centre)


def _capture(rng: np.random.Generator, step: Step) -> Law:
    return Capture("dispersion", C6=S(rng.uniform(0.5, 2) * 1e-85))


def _wall(rng: np.random.Generator, step: Step) -> Law:
    if rng.random() < 0.5:
        return Wall(S(float(10 ** rng.uniform(-6, -4))), "uptake only")
    D = {"diffusion": S(2e-5), "diffusion_at": S(300.0), "diffusion_pressure": S(1e5)}
    return Wall(S(float(10 ** rng.uniform(-5, -1))), "quick", **D)  # type: ignore[arg-type]


def _photolysis(rng: np.random.Generator, step: Step) -> Law:
    return Photolysis(S(_size(rng, step)))


def _source(rng: np.random.Generator, step: Step) -> Law:
    return Source(S(rng.uniform(0.001, 0.05)))


MAKERS: dict[str, Callable[[np.random.Generator, Step], Law]] = {
    "fixed": _fixed,
    "arrhenius": _arrhenius,
    "collision": _collision,
    "cross-section": _cross_section,
    "table": _table,
    "termolecular": _termolecular,
    "falloff": _falloff,
    "capture": _capture,
    "wall": _wall,
    "photolysis": _photolysis,
    "source": _source,
}
"""A law of each word with made-up numbers. A new law needs a line here."""


def _size(rng: np.random.Generator, step: Step) -> float:
    """A rate constant that makes the step's time about 1 to 1000 s at 30 mol/m^3."""
    order = step.order + (step.bath is not None)
    return float(10 ** rng.uniform(-3, 0) * 30.0 ** (1 - order))


def _reverse(rng: np.random.Generator, kind: str) -> GivenEquilibrium:
    enthalpy = S(rng.uniform(-6e4, 6e4)) if rng.random() < 0.7 else None
    constant = S(float(10 ** rng.uniform(-1, 1)) * {"Kp": 1e4, "Kc": 10.0, "K": 1.0}[kind])
    return GivenEquilibrium(kind, constant, S(rng.uniform(300, 500)), enthalpy)  # type: ignore[arg-type]


def _orders(step: Step, turn: int) -> tuple[tuple[str, float], ...]:
    """Orders that are not the coefficients: zero, below one, between one and two, two."""
    choices = (0.0, 1.5, 0.5, 2.0)
    names = [name for name, _ in step.reactants]
    return tuple((name, choices[(turn // 9 + i) % 4]) for i, name in enumerate(names))


def _closed_step(rng: np.random.Generator, number: int, reaction: int, turn: int) -> Step:
    """One step of the list, its law and extras by turns so that none is left out."""
    left, right = _REACTIONS[reaction]
    step = Step(f"s{number}", tuple(left.items()), tuple(right.items()), Fixed(S(1.0)))
    extra = ("", "bath", "orders", "Kp", "Kc", "K", "thermochemistry", "heat", "photon")[turn % 9]
    if extra == "orders":
        step = replace(step, stated_orders=_orders(step, turn))
    elif extra == "bath":
        efficiencies = {name: float(rng.uniform(0, 8)) for name in (*left, "Ar")}
        step = replace(step, bath=Bath(efficiencies, 1.0 if rng.random() < 0.7 else 0.4))
    elif extra == "thermochemistry":
        step = replace(step, reverse="thermochemistry")
    elif extra in {"Kp", "Kc", "K"}:
        step = replace(step, reverse=_reverse(rng, extra))
    if extra in {"bath", "Kp", "Kc"} and rng.random() < 0.5:
        step = replace(step, reverse="thermochemistry")
    if extra == "heat":
        reverse = "thermochemistry" if rng.random() < 0.5 else None
        step = replace(step, heat=S(rng.uniform(-8e4, 8e4)), reverse=reverse)
    if extra == "photon":
        step = replace(step, photon=S(rng.uniform(2e5, 4e5)))
    words = [word for word in MAKERS if _fits(word, step)]
    pairs = [word for word in words if LAWS[word].pair_needed]
    if turn % 2 and pairs:
        words = pairs
    return replace(step, law=MAKERS[words[turn // 2 % len(words)]](rng, step))


def _fits(word: str, step: Step) -> bool:
    """Whether a law can serve a step."""
    bath = step.bath is not None
    if LAWS[word].pair_needed:
        return len(step.partners) == 2 and not bath
    if word == "termolecular":
        return step.stated_orders is None and step.order + bath == 3
    if word == "falloff":
        return bath
    if word == "source":
        return not step.reactants
    if word in {"wall", "photolysis"}:
        alone = [number for _, number in step.reactants] == [1]
        return alone and not bath and step.stated_orders is None and step.reverse is None
    return True


def _open_step(rng: np.random.Generator, name: str, gas_name: str, source: bool) -> Step:
    side = ((gas_name, 1.0),)
    step = Step(name, () if source else side, side if source else (), Fixed(S(1.0)))
    if not source and rng.random() < 0.3:
        step = replace(step, stated_orders=((gas_name, 0.0),))
    elif not source and rng.random() < 0.6:
        return replace(step, law=_wall(rng, step))
    if source:
        return replace(step, law=_source(rng, step))
    return replace(step, law=_fixed(rng, step))


def temperature(rng: np.random.Generator, mode: str) -> Temperature:
    start = S(rng.uniform(380, 560))
    if mode == "isothermal":
        return Isothermal(start)
    if mode == "program":
        middle = (S(rng.uniform(50, 150)), S(rng.uniform(380, 700)))
        return Program(((S(0.0), start), middle, (S(400.0), S(500.0))))
    if mode == "adiabatic":
        return Adiabatic(start)
    wall = S(rng.uniform(1, 50)) if mode == "exchange with wall" else None
    return Exchange(start, S(480.0), S(rng.uniform(0.01, 0.5)), wall)


def random_experiment(index: int) -> Experiment:
    """Experiment ``index``; the frame goes round in `FRAMES`, the extras by turns."""
    rng = np.random.default_rng(20_000 + index)
    holds, dead, mode = FRAMES[index % len(FRAMES)]
    reactions = rng.choice(len(_REACTIONS), size=2, replace=False)
    turn = int(rng.integers(0, 9)) + index
    steps = [_closed_step(rng, i, int(r), turn + 2 * i) for i, r in enumerate(reactions)]
    if index % 2:
        used = sorted({name for step in steps for name in step.net})
        steps.append(_open_step(rng, "loss", str(rng.choice(used)), False))
        steps.append(_open_step(rng, "inlet", str(rng.choice(used)), True))
    names = list(dict.fromkeys([*(name for step in steps for name in step.net), "Ar"]))
    vessel = Vessel(
        holds,  # type: ignore[arg-type]
        S(rng.uniform(0.5e-3, 3e-3)),
        shape=Shape("sphere"),
        dead_space=DeadSpace(S(rng.uniform(2e-5, 2e-4)), S(296.0)) if dead else None,
    )
    fill = Fill(
        {name: Portion(S(rng.uniform(1e3, 3e4)), "pressure") for name in names}, at=S(300.0)
    )
    return Experiment(
        f"random {index}",
        tuple(gas(name) for name in names),
        tuple(steps),
        vessel,
        temperature(rng, mode),
        fill,
    )


def random_state(index: int, system: object, scarce: float = 0.02) -> np.ndarray:
    """A state not far from the start: amounts from ``scarce`` to 1 of the total, v and T moved."""
    rng = np.random.default_rng(30_000 + index)
    y = system.initial_state.copy()  # type: ignore[attr-defined]
    n = system.n_gases  # type: ignore[attr-defined]
    total = system.total_concentration  # type: ignore[attr-defined]
    y[:n] = total * np.exp(rng.uniform(np.log(scarce), 0.0, n))
    if system.volume_varies:  # type: ignore[attr-defined]
        y[system.volume_index] = rng.uniform(0.6, 1.6)  # type: ignore[attr-defined]
    if system.temperature_varies:  # type: ignore[attr-defined]
        y[system.temperature_index] = rng.uniform(350, 900)  # type: ignore[attr-defined]
    return np.asarray(y)
