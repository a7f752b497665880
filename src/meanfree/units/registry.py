"""The units of the trade, defined for pint: a short list of our own, so that a typing slip meets
no exotic unit ("10 C" is no charge here), and so that start-up stays short.
"""

from __future__ import annotations

import difflib
import math
from functools import cache
from typing import TYPE_CHECKING, Any, NamedTuple

from meanfree import constants
from meanfree.units.gate import Factors, RefusedError, quoted

if TYPE_CHECKING:
    import pint

_DEFINITIONS = f"""
@defaults
    group = international
    system = mks
@end
tera- = 1e12 = T-
giga- = 1e9 = G-
mega- = 1e6 = M-
kilo- = 1e3 = k-
milli- = 1e-3 = m-
micro- = 1e-6 = µ- = u-
nano- = 1e-9 = n-
pico- = 1e-12 = p-
femto- = 1e-15 = f-
meter = [length] = m = metre
centimeter = 1e-2 * meter = cm = centimetre
second = [time] = s = sec
gram = [mass] = g
kelvin = [temperature] = K
mole = [substance] = mol
ampere = [current] = A
degree_Celsius = kelvin; offset: 273.15 = degC = celsius
degree_Fahrenheit = 5 / 9 * kelvin; offset: 233.15 + 200 / 9 = degF = fahrenheit
degree_Rankine = 5 / 9 * kelvin = degR = rankine
molecule = 1 / {constants.N_A!r} * mole = molecule = molec = particle = atom
angstrom = 1e-10 * meter = Å = Angstrom = ångström
bohr = 5.29177210544e-11 * meter = bohr = a0
micron = 1e-6 * meter
decimeter = 0.1 * meter = dm = decimetre
inch = 0.0254 * meter = in
foot = 0.3048 * meter = ft
liter = 1e-3 * meter ** 3 = L = l = litre
cubic_centimeter = 1e-6 * meter ** 3 = cc = ccm
minute = 60 * second = min
hour = 3600 * second = h = hr
day = 86400 * second = d
week = 604800 * second = week
year = 31557600 * second = yr
hertz = 1 / second = Hz
dalton = {constants.m_u!r} * kilogram = Da = amu
newton = kilogram * meter / second ** 2 = N
pascal = newton / meter ** 2 = Pa
hectopascal = 1e2 * pascal = hPa
bar = 1e5 * pascal = bar = bara
atmosphere = {constants.ATMOSPHERE!r} * pascal = atm
torr = {constants.ATMOSPHERE!r} / 760 * pascal = torr = Torr
mmHg = 133.322387415 * pascal = mmHg
inHg = 3386.388640341 * pascal = inHg
psi = 6894.757293168361 * pascal = psi = psia
joule = newton * meter = J
watt = joule / second = W
calorie = {constants.CALORIE!r} * joule = cal
electron_volt = {constants.e!r} * joule = eV
hartree = 4.3597447222060e-18 * joule = hartree = Hartree
coulomb = ampere * second
volt = joule / coulomb = V
debye = 1e-21 / {constants.c!r} * coulomb * meter = D = debye
molar = mole / liter = M
"""

_MEANT = {"C": "degC", "F": "degF", "c": "degC", "k": "K", "kelvins": "K", "S": "s", "mn": "min"}
_COMMON = """
K degC degF Pa kPa MPa hPa mbar bar atm torr mTorr mmHg psi m cm mm µm nm pm angstrom L mL µL cm^3
m^3 s ms µs ns min h day mol mmol µmol nmol kmol molecule g mg kg J kJ cal kcal eV meV hartree W mW
D M mM ppm ppb %
""".split()  # noqa: SIM905 -- fifty quoted names would be harder to read


class Size(NamedTuple):
    """A unit in SI: value_SI = value * factor + offset; ``powers`` of the base dimensions."""

    factor: float
    offset: float
    powers: dict[str, float]


@cache
def _registry() -> pint.UnitRegistry[float]:
    import pint

    registry: pint.UnitRegistry[float] = pint.UnitRegistry(
        None, autoconvert_offset_to_baseunit=True
    )
    registry.load_definitions(_DEFINITIONS.splitlines())
    return registry


@cache
def size(parts: Factors) -> Size:
    """What a product of units is in SI with mol. Raises `RefusedError` for an unknown unit."""
    registry = _registry()
    for name, _ in parts:
        if not _known(name):
            raise RefusedError(f"in which {quoted(name)} is no unit known here", _near(name))
    unit = registry.parse_units("*".join(f"{name}**({power!r})" for name, power in parts))
    powers = {
        key.strip("[]"): float(power) for key, power in dict[str, Any](unit.dimensionality).items()
    }
    scale = _offset_scale(parts[0][0]) if parts else ""
    if scale and parts == ((parts[0][0], 1.0),):
        zero = _si(registry.Quantity(0.0, unit).to_base_units())
        one = registry.Quantity(1.0, registry.parse_units(f"delta_{scale}")).to_base_units()
        return Size(_si(one), zero, powers)
    if any(_offset_scale(name) for name, _ in parts):
        raise RefusedError("with a temperature scale inside a compound unit", "K instead")
    try:
        factor = _si(registry.Quantity(1.0, unit).to_base_units())
    except OverflowError:
        factor = math.inf
    if not 0 < factor < math.inf:
        raise RefusedError("with a unit too large or too small to hold")
    return Size(factor, 0.0, powers)


def _si(quantity: Any) -> float:
    # pint's base of mass in our short list is the gram.
    grams: float = dict(quantity.dimensionality).get("[mass]", 0)
    return float(float(quantity.magnitude) * 1e-3 ** float(grams))


def _known(name: str) -> bool:
    """Is there such a unit? A plural s counts only where the whole word is written ("hours")."""
    parse = _registry().parse_unit_name
    read = parse(name)
    if name.endswith("s") and read and parse(name[:-1]) == read:
        return any(f"{prefix}{unit}s" == name for prefix, unit, _ in read)
    return bool(read)


def _offset_scale(name: str) -> str:
    """The full name of a temperature scale whose zero is not absolute zero, else empty."""
    for _, unit, _ in _registry().parse_unit_name(name):
        if unit in ("degree_Celsius", "degree_Fahrenheit"):
            return str(unit)
    return ""


def _near(name: str) -> str:
    if name in _MEANT:
        return f'did you mean "{_MEANT[name]}"?'
    folded = {unit.lower(): unit for unit in _COMMON}
    # A letter's case is the least of slips: "Tor" is nearer to "torr" than to "mTorr".
    near = folded.get(name.lower()) or next(
        (folded[unit] for unit in difflib.get_close_matches(name.lower(), folded, n=1, cutoff=0.6)),
        "",
    )
    return f'did you mean "{near}"?' if near else ""
