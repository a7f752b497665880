"""Numbers and units as a reader wants them: few digits, familiar units, no notation of machines.

SI goes out to the screen here and nowhere else; text of the case is made harmless here.
"""

from __future__ import annotations

import math
import unicodedata
from dataclasses import dataclass

from meanfree import units
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.gases.formula import parse_formula
from meanfree.gases.gas import Gas
from meanfree.sourced import Sourced

_SUBSCRIPT = str.maketrans("0123456789+-", "₀₁₂₃₄₅₆₇₈₉₊₋")
_SUPERSCRIPT = str.maketrans("0123456789+-.", "⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻·")

MINUTE, HOUR, DAY, YEAR = 60.0, 3600.0, 86400.0, 365.25 * 86400.0


def clean(text: object) -> str:
    """Text of a case on one line, with control and direction characters made visible."""
    parts = []
    for character in str(text):
        if character in "\n\t\r":
            parts.append(" ")
        elif unicodedata.category(character).startswith("C"):
            parts.append(f"\\u{ord(character):04x}")
        else:
            parts.append(character)
    return "".join(parts)


def number(value: float, digits: int = 3) -> str:
    """A number with that many significant digits: ``0.0123``, ``1.2 × 10⁻⁵``, ``12 300``.

    >>> number(0.012345), number(1.2345e-5), number(123456.0, 4), number(0.0)
    ('0.0123', '1.23 × 10⁻⁵', '123 500', '0')
    """
    value = float(value)
    if value == 0:
        return "0"
    if not math.isfinite(value):
        return "∞" if value > 0 else "−∞" if value < 0 else "—"
    mantissa, power = f"{abs(value):.{digits - 1}e}".split("e")
    sign, exponent = "−" if value < 0 else "", int(power)
    if not -4 < exponent < 6:
        return f"{sign}{mantissa} × 10{str(exponent).translate(_SUPERSCRIPT)}"
    rounded = float(f"{mantissa}e{power}")
    decimals = max(0, digits - 1 - exponent)
    return sign + f"{rounded:,.{decimals}f}".replace(",", " ")


def power_of_ten(value: float) -> str:
    """The power of ten nearest to a value.

    >>> power_of_ten(1e-7), power_of_ten(1.0)
    ('10⁻⁷', '1')
    """
    power = round(math.log10(value))
    return f"10{str(power).translate(_SUPERSCRIPT)}" if power else "1"


def given(value: float, digits: int = 7) -> str:
    """A number as someone gave it: no digits beyond those that say something.

    >>> given(1.8), given(9.4e9), given(102.0), given(0.27)
    ('1.8', '9.4 × 10⁹', '102', '0.27')
    """
    text = number(value, digits)
    mantissa, times, power = text.partition(" × ")
    if "." in mantissa:
        mantissa = mantissa.rstrip("0").rstrip(".")
    return mantissa + times + power


def percent(fraction: float, digits: int = 3) -> str:
    """A fraction as per cent: ``37.2 %``; what is nearly all is not rounded to all.

    >>> percent(0.3721), percent(0.999), percent(0.99996), percent(0.5), percent(-0.25)
    ('37.2 %', '99.9 %', '99.996 %', '50 %', '−25 %')
    >>> percent(1 - 1e-9)
    'over 99.999 %'
    """
    value = 100 * float(fraction)
    if 99.999 < value < 100:
        return "over 99.999 %"
    text = f"{abs(value):.{digits}g}"
    if 99 < abs(value) < 100 and float(text) >= 100:
        text = f"{100 - float(f'{100 - abs(value):.1g}'):.10g}"
    if "e" in text:
        text = number(abs(value), digits)
    return ("−" if value < 0 and text != "0" else "") + text + " %"


def duration(seconds: float | None, digits: int = 3) -> str:
    """A length of time in the unit a person would say; None is "not reached".

    >>> duration(870.0), duration(7380.0), duration(0.0123), duration(3.2e-7)
    ('14.5 min', '2 h 3 min', '12.3 ms', '0.32 µs')
    >>> duration(200 * 86400.0), duration(1e11), duration(None)
    ('200 d', '3 170 years', 'not reached')
    """
    if seconds is None:
        return "not reached"
    t = float(seconds)
    if t == 0:
        return "0 s"
    for factor, name, below in ((1e-9, "ns", 1e-7), (1e-6, "µs", 1e-3), (1e-3, "ms", 1.0)):
        if t < below * (1 - 0.5 * 10.0**-digits):
            return f"{_shortest(t / factor, digits)} {name}"
    if t < 2 * MINUTE:
        return f"{_shortest(t, digits)} s"
    if t < 2 * HOUR - 30:
        return f"{_shortest(t / MINUTE, digits)} min"
    if t < 2 * DAY - 30:
        return _two(t, HOUR, "h", MINUTE, "min")
    if t < 100 * DAY:
        return _two(t, DAY, "d", HOUR, "h")
    if t < 2 * YEAR:
        return f"{_shortest(t / DAY, digits)} d"
    return f"{number(t / YEAR, digits)} years"


def _shortest(value: float, digits: int) -> str:
    text = f"{value:.{digits}g}"
    return number(value, digits) if "e" in text else text


def _two(t: float, large: float, large_name: str, small: float, small_name: str) -> str:
    whole = round(t / small)
    ratio = round(large / small)
    rest = whole % ratio
    return f"{whole // ratio} {large_name}" + (f" {rest} {small_name}" if rest else "")


def pretty_unit(unit: str) -> str:
    """A unit as printed: ``m^3/mol/s`` becomes ``m³/mol/s``.

    >>> pretty_unit("cm^3/molecule/s"), pretty_unit("1/s"), pretty_unit("degC")
    ('cm³/molecule/s', '1/s', '°C')
    """
    parts: list[str] = []
    raised = False
    for character in unit.replace("**", "^").replace("degC", "°C").replace("degF", "°F"):
        if character == "^":
            raised = True
        elif raised and character in "0123456789+-.":
            parts.append(character.translate(_SUPERSCRIPT))
        elif character not in "()":
            raised = False
            parts.append("·" if character == "*" else character)
    return "".join(parts).replace("angstrom", "Å").replace("micrometer", "µm")


def powers(unit: str, power: float) -> str:
    """A power of a unit per second, as printed.

    >>> powers("torr", -1.0), powers("bar", -2.0), powers("Pa", 1.0), powers("torr", -0.5)
    ('torr⁻¹ s⁻¹', 'bar⁻² s⁻¹', 'Pa s⁻¹', 'torr⁻⁰·⁵ s⁻¹')
    """
    raised = "" if power == 1 else f"{power:g}".translate(_SUPERSCRIPT)
    return f"{pretty_unit(unit)}{raised} s⁻¹"


def quantity(value: float, unit: str, dimension: str, digits: int = 3) -> str:
    """An SI value in a unit: ``50 torr``."""
    shown = units.from_si(float(value), unit, dimension) if unit else float(value)
    space = "" if not unit else " "
    return f"{number(shown, digits)}{space}{pretty_unit(unit)}"


def rate(value: float, unit: str, order: float, digits: int = 4) -> str:
    """A rate constant of an overall order in a unit."""
    return quantity(value, unit, units.rate_constant(order), digits)


def as_written(sourced: Sourced) -> str:
    """A value of the case in the unit and the counting it was written in."""
    value = sourced.value * sourced.per
    if sourced.unit and sourced.dimension:
        value = units.from_si(value, sourced.unit, sourced.dimension)
    return f"{given(value)} {pretty_unit(sourced.unit)}".strip()


def temperature(kelvin: float) -> str:
    """A temperature: ``480 K``, ``298.15 K``."""
    return f"{float(f'{kelvin:.2f}'):g} K"


def chemical(gas: Gas) -> str:
    """A gas as printed: subscripts where the name is its formula, else the name literally.

    >>> chemical(Gas("N2O4", parse_formula("N2O4"))), chemical(Gas.label("A2"))
    ('N₂O₄', 'A2')
    """
    return formula_text(gas.name) if _is_formula(gas) else clean(gas.name)


def _is_formula(gas: Gas) -> bool:
    if gas.formula is None:
        return False
    try:
        return parse_formula(gas.name) == gas.formula
    except InputError:
        return False


def formula_text(text: str) -> str:
    """A formula with its counts as subscripts and its charge as superscript.

    >>> formula_text("(CH3)2CO"), formula_text("SO4^2-"), formula_text("O2+"), formula_text("e-")
    ('(CH₃)₂CO', 'SO₄²⁻', 'O₂⁺', 'e⁻')
    """
    body = text.rstrip("+-")
    signs = text[len(body) :]
    body, _, size = body.partition("^")
    if signs and not size and body.rstrip("0123456789").endswith("]"):
        core = body.rstrip("0123456789")
        body, size = core, body[len(core) :]
    return body.translate(_SUBSCRIPT) + (size + signs).translate(_SUPERSCRIPT)


def reaction(text: str, experiment: Experiment) -> str:
    """A reaction as printed, each gas in it as `chemical` prints it."""
    words = [
        chemical(experiment.gas_named[word]) if word in experiment.gas_named else clean(word)
        for word in text.split(" ")
    ]
    return " ".join(words)


@dataclass(frozen=True)
class UnitsInUse:
    """The units in which a case is shown: those it was written in, else common ones."""

    pressure: str = "kPa"
    concentration: str = "mol/m^3"
    volume: str = "L"
    amount: str = "mmol"


def units_in_use(experiment: Experiment) -> UnitsInUse:
    """The units that the case was written in: those of the total, of the gases, of the vessel."""
    fill, vessel = experiment.fill, experiment.vessel
    portions = [*([fill.total] if fill.total is not None else []), *fill.gases.values()]
    written = [portion.quantity for portion in portions]
    written += [q for q in (vessel.pressure, vessel.rated_pressure, vessel.volume) if q is not None]
    default = UnitsInUse()

    def first(dimension: str, otherwise: str) -> str:
        return next((q.unit for q in written if q.dimension == dimension and q.unit), otherwise)

    return UnitsInUse(
        pressure=first("pressure", default.pressure),
        concentration=first("concentration", default.concentration),
        volume=first("volume", default.volume),
        amount=first("amount", default.amount),
    )


def pressure(pascal: float, shown: UnitsInUse, digits: int = 4) -> str:
    """A pressure in the unit of the case."""
    return quantity(pascal, shown.pressure, "pressure", digits)


def slope(pascal_per_second: float, shown: UnitsInUse) -> str:
    """A change of pressure per time, above zero, in the first time that gives a tenth or more.

    >>> slope(1.0, UnitsInUse("torr")), slope(2e4, UnitsInUse())
    ('0.450 torr/min', '20.0 kPa/s')
    """
    per_second = units.from_si(pascal_per_second, shown.pressure, "pressure")
    times = ((1.0, "s"), (MINUTE, "min"), (HOUR, "h"), (DAY, "d"))
    length, name = next((one for one in times if per_second * one[0] >= 0.1), times[-1])
    return f"{number(per_second * length)} {pretty_unit(shown.pressure)}/{name}"


def change(before: float, after: float) -> str:
    """A change relative to what was before: ``+9.3 %``, "unchanged"."""
    if before == 0:
        return "from nothing"
    ratio = after / before - 1
    if abs(ratio) < 5e-6:
        return "unchanged"
    text = percent(ratio)
    return text if ratio < 0 else f"+{text}"


def is_per_molecule(unit: str) -> bool:
    """True for a unit that counts molecules: cm^3/molecule/s, cm^6/molecule^2/s."""
    return "molecule" in unit
