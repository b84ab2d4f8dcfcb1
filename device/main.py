"""Chooses the board, makes the controller, loops. The only file that works at import time, and only as the program."""

from device.board.seam import Board
from device.control.controller import Controller


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


def main() -> None:
    """Run until the firmware is told to leave."""
    board = choose_board()
    controller = Controller(board)
    controller.start()
    while not controller.left:
        step(board, controller)


if __name__ == "__main__":
    main()
