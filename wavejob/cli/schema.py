"""Print the JSON Schema of the job file, for editors that complete and check while one types."""

from __future__ import annotations

import json
from argparse import ArgumentParser, Namespace
from typing import Any

from ..settings import JobKeys
from . import terminal

DIALECT = "http://json-schema.org/draft-07/schema#"  # what editors of YAML read; newer readers take it as well
NAME = "urn:wavejob:job-file:1"


def add_arguments(parser: ArgumentParser) -> None:
    """Nothing of its own."""


def run(_: Namespace) -> int:
    terminal.show(json.dumps(schema(), indent=2))
    return 0


def schema() -> dict[str, Any]:
    """The schema. A file with `based_on` may leave out anything, so only its outermost keys are known."""
    whole = _plain(JobKeys.model_json_schema(by_alias=True))
    definitions = whole.pop("$defs")
    return {
        "$schema": DIALECT,
        "$id": NAME,
        "title": "Job file of wavejob, format 1",
        "type": "object",
        "if": {"required": ["based_on"]},
        "then": {"properties": dict.fromkeys(whole["properties"], True), "additionalProperties": False},
        "else": {"$ref": "#/$defs/JobFile"},
        "$defs": {**definitions, "JobFile": whole},
    }


def _plain(node: Any, *, names: bool = False) -> Any:
    """Without made-up titles and defaults of null; `names` tells that the keys are names of ours."""
    if isinstance(node, list):
        return [_plain(item) for item in node]
    if not isinstance(node, dict):
        return node
    kept = {k: v for k, v in node.items() if names or not (k == "title" or (k == "default" and v is None))}
    return {key: _plain(value, names=key in ("properties", "$defs") and not names) for key, value in kept.items()}
