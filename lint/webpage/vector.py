"""A drawing of the plotting library as a small piece of SVG for the page.

The library writes a whole document with colours and fonts in style attributes, which the page's
content policy forbids; colours become classes, so that light and dark are the style sheet's choice.
"""

import re
import xml.etree.ElementTree as ElementTree
from io import BytesIO
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from matplotlib.figure import Figure

# What a colour stands for.  The values only tell roles apart; the style sheet paints them.
INK, SOFT, GRID, BESIDE, MAIN, SUSPECT, PROPOSED, GROUND = (
    "#101010",
    "#202020",
    "#303030",
    "#404040",
    "#505050",
    "#606060",
    "#707070",
    "#808080",
)
_CLASSES = {
    INK: "ink",
    SOFT: "soft",
    GRID: "grid",
    BESIDE: "beside",
    MAIN: "main",
    SUSPECT: "suspect",
    PROPOSED: "proposed",
    GROUND: "ground",
}
_SVG = "{http://www.w3.org/2000/svg}"
_LINK = "{http://www.w3.org/1999/xlink}href"
# Properties that SVG also takes as plain attributes, and what they are when unsaid.
_UNSAID = {
    "stroke-width": "1",
    "stroke-dasharray": "",
    "stroke-linejoin": "miter",
    "stroke-linecap": "butt",
    "stroke-opacity": "1",
    "fill-opacity": "1",
    "opacity": "1",
    "text-anchor": "start",
    "font-weight": "400",
}
_KEPT = ("d", "x", "y", "id", "transform", "width", "height", "clip-path")
_LONG = re.compile(r"-?\d+\.\d{2,}")


def vector(figure: "Figure", name: str, title: str) -> str:
    """The figure as one ``svg`` element; ``name`` keeps its identifiers apart from others'.

    title: what a reader who does not see the drawing is told.
    """
    raw = BytesIO()
    figure.savefig(raw, format="svg", metadata={"Date": None})
    root = ElementTree.fromstring(raw.getvalue())
    names: dict[str, str] = {}
    drawn = ElementTree.Element("svg", viewBox=root.attrib["viewBox"], role="img")
    drawn.set("aria-label", title)
    for child in root:
        _take(child, drawn, names, name)
    _drop_unused(drawn)
    return ElementTree.tostring(drawn, encoding="unicode")


def _take(
    source: ElementTree.Element, parent: ElementTree.Element, names: dict[str, str], prefix: str
) -> None:
    """Copy an element and what is in it, without what the page does not need."""
    tag = source.tag.removeprefix(_SVG) if isinstance(source.tag, str) else ""
    if tag in ("", "metadata", "style", "title"):
        return
    attributes = {key: source.attrib[key] for key in _KEPT if key in source.attrib}
    if tag == "g":
        attributes.pop("id", None)  # the library names every group; nothing refers to them
    if attributes.get("transform", "").startswith("rotate(-0 "):
        del attributes["transform"]
    if _LINK in source.attrib:
        attributes["href"] = source.attrib[_LINK]
    attributes |= _properties(source.attrib.get("style", ""), tag)
    if tag == "g" and not attributes:
        for child in source:
            _take(child, parent, names, prefix)
        return
    for key, value in attributes.items():
        if key in ("id", "href", "clip-path"):
            attributes[key] = _renamed(value, names, prefix)
        else:
            attributes[key] = _LONG.sub(_short, " ".join(value.split()))
    copy = ElementTree.SubElement(parent, tag, attributes)
    copy.text = source.text if tag == "text" else None
    for child in source:
        _take(child, copy, names, prefix)


def _renamed(value: str, names: dict[str, str], prefix: str) -> str:
    """An identifier, ``#identifier`` or ``url(#identifier)`` under the page's own short name."""
    found = re.search(r"[\w-]+(?=\)?$)", value)
    assert found is not None
    own = names.setdefault(found[0], f"{prefix}-{len(names)}")
    return value[: found.start()] + own + value[found.end() :]


def _properties(style: str, tag: str) -> dict[str, str]:
    """A style attribute as plain attributes, its colours as classes."""
    stated = {
        key.strip(): value.strip()
        for key, colon, value in (item.partition(":") for item in style.split(";"))
        if colon
    }
    if "font" in stated:
        font = stated.pop("font")
        stated["font-size"] = re.search(r"([\d.]+)px", font)[1]  # type: ignore[index]
        stated["font-weight"] = next(iter(re.findall(r"\b(700|bold)\b", font)), "400")
    classes, found = [], {}
    for key, value in stated.items():
        if key in ("fill", "stroke") and value.lower() in _CLASSES:
            classes.append(f"{key[0]}-{_CLASSES[value.lower()]}")
        elif key in ("fill", "stroke", "font-size") or _UNSAID.get(key, value) != value:
            found[key] = value
    if classes:
        found["class"] = " ".join(classes)
    if tag == "text" and "fill" not in found and not any(c.startswith("f-") for c in classes):
        found["class"] = "f-ink"
    return found


def _drop_unused(drawn: ElementTree.Element) -> None:
    """Leave out named shapes to which nothing refers, and backgrounds without paint."""
    text = ElementTree.tostring(drawn, encoding="unicode")
    for parent in list(drawn.iter()):
        for child in list(parent):
            name = child.get("id")
            painted = child.get("fill") != "none" or "s-" in child.get("class", "")
            if f"#{name}" not in text if name else child.tag == "path" and not painted:
                parent.remove(child)


def _short(number: re.Match[str]) -> str:
    return f"{float(number[0]):.1f}".removesuffix(".0")
