"""Structs and unions as classes."""

from __future__ import annotations

from codegen.javascript.types import WORD, NotTranslatable, Number, Record, Types


def record_lines(record: Record, types: Types) -> list[str]:
    """A class whose objects are made once, with zeros or the values given, and filled in place."""
    members = types.members[record.name]
    if record.union:
        return _union_lines(record.name, types)
    given = ", ".join(f"{name} = {types.fresh(member)}" for name, member in members.items())
    copies = [
        line for name, member in members.items() for line in types.filled(member, f"this.{name}", f"other.{name}")
    ]
    return [
        f"class {record.name} {{",
        f"  constructor({given}) {{",
        *(f"    this.{name} = {name};" for name in members),
        "  }",
        "  become(other) {",
        *(f"    {line}" for line in copies),
        "    return this;",
        "  }",
        "}",
    ]


def _union_lines(name: str, types: Types) -> list[str]:
    """A number and its bits: two views of eight bytes."""
    lines = [f"class {name} {{", "  constructor() {", "    const bytes = new ArrayBuffer(8);"]
    views = {}
    for member, kind in types.members[name].items():
        if not isinstance(kind, Number):
            raise NotTranslatable(f"a union of {kind}")
        views[member] = "BigUint64Array" if kind == WORD else "Float64Array"
    lines += [f"    this.{member}_view = new {view}(bytes);" for member, view in views.items()]
    lines += ["  }"]
    for member in views:
        lines += [f"  get {member}() {{", f"    return this.{member}_view[0];", "  }"]
        lines += [f"  set {member}(value) {{", f"    this.{member}_view[0] = value;", "  }"]
    word = next(member for member, view in views.items() if view == "BigUint64Array")  # which keeps a NaN's bits
    return [*lines, "  become(other) {", f"    this.{word} = other.{word};", "    return this;", "  }", "}"]
