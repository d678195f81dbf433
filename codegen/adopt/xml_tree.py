"""Reads XML of unknown origin into a plain tree that knows its line numbers.

Python's expat is used directly, for two reasons: it tells the line of every element, so that an error can point at it;
and it calls back on a document type declaration before any entity is expanded, so that entity bombs and external
entities are refused rather than limited.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import NoReturn
from xml.parsers import expat

from codegen.errors import CallError, Fault

LARGEST_BYTES = 16 * 1024 * 1024  # real robot descriptions stay under 1 MB
DEEPEST = 64  # elements inside one another; a robot description needs 6


@dataclass(frozen=True, slots=True)
class Element:
    """One XML element; `line` counts from 1."""

    tag: str
    attributes: dict[str, str]
    line: int
    children: list[Element] = field(default_factory=list)

    def all(self, tag: str) -> list[Element]:
        """The children with this tag, in the order of the file."""
        return [child for child in self.children if child.tag == tag]


class _TreeBuilder:
    """Collects expat's calls into Elements."""

    def __init__(self, source: str) -> None:
        self.source = source
        self.root: Element | None = None
        self.open_elements: list[Element] = []
        self.parser = expat.ParserCreate()
        self.parser.buffer_text = True
        self.parser.StartElementHandler = self.start
        self.parser.EndElementHandler = self.end
        self.parser.StartDoctypeDeclHandler = self.refuse_doctype

    def refuse(self, what: str, hint: str) -> NoReturn:
        raise CallError(Fault(f"{self.source}: line {self.parser.CurrentLineNumber}", what, hint))

    def start(self, tag: str, attributes: dict[str, str]) -> None:
        if len(self.open_elements) >= DEEPEST:
            self.refuse(f"elements are nested more than {DEEPEST} deep", "this is no robot description")
        element = Element(tag, attributes, self.parser.CurrentLineNumber)
        if self.open_elements:
            self.open_elements[-1].children.append(element)
        else:
            self.root = element
        self.open_elements.append(element)

    def end(self, _tag: str) -> None:
        self.open_elements.pop()

    def refuse_doctype(self, *_declaration: object) -> None:
        self.refuse(
            "has a document type declaration (<!DOCTYPE ...>), which may define entities",
            "a robot description needs none: delete it and write out what its entities stood for",
        )


def parse_xml(content: bytes, source: str) -> Element:
    """The root element of an XML document.

    Raises CallError, naming the line, for anything that is not plain well-formed XML of a sane size.
    """
    if len(content) > LARGEST_BYTES:
        what = f"is {len(content)} bytes long; at most {LARGEST_BYTES} are read"
        raise CallError(Fault(source, what, "a robot description names its meshes, it does not hold them"))
    builder = _TreeBuilder(source)
    try:
        builder.parser.Parse(content, True)
    except expat.ExpatError as error:
        where = f"{source}: line {error.lineno}, column {error.offset + 1}"
        what = f"is not well-formed XML: {expat.ErrorString(error.code)}"
        raise CallError(Fault(where, what, "export the robot description again")) from None
    except (LookupError, ValueError) as error:  # an encoding that Python does not know
        raise CallError(Fault(source, f"cannot be read: {error}", "save it as UTF-8")) from None
    assert builder.root is not None  # expat refuses a document without elements
    return builder.root
