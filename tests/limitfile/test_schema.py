"""The JSON Schema for editors."""

from __future__ import annotations

import copy

import jsonschema
import pytest
import yaml

from acceptance.limitfile.load import bench_schema, limits_schema
from acceptance.limitfile.model import BenchFile, LimitsFile, Requirements
from acceptance.limitfile.yamltree import read_tree

FILES = [("good.yaml", limits_schema), ("speed.yaml", limits_schema), ("bench.yaml", bench_schema)]


def problems(schema, content):
    """What a validator of the declared draft objects to."""
    validator = jsonschema.validators.validator_for(schema)(schema)
    return [error.message for error in validator.iter_errors(content)]


@pytest.mark.parametrize("schema", [limits_schema(), bench_schema()])
def test_schema_is_a_schema(schema):
    """Of the draft it declares, without an address of its own."""
    assert schema["$schema"] == "https://json-schema.org/draft/2020-12/schema"
    assert "$id" not in schema
    jsonschema.Draft202012Validator.check_schema(schema)


@pytest.mark.parametrize(("name", "schema"), FILES)
def test_schema_accepts_good_files(data, name, schema):
    """As the loader reads them, and as an editor does, which takes 1 and 1.10 for numbers."""
    raw = (data / name).read_bytes()

    class Editor(yaml.SafeLoader):
        """Like an editor of YAML 1.2: dates and the word no are texts."""

    kept = {"tag:yaml.org,2002:int", "tag:yaml.org,2002:float", "tag:yaml.org,2002:null"}
    Editor.yaml_implicit_resolvers = {
        first: [(tag, pattern) for tag, pattern in resolvers if tag in kept]
        for first, resolvers in yaml.SafeLoader.yaml_implicit_resolvers.items()
    }

    assert problems(schema(), read_tree(raw).plain()) == []
    assert problems(schema(), yaml.load(raw, Loader=Editor)) == []  # noqa: S506 - derived from the safe one


def mappings(content, path=()):
    """The path of every mapping in a tree."""
    if isinstance(content, dict):
        yield path
        for key, value in content.items():
            yield from mappings(value, (*path, key))
    elif isinstance(content, list):
        for i, value in enumerate(content):
            yield from mappings(value, (*path, i))


OPEN = {("ratings", "outputs"), ("log", "columns"), ("log", "stated"), ("instruments",), ("lead_resistance",)}


def test_schema_refuses_an_unknown_key_everywhere(data):
    """In every mapping, but for those whose keys are names."""
    good = read_tree((data / "good.yaml").read_bytes()).plain()
    schema = limits_schema()
    for path in mappings(good):
        content = copy.deepcopy(good)
        place = content
        for step in path:
            place = place[step]
        place["unheard_of"] = {"unheard_of": "x"}
        if path[-1:] == ("load",):
            continue  # loads of several outputs, by name
        assert problems(schema, content), path


def test_schema_refuses_a_missing_key(data):
    """Product, ratings and limits are needed."""
    good = read_tree((data / "good.yaml").read_bytes()).plain()
    for key in ("acceptance", "product", "ratings", "limits"):
        assert problems(limits_schema(), {k: v for k, v in good.items() if k != key})


def test_schema_keeps_in_step_with_the_models():
    """Every key of every model is in it under the file's name, and no other."""
    schema = limits_schema()

    assert set(schema["properties"]) == set(LimitsFile.model_fields)
    assert set(bench_schema()["properties"]) == set(BenchFile.model_fields)
    assert set(schema["$defs"]["Requirements"]["properties"]) == set(Requirements.model_fields)
    assert {"from", "to", "relative_to"} < set(schema["$defs"]["LoadRegulation"]["properties"])
    assert {"set", "class"} < set(schema["$defs"]["Published"]["properties"])
    for name, definition in schema["$defs"].items():
        shapes = definition.get("anyOf", [definition])
        assert all(shape.get("additionalProperties") is False for shape in shapes if shape["type"] == "object"), name
        assert definition.get("description") or "anyOf" in definition, name


@pytest.mark.parametrize("schema", [limits_schema(), bench_schema()])
def test_schema_knows_no_null(schema):
    """A key is left out, not null."""
    assert "'null'" not in str(schema)
    assert problems(schema, {"log": None})
