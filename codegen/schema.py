"""The JSON Schema (draft 2020-12) of the arm file, for editors that check and complete while one types.

It is made from the reader's own table of keys. A schema cannot say everything: that limits stand in order, that held
names exist and the joint count fits the task, the reader tells. Every file that the reader takes is valid under it.
"""

from __future__ import annotations

from typing import Any

from codegen.armfile_keys import (
    ANGLE_UNITS,
    LENGTH_UNITS,
    LONGEST_NAME,
    MOST_JOINTS,
    TABLES,
    Holds,
    Key,
    Table,
)
from codegen.armfile_names import IDENTIFIER_PATTERN, KEYWORDS, LABEL_PATTERN

Schema = dict[str, Any]
_LENGTH = max(unit.largest for unit in LENGTH_UNITS.values())
_ANGLE = max(unit.largest for unit in ANGLE_UNITS.values())
_EITHER = max(_LENGTH, _ANGLE)  # of the joint variable: its kind decides, which the schema of one key cannot see


def arm_file_schema() -> Schema:
    """A new dictionary on every call, ready for json.dumps."""
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "linkwright arm file",
        "description": "A serial robot arm of 1 to 7 joints by its link table (Denavit-Hartenberg rows).",
    } | _object(
        {table.name: _of_table(table) for table in TABLES},
        [table.name for table in TABLES if table.required],
    )


def _of_table(table: Table) -> Schema:
    row = _object({key.name: _of_key(key) for key in table.keys}, [key.name for key in table.keys if key.required])
    if not table.repeated:
        return {"description": table.meaning} | row
    return {"description": table.meaning, "type": "array", "minItems": 1, "maxItems": MOST_JOINTS, "items": row}


def _object(properties: Schema, required: list[str]) -> Schema:
    needed = {"required": required} if required else {}
    return {"type": "object", "properties": properties, "additionalProperties": False} | needed


def _of_key(key: Key) -> Schema:
    default = {"default": key.default} if key.default else {}
    return {"description": key.meaning} | _of_value(key) | default


def _of_value(key: Key) -> Schema:
    match key.holds:
        case Holds.CHOICE:
            return {"enum": list(key.choices)}
        case Holds.IDENTIFIER:
            return _text(f"^{IDENTIFIER_PATTERN}$") | {"not": {"anyOf": [{"pattern": "^(__|_[A-Z])"}, _keywords()]}}
        case Holds.LABEL:
            return _text(f"^{LABEL_PATTERN}$")
        case Holds.LABELS:
            return {"type": "array", "items": {"type": "string"}, "uniqueItems": True, "default": []}
        case Holds.LENGTH:
            return _number(_LENGTH) | {"default": 0}
        case Holds.ANGLE:
            return _number(_ANGLE) | {"default": 0}
        case Holds.LENGTHS:
            return _list(_number(_LENGTH), 3) | {"default": [0, 0, 0]}
        case Holds.ANGLES:
            return _list(_number(_ANGLE), 3) | {"default": [0, 0, 0]}
        case Holds.LIMITS:
            return _list(_number(_EITHER), 2)
        case Holds.SPEED:
            return {"type": "number", "exclusiveMinimum": 0, "maximum": _EITHER}


def _text(pattern: str) -> Schema:
    return {"type": "string", "maxLength": LONGEST_NAME, "pattern": pattern}


def _keywords() -> Schema:
    return {"enum": sorted(KEYWORDS)}


def _number(largest: int) -> Schema:
    return {"type": "number", "minimum": -largest, "maximum": largest}


def _list(items: Schema, count: int) -> Schema:
    return {"type": "array", "items": items, "minItems": count, "maxItems": count}
