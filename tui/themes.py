"""Three themes: dark, light and high contrast, with the tokens that the stylesheets use.

Colour never carries a meaning alone: severities have words and marks, marked atoms have shapes, focus
changes the weight of a rule. Text tokens reach a contrast of 4.5 to 1 on their background in dark and
light, 7 to 1 in the high-contrast theme (WCAG 2 formula, checked in the tests).
"""

from __future__ import annotations

from textual.theme import Theme

_DARK = {
    "rule": "#3d4a50",
    "title": "#9fb8b0",
    "quiet": "#93a1a6",
    "severity-serious": "#f08c7a",
    "severity-caution": "#deb54f",
    "severity-note": "#9db4bf",
    "mark-centre": "#dc97d8",
    "mark-leaving": "#77bfe0",
    "mark-motif": "#eb9f5c",
    "mark-match": "#93cf8d",
}
_LIGHT = {
    "rule": "#bdb8ab",
    "title": "#2d5f56",
    "quiet": "#5b6468",
    "severity-serious": "#9c2314",
    "severity-caution": "#6f4e00",
    "severity-note": "#45575f",
    "mark-centre": "#84297a",
    "mark-leaving": "#17617b",
    "mark-motif": "#974009",
    "mark-match": "#34622f",
}
_CONTRAST = {
    "rule": "#ffffff",
    "title": "#ffffff",
    "quiet": "#e0e0e0",
    "severity-serious": "#ffb3a7",
    "severity-caution": "#ffe066",
    "severity-note": "#cfe8ff",
    "mark-centre": "#ffb3fb",
    "mark-leaving": "#9fe3ff",
    "mark-motif": "#ffc48a",
    "mark-match": "#b6ffae",
}

DARK = Theme(
    name="fume-hood",
    primary="#7fb3a6",
    secondary="#8aa4b0",
    accent="#e0b354",
    warning="#deb54f",
    error="#f08c7a",
    success="#93cf8d",
    foreground="#dbe0dd",
    background="#13181a",
    surface="#1a2124",
    panel="#222b2f",
    dark=True,
    variables={
        **_DARK,
        "footer-key-foreground": "#e0b354",
        "input-cursor-background": "#dbe0dd",
        "input-cursor-foreground": "#13181a",
        "input-selection-background": "#7fb3a6 40%",
    },
)
LIGHT = Theme(
    name="notebook-page",
    primary="#2d6f63",
    secondary="#4f6671",
    accent="#7a5200",
    warning="#6f4e00",
    error="#9c2314",
    success="#34622f",
    foreground="#21272a",
    background="#f6f4ee",
    surface="#efece3",
    panel="#e5e1d5",
    dark=False,
    variables={
        **_LIGHT,
        "footer-key-foreground": "#7a5200",
        "input-cursor-background": "#21272a",
        "input-cursor-foreground": "#f6f4ee",
    },
)
CONTRAST = Theme(
    name="high-contrast",
    primary="#ffffff",
    secondary="#e0e0e0",
    accent="#ffe066",
    warning="#ffe066",
    error="#ffb3a7",
    success="#b6ffae",
    foreground="#ffffff",
    background="#000000",
    surface="#000000",
    panel="#1c1c1c",
    dark=True,
    variables={**_CONTRAST, "footer-key-foreground": "#ffe066"},
)

THEMES = (DARK, LIGHT, CONTRAST)
THEME_OF_SETTING = {"dark": DARK.name, "light": LIGHT.name, "high-contrast": CONTRAST.name}
"""Theme by the word of the settings file; any other word means dark."""

TOKENS: dict[str, str] = _DARK
"""Values for the tokens under a theme that is not ours."""
