"""The desk's own colours: four themes, and one named colour for each meaning.

Styles use the variables (`$state-short`, `$series-1` ...); code that draws takes them from `App.theme_variables`.
No meaning rests on a colour: each also has its sign, its word or its own dash and glyph. The hues of states and series
keep apart for every common kind of colour blindness: blue against orange, told apart in lightness too (after the set
of Okabe & Ito 2008, "Color Universal Design").
"""

from __future__ import annotations

from types import MappingProxyType

from textual.theme import Theme

# name: (dark, light, high contrast, the terminal's own palette)
_COLOURS = {
    "state-explains": ("#7fb8e6", "#0a5a97", "#9fd4ff", "ansi_bright_blue"),
    "state-short": ("#e8a15c", "#95480a", "#ffc04d", "ansi_yellow"),
    "state-unclear": ("#c3a8dc", "#6a4490", "#e6ccff", "ansi_magenta"),
    "state-split": ("#f08fa8", "#a3123f", "#ffb0cc", "ansi_bright_magenta"),
    "state-open": ("#a9b7bd", "#4a585e", "#ffffff", "ansi_default"),
    "state-todo": ("#9aa2a7", "#5d656a", "#e0e0e0", "ansi_default"),
    "state-nodata": ("#9aa2a7", "#5d656a", "#e0e0e0", "ansi_default"),
    "attention": ("#f2cf63", "#7a5200", "#ffee55", "ansi_bright_yellow"),
    "quiet": ("#9aa2a7", "#5b6367", "#dddddd", "ansi_default"),
    "rule-line": ("#3b4449", "#b9b3a4", "#ffffff", "ansi_default"),
    "plot-grid": ("#68757b", "#86837a", "#9a9a9a", "ansi_bright_black"),
    "cursor-row": ("#24323c", "#d8e3ea", "#102a40", "ansi_default"),
    "series-total": ("#f4efe2", "#1d2326", "#ffffff", "ansi_default"),
    "series-1": ("#7fb8e6", "#0a5a97", "#9fd4ff", "ansi_bright_blue"),
    "series-2": ("#e8a15c", "#95480a", "#ffc04d", "ansi_yellow"),
    "series-3": ("#8fcfae", "#12664a", "#8fffc4", "ansi_green"),
    "series-point": ("#f4efe2", "#111618", "#ffffff", "ansi_default"),
    "series-limit": ("#c3a8dc", "#6a4490", "#e6ccff", "ansi_magenta"),
    "series-dropped": ("#9aa2a7", "#5d656a", "#e0e0e0", "ansi_default"),
    "pull-strong": ("#f08fa8", "#a3123f", "#ffb0cc", "ansi_bright_red"),
}
_GROUNDS = {
    "dark": dict(background="#14191c", surface="#1a2125", panel="#212a2f", foreground="#dcd8cc"),
    "light": dict(background="#f7f4ec", surface="#efebe0", panel="#e6e1d3", foreground="#20262a"),
    "contrast": dict(background="#000000", surface="#000000", panel="#101010", foreground="#ffffff"),
    "terminal": dict.fromkeys(("background", "surface", "panel", "foreground"), "ansi_default"),
}
_ANSI = {  # what Textual's own style sheets ask of a theme of sixteen colours
    "ansi-background": "ansi_default",
    "ansi-foreground": "ansi_default",
    "border-blurred": "ansi_default",
    "block-cursor-background": "ansi_blue",
    "block-cursor-foreground": "ansi_default",
}
_DESCRIPTIONS = MappingProxyType(
    {
        "dark": "lamplight on slate",
        "light": "ink on paper",
        "contrast": "white on black, every colour bright",
        "terminal": "the sixteen colours of your own terminal",
    }
)
THEME_NAMES = tuple(_GROUNDS)
DEFAULT_THEME = "dark"


def theme_name(short: str) -> str:
    """The name under which a theme is registered with the app."""
    return f"plainlight-{short}"


def describe(short: str) -> str:
    """What a theme looks like, in a few words."""
    return _DESCRIPTIONS[short]


def themes() -> list[Theme]:
    """All four, ready to be registered."""
    return [_theme(name, column) for column, name in enumerate(THEME_NAMES)]


def _theme(name: str, column: int) -> Theme:
    colours = {key: row[column] for key, row in _COLOURS.items()}
    ansi = name == "terminal"
    return Theme(
        name=theme_name(name),
        primary=colours["state-explains"],
        secondary=colours["quiet"],
        accent=colours["attention"],
        warning=colours["state-short"],
        error=colours["pull-strong"],
        success=colours["series-3"],
        boost="ansi_default" if ansi else _GROUNDS[name]["surface"],
        dark=name != "light",
        ansi=ansi,
        variables=colours | _text_entry(colours, ansi),
        **_GROUNDS[name],
    )


def _text_entry(colours: dict[str, str], ansi: bool) -> dict[str, str]:
    """How the cursor and the selection of a text line look."""
    selection = "ansi_blue" if ansi else colours["cursor-row"]
    return {
        "input-selection-background": selection,
        "screen-selection-background": selection,
        "scrollbar": colours["quiet"],
        "scrollbar-hover": colours["quiet"],
        "scrollbar-active": colours["attention"],
        "scrollbar-background": "ansi_default" if ansi else "transparent",
    } | (_ANSI if ansi else {})
