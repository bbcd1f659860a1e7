"""A page as one HTML file that needs nothing else: style inside, drawings inside, no script, no request.

It owns the document, not what it says. Text is escaped by the template engine (autoescape is on for every template
here) after control and direction characters were made visible. A content security policy in the head forbids scripts,
frames, forms and every request; the one style sheet is allowed by its hash, so a style smuggled in with a note would
not apply either.
"""

from __future__ import annotations

import base64
import hashlib
from functools import cache
from importlib import resources
from typing import Any

from kb.exchange.report_blocks import NO_PERMISSION, Figure, Page
from kb.plain import plain


def page_html(page: Page) -> str:
    """Return a whole document."""
    style = style_sheet()
    digest = base64.b64encode(hashlib.sha256(style.encode()).digest()).decode()
    return str(
        _templates()
        .get_template("page.html.jinja")
        .render(page=page, style=style, style_hash=digest, no_permission=NO_PERMISSION)
    )


def page_fragment(page: Page) -> str:
    """Return the page's body with its style, for a notebook cell."""
    return str(
        _templates()
        .get_template("fragment.html.jinja")
        .render(page=page, style=style_sheet(), no_permission=NO_PERMISSION)
    )


@cache
def style_sheet() -> str:
    """Return the style sheet."""
    return _source("page.css")


def _source(name: str) -> str:
    return resources.files("kb").joinpath("data", "pages", name).read_text(encoding="utf-8")


@cache
def _templates() -> Any:
    from jinja2 import Environment, FunctionLoader, StrictUndefined
    from markupsafe import Markup

    environment = Environment(
        loader=FunctionLoader(_source),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )

    def drawing(figure: Figure) -> Markup:
        return Markup(figure.svg)  # made by this project's drawing code from escaped text

    def kind(block: object) -> str:
        return type(block).__name__

    def safe(text: str) -> str:
        return plain(text, keep_lines=True)

    environment.filters.update(drawing=drawing, kind=kind, safe_text=safe)
    return environment
