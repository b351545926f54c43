"""The further pages of a candidate. A page is titles and a function from what is known to rows: add one to PAGES."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from tui.desk.screens.page_data import facts_page, fits_page, measurements_page, mixture_page, quiet
from tui.desk.screens.page_events import dips_page, lookalikes_page, others_page, pictures_page, story_page
from tui.desk.screens.walk import Walk
from tui.desk.widgets.rows import Row, row, row_width


@dataclass(frozen=True, slots=True)
class Page:
    """One page: its title, a shorter one for narrow tab lines, what draws it at a width, knowing the rows in sight."""

    title: str
    short: str
    draw: Callable[[Walk, int, int], list[Row]]


PAGES = (
    Page("facts", "facts", facts_page),
    Page("measured", "bands", measurements_page),
    Page("all fits", "fits", fits_page),
    Page("mixture", "mixture", mixture_page),
    Page("dips", "dips", dips_page),
    Page("pictures", "pictures", pictures_page),
    Page("look-alikes", "alike", lookalikes_page),
    Page("rulings", "rulings", others_page),
    Page("story", "story", story_page),
)


FACTS = 1 + [page.title for page in PAGES].index("facts")  # it has every caution in full
RULINGS = 1 + [page.title for page in PAGES].index("rulings")  # where a walk ends
LOOK_ALIKES = 1 + [page.title for page in PAGES].index("look-alikes")  # what this page shows is looked for when asked


def page_rows(walk: Walk, width: int, height: int) -> list[Row]:
    """The page on view under the line of all titles; `walk.page` counts from 1, 0 being the plot."""
    inner = max(20, width - 2)
    body = PAGES[walk.page - 1].draw(walk, inner, height - 2) if walk.loaded else [quiet("reading ...")]
    return [tab_row(walk.page, width), [], *([*row(" "), *line] for line in body)]


def tab_row(here: int, width: int) -> Row:
    """Every page by number and title, the one on view between brackets; whole titles where there is room for all."""
    for titles in ([page.title for page in PAGES], [page.short for page in PAGES]):
        tabs: Row = []
        for number, title in enumerate(titles, start=1):
            text = f"{number} {title}"
            action = f"page({number})"
            tabs += row(" ", (f"[{text}]", "now", action) if number == here else (text, "quiet", action))
        if row_width(tabs) <= width:
            return tabs
    return tabs
