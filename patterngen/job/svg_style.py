"""The few properties of style that change outlines: fill rule, display, visibility, cuts, transforms.

A property is looked up in an element's own style, then in the style sheets by simple
selectors, then in its attribute.
"""

from __future__ import annotations

import re
import xml.etree.ElementTree as ET
from collections.abc import Mapping
from dataclasses import dataclass

from patterngen.job.svg_remarks import OutlineError, Remarks, clip
from patterngen.job.svg_tree import SVG, Tree, short


@dataclass
class Style:
    """What an element hands down to what it holds."""

    fill_rule: str = "nonzero"
    visible: bool = True


class Styles:
    """The style of every element of a tree; what is not understood is left out with a remark or refused."""

    def __init__(self, tree: Tree, remarks: Remarks) -> None:
        self._tree = tree
        self._sheet = _style_sheet(tree.root, remarks)

    def value(self, element: ET.Element, name: str, *, attribute: bool = True) -> str | None:
        """A style property: the element's own style over the style sheet over the attribute."""
        own = _declarations(element.get("style", ""))
        if name in own:
            return own[name]
        classes = element.get("class", "").split()
        keys = (f"#{element.get('id', '')}", *(f".{c}" for c in classes), short(element.tag), "*")
        for key in keys:
            if name in self._sheet.get(key, {}):
                return self._sheet[key][name]
        value = element.get(name) if attribute else None
        return value.strip() if value is not None else None

    def inherit(self, element: ET.Element, style: Style) -> Style:
        """What an element hands down: its own properties over those it was handed."""
        rule, visibility = self.value(element, "fill-rule"), self.value(element, "visibility")
        return Style(
            rule if rule in ("nonzero", "evenodd") else style.fill_rule,
            style.visible if visibility in (None, "inherit") else visibility == "visible",
        )

    def refuse_cut(self, element: ET.Element) -> None:
        """Raise `OutlineError` where a clip or a mask cuts an element."""
        for name in ("clip-path", "mask"):
            if self.value(element, name) not in (None, "none"):
                raise self._tree.error(
                    element,
                    f"is cut by a {name}",
                    allowed="outlines that are already cut: apply it in the drawing program",
                )

    def refuse_transform(self, element: ET.Element) -> None:
        """Raise `OutlineError` where a style moves an element: only the attribute is understood."""
        if self.value(element, "transform", attribute=False) not in (None, "none"):
            raise self._tree.error(element, "has a transform in its style", allowed="the attribute transform")


def _style_sheet(root: ET.Element, remarks: Remarks) -> dict[str, dict[str, str]]:
    """Simple selectors (element, .class, #id, *) of the style sheets; anything else is left out."""
    out: dict[str, dict[str, str]] = {}
    for style in root.iter(f"{SVG}style"):
        text = re.sub(r"/\*.*?\*/", " ", style.text or "", flags=re.DOTALL)
        for at_rule in re.findall(r"@[\w-]+", text):
            remarks.leave_out(f"style rule {at_rule}")
        text = re.sub(r"@[^{};]*;", " ", text)
        for selectors, body in re.findall(r"([^{}]+)\{([^{}]*)\}", text):
            for selector in selectors.split(","):
                key = selector.strip()
                if re.fullmatch(r"[.#]?[\w-]+|\*", key):
                    out.setdefault(key, {}).update(_declarations(body))
                elif set(_declarations(body)) & {
                    "fill-rule",
                    "display",
                    "visibility",
                    "clip-path",
                    "mask",
                    "transform",
                }:
                    raise OutlineError(
                        "its style sheet has a selector that is not understood",
                        value=clip(key),
                        allowed="element, .class or #id",
                    )
    return out


def _declarations(text: str) -> Mapping[str, str]:
    pairs = (part.split(":", 1) for part in text.split(";") if ":" in part)
    return {name.strip().lower(): value.replace("!important", "").strip() for name, value in pairs}
