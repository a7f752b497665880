"""The arguments of `collide` become a question about two gases, or every problem in one go."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

from meanfree import constants, units
from meanfree.errors import InputError, Problem
from meanfree.gases.gas import Gas
from meanfree.gases.identity import SeveralGasesError, UnknownGasError, are_same, find_gas
from meanfree.report import wording
from meanfree.report.pair.question import PairQuestion
from meanfree.sourced import Sourced
from meanfree.units.gate import quoted

AS_GIVEN = "as given on the command line"
DEFAULT_TEMPERATURE = Sourced(298.15, "K", "taken, for want of --at", "temperature", default=True)
DEFAULT_PRESSURE = Sourced(
    constants.STANDARD_PRESSURE, "bar", "taken, for want of --pressure", "pressure", default=True
)
_EXAMPLES = {
    "--diameter": 'H2="2.83 angstrom"',
    "--cas": "C4H6=106-99-0",
    "--formula": "butadiene=C4H6",
    "--mole-fraction": "H2=0.3",
}


@dataclass(frozen=True)
class PairArguments:
    """What stands on the command line, as text."""

    gases: tuple[str, str]
    at: str | None = None
    pressure: str | None = None
    coverage: str | None = None
    plane: bool = False
    threshold: str | None = None
    Ea: str | None = None
    mole_fractions: Sequence[str] = ()
    diameters: Sequence[str] = ()
    cas: Sequence[str] = ()
    formulas: Sequence[str] = ()

    def words(self) -> list[str]:
        """The words to type for the same question, defaults written out."""
        at = self.at or f"{DEFAULT_TEMPERATURE.value:g} K"
        words = [*self.gases, "--at", at]
        if self.plane:
            words.append("--plane")
        pressure = self.pressure or (None if self.plane else "1 bar")
        single = (
            ("--pressure", pressure),
            ("--coverage", self.coverage),
            ("--threshold", self.threshold),
            ("--Ea", self.Ea),
        )
        for option, text in single:
            words += [option, text] if text is not None else []
        several = (
            ("--mole-fraction", self.mole_fractions),
            ("--diameter", self.diameters),
            ("--cas", self.cas),
            ("--formula", self.formulas),
        )
        for option, texts in several:
            for text in texts:
                words += [option, text]
        return words


def question_of(arguments: PairArguments) -> PairQuestion:
    """The question that these arguments ask. Raises `InputError` with every problem."""
    reader = _Reader(arguments)
    question = reader.read()
    if reader.problems or question is None:
        raise InputError(reader.problems)
    filled = question.collisions().crowd
    if filled is not None and filled.filled_fraction >= question.closest_packing:
        option = "--coverage" if question.in_plane else "--pressure"
        asked = question.coverage or question.pressure
        assert asked is not None
        room = "surface" if question.in_plane else "volume"
        taken = f" ({asked.source})" if asked.default else ""
        raise InputError.at(
            option,
            f"{wording.as_written(asked)}{taken}, at which the molecules would need "
            f"{wording.percent(filled.filled_fraction)} of the {room}",
            "a dilute gas, in which molecules fill next to nothing",
        )
    return question


@dataclass
class _Reader:
    arguments: PairArguments
    problems: list[Problem] = field(default_factory=list)

    def wrong(self, key: str, found: str, expected: str) -> None:
        self.problems.append(Problem(key, found, expected))

    def read(self) -> PairQuestion | None:
        said = self.arguments
        names = said.gases
        gases = self.gases(names)
        temperature = self.quantity("--at", said.at, "temperature") or DEFAULT_TEMPERATURE
        pressure, coverage = self.amounts()
        threshold, Ea = self.barrier()
        fractions = self.fractions(names, gases, coverage is not None or not said.plane)
        if self.problems or len(gases) != 2:
            return None
        return PairQuestion(
            gases=(gases[0], gases[1]),
            temperature=temperature,
            in_plane=said.plane,
            pressure=pressure,
            coverage=coverage,
            mole_fractions=fractions,
            threshold=threshold,
            activation_energy=Ea,
        )

    def quantity(self, option: str, text: str | None, dimension: str) -> Sourced | None:
        """A quantity in SI, None where there is none."""
        if text is None:
            return None
        try:
            return units.read(text, dimension, AS_GIVEN)
        except units.QuantityError as error:
            self.wrong(option, error.found, error.expected)
            return None

    def amounts(self) -> tuple[Sourced | None, Sourced | None]:
        """Pressure in space or coverage in a plane."""
        said = self.arguments
        pressure = self.above_zero("--pressure", said.pressure, "pressure")
        coverage = self.above_zero("--coverage", said.coverage, "surface concentration")
        if said.plane and said.pressure is not None:
            self.wrong(
                "--pressure",
                f"{quoted(said.pressure)} with --plane, where there is no pressure",
                f"--coverage with {units.phrase('surface concentration')}",
            )
        if not said.plane and said.coverage is not None:
            self.wrong(
                "--coverage",
                f"{quoted(said.coverage)} without --plane",
                "--plane for molecules on a surface, or --pressure for a gas",
            )
        if said.plane:
            return None, coverage
        return pressure or DEFAULT_PRESSURE, None

    def above_zero(self, option: str, text: str | None, dimension: str) -> Sourced | None:
        value = self.quantity(option, text, dimension)
        if value is not None and value.value == 0:
            self.wrong(option, quoted(text), f"{units.phrase(dimension)}, above 0")
        return value

    def barrier(self) -> tuple[Sourced | None, Sourced | None]:
        """Threshold or activation energy."""
        said = self.arguments
        threshold = self.quantity("--threshold", said.threshold, "molar energy")
        if threshold is not None and threshold.value < 0:
            expected = f"{units.phrase('molar energy')}, at least 0; a negative Ea goes to --Ea"
            self.wrong("--threshold", quoted(said.threshold), expected)
        Ea = self.quantity("--Ea", said.Ea, "molar energy")
        if said.threshold is not None and said.Ea is not None:
            self.wrong("--Ea", "--threshold beside it", "one of the two: E0 is Ea - RT/2")
        return threshold, Ea

    def by_gas(self, option: str, texts: Sequence[str], names: Sequence[str]) -> dict[str, str]:
        """What ``GAS=VALUE`` says of each gas of the command."""
        found: dict[str, str] = {}
        for text in texts:
            name, equals, value = text.rpartition("=")
            if not equals or not name or not value.strip():
                self.wrong(option, quoted(text), f"GAS=VALUE, such as {_EXAMPLES[option]}")
            elif name not in names:
                from meanfree.case.findings import did_you_mean, one_of

                listed = one_of(dict.fromkeys(names)) + did_you_mean(name, names)
                self.wrong(option, f"{quoted(name)}, no gas of this command", listed)
            elif name in found:
                self.wrong(option, f"two values for {name}", "one")
            else:
                found[name] = value.strip()
        return found

    def gases(self, names: Sequence[str]) -> list[Gas]:
        """The gases with what the command says of them; fewer where one is not settled."""
        said = self.arguments
        formulas = self.by_gas("--formula", said.formulas, names)
        numbers = self.by_gas("--cas", said.cas, names)
        diameters = self.by_gas("--diameter", said.diameters, names)
        known: dict[str, Gas] = {}
        for name in dict.fromkeys(names):
            gas = self.gas(name, formulas.get(name), numbers.get(name))
            given = self.quantity("--diameter", diameters.get(name), "length")
            if gas is not None:
                known[name] = gas if given is None else replace(gas, diameter=given)
        self.share_diameters(known, diameters)
        for name, gas in known.items():
            if gas.diameter is None and name not in diameters:
                found, example = f"no known diameter of {name}", f'{name}="4.1 angstrom"'
                self.wrong("--diameter", found, f"one, such as --diameter {example}")
        return [known[name] for name in names if name in known]

    def gas(self, name: str, formula: str | None, cas: str | None) -> Gas | None:
        try:
            return find_gas(name, formula=formula, cas=cas)
        except UnknownGasError as error:
            hint = f" (perhaps {', '.join(error.near)})" if error.near else ""
            expected = (
                f"a gas that is known{hint}, or one with --formula {name}=… and --cas {name}=…"
            )
            self.wrong("GAS", error.problems[0].found, expected)
        except SeveralGasesError as error:
            expected = f"--cas {name}=… with one of: {error.candidates}; or none"
            self.wrong("GAS", error.problems[0].found, expected)
        except InputError as error:
            options = {f"gases.{name}.formula": "--formula", f"gases.{name}.cas": "--cas"}
            self.problems += [
                replace(problem, key=options.get(problem.key, "GAS")) for problem in error.problems
            ]
        return None

    def share_diameters(self, known: dict[str, Gas], given: dict[str, str]) -> None:
        """One gas under two names has one diameter: what is said of either holds for both."""
        if len(known) != 2 or not are_same(*known.values()):
            return
        (first, one), (second, other) = known.items()
        if one.diameter is None or other.diameter is None:
            return
        if first in given and second in given:
            if one.diameter.value != other.diameter.value:
                found = f"{given[first]} for {first} and {given[second]} for {second}"
                self.wrong("--diameter", found, "one value: the two are one gas")
        elif first in given:
            known[second] = replace(other, diameter=one.diameter)
        elif second in given:
            known[first] = replace(one, diameter=other.diameter)

    def fractions(
        self, names: tuple[str, str], gases: Sequence[Gas], has_amount: bool
    ) -> tuple[float, float] | None:
        """Mole fractions of the two; what is said of one gas settles the other."""
        texts = self.arguments.mole_fractions
        given = self.by_gas("--mole-fraction", texts, names)
        values: dict[str, float] = {}
        for name, text in given.items():
            try:
                values[name] = units.read_number(text, "fraction").value
            except units.QuantityError as error:
                self.wrong("--mole-fraction", error.found, error.expected)
        if not texts:
            return None
        if len(gases) == 2 and are_same(*gases):
            self.wrong("--mole-fraction", quoted(texts[0]), "none: the two are one gas, pure")
            return None
        if not has_amount:
            self.wrong("--mole-fraction", f"{quoted(texts[0])} without --coverage", "both, or none")
            return None
        if not values or len(values) != len(given):
            return None
        first, second = names
        one = values.get(first, 1.0 - values.get(second, 0.0))
        other = values.get(second, 1.0 - one)
        if abs(one + other - 1.0) > 1e-9:
            self.wrong(
                "--mole-fraction",
                f"{wording.given(one)} and {wording.given(other)}",
                "two fractions that add up to 1, or one of them",
            )
        return one, other
