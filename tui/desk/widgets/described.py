"""What is said of the chosen candidate: a few lines of fixed height, so that saying it moves nothing else."""

from __future__ import annotations

from textual.content import Content
from textual.widget import Widget

from tui.desk.text import wrap

Said = tuple[str, str]  # text, already safe; the name of its style
STYLES = ("plain", "quiet", "attention")


class Described(Widget):
    """Sentences one under the other, each begun on a line of its own; what finds no room is left out from the end."""

    COMPONENT_CLASSES = {f"described--{name}" for name in STYLES}
    DEFAULT_CSS = "Described { height: 3; padding: 0 1; }"

    def __init__(self, *, id: str | None = None) -> None:
        super().__init__(id=id)
        self.said: list[Said] = []

    def say(self, said: list[Said]) -> None:
        """Say these sentences."""
        if said != self.said:
            self.said = said
            self.refresh()

    def render(self) -> Content:
        """The lines that there is room for."""
        lines = [
            Content.styled(line, self.get_visual_style(f"described--{style}"))
            for text, style in self.said
            for line in wrap(text, max(1, self.size.width))
        ]
        return Content("\n").join(lines[: self.size.height])
