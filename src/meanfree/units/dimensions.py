"""The kinds of quantity that meanfree knows, by the word that names them.

A word such as "pressure" decides which units are accepted, what SI unit is used inside, which
values are possible at all, and how a message says what would be right.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cache

INFINITE = float("inf")


@dataclass(frozen=True)
class Dimension:
    """One kind of quantity.

    ``powers`` of the base dimensions; ``si`` the unit used inside; ``example`` for messages.
    ``lowest`` and ``highest`` are SI values; ``above`` means the lowest itself is not
    possible. ``molecules``: where the amount is left out of a unit, molecules are counted.
    ``aliases`` are further unit texts (`K`, `cm^-1` for an energy) by the route to SI.
    """

    word: str
    powers: dict[str, float]
    si: str
    example: str
    lowest: float = 0.0
    highest: float = INFINITE
    above: bool = False
    molecules: bool = False
    article: str = "a"
    known: str = ""
    routes: tuple[str, ...] = field(default=())

    @property
    def phrase(self) -> str:
        """What would be right, for a message."""
        return f'{self.article} {self.known or self.word} such as "{self.example}"'


def _powers(text: str) -> dict[str, float]:
    names = {
        "L": "length",
        "M": "mass",
        "T": "time",
        "K": "temperature",
        "N": "substance",
        "I": "current",
    }
    found = {}
    for part in text.split():
        found[names[part[0]]] = float(part[1:])
    return found


def _plain_dimensions() -> list[Dimension]:
    D = Dimension
    return [
        D("pure", {}, "", "0.5", lowest=-INFINITE, known="pure number"),
        D("fraction", {}, "", "0.27", highest=1.0),
        D("temperature", _powers("K1"), "K", "480 K", highest=1e6, above=True),
        D("temperature difference", _powers("K1"), "K", "5 K", highest=1e6, lowest=-1e6),
        D("pressure", _powers("M1 L-1 T-2"), "Pa", "50 torr", highest=1e12),
        D("volume", _powers("L3"), "m^3", "1.8 L", highest=1e12, above=True),
        D("time", _powers("T1"), "s", "10 min", highest=1e30),
        D("length", _powers("L1"), "m", "4.1 angstrom", highest=1e6, above=True),
        D("area", _powers("L2"), "m^2", "25 cm^2", highest=1e12, above=True),
        D("cross-section", _powers("L2"), "m^2", "0.4 nm^2", highest=1e-6),
        D("amount", _powers("N1"), "mol", "2 mmol", highest=1e15, article="an"),
        D("concentration", _powers("N1 L-3"), "mol/m^3", "0.01 mol/L", highest=1e9, molecules=True),
        D(
            "surface concentration",
            _powers("N1 L-2"),
            "mol/m^2",
            "1e14 1/cm^2",
            highest=1e6,
            molecules=True,
        ),
        D(
            "rate constant in a plane",
            _powers("L2 N-1 T-1"),
            "m^2/mol/s",
            "1e13 cm^2/mol/s",
            molecules=True,
        ),
        D(
            "number density",
            _powers("L-3"),
            "1/m^3",
            "1e16 1/cm^3",
            highest=1e33,
            routes=("number density",),
        ),
        D(
            "molar energy",
            _powers("M1 L2 T-2 N-1"),
            "J/mol",
            "102 kJ/mol",
            lowest=-1e8,
            highest=1e8,
            known="molar energy",
            routes=("energy",),
        ),
        D(
            "photon energy",
            _powers("M1 L2 T-2 N-1"),
            "J/mol",
            "365 nm",
            highest=1e9,
            above=True,
            known="photon energy or wavelength",
            routes=("energy", "wavelength"),
        ),
        D("heat capacity", _powers("M1 L2 T-2 K-1"), "J/K", "40 J/K"),
        D("molar heat capacity", _powers("M1 L2 T-2 K-1 N-1"), "J/mol/K", "29 J/mol/K"),
        D("conductance", _powers("M1 L2 T-3 K-1"), "W/K", "0.09 W/K"),
        D("energy", _powers("M1 L2 T-2"), "J", "40 J", article="an"),
        D("mass", _powers("M1"), "kg", "20 mg", above=True),
        D("molar mass", _powers("M1 N-1"), "kg/mol", "65.46 g/mol", above=True),
        D("frequency", _powers("T-1"), "1/s", "1e-3 1/s"),
        D(
            "molar absorption coefficient",
            _powers("L2 N-1"),
            "m^2/mol",
            "85 L/mol/cm",
            above=True,
        ),
        D(
            "absorption cross-section",
            _powers("L2"),
            "m^2",
            "2.5e-19 cm^2",
            above=True,
            article="an",
        ),
        D("speed", _powers("L1 T-1"), "m/s", "300 m/s"),
        D("diffusivity", _powers("L2 T-1"), "m^2/s", "0.2 cm^2/s", above=True),
        D("pressure rise", _powers("M1 L-1 T-3"), "Pa/s", "0.02 torr/h", highest=1e9, above=True),
        D("power", _powers("M1 L2 T-3"), "W", "5 W"),
        D(
            "polarisability",
            _powers("L3"),
            "m^3",
            "1.6 angstrom^3",
            above=True,
            known="polarisability volume",
        ),
        D("dipole moment", _powers("I1 T1 L1"), "A*s*m", "1.1 D"),
        D(
            "dispersion coefficient",
            _powers("M1 L8 T-2"),
            "J*m^6",
            "60 hartree*bohr^6",
            above=True,
            known="dispersion coefficient C6",
        ),
    ]


_PLAIN = {dimension.word: dimension for dimension in _plain_dimensions()}
_RATE = "rate constant of order "
_RATE_P = "rate constant in pressures, of order "
_KP = "equilibrium constant Kp for a change of "
_KC = "equilibrium constant Kc for a change of "


def rate_constant(order: float) -> str:
    """Dimension word of a rate constant of that overall order: (m^3/mol)^(order-1)/s."""
    return f"{_RATE}{order:g}"


def rate_constant_in_pressures(order: float) -> str:
    """Dimension word of the same where pressures stand for concentrations: Pa^(1-order)/s."""
    return f"{_RATE_P}{order:g}"


def equilibrium_constant(kind: str, change: float) -> str:
    """Dimension word of "Kp" [Pa^change], "Kc" [(mol/m^3)^change] or "K" [1]."""
    if kind == "K" or change == 0:
        return "equilibrium constant"
    return f"{_KP if kind == 'Kp' else _KC}{change:g}"


@cache
def named(word: str) -> Dimension:
    """The dimension of that word. Raises `KeyError` where there is none."""
    if word in _PLAIN:
        return _PLAIN[word]
    if word == "equilibrium constant":
        return Dimension(word, {}, "", "0.12", article="an", above=True)
    if word.startswith(_RATE):
        return _rate_constant(word, float(word.removeprefix(_RATE)))
    if word.startswith(_RATE_P):
        n = float(word.removeprefix(_RATE_P)) - 1
        powers = {"mass": -n, "length": n, "time": 2 * n - 1}
        si = f"Pa^{-n:g}/s"
        return Dimension(word, {key: p for key, p in powers.items() if p}, si, f"1e-6 {si}")
    if word.startswith(_KP):
        power = float(word.removeprefix(_KP))
        powers = {"mass": power, "length": -power, "time": -2 * power}
        example = "0.12 " + _raised("bar", power)
        known = "equilibrium constant Kp"
        return Dimension(
            word, powers, _raised("Pa", power), example, above=True, article="an", known=known
        )
    if word.startswith(_KC):
        power = float(word.removeprefix(_KC))
        powers = {"substance": power, "length": -3 * power}
        si = "mol/m^3" if power == 1 else f"mol^{power:g}/m^{3 * power:g}"
        example = "0.02 mol/L" if power == 1 else f"0.02 mol^{power:g}*L^{-power:g}"
        return Dimension(
            word,
            powers,
            si,
            example,
            above=True,
            molecules=True,
            article="an",
            known="equilibrium constant Kc",
        )
    raise KeyError(word)


def _raised(unit: str, power: float) -> str:
    return unit if power == 1 else f"1/{unit}" if power == -1 else f"{unit}^{power:g}"


def _rate_constant(word: str, order: float) -> Dimension:
    n = order - 1
    powers = {"length": 3 * n, "substance": -n, "time": -1.0}
    si = {0.0: "1/s", 1.0: "m^3/mol/s", -1.0: "mol/m^3/s"}.get(n, f"m^{3 * n:g}*mol^{-n:g}/s")
    litres = {0.0: "1/s", 1.0: "L/mol/s", -1.0: "mol/L/s"}.get(n, f"L^{n:g}*mol^{-n:g}/s")
    if n > 1:
        si, litres = f"m^{3 * n:g}/mol^{n:g}/s", f"L^{n:g}/mol^{n:g}/s"
    known = f"rate constant of order {order:g}" if order != 0 else "rate of order 0"
    return Dimension(
        word,
        {key: power for key, power in powers.items() if power != 0},
        si,
        f"1e3 {litres}" if n else "1e-3 1/s",
        molecules=n != 0,
        known=known,
    )


def phrase(word: str) -> str:
    """What would be right, for a message: ``a pressure such as "50 torr"``."""
    return named(word).phrase


def any_phrase(words: tuple[str, ...]) -> str:
    """What would be right where several kinds are allowed, with one example."""
    if len(words) == 1:
        return phrase(words[0])
    names = [f"{named(w).article} {named(w).known or w}" for w in words]
    return f'{", ".join(names[:-1])} or {names[-1]}, such as "{named(words[0]).example}"'


def si_unit(word: str) -> str:
    """The SI unit of a dimension, empty for pure numbers."""
    return named(word).si


def word_for(powers: dict[str, float]) -> str:
    """The name of the quantity that has these base dimensions, empty if we know none."""
    for dimension in _PLAIN.values():
        if dimension.powers == powers and dimension.word != "pure":
            return f"{dimension.article} {dimension.word}" if powers else "a pure number"
    return ""
