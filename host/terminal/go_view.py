"""The go line: can I go? A word first, then the sentence; it can be read without colour."""

from host.model import LayoutModel
from host.terminal.rows import fit
from host.views import GoLine

# The word and sign before the sentence.
SIGNS = {"go": "GO", "wait": "WAIT", "stop": "STOP", "out": "OUT", "lost": "LOST"}
_FRAMES = {"go": ">> {} <<", "wait": ".. {} ..", "stop": "## {} ##", "out": "!! {} !!", "lost": "?? {} ??"}


def go_text(line: GoLine, width: int) -> str:
    """The whole line: sign, word, sentence."""
    word = SIGNS.get(line.level, line.level.upper())
    frame = _FRAMES.get(line.level, "{}").format(word)
    whole = f" {frame:<11}{_sentence(line)}"
    # What to do matters more than the frame round the word.
    return fit(whole if len(whole) <= width else f" {word}: {_sentence(line)}", width)


def _sentence(line: GoLine) -> str:
    """The sentence without the word that the sign has said already."""
    text = line.text
    for said in ("wait: ", "wait ", "stopped: ", "lost: "):
        if text.startswith(said):
            return text[len(said) :]
    return "ready: every bank is full enough for every throw" if text == "ready" else text


def title_text(model: LayoutModel) -> str:
    """Which layout, whether board and file agree, which board."""
    name = model.title
    if model.connection.state == "lost":
        return f"{name}, as last told"
    if model.settings_match is False:
        return f"{name}, board and file differ"
    return f"{name}, {model.board.kind} board" if model.board is not None and not model.several else name
