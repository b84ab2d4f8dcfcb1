"""Chooses the board, makes the controller, loops. The only file that works at import time, and only as the program."""

import gc
import sys

# Garbage that is left between modules and records breaks a small memory into pieces: while loading, it is collected
# each time so many bytes were taken. Afterwards the loop collects.
WHILE_IMPORTING = 8192
WHILE_LOADING = 16_384
NEVER = -1


def collect_each(taken: int) -> None:
    """Where memory is small, collect garbage each time so many bytes were taken."""
    if sys.platform == "rp2":
        gc.threshold(taken)  # type: ignore[attr-defined,unused-ignore]


if __name__ == "__main__":
    collect_each(WHILE_IMPORTING)

from device.board.seam import Board  # noqa: E402
from device.control.controller import Controller  # noqa: E402


def choose_board() -> Board:
    """The board that this program runs on: `board_choice.py` beside it decides, else the hardware."""
    try:
        from board_choice import make_board  # type: ignore[import-not-found,unused-ignore]
    except ImportError:
        from device.board.pico import make_board  # type: ignore[import-not-found,unused-ignore]
    return make_board()  # type: ignore[no-any-return,unused-ignore]


def step(board: Board, controller: Controller) -> None:
    """Once round the loop: the tick allocates nothing; what may allocate follows it, when there is such work."""
    board.before_tick(controller.due_us)
    controller.tick()
    board.after_tick()
    if controller.has_work:
        controller.work()
    if controller.may_collect:
        board.collect()
        controller.collected()


def loop(board: Board) -> None:
    """Run until the firmware is told to leave."""
    collect_each(WHILE_LOADING)
    controller = Controller(board)
    controller.start()
    collect_each(NEVER)
    board.begin()
    while not controller.left:
        step(board, controller)
    board.end()


def main() -> None:
    """Run the loop; what goes wrong in it is noted, and the board starts again with everything off."""
    board = choose_board()
    if board.stay_at_prompt:
        return
    try:
        loop(board)
    except Exception as error:
        board.crashed(error)
        raise


if __name__ == "__main__":
    main()
