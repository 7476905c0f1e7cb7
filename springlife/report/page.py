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


def page(report: Report, figures: Mapping[str, str]) -> str:
    """Return the page; ``figures`` holds the SVG text of each figure by name."""
    from jinja2 import Environment, StrictUndefined
    from markupsafe import Markup

    templates = files("springlife").joinpath("report/templates")
    script = templates.joinpath("page.js").read_text(encoding="utf-8")
    digest = base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()
    setting = Environment(autoescape=True, undefined=StrictUndefined, keep_trailing_newline=True)
    template = setting.from_string(templates.joinpath("page.html.jinja").read_text(encoding="utf-8"))
    inline = {name: Markup(inlined(svg, name)) for name, svg in figures.items()}
    return template.render(**report.to_dict(), figures=inline, script=Markup(script), script_hash=digest)


def inlined(svg: str, name: str) -> str:
    """Return an SVG file as an element of a page: identifiers of its own, colours of the page."""
    svg = svg[svg.index("<svg") :]
    svg = re.sub(r"<metadata>.*?</metadata>", "", svg, flags=re.DOTALL)
    for size in ("width", "height"):
        svg = re.sub(rf'(<svg [^>]*?) {size}="[^"]*"', r"\1", svg, count=1)
    svg = re.sub(r'\bid="([^"]*)"', rf'id="{name}-\1"', svg)
    svg = re.sub(r'href="#([^"]*)"', rf'href="#{name}-\1"', svg)
    svg = re.sub(r"url\(#([^)]*)\)", rf"url(#{name}-\1)", svg)
    for colour, variable in COLOURS.items():
        svg = svg.replace(colour, variable)
    return svg.replace("<svg ", '<svg aria-hidden="true" focusable="false" ', 1)
