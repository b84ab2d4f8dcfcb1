"""What the host may ask, and what the board does about it. Runs after the tick: may allocate."""

from shared_protocol import messages
from shared_protocol.line import Decoded
from shared_protocol.settings_table import SETTINGS
from shared_protocol.words import (
    REASONS,
    SCOPE_ALL,
    WHY_BOARD_RESTARTED,
    WHY_BUSY,
    WHY_FLASH,
    WHY_LEAVING,
    WHY_NO_SETTINGS,
    WHY_NO_SUCH_THROW,
    WHY_NOT_OUT,
    WHY_OK,
    WHY_OPERATOR,
    WHY_SETTINGS_COMING,
)

TYPE_CHECKING = False
if TYPE_CHECKING:
    from device.control.controller import Controller


class Requests:
    """Takes decoded messages and carries them out on the controller."""

    def __init__(self, controller: "Controller") -> None:
        self._controller = controller

    def take(self, decoded: Decoded, body: bytes, now_ms: int) -> None:
        """Carry out one message."""
        message = decoded.message
        values = decoded.values
        if message in SETTINGS:
            self._record(body)
        elif message is messages.HELLO:
            self._hello(number(values, 0))
        elif message is messages.ASK:
            self._ask(number(values, 0))
        elif message is messages.ACK:
            self._controller.outbox.acknowledge(number(values, 0))
        elif message is messages.STOP:
            self._controller.stop(now_ms)
            self._answer(messages.TO_STOP, WHY_OK, -1)
        elif message is messages.THROW:
            self._throw(values, now_ms)
        elif message is messages.ROUTE:
            self._route(values, now_ms)
        elif message is messages.TRACE:
            self._controller.teller.begin_trace(number(values, 0))
        elif message is not messages.ALIVE:
            self._with_boot(decoded, now_ms)

    def _answer(self, to: int, why: int, which: int) -> None:
        values = self._controller.outbox.plain(messages.ANSWER)
        values[0] = to
        values[1] = 1 if why == WHY_OK else 0
        values[2] = why
        values[3] = which

    # ---- the first exchange

    def _hello(self, version: int) -> None:
        controller = self._controller
        board = controller.board
        controller.outbox.open = True
        if version != messages.VERSION:
            values = controller.outbox.plain(messages.WRONG_VERSION)
            values[0] = messages.VERSION
            values[1] = messages.FIRMWARE
            values[2] = version
            return
        values = controller.outbox.plain(messages.BOARD)
        values[0] = messages.VERSION
        values[1] = messages.FIRMWARE
        values[2] = board.kind
        values[3] = board.uid
        values[4] = board.boot
        values[5] = controller.store.crc
        values[6] = board.caps
        if board.cause or board.crash:
            values = controller.outbox.plain(messages.STARTED)
            values[0] = board.cause
            values[1] = board.crash
            if board.crash:
                board.forget_crash()
        controller.outbox.again()

    def _ask(self, what: int) -> None:
        controller = self._controller
        if what == messages.ASK_STATUS:
            controller.teller.begin_status()
        elif what == messages.ASK_TRACE:
            # A trace is asked for by its own message, which names the bank.
            self._answer(messages.TO_ASK, WHY_NO_SUCH_THROW, -1)
        elif controller.teller.sending_settings:
            self._answer(messages.TO_ASK, WHY_BUSY, -1)
        else:
            controller.store.begin_telling()
            controller.teller.begin_settings()

    # ---- throws and routes

    def _cannot(self, boot: int) -> int:
        controller = self._controller
        if boot != controller.board.boot:
            return WHY_BOARD_RESTARTED
        if controller.leaving:
            return WHY_LEAVING
        if controller.queue is None:
            return WHY_NO_SETTINGS
        if controller.store.staging:
            return WHY_SETTINGS_COMING
        return WHY_OK

    def _throw(self, values: "list[object]", now_ms: int) -> None:
        controller = self._controller
        why = self._cannot(number(values, 0))
        request, junction, lie = number(values, 1), number(values, 2), number(values, 3)
        queue = controller.queue
        if why == WHY_OK and queue is not None:
            queue.throw(request, 0, junction, lie, number(values, 4), now_ms)
        elif why == WHY_BOARD_RESTARTED:
            # A number of another boot: it says nothing about the numbers of this one.
            controller.refuse(request, junction, lie, why)
        elif not controller.memory.repeated(request):
            controller.memory.begin(request, False)
            controller.memory.finish(request, controller.refuse(request, junction, lie, why))

    def _route(self, values: "list[object]", now_ms: int) -> None:
        controller = self._controller
        why = self._cannot(number(values, 0))
        request, route = number(values, 1), number(values, 2)
        queue = controller.queue
        if why == WHY_OK and queue is not None:
            queue.route(request, 0, route, number(values, 3), now_ms)
        elif why == WHY_BOARD_RESTARTED:
            controller.refuse_route(request, route, why)
        elif not controller.memory.repeated(request):
            controller.memory.begin(request, True)
            controller.memory.finish(request, controller.refuse_route(request, route, why))

    # ---- the rest needs the right boot number

    def _with_boot(self, decoded: Decoded, now_ms: int) -> None:
        controller = self._controller
        message = decoded.message
        values = decoded.values
        right = number(values, 0) == controller.board.boot
        if message is messages.RELEASE:
            if right:
                controller.release()
            self._answer(messages.TO_RELEASE, WHY_OK if right else WHY_BOARD_RESTARTED, -1)
        elif message is messages.CLEAR:
            self._clear(right, number(values, 1), number(values, 2))
        elif message is messages.CANCEL:
            self._cancel(right, number(values, 1), now_ms)
        elif message is messages.STAGE:
            self._stage(right, number(values, 1))
        elif message is messages.COMMIT:
            crc = values[1]
            assert isinstance(crc, bytes)
            self._commit(right, crc)
        elif message is messages.ABANDON:
            if right:
                controller.store.abandon()
        elif message is messages.RESTART:
            if right:
                controller.leave(True, now_ms)
            self._answer(messages.TO_RESTART, WHY_OK if right else WHY_BOARD_RESTARTED, -1)

    def _clear(self, right: bool, scope: int, which: int) -> None:
        why = WHY_BOARD_RESTARTED
        if right:
            cleared = self._controller.clear_all() if scope == SCOPE_ALL else self._controller.clear(scope, which)
            why = WHY_OK if cleared else WHY_NOT_OUT
        self._answer(messages.TO_CLEAR, why, which)

    def _cancel(self, right: bool, which: int, now_ms: int) -> None:
        why = WHY_BOARD_RESTARTED
        queue = self._controller.queue
        if right:
            why = WHY_NO_SUCH_THROW
            if queue is not None and queue.cancel(which, WHY_OPERATOR, now_ms):
                why = WHY_OK
        self._answer(messages.TO_CANCEL, why, which)

    # ---- settings

    def _stage(self, right: bool, count: int) -> None:
        controller = self._controller
        why = WHY_OK
        if not right:
            why = WHY_BOARD_RESTARTED
        elif controller.busy or controller.leaving:
            why = WHY_BUSY
        else:
            controller.store.abandon()
            if not controller.store.begin(count):
                why = WHY_FLASH
        self._answer(messages.TO_STAGE, why, count)

    def give_way(self) -> None:
        """A throw asked for at the panel comes before settings that are arriving: they are dropped."""
        self._controller.store.abandon()
        self._answer(messages.TO_STAGE, WHY_BUSY, -1)

    def _record(self, body: bytes) -> None:
        """A record outside a transaction is of no use to anybody: it is left unread."""
        store = self._controller.store
        if store.staging and not store.stage(body):
            store.abandon()
            self._answer(messages.TO_STAGE, WHY_FLASH, -1)

    def _commit(self, right: bool, crc: bytes) -> None:
        controller = self._controller
        if not right or not controller.store.staging:
            self._answer(messages.TO_COMMIT, WHY_NO_SUCH_THROW if right else WHY_BOARD_RESTARTED, -1)
            return
        if controller.busy:
            controller.store.abandon()
            self._answer(messages.TO_COMMIT, WHY_BUSY, -1)
            return
        found = controller.commit_settings(crc)
        if found.problem is not None or found.sequence == 0:
            problem = found.problem
            values = controller.outbox.plain(messages.REJECTED)
            values[0] = problem.record if problem else -1
            values[1] = problem.field.encode() if problem else b""
            values[2] = REASONS.index(problem.why) if problem else WHY_FLASH
            return
        values = controller.outbox.plain(messages.ACCEPTED)
        values[0] = found.crc
        values[1] = found.sequence


def number(values: "list[object]", place: int) -> int:
    """A value that the table says is a whole number."""
    value = values[place]
    assert isinstance(value, int)
    return value
