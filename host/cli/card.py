"""`settings card`: one page for the lid."""

import argparse
from typing import TYPE_CHECKING

from host.cli.cautions import CAUTIONS
from host.cli.common import DONE, Wrong, say, say_json
from host.wording import volts
from shared_protocol.sentences import FAULT_TEXTS
from shared_protocol.settings_table import BUTTON_KINDS, JUNCTION_KINDS

if TYPE_CHECKING:
    from shared_protocol.settings import ButtonSettings, Settings

NO_COMPUTER = (
    "The buttons work without a computer. A press that can't fire yet waits for its bank.",
    "Something wrong: press stop. Nothing further fires; a pulse that runs ends by itself within 65 ms.",
    "Count the blinks, find the number under 'Blinks', do what it says.",
    "Mended: hold the clear button for 3 seconds. Then press release.",
    "A coil that is hot or a bank that stays low: switch the supply off, do not press again.",
)


def run(args: argparse.Namespace) -> int:
    """Print the page, from the layout file or from the board."""
    from host.cli.settings import named_settings

    lines: list[str] = []
    for _, _, settings in named_settings(args):
        if settings is None:
            raise Wrong("there are no settings to print")
        lines += ["\f"] if lines else []
        lines += card_lines(settings)
    if args.json:
        say_json({"lines": lines})
    else:
        for line in lines:
            say(line)
    return DONE


def card_lines(settings: "Settings") -> list[str]:
    """The page, 80 columns at most."""
    title = settings.board.name.decode() if settings.board is not None else ""
    lines = [title or "Board without a name", "=" * max(1, len(title))]
    lines += ["", "Banks"]
    for bank in settings.banks:
        cap = f", {bank.charge.cap_uf} uF"
        lines.append(f"  {bank.i + 1} {bank.name.decode()}: full at {volts(bank.full_mv)}{cap}")
    lines += ["", "Junctions (lie: ready voltage)"]
    for junction in settings.junctions:
        banks = sorted({settings.banks[settings.motors[motor].bank].name.decode() for motor in junction.motors})
        kind = JUNCTION_KINDS[junction.kind].replace("_", "-")
        lines.append(f"  {junction.i + 1:2} {junction.name.decode()}, {kind}, bank {' and '.join(banks)}")
        for lie in junction.lies:
            name, word = lie.name.decode(), lie.word.decode()
            said = f"{name} ({word})" if word and word != name else name
            lines.append(f"       {said}: {volts(lie.ready_mv)}")
    if settings.routes:
        lines += ["", "Routes"]
        lines += [
            f"  {route.i + 1:2} {route.name.decode()}: {len(route.throws) // 2} throws" for route in settings.routes
        ]
    lines += ["", "Buttons"]
    lines += [f"  {_button(settings, button)}" for button in settings.buttons] or ["  none"]
    lines += ["", "Blinks (number of the fault)"]
    for number, (_, what, remedy, _, _) in enumerate(FAULT_TEXTS):
        if number:
            lines += [f"  {number}  {what}:", f"     {remedy}"]
    lines += ["", "With no computer"] + [f"  - {text}" for text in NO_COMPUTER]
    lines += ["", "Cautions"] + [f"  - {text}" for text in CAUTIONS]
    return _folded(lines)


def _button(settings: "Settings", button: "ButtonSettings") -> str:
    kind = BUTTON_KINDS[button.kind]
    text = f"input {button.input}: {kind}"
    if 0 <= button.j < len(settings.junctions):
        junction = settings.junctions[button.j]
        text += f" {junction.name.decode()}"
        for lie, joint in ((button.lie, "to"), (button.other, "else")):
            if 0 <= lie < len(junction.lies):
                text += f" {joint} {(junction.lies[lie].word or junction.lies[lie].name).decode()}"
    elif kind == "route" and 0 <= button.n < len(settings.routes):
        text += f" {settings.routes[button.n].name.decode()}"
    elif button.n >= 0:
        text += f" {button.n}"
    return text


def _folded(lines: list[str]) -> list[str]:
    import textwrap

    folded: list[str] = []
    for line in lines:
        indent = " " * (len(line) - len(line.lstrip()) + 2)
        folded += textwrap.wrap(line, 80, subsequent_indent=indent, drop_whitespace=True) or [""]
    return folded
