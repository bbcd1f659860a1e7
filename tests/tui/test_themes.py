"""Themes: text can be read on its ground, and every theme knows every token."""

from __future__ import annotations

import pytest
from textual.theme import Theme

from tui.themes import CONTRAST, THEMES, TOKENS


def luminance(colour: str) -> float:
    """Relative luminance by the WCAG 2 definition."""
    parts = [int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5)]
    linear = [p / 12.92 if p <= 0.04045 else ((p + 0.055) / 1.055) ** 2.4 for p in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    high, low = sorted((luminance(one), luminance(other)), reverse=True)
    return (high + 0.05) / (low + 0.05)


@pytest.mark.parametrize("theme", THEMES, ids=lambda t: t.name)
def test_text_can_be_read_on_every_ground(theme: Theme) -> None:
    """4.5 to 1 as WCAG 2 asks of text at level AA, 7 to 1 (AAA) in the high-contrast theme."""
    least = 7.0 if theme is CONTRAST else 4.5
    texts = {name: theme.variables[name] for name in TOKENS if name != "rule"}
    texts |= {"foreground": theme.foreground, "accent": theme.accent, "error": theme.error, "primary": theme.primary}
    for ground in (theme.background, theme.surface, theme.panel):
        for name, colour in texts.items():
            assert contrast(colour, ground) >= least, (name, ground)


@pytest.mark.parametrize("theme", THEMES, ids=lambda t: t.name)
def test_every_theme_has_every_token(theme: Theme) -> None:
    assert set(TOKENS) <= set(theme.variables)
