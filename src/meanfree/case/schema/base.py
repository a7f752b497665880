"""What all tables share: strict shapes, quantities read at once, and errors in our words.

A table with a wrong field is still read for its other fields, so that the second pass finds
everything else that is wrong in the same go: a wrong or missing field is None, and `is_wrong`
tells it from one that was left out.
"""

from __future__ import annotations

from typing import Annotated, Any, ClassVar, TypeVar

from pydantic import (
    BaseModel,
    ConfigDict,
    PrivateAttr,
    StringConstraints,
    ValidationError,
    ValidatorFunctionWrapHandler,
    field_validator,
)
from pydantic.fields import FieldInfo
from pydantic_core import PydanticCustomError, core_schema

from meanfree.case.findings import Findings, did_you_mean, one_of
from meanfree.sourced import Sourced
from meanfree.units import QuantityError, any_phrase, read_any, read_number
from meanfree.units.dimensions import named
from meanfree.units.gate import quoted
from meanfree.units.reading import described

_WRONG = object()
AS_GIVEN = "the case file"
TOP_KEYS = ("labels", "title", "purpose")


class Table(BaseModel):
    """Base of every table of a case file."""

    model_config = ConfigDict(
        extra="forbid", strict=True, arbitrary_types_allowed=True, defer_build=True
    )
    hints: ClassVar[dict[str, str]] = {}
    _wrong: frozenset[str] = PrivateAttr(default=frozenset())

    @field_validator("*", mode="wrap")
    @classmethod
    def _skip_wrong(cls, value: Any, handler: ValidatorFunctionWrapHandler) -> Any:
        return None if value is _WRONG else handler(value)

    @classmethod
    def hint(cls, key: str) -> str:
        """What is meant by an unknown key that is often written, empty if nothing is known."""
        return cls.hints.get(key, "")

    def is_wrong(self, field: str) -> bool:
        """True where the field was there, or should have been, and was refused."""
        return field in self._wrong

    def has(self, field: str) -> bool:
        """True where the file gives this key, right or wrong."""
        return self.is_wrong(field) or getattr(self, field) is not None


T = TypeVar("T", bound=Table)


def shape(model: type[T], raw: object, address: str, findings: Findings) -> T | None:
    """The table that ``raw`` holds; what is wrong goes to ``findings``.

    None only where there is no table at all.
    """
    if not isinstance(raw, dict):
        findings.wrong(address, described(raw), "a table")
        return None
    try:
        return model.model_validate(raw)
    except ValidationError as error:
        wrong = set()
        for item in error.errors(include_url=False, include_input=True):
            wrong.add(str(item["loc"][0]))
            _tell(model, dict(item), address, findings)
    fields = set(model.model_fields)
    kept = {key: value for key, value in raw.items() if key in fields - wrong}
    table = model.model_validate({**kept, **dict.fromkeys(fields & wrong, _WRONG)})
    table._wrong = frozenset(wrong)
    return table


def _tell(model: type[Table], item: dict[str, Any], address: str, findings: Findings) -> None:
    """One of pydantic's errors in our words."""
    loc, kind, context = item["loc"], item["type"], item.get("ctx", {})
    words = [
        str(part) or '""' for part in loc if not str(part).startswith(("function-", "tagged-"))
    ]
    owner, field = _owner(model, words)
    key = ".".join([address, *words]) if address else ".".join(words)
    if kind == "extra_forbidden":
        _unknown_key(owner, words, key, findings)
    elif kind == "missing":
        findings.wrong(key, "nothing", f"{words[-1]} = …, {_expected(field)}")
    elif kind == "quantity":
        findings.wrong(key, context["found"], context["expected"])
    elif kind == "literal_error":
        choices = [
            word.strip("'") for word in context["expected"].replace(" or ", ", ").split(", ")
        ]
        found = item["input"]
        near = did_you_mean(found, choices) if isinstance(found, str) else ""
        findings.wrong(key, described(found), one_of(choices) + near)
    else:
        findings.wrong(key, described(item["input"]), _KINDS.get(kind) or _expected(field))


_KINDS = {
    "string_type": "a text in quotes",
    "string_too_short": "a text that is not empty",
    "bool_type": "true or false",
    "dict_type": "a table",
    "model_type": "a table",
    "list_type": "a list",
    "tuple_type": "a list",
}


def _owner(model: type[Table], words: list[str]) -> tuple[type[Table], FieldInfo | None]:
    """The table model, and the field in it, that a location means."""
    field = model.model_fields.get(words[0]) if words else None
    inner = _inner_table(field)
    if inner is not None and len(words) > 1:
        return _owner(inner, words[1:])
    return model, field


def _inner_table(field: FieldInfo | None) -> type[Table] | None:
    candidates = [] if field is None else [field.annotation, *_arguments(field.annotation)]
    for candidate in candidates:
        if isinstance(candidate, type) and issubclass(candidate, Table):
            return candidate
    return None


def _arguments(annotation: Any) -> tuple[Any, ...]:
    return getattr(annotation, "__args__", ())


def _unknown_key(owner: type[Table], words: list[str], key: str, findings: Findings) -> None:
    if words[-1] in TOP_KEYS:
        expected = f'"{words[-1]}" at the top of the file, before the first [table]: '
        findings.wrong(
            key, "a key after a table header", expected + "a key belongs to the table above it"
        )
        return
    hint = owner.hint(words[-1])
    if hint:
        findings.wrong(key, "an unknown key", hint)
        return
    names = list(owner.model_fields)
    near = did_you_mean(words[-1], names)
    findings.wrong(key, "an unknown key", f"one of {', '.join(names)}{near}")


def _expected(field: FieldInfo | None) -> str:
    if field is None:
        return "a value of another kind"
    for mark in field.metadata:
        if isinstance(mark, Quantity | Number):
            return mark.phrase
    return field.description or "a value"


class Quantity:
    """Marks a field that is written as a text with a unit, and reads it."""

    def __init__(self, *dimensions: str) -> None:
        self.dimensions = dimensions

    @property
    def phrase(self) -> str:
        """What would be right."""
        return any_phrase(self.dimensions)

    def _read(self, value: object) -> Sourced:
        try:
            return read_any(value, self.dimensions, AS_GIVEN)
        except QuantityError as error:
            raise _refusal(error) from None

    def __get_pydantic_core_schema__(self, source: Any, handler: Any) -> core_schema.CoreSchema:
        return core_schema.no_info_plain_validator_function(self._read)

    def __get_pydantic_json_schema__(self, schema: Any, handler: Any) -> dict[str, Any]:
        return {"type": "string", "examples": [named(word).example for word in self.dimensions]}


class Number:
    """Marks a field that is a number without a unit, and reads it within its bounds.

    What goes up to 1 is a share of something, and may be written "10 %" as in the fill.
    """

    def __init__(self, lowest: float, highest: float, *, above: bool = False) -> None:
        self.lowest, self.highest, self.above = lowest, highest, above
        self.is_share = lowest == 0 and highest == 1

    @property
    def phrase(self) -> str:
        """What would be right."""
        bound = "above" if self.above else "of at least"
        return f"a number {bound} {self.lowest:g} and at most {self.highest:g}"

    def _read(self, value: object) -> Sourced:
        try:
            number = read_number(value, "fraction" if self.is_share else "pure")
        except QuantityError as error:
            raise _refusal(QuantityError(error.found, self.phrase)) from None
        low_enough = number.value > self.lowest if self.above else number.value >= self.lowest
        if not low_enough or number.value > self.highest:
            raise _refusal(QuantityError(described(value), self.phrase))
        return number

    def __get_pydantic_core_schema__(self, source: Any, handler: Any) -> core_schema.CoreSchema:
        return core_schema.no_info_plain_validator_function(self._read)

    def __get_pydantic_json_schema__(self, schema: Any, handler: Any) -> dict[str, Any]:
        low = "exclusiveMinimum" if self.above else "minimum"
        number = {"type": "number", low: self.lowest, "maximum": self.highest}
        return {"anyOf": [number, {"type": "string"}]} if self.is_share else number


class Later:
    """Marks a value whose unit depends on the rest of the case; the second pass reads it."""

    def __init__(self, *examples: str, kinds: tuple[str, ...] = ("string",)) -> None:
        self.examples = examples
        self.kinds = kinds

    def __get_pydantic_core_schema__(self, source: Any, handler: Any) -> core_schema.CoreSchema:
        return core_schema.any_schema()

    def __get_pydantic_json_schema__(self, schema: Any, handler: Any) -> dict[str, Any]:
        kind = self.kinds[0] if len(self.kinds) == 1 else list(self.kinds)
        return {"type": kind, "examples": list(self.examples)}


class Inner:
    """Marks a table of one of several shapes (or a plain number), which the second pass reads."""

    def __init__(self, *models: type[Table], number: bool = False) -> None:
        self.models, self.number = models, number

    def __get_pydantic_core_schema__(self, source: Any, handler: Any) -> core_schema.CoreSchema:
        return core_schema.any_schema()

    def __get_pydantic_json_schema__(self, schema: Any, handler: Any) -> dict[str, Any]:
        for model in self.models:
            model.model_rebuild()
        tables = [handler(model.__pydantic_core_schema__) for model in self.models]
        return {"anyOf": [{"type": "number"}, *tables] if self.number else tables}


def _refusal(error: QuantityError) -> PydanticCustomError:
    return PydanticCustomError(
        "quantity", "refused", {"found": error.found, "expected": error.expected}
    )


class Text:
    """Marks a text of bounded length without control characters."""

    def __init__(self, longest: int, *, lines: bool = False) -> None:
        self.longest, self.lines = longest, lines

    def _read(self, value: str) -> str:
        if len(value) > self.longest:
            expected = f"a text of at most {self.longest} characters"
            raise _refusal(QuantityError(quoted(value), expected))
        flat = " ".join(value.split()) if self.lines else value
        if not flat.isprintable():
            expected = "text on one line without control characters"
            raise _refusal(QuantityError(quoted(value), expected))
        return flat

    def __get_pydantic_core_schema__(self, source: Any, handler: Any) -> core_schema.CoreSchema:
        return core_schema.no_info_after_validator_function(self._read, handler(source))


_STRIPPED = StringConstraints(strip_whitespace=True, min_length=1)
Line = Annotated[str, _STRIPPED, Text(300)]
Prose = Annotated[str, _STRIPPED, Text(2000, lines=True)]
Temperature = Annotated[Sourced, Quantity("temperature")]
Pressure = Annotated[Sourced, Quantity("pressure")]
Volume = Annotated[Sourced, Quantity("volume")]
Time = Annotated[Sourced, Quantity("time")]
Length = Annotated[Sourced, Quantity("length")]
Area = Annotated[Sourced, Quantity("area")]
MolarEnergy = Annotated[Sourced, Quantity("molar energy")]
