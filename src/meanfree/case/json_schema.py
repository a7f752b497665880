"""The JSON Schema of the case file, made from the same models that check its shape."""

from __future__ import annotations

import json
from typing import Any, Union

from pydantic import BaseModel, ConfigDict, Field, create_model

from meanfree.case.laws.registry import LAW_SHAPES
from meanfree.case.schema.base import Line, Prose
from meanfree.case.schema.data import DataTable
from meanfree.case.schema.fit import FitTable
from meanfree.case.schema.flows import FlowTable
from meanfree.case.schema.plan import PlanTable
from meanfree.case.schema.steps import ReverseTable
from meanfree.case.schema.sweep import SweepTable
from meanfree.case.schema.tables import (
    TEMPERATURES,
    CaseTable,
    FillTable,
    GasTable,
    RunTable,
    SampleTable,
    VesselTable,
)

DIALECT = "https://json-schema.org/draft/2020-12/schema"


def case_schema() -> dict[str, Any]:
    """The schema as nested plain data."""
    temperature: Any = Union[tuple(TEMPERATURES.values())]  # noqa: UP007 -- made from a list
    step: Any = Union[tuple(LAW_SHAPES.values())]  # noqa: UP007
    top = CaseTable.model_fields
    model: type[BaseModel] = create_model(
        "Case",
        __config__=ConfigDict(extra="forbid", arbitrary_types_allowed=True),
        title=(Line, Field(description=top["title"].description)),
        purpose=(Prose, Field("", description=top["purpose"].description)),
        labels=(list[Line], Field(default=[], description=top["labels"].description)),
        vessel=(VesselTable, ...),
        temperature=(temperature, ...),
        fill=(FillTable, ...),
        run=(RunTable | None, None),
        gases=(dict[str, GasTable], Field(default={}, description="who the gases are")),
        steps=(list[step], Field(min_length=1, description="the reactions, one way each")),
        samples=(list[SampleTable], Field(default=[], description="gas drawn while it runs")),
        flows=(list[FlowTable], Field(default=[], description="leaks, pumping and dilution")),
        data=(list[DataTable], Field(default=[], description="measured runs")),
        fit=(FitTable | None, None),
        plan=(PlanTable | None, None),
        sweep=(SweepTable | None, None),
    )
    schema = model.model_json_schema()
    reverse = ReverseTable.model_json_schema()
    for table in schema["$defs"].values():
        if "reverse" in table.get("properties", {}):
            described = table["properties"]["reverse"].get("description", "")
            table["properties"]["reverse"] = {
                "anyOf": [{"const": "thermochemistry"}, {"$ref": "#/$defs/ReverseTable"}],
                "description": described,
            }
    schema["$defs"]["ReverseTable"] = reverse
    return {"$schema": DIALECT, **schema, "title": "A meanfree case file"}


def schema_text() -> str:
    """The schema as the text of a file."""
    return json.dumps(case_schema(), indent=2, ensure_ascii=False) + "\n"
