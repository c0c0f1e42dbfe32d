"""Drawing with matplotlib into SVG that stands in a page: style, labels moved apart, unique names, words."""

from __future__ import annotations

import io
import re
from collections.abc import Sequence
from contextlib import AbstractContextManager
from typing import TYPE_CHECKING
from xml.etree import ElementTree

if TYPE_CHECKING:
    from matplotlib.figure import Figure

# Blue, amber and vermilion of Okabe and Ito, "Color Universal Design", 2008, the last one darker so that it
# can be read as text; the greys differ in lightness.
ACCENT = "#0072B2"
AMBER = "#E69F00"
VERMILION = "#B34700"
INK = "#22262B"
MUTED = "#62666C"
RULE = "#B9B6AD"

_SVG = "http://www.w3.org/2000/svg"
_XLINK = "http://www.w3.org/1999/xlink"

_STYLE = {
    "svg.fonttype": "none",
    "svg.hashsalt": "ferrule",
    "font.size": 8.5,
    "axes.edgecolor": RULE,
    "axes.labelcolor": INK,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "xtick.color": RULE,
    "ytick.color": RULE,
    "xtick.labelcolor": INK,
    "ytick.labelcolor": INK,
    "text.color": INK,
    "hatch.linewidth": 0.6,
}


def styled() -> AbstractContextManager[None]:
    """The report's style, for as long as a picture is drawn."""
    from matplotlib import rc_context

    return rc_context(_STYLE)


def figure(width: float, height: float) -> Figure:
    """An empty figure [inch] without any global state of the plotting library."""
    from matplotlib.figure import Figure

    made = Figure(figsize=(width, height))
    made.patch.set_visible(False)
    return made


def spread(wanted: Sequence[float], gap: float, low: float, high: float) -> list[float]:
    """Ascending positions moved apart to at least ``gap``, as little as that takes, inside low to high."""
    placed: list[list[float]] = []  # clusters: sum of wanted, number
    for w in wanted:
        placed.append([w, 1.0])
        while len(placed) > 1:
            (a, n), (b, m) = placed[-2], placed[-1]
            if b / m - a / n >= gap * (n + m) / 2:
                break
            placed[-2:] = [[a + b, n + m]]
    out: list[float] = []
    for total, n in placed:
        first = total / n - gap * (n - 1) / 2
        out += [first + gap * k for k in range(int(n))]
    shift = min(0.0, high - out[-1]) if out else 0.0
    shift = max(shift, low - out[0]) if out else 0.0
    return [y + shift for y in out]


def svg_of(fig: Figure, key: str, title: str, words: str) -> str:
    """The figure as an SVG element for a page: an image with title and description, ids begun with ``key``.

    The page's own type is used (sizes stay), and the size is left to the page.
    """
    data = io.BytesIO()
    fig.savefig(data, format="svg", metadata={"Date": None, "Creator": None, "Format": None, "Type": None})
    root = ElementTree.fromstring(data.getvalue())
    _own_names(root, key)
    for child in [c for c in root if c.tag == f"{{{_SVG}}}metadata"]:
        root.remove(child)
    for element in root.iter():
        if "style" in element.attrib:
            element.set("style", re.sub(r"font-family:[^;]*;?\s*", "", element.attrib["style"]))
    for name in ("width", "height", "version"):
        root.attrib.pop(name, None)
    root.set("role", "img")
    root.set("aria-labelledby", f"{key}-title {key}-words")
    for k, (tag, text) in enumerate((("title", title), ("desc", words))):
        element = ElementTree.Element(f"{{{_SVG}}}{tag}", {"id": f"{key}-{'words' if k else 'title'}"})
        element.text = text
        root.insert(k, element)
    ElementTree.register_namespace("", _SVG)
    ElementTree.register_namespace("xlink", _XLINK)
    return ElementTree.tostring(root, encoding="unicode")


def _own_names(root: ElementTree.Element, key: str) -> None:
    """Keep only the ids that something refers to, and make them unlike those of other pictures."""
    text = ElementTree.tostring(root, encoding="unicode")
    used = set(re.findall(r"url\(#([^)]+)\)", text)) | set(re.findall(r'href="#([^"]+)"', text))
    for element in root.iter():
        name = element.attrib.pop("id", None)
        if name in used:
            element.set("id", f"{key}-{name}")
        for attribute, value in element.attrib.items():
            if attribute == f"{{{_XLINK}}}href":
                element.set(attribute, value.replace("#", f"#{key}-", 1))
            elif "url(#" in value:
                element.set(attribute, value.replace("url(#", f"url(#{key}-"))
