"""Random mechanisms as plain numbers, and the same mechanism as an Experiment.

The plain form is what independent integrators read; the program under test sees only the
Experiment. Gases are (CH2)s, so every step can conserve elements, and have constant heat
capacities, so that their energies are closed forms anybody can write down.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Fill, Portion
from meanfree.experiment.mechanism import Bath, Step
from meanfree.experiment.plan import RunPlan
from meanfree.experiment.temperature import Adiabatic, Isothermal, Program, Temperature
from meanfree.experiment.vessel import DeadSpace, Vessel
from meanfree.gases.formula import parse_formula
from meanfree.gases.gas import Gas
from meanfree.gases.thermochemistry import from_values
from meanfree.rates.arrhenius import Arrhenius
from meanfree.sourced import Sourced

UNITS = {
    "concentration": "mol/m^3", "volume": "m^3", "temperature": "K", "time": "s",
    "molar energy": "J/mol", "": "",
}  # fmt: skip


def si(value: float, dimension: str = "") -> Sourced:
    """A number in SI with its unit, so that addresses speak SI as well."""
    return Sourced(value, UNITS[dimension], dimension=dimension)


VOLUME, DEAD_T = 2e-3, 300.0
"""Volume at filling [m^3]; temperature of the dead space [K]."""


@dataclass(frozen=True)
class PlainStep:
    """``left`` and ``right``: gas -> coefficient; ``orders`` where they are not those of the left.

    k = A exp(-E/RT) [SI]; ``bath``: gas -> efficiency, 1 for the rest; None without M.
    ``reverse``: the other way follows from the energies of the gases.
    """

    left: dict[int, float]
    right: dict[int, float]
    A: float
    E: float
    orders: dict[int, float] | None = None
    bath: dict[int, float] | None = None
    reverse: bool = False


@dataclass(frozen=True)
class PlainMechanism:
    """Everything about one experiment. Concentrations [mol/m^3] at ``T_fill`` [K].

    ``mode`` is isothermal, adiabatic or program (``points``: (s, K), the first at time zero);
    ``dead`` is the dead space over the volume at filling.
    """

    sizes: tuple[int, ...]
    cp: tuple[float, ...]
    h: tuple[float, ...]
    s: tuple[float, ...]
    steps: tuple[PlainStep, ...]
    fill: tuple[float, ...]
    end: float
    holds: str = "volume"
    mode: str = "isothermal"
    T: float = 500.0
    T_fill: float = 500.0
    points: tuple[tuple[float, float], ...] = ()
    dead: float = 0.0
    names: tuple[str, ...] = field(init=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "names", tuple(f"G{i}" for i in range(len(self.sizes))))


def experiment_of(plain: PlainMechanism) -> Experiment:
    """The same as the program takes it."""
    names = plain.names
    gases = [
        Gas(
            names[i],
            parse_formula(f"C{size}H{2 * size}"),
            thermochemistry=from_values(
                enthalpy_298=si(plain.h[i]),
                entropy_298=si(plain.s[i]),
                heat_capacity=Sourced(plain.cp[i]),
            ),
        )
        for i, size in enumerate(plain.sizes)
    ]
    steps = [
        Step(
            f"s{j}",
            tuple((names[g], float(n)) for g, n in s.left.items()),
            tuple((names[g], float(n)) for g, n in s.right.items()),
            Arrhenius(si(s.A), si(s.E, "molar energy")),
            stated_orders=None
            if s.orders is None
            else tuple((names[g], n) for g, n in s.orders.items()),
            bath=None if s.bath is None else Bath({names[g]: e for g, e in s.bath.items()}),
            reverse="thermochemistry" if s.reverse else None,
        )
        for j, s in enumerate(plain.steps)
    ]
    mode: Temperature = Isothermal(si(plain.T, "temperature"))
    if plain.mode == "adiabatic":
        mode = Adiabatic(si(plain.T, "temperature"))
    elif plain.mode == "program":
        mode = Program(tuple((si(t), si(T, "temperature")) for t, T in plain.points))
    dead = DeadSpace(si(plain.dead * VOLUME), si(DEAD_T)) if plain.dead else None
    return Experiment(
        "a plain mechanism",
        tuple(gases),
        tuple(steps),
        Vessel(plain.holds, si(VOLUME, "volume"), dead_space=dead),  # type: ignore[arg-type]
        mode,
        Fill(
            {
                n: Portion(si(c, "concentration"), "concentration")
                for n, c in zip(names, plain.fill, strict=True)
            },
            at=si(plain.T_fill, "temperature"),
        ),
        RunPlan(si(plain.end, "time")),
    )


KINDS = {
    "isothermal": ("one", "split", "two", "join", "bath", "half", "loss", "zero"),
    "program": ("one", "split", "two", "join", "bath", "half", "loss", "zero"),
    "adiabatic": ("one", "split", "two", "join", "bath"),
}
"""What steps may be: those of closed vessels where energy is balanced."""


def random_mechanism(seed: int) -> PlainMechanism:
    """Mechanism ``seed``: 5 to 7 gases, 5 to 10 steps, rates over eight decades at 500 K.

    Vessel and temperature go round with the seed: rigid and piston; isothermal twice as often as
    adiabatic and programmed. Half of the steps are reversible by their energies.
    """
    rng = np.random.default_rng([11, seed])
    holds = ("volume", "pressure")[seed % 2]
    mode = ("isothermal", "adiabatic", "isothermal", "program")[seed // 2 % 4]
    n, m = int(rng.integers(5, 8)), int(rng.integers(5, 11))
    sizes = (1, 1, 2, 2, 3, *(int(s) for s in rng.integers(1, 4, n - 5)))
    steps = [_step(rng, sizes, mode) for _ in range(m)]
    hot = 20e3 if mode == "adiabatic" else 40e3
    # Entropies fall as gases join, so that equilibrium constants are near one at 1 mol/m^3.
    h = [float(rng.uniform(-hot, hot)) for _ in sizes]
    s = [float(250.0 + 25.0 * (size - 1) + rng.uniform(-15, 15)) for size in sizes]
    fill = [float(10 ** rng.uniform(-3, 0)) if i < n // 2 + 1 else 0.0 for i in range(n)]
    points = ((0.0, 450.0), (10.0, float(rng.uniform(500, 600))), (20.0, 480.0))
    return PlainMechanism(
        sizes,
        tuple(float(30.0 + 25.0 * size + rng.uniform(0, 20)) for size in sizes),
        tuple(h),
        tuple(s),
        tuple(steps),
        tuple(fill),
        end=30.0,
        holds=holds,
        mode=mode,
        T=450.0 if mode == "program" else 500.0,
        points=points if mode == "program" else (),
        dead=0.05 if mode == "isothermal" and rng.random() < 0.3 else 0.0,
    )


def _step(rng: np.random.Generator, sizes: tuple[int, ...], mode: str) -> PlainStep:
    """One random step that conserves atoms, or lets gas in or out."""
    kind = str(rng.choice(KINDS[mode]))
    E = float(rng.uniform(1e4, 8e4))
    A = float(10 ** rng.uniform(-4, 4)) * float(np.exp(E / (8.314 * 500.0)))
    numbers = {"one": (1, 1), "split": (1, 2), "two": (2, 2), "join": (2, 1)}
    if kind == "loss":
        return PlainStep({int(rng.integers(len(sizes))): 1.0}, {}, 1e-3 * A, E)
    if kind == "zero":
        return PlainStep({}, {int(rng.integers(len(sizes))): 1.0}, 1e-6 * A, E)
    left, right = _balanced(rng, sizes, *numbers.get(kind, (1, 1)))
    if kind == "half":
        order = float(rng.choice([0.5, 1.5]))
        return PlainStep(
            left, right, min(A, 10.0 * np.exp(E / 4157.0)), E, dict.fromkeys(left, order)
        )
    bath = {next(iter(left)): float(rng.uniform(0, 6))} if kind == "bath" else None
    return PlainStep(left, right, A, E, None, bath, bool(rng.random() < 0.5))


def _balanced(
    rng: np.random.Generator, sizes: tuple[int, ...], lefts: int, rights: int
) -> tuple[dict[int, float], dict[int, float]]:
    """Gases drawn until both sides have the same atoms and no gas stands on both."""
    while True:
        chosen = [int(i) for i in rng.integers(0, len(sizes), lefts + rights)]
        left, right = chosen[:lefts], chosen[lefts:]
        same = sum(sizes[i] for i in left) == sum(sizes[i] for i in right)
        if same and not set(left) & set(right):
            return _counted(left), _counted(right)


def _counted(gases: list[int]) -> dict[int, float]:
    return {i: float(gases.count(i)) for i in dict.fromkeys(gases)}


def conditions(plain: PlainMechanism, count: int, seed: int) -> dict[str, np.ndarray]:
    """Columns for `many`: every pre-exponential, every fill, and a temperature that is one number.

    Within a factor of two, and 25 K, of the mechanism's.
    """
    rng = np.random.default_rng([12, seed])
    table = {
        f"steps.s{j}.A": s.A * np.exp(rng.uniform(-0.7, 0.7, count))
        for j, s in enumerate(plain.steps)
    }
    for name, c in zip(plain.names, plain.fill, strict=True):
        if c > 0:
            table[f"fill.gases.{name}"] = c * np.exp(rng.uniform(-0.7, 0.7, count))
    if plain.mode != "program":
        table["temperature.value"] = plain.T + rng.uniform(-25, 25, count)
    return table


def condition(plain: PlainMechanism, table: dict[str, np.ndarray], row: int) -> PlainMechanism:
    """The mechanism under one row of such a table."""
    steps = [
        replace(s, A=float(table.get(f"steps.s{j}.A", [s.A] * (row + 1))[row]))
        for j, s in enumerate(plain.steps)
    ]
    fill = [
        float(table[f"fill.gases.{name}"][row]) if f"fill.gases.{name}" in table else c
        for name, c in zip(plain.names, plain.fill, strict=True)
    ]
    T = float(table["temperature.value"][row]) if "temperature.value" in table else plain.T
    return replace(plain, steps=tuple(steps), fill=tuple(fill), T=T)
