"""Rows of text with a look for each piece: what view models make and the `Lines` widget draws.

A look is a name such as 'good'; the style sheet says how it is drawn. What a look says, words or signs say as well:
every row can be read without colour.
"""

from dataclasses import dataclass

LOOKS = ("plain", "dim", "strong", "good", "warn", "bad", "picked", "head")
ELLIPSIS = "\u2026"


@dataclass(frozen=True)
class Piece:
    """Some text in one look."""

    text: str
    look: str = "plain"


Row = tuple[Piece, ...]
Rows = list[Row]


def row(*pieces: Piece | str) -> Row:
    """A row; bare text is plain."""
    return tuple(Piece(piece) if isinstance(piece, str) else piece for piece in pieces)


def text_of(line: Row) -> str:
    """The row without looks."""
    return "".join(piece.text for piece in line)


def texts_of(lines: Rows) -> list[str]:
    """The rows without looks and without trailing blanks."""
    return [text_of(line).rstrip() for line in lines]


def fit(text: str, width: int, right: bool = False) -> str:
    """Exactly `width` characters: cut with an ellipsis, or padded (on the left if `right`)."""
    if width <= 0:
        return ""
    if len(text) > width:
        return text[: width - 1] + ELLIPSIS
    return text.rjust(width) if right else text.ljust(width)


def fit_row(line: Row, width: int) -> Row:
    """The row cut at `width`; the last piece that shows ends in an ellipsis if something was cut."""
    if len(text_of(line)) <= width:
        return line
    kept: list[Piece] = []
    left = width
    for piece in line:
        if len(piece.text) > left or (len(piece.text) == left and piece is not line[-1]):
            kept.append(Piece(fit(piece.text + " ", left) if left else "", piece.look))
            break
        kept.append(piece)
        left -= len(piece.text)
    return tuple(kept)


def wrap(text: str, width: int, most: int = 0) -> list[str]:
    """Lines of at most `width`, broken between words; at most `most` of them (0: any number), the last one cut."""
    lines: list[str] = []
    for word in text.split():
        if lines and len(lines[-1]) + 1 + len(word) <= width:
            lines[-1] += " " + word
        else:
            while len(word) > width > 0:
                lines.append(word[:width])
                word = word[width:]
            lines.append(word)
    if most and len(lines) > most:
        lines[most - 1] = fit(" ".join(lines[most - 1 :]), width)
        del lines[most:]
    return lines


def between(left: str, right: str, width: int) -> str:
    """`left` and `right` at the two ends of a row; `left` is cut first."""
    room = width - len(right) - 1
    if room < 1:
        return fit(left, width)
    return fit(left, room) + " " + right


def volts(mv: int) -> str:
    """Millivolts as volts, '?' when unknown: '15.9'."""
    return f"{mv / 1000:.1f}" if mv >= 0 else "?"


def seconds(ms: float) -> str:
    """Milliseconds as seconds, rounded up to a tenth: a wait is never said to be over before it is."""
    tenths = max(0, -int(-ms // 100))
    return f"{tenths / 10:.1f} s" if tenths < 1000 else f"{tenths // 10} s"


def age(since_s: float | None, now_s: float) -> str:
    """How old news is, in whole seconds; 'never' when there were none."""
    if since_s is None:
        return "never"
    passed_s = max(0.0, now_s - since_s)
    if passed_s < 1.0:
        return "<1 s"
    if passed_s < 100:
        return f"{int(passed_s)} s"
    return f"{int(passed_s // 60)} min" if passed_s < 6000 else f"{int(passed_s // 3600)} h"
