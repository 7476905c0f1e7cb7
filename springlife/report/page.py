"""The report as one page of HTML: no network, figures inline, light and dark, tables that sort."""

from __future__ import annotations

import base64
import hashlib
import re
from collections.abc import Mapping
from importlib.resources import files
from typing import TYPE_CHECKING

from springlife.report.style import ACCENT, GREY, INK, PALE

if TYPE_CHECKING:
    from springlife.report.contents import Report

# Colours of the figures become those of the page, so that they follow light and dark.
COLOURS = {INK: "var(--ink)", ACCENT: "var(--accent)", GREY: "var(--grey)", PALE: "var(--pale)",
           "#ffffff": "var(--paper)"}  # fmt: skip


LONGEST = 22  # characters of a word that a cell shows whole


def page(report: Report, figures: Mapping[str, str]) -> str:
    """Return the page; ``figures`` holds the SVG text of each figure by name."""
    from jinja2 import Environment, StrictUndefined
    from markupsafe import Markup

    templates = files("springlife").joinpath("report/templates")
    script = templates.joinpath("page.js").read_text(encoding="utf-8")
    digest = base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()
    setting = Environment(autoescape=True, undefined=StrictUndefined, keep_trailing_newline=True)
    setting.tests["longworded"] = lambda text: any(len(word) > LONGEST for word in text.split())
    template = setting.from_string(templates.joinpath("page.html.jinja").read_text(encoding="utf-8"))
    inline = {name: Markup(inlined(svg, name)) for name, svg in figures.items()}
    return template.render(**report.to_dict(), figures=inline, script=Markup(script), script_hash=digest)


def inlined(svg: str, name: str) -> str:
    """Return an SVG file as an element of a page: identifiers of its own, colours of the page."""
    svg = svg[svg.index("<svg") :]
    svg = re.sub(r"<metadata>.*?</metadata>", "", svg, flags=re.DOTALL)
    for size in ("width", "height"):
        svg = re.sub(rf'(<svg [^>]*?) {size}="[^"]*"', r"\1", svg, count=1)
    svg = re.sub(r"<[^>]*>", lambda tag: _of_page(tag[0], name), svg)
    return svg.replace("<svg ", '<svg aria-hidden="true" focusable="false" ', 1)


def _of_page(tag: str, name: str) -> str:
    """Return one tag of a figure with identifiers of its own and colours of the page; text is left alone."""
    tag = re.sub(r'\bid="([^"]*)"', rf'id="{name}-\1"', tag)
    tag = re.sub(r'href="#([^"]*)"', rf'href="#{name}-\1"', tag)
    tag = re.sub(r"url\(#([^)]*)\)", rf"url(#{name}-\1)", tag)
    for colour, variable in COLOURS.items():
        tag = tag.replace(f": {colour}", f": {variable}")
    return tag
