"""The one widget that draws rows. Only lines that changed are drawn again: kind to a slow connection."""

from rich.segment import Segment
from textual.geometry import Region, Size
from textual.markup import escape
from textual.scroll_view import ScrollView
from textual.strip import Strip

from host.terminal.rows import LOOKS, Rows


class Lines(ScrollView):
    """Shows rows of text; scrolls if there are more than fit."""

    COMPONENT_CLASSES = {f"lines--{look}" for look in LOOKS}  # noqa: RUF012
    can_focus = False

    def __init__(self, id: str | None = None, classes: str | None = None) -> None:
        super().__init__(id=id, classes=classes)
        self._rows: Rows = []
        self._title = ""

    @property
    def rows(self) -> Rows:
        """What is shown."""
        return self._rows

    def show(self, rows: Rows, title: str) -> None:
        """Show these rows under this title; what stays the same is not drawn again."""
        if title != self._title:
            self._title = title
            # Setting a title draws the whole widget again, even if it is the same.
            self.border_title = escape(title)
        before, self._rows = self._rows, rows
        if len(before) != len(rows) or self.virtual_size.width != self.size.width:
            self.virtual_size = Size(self.size.width, len(rows))
            self.refresh()
            return
        top = self.scroll_offset.y
        for place, line in enumerate(rows):
            if line != before[place]:
                self.refresh(Region(0, place - top, self.size.width, 1))

    def on_resize(self) -> None:
        """Rows are never wider than the widget."""
        self.virtual_size = Size(self.size.width, len(self._rows))

    def render_line(self, y: int) -> Strip:
        """One line of the visible part."""
        place = y + self.scroll_offset.y
        width = self.size.width
        if not 0 <= place < len(self._rows):
            return Strip.blank(width, self.rich_style)
        segments = [
            Segment(piece.text, self.get_component_rich_style(f"lines--{piece.look}"))
            for piece in self._rows[place]
            if piece.text
        ]
        return Strip(segments).adjust_cell_length(width, self.rich_style)
