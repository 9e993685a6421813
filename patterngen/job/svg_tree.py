"""The safe gate for XML, and the tree of elements behind it.

No document type, no entities, no endless nesting: what passes is plain SVG of a bounded
size.  The tree knows elements by their ids, follows references within the file and names
an element so that its author finds it.
"""

from __future__ import annotations

import xml.etree.ElementTree as ET
from difflib import get_close_matches
from typing import Any

from patterngen.job.svg_remarks import OutlineError, clip

DEEPEST = 64
MOST_ELEMENTS = 50_000
SVG = "{http://www.w3.org/2000/svg}"
_HREF = ("href", "{http://www.w3.org/1999/xlink}href")


class _Counting(ET.TreeBuilder):
    """Builds the tree and stops at too deep or too many."""

    def __init__(self) -> None:
        super().__init__()
        self._depth = self._count = 0

    def start(self, tag: Any, attrs: Any) -> Any:
        self._depth += 1
        self._count += 1
        if self._depth > DEEPEST:
            raise OutlineError("elements nested too deep", allowed=f"at most {DEEPEST} levels")
        if self._count > MOST_ELEMENTS:
            raise OutlineError("too many elements", allowed=f"at most {MOST_ELEMENTS}")
        return super().start(tag, attrs)

    def end(self, tag: Any) -> Any:
        self._depth -= 1
        return super().end(tag)


def parse(data: bytes) -> ET.Element:
    """The root element of an SVG text.

    Raises `OutlineError`: not well-formed, no SVG, a document type or entities of its own, too deep or too many.
    """
    from defusedxml.common import DefusedXmlException, DTDForbidden
    from defusedxml.ElementTree import DefusedXMLParser

    parser = DefusedXMLParser(target=_Counting(), forbid_dtd=True)
    try:
        for at in range(0, len(data), 1 << 16):
            parser.feed(data[at : at + (1 << 16)])
        root = parser.close()
    except DTDForbidden:
        raise OutlineError(
            "it has a document type declaration", allowed="SVG without <!DOCTYPE ...>: take that line out"
        ) from None
    except DefusedXmlException:
        raise OutlineError("it has entities of its own", allowed="plain SVG") from None
    except ET.ParseError as error:
        line, column = error.position
        raise OutlineError(f"it is not well-formed XML (line {line}, column {column + 1})", allowed="SVG") from None
    except (LookupError, ValueError) as error:
        if isinstance(error, OutlineError):
            raise
        raise OutlineError("its text encoding is not known", allowed="UTF-8") from None
    if root.tag != f"{SVG}svg":
        raise OutlineError(
            "it is XML but no SVG",
            value=f"<{short(root.tag)}>",
            allowed='<svg xmlns="http://www.w3.org/2000/svg" ...>',
        )
    assert isinstance(root, ET.Element)
    return root


class Tree:
    """The elements of a drawing by id and by place."""

    def __init__(self, root: ET.Element) -> None:
        self.root = root
        self.by_id: dict[str, ET.Element] = {}
        self._twice: set[str] = set()
        self._parents = {child: parent for parent in root.iter() for child in parent}
        for element in root.iter():
            if identity := element.get("id"):
                if identity in self.by_id:
                    self._twice.add(identity)
                self.by_id.setdefault(identity, element)

    def find(self, identity: str) -> ET.Element:
        """The one element with this id.  Raises `OutlineError` where there is none or more than one."""
        if identity in self._twice:
            raise OutlineError("more than one element has this id", value=clip(identity), allowed="an id of its own")
        element = self.by_id.get(identity)
        if element is None:
            close = get_close_matches(identity, self.by_id, n=1, cutoff=0.3)
            raise OutlineError(
                "no element has this id",
                value=clip(identity),
                allowed=clip(", ".join(self.by_id) or "the drawing has no ids"),
                nearest=close[0] if close else "",
            )
        return element

    def ancestors(self, element: ET.Element) -> list[ET.Element]:
        """What an element stands in, from the root down."""
        chain = [element]
        while chain[-1] in self._parents:
            chain.append(self._parents[chain[-1]])
        return chain[:0:-1]

    def refuse_too_many_uses(self, element: ET.Element) -> None:
        """Raise `OutlineError` where an element with every use spelt out holds too many."""
        if self._spelt_out(element, {}) > MOST_ELEMENTS:
            raise OutlineError(
                "its uses of uses grow too many", allowed=f"at most {MOST_ELEMENTS} elements when all are spelt out"
            )

    def _spelt_out(self, element: ET.Element, known: dict[ET.Element, int]) -> int:
        """How many elements there are with every use spelt out; a circle counts once, as drawing refuses it."""
        if element not in known:
            known[element] = 0
            parts = list(element)
            if short(element.tag) == "use":
                target = reference(element) or ""
                parts += [self.by_id[target[1:]]] if target[1:] in self.by_id else []
            known[element] = 1 + sum(self._spelt_out(part, known) for part in parts)
        return known[element]

    def name(self, element: ET.Element) -> str:
        """An element as a message names it: by its id, else by its number among its like."""
        tag = short(element.tag)
        if identity := element.get("id"):
            return f'<{tag} id="{clip(identity)}">'
        same = list(self.root.iter(element.tag))
        return f"<{tag}> number {same.index(element) + 1}"

    def error(self, element: ET.Element, problem: str, *, value: str = "", allowed: str = "") -> OutlineError:
        """The error that says what is wrong with an element."""
        return OutlineError(f"{self.name(element)} {problem}", value=value, allowed=allowed)


def reference(element: ET.Element) -> str | None:
    """What an element refers to, in the new or the old spelling."""
    return next((element.get(name) for name in _HREF if element.get(name)), None)


def short(tag: Any) -> str:
    """A tag without its namespace."""
    return str(tag).rpartition("}")[2]
