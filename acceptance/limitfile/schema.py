"""JSON Schema of limits and bench files, for editors: made from the models that the loader itself uses."""

from __future__ import annotations

from typing import Any

from pydantic.json_schema import GenerateJsonSchema, JsonSchemaValue
from pydantic_core import core_schema

from acceptance.limitfile.model import BenchFile, LimitsFile
from acceptance.limitfile.published import known_sets

__all__ = ["bench_schema", "limits_schema"]

_DIALECT = "https://json-schema.org/draft/2020-12/schema"


class _FileSchema(GenerateJsonSchema):
    """The schema of what stands in a file: texts, never null, and no defaults in another shape than the file's."""

    def nullable_schema(self, schema: core_schema.NullableSchema) -> JsonSchemaValue:
        """A key may be left out; it can't be null."""
        return self.generate_inner(schema["schema"])

    def default_schema(self, schema: core_schema.WithDefaultSchema) -> JsonSchemaValue:
        """A default is shown where it is written like a value of the file."""
        made = self.generate_inner(schema["schema"])
        if isinstance(schema.get("default"), str):
            return {**made, "default": schema["default"]} if "$ref" not in made else made
        return made

    def literal_schema(self, schema: core_schema.LiteralSchema) -> JsonSchemaValue:
        """One of several words; a number among them may stand without quotation marks."""
        words = list(schema["expected"])
        numbers = [int(word) for word in words if str(word).isdigit()]
        return {"enum": [*words, *numbers]}


def limits_schema() -> dict[str, Any]:
    """JSON Schema (draft 2020-12) of a limits file."""
    return _schema(LimitsFile, "Limits file")


def bench_schema() -> dict[str, Any]:
    """JSON Schema (draft 2020-12) of a bench file."""
    return _schema(BenchFile, "Bench file")


def _schema(model: type[BenchFile], title: str) -> dict[str, Any]:
    made = model.model_json_schema(by_alias=True, schema_generator=_FileSchema)
    if "Published" in made["$defs"]:
        made["$defs"]["Published"]["properties"]["set"] |= {"type": "string", "enum": list(known_sets())}
    return {"$schema": _DIALECT, **made, "title": title}
