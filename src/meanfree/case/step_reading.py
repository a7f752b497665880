"""What a rate law's table may know and say while it is read."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

from meanfree.case.findings import Findings
from meanfree.case.in_pressures import IN_CONCENTRATIONS, in_pressures
from meanfree.case.meaning.reaction import Reaction
from meanfree.case.schema.base import AS_GIVEN
from meanfree.case.schema.steps import StepTable
from meanfree.experiment.temperature import Temperature, is_constant
from meanfree.gases.gas import Gas
from meanfree.sourced import Sourced
from meanfree.units import QuantityError, phrase, rate_constant, read
from meanfree.units.gate import quoted
from meanfree.units.reading import described


@dataclass
class StepReading:
    """One step while it is read.

    ``reaction``, ``orders``, ``per`` and ``temperature`` are None where they were refused; what
    depends on them is passed over, for the first error counts. ``gases`` holds None for a
    gas that is not known.
    """

    address: str
    table: StepTable
    findings: Findings
    gases: Mapping[str, Gas | None]
    temperature: Temperature | None
    reaction: Reaction | None = None
    orders: Mapping[str, float] | None = None
    per: float | None = 1.0

    def wrong(self, field: str, found: str, expected: str) -> None:
        """Add a problem at a key of this step."""
        self.findings.wrong(f"{self.address}.{field}", found, expected)

    @property
    def count(self) -> int:
        """Number of problems so far."""
        return len(self.findings.problems)

    @property
    def temperature_varies(self) -> bool:
        """True where the run is known not to be at one temperature."""
        return self.temperature is not None and not is_constant(self.temperature)

    @property
    def source(self) -> str:
        """Where this step's numbers come from."""
        return self.table.source or AS_GIVEN

    def sourced(self, quantity: Sourced) -> Sourced:
        """A quantity of this step with the step's source."""
        return quantity if quantity.default else replace(quantity, source=self.source)

    def rate_constant(self, field: str, *, bath: bool | None = None) -> Sourced | None:
        """The rate constant at a key, per event and in SI; None where that cannot be.

        Its order is the step's, and one more where M is written (``bath`` overrides that).
        """
        raw = getattr(self.table, field)
        return None if raw is None else self.rate_constant_of(raw, field, bath=bath)

    def rate_constant_of(
        self, raw: object, field: str, *, bath: bool | None = None, at: float | None = None
    ) -> Sourced | None:
        """The same of a value that stands deeper in the table; ``field`` is its key there.

        ``at`` [K] is the temperature at which it holds, where the table says so.
        """
        if self.reaction is None or self.orders is None:
            if not isinstance(raw, str):
                self.wrong(field, f"{described(raw)}, a bare number", _ANY_RATE)
            return None
        with_bath = self.reaction.bath if bath is None else bath
        order = sum(self.orders.values()) + (1.0 if with_bath else 0.0)
        try:
            k = read(raw, rate_constant(order), self.source)
        except QuantityError as error:
            pressures = in_pressures(raw, order)
            if pressures is None:
                self.wrong(field, error.found, error.expected)
                return None
            held = self.temperature.initial if self._is_held(field) and self.temperature else at
            if held is None:
                self.wrong(field, f"{quoted(raw)}, in pressures", IN_CONCENTRATIONS)
                return None
            k = pressures.at(held, self.source)
            self.findings.note(f"{self.address}.{field}: {pressures.words(raw, held)}")
        if self.per is None:
            return None
        return replace(k, value=k.value / self.per, per=self.per)

    def _is_held(self, field: str) -> bool:
        """True for a plain number in a run at one temperature, which is then where it holds."""
        return field in ("k", "rate") and not self.temperature_varies

    def counts_events(self) -> None:
        """Refuse k_counts where the rate constant is computed."""
        if self.table.k_counts != "events":
            self.wrong(
                "k_counts",
                f'"{self.table.k_counts}" with a rate constant that is computed',
                '"events", or no k_counts: each collision is one event',
            )

    def one_way(self, what: str) -> None:
        """Refuse a reverse of what has none."""
        if self.table.has("reverse"):
            self.wrong("reverse", f"a reverse of {what}", "no reverse: it has no detailed balance")

    def needs_pair(self, *, diameters: bool) -> None:
        """Refuse the step unless it is an encounter of two real molecules of known size."""
        if self.reaction is None:
            return
        expected = "two molecules that meet, such as 2 NOCl or H + Br2"
        molecules = [(gas, n) for gas, n in self.reaction.reactants]
        total = sum(n for _, n in molecules)
        if self.reaction.bath:
            self.wrong("reaction", "+ M with a collision law", f"{expected}, without M")
        elif total != 2 or any(n != int(n) for _, n in molecules):
            word = "molecule" if total == 1 else "molecules"
            self.wrong("reaction", f"{total:g} {word} on the left", expected)
        elif self.table.orders is not None:
            self.wrong("orders", "orders with a collision law", "no orders: they are 1 and 1, or 2")
        for name, _ in molecules:
            gas = self.gases.get(name)
            if gas is None:
                continue
            if gas.molar_mass is None:
                self.wrong(
                    "law",
                    f"the label {name}, which has no mass",
                    "a law that needs no mass, such as arrhenius",
                )
            elif diameters and gas.diameter is None:
                self.findings.wrong(
                    f"gases.{name}.diameter",
                    f"no known diameter of {name}, which {self.address} needs",
                    f"one under [gases.{name}], {phrase('length').replace('a length ', '')}",
                )


_ANY_RATE = 'a rate constant in quotes and with its unit, such as "9.4e9 L/mol/s"'
