"""The controller: one tick after another, everything that the board decides.

`tick` allocates nothing, in any state. `work` follows it when there is something that may allocate: a line from the
host, a settings transfer.
"""

from device.control.buttons import Buttons
from device.control.contacts import Contacts
from device.control.endpoint import Endpoint
from device.control.firing import Firing
from device.control.followers import PERIOD_MS, Followers
from device.control.lies import LieKeeper
from device.control.light import Light
from device.control.memory import RequestMemory
from device.control.outbox import Outbox
from device.control.plant import Plant
from device.control.queue import Queue
from device.control.requests import Requests
from device.control.store import SettingsStore, Slot
from device.control.telling import Teller
from device.control.throws import Throws
from device.control.ticks import elapsed
from shared_protocol import messages
from shared_protocol.crc import CrcTables
from shared_protocol.settings import Settings
from shared_protocol.words import HELD_DOWN, REFUSED, SCOPE_BANK, WHY_HOST_LOST, WHY_LEAVING

TYPE_CHECKING = False
if TYPE_CHECKING:
    from collections.abc import Callable

    from device.board.seam import Board

# With nothing to do, the banks are still looked at this often.
IDLE_US = 20_000
SOON_US = 1000
# What a tick may spend on slices before it goes on (the last one begun is finished).
SLICES_US = 60
# While a crossing is near, the link is looked at this often.
NEAR_MS = 4
# Garbage is collected when nothing is due for this long (see Board.collect).
COLLECT_IDLE_US = 10_000
# When told to leave: the outcomes get this long to go out.
LEAVE_MS = 300


class Controller:
    """Owns all parts. `due_us` tells the loop how long nothing is due; 0: tick again at once."""

    def __init__(self, board: "Board") -> None:
        self.board = board
        tables = CrcTables()
        self.outbox = Outbox(tables)
        self.endpoint = Endpoint(board, tables, self.outbox)
        self.store = SettingsStore(board, self.endpoint.decoder)
        self.teller = Teller(board, self.outbox)
        self.memory = RequestMemory(self.outbox)
        self.requests = Requests(self)
        self.lies = LieKeeper(board)
        self._light = Light(board)
        self.plant: "Plant | None" = None
        self.queue: "Queue | None" = None
        self._firing: "Firing | None" = None
        self._contacts: "Contacts | None" = None
        self._buttons: "Buttons | None" = None
        self._followers: "Followers | None" = None
        self.due_us = 0
        self.has_work = False
        self.may_collect = False
        self._litter = False
        self.leaving = False
        self.left = False
        self._reset_after = False
        self._leave_ms = 0
        self._host_there = False
        self._last_ms = -1
        self._inputs_changed = False
        self._slices: "list[Callable[[int], None]]" = []
        self._slice_ms: "list[int]" = []
        self._slice = 0
        self._bank = 0
        self._lay_slices()

    # ---- settings

    def start(self) -> None:
        """Load the settings. At power-up nothing fires, unless they ask for the saved lies; then through the queue."""
        settings = self.store.load()
        if settings is not None:
            self._build(settings)
            assert self.plant is not None
            if self.plant.restore:
                self.lies.begin_restore(self.plant)

    def commit_settings(self, crc: bytes) -> "Slot":
        """Check the settings that were staged and put them in force; what is known of unchanged motors stays known.

        The plant that is there goes first: a board has not the memory for two. Nothing waits or runs, nothing fires.
        """
        known = self.plant.known() if self.plant is not None else None
        self._forget_plant()
        found = self.store.commit(crc)
        settings = found.settings
        if settings is None:
            # The set before stays in force; it is read from its slot again.
            settings = self.store.load()
        if settings is not None:
            self._build(settings)
            if known is not None and self.plant is not None:
                self.plant.keep(known, found.problem is not None)
        found.settings = None
        return found

    def _forget_plant(self) -> None:
        self.plant = None
        self.queue = None
        self._firing = None
        self._contacts = None
        self._buttons = None
        self._followers = None
        self._lay_slices()

    def _build(self, settings: Settings) -> None:
        self.board.configure(settings)
        plant = Plant(settings, self.board, self.outbox)
        throws = Throws(plant, self.outbox, self.memory)
        firing = Firing(plant, self.board, self.outbox, throws)
        queue = Queue(plant, self.board, self.outbox, self.memory, firing, throws)
        self.plant = plant
        self._firing = firing
        self.queue = queue
        self._contacts = Contacts(plant, firing)
        self._buttons = Buttons(plant, queue)
        self._followers = Followers(plant, self.board)
        self._lay_slices()
        for bank in range(len(plant.banks)):
            self.board.charge(bank, True)

    # ---- the loop

    def tick(self) -> None:
        """One tick. Allocates nothing.

        In each: the voltages that a throw waits for, and the link. What counts in milliseconds is done in slices, as
        many as fit into SLICES_US: so a tick stays short, and a pulse is not late because of a lamp.
        """
        board = self.board
        now_ms = board.ticks_ms()
        queue = self.queue
        hot = queue is not None and queue.dispatch.hot
        if hot:
            assert queue is not None
            passed_ms = now_ms - self._last_ms
            if 0 <= passed_ms < (NEAR_MS if queue.dispatch.near else 1):
                # Nothing but the voltages, until the next millisecond (or a few, if the crossing is near).
                queue.dispatch.tick(now_ms)
                return
        self._last_ms = now_ms
        begun_us = board.ticks_us()
        endpoint = self.endpoint
        endpoint.read(hot)
        if endpoint.told_to_leave and not self.leaving:
            self.leave(False, now_ms)
        if queue is None or not queue.dispatch.holds(now_ms):
            self._sweep(begun_us, now_ms)
        queue = self.queue
        if queue is not None and (queue.throws.count or self.store.staging):
            self._tick_queue(queue, now_ms)
        outbox = self.outbox
        if outbox.open:
            if self.teller.telling:
                self._tell(now_ms)
            endpoint.write(hot)
        if self.leaving:
            self._go_on_leaving(now_ms)
        self._see_what_is_next(now_ms)

    def _see_what_is_next(self, now_ms: int) -> None:
        self.has_work = (
            self.endpoint.line_waiting
            or self.lies.wants_work
            or (self.teller.sending_settings and self.teller.wants_record)
            or (self.store.staging and self.busy)
        )
        if self.busy:
            self.due_us = 0
            self.may_collect = False
        else:
            self.due_us = self._due_us(now_ms)
            self.may_collect = self._litter and self.due_us >= COLLECT_IDLE_US

    def _tick_queue(self, queue: Queue, now_ms: int) -> None:
        firing = self._firing
        plant = self.plant
        assert firing is not None and plant is not None
        if firing.running:
            # The lowest reading of a pulse tells how deep it went.
            for gate in plant.banks:
                if gate.before_mv >= 0:
                    gate.look()
        fired = firing.fired
        queue.dispatch.hold(self.store.staging)
        queue.tick(now_ms)
        if firing.fired != fired:
            self._litter = True

    def _sweep(self, begun_us: int, now_ms: int) -> None:
        """The next slices: each once a millisecond at most, until the tick's time is used up."""
        slices = self._slices
        for _ in slices:
            place = self._slice
            if self._slice_ms[place] == now_ms:
                return
            self._slice_ms[place] = now_ms
            self._slice = place + 1 if place + 1 < len(slices) else 0
            slices[place](now_ms)
            if elapsed(self.board.ticks_us(), begun_us) >= SLICES_US:
                return

    def _lay_slices(self) -> None:
        """List what is done once a millisecond, in this order."""
        slices: "list[Callable[[int], None]]" = []
        if self.plant is not None:
            slices += [self._slice_bank for _ in self.plant.banks]
            slices += [self._slice_contacts, self._slice_panel, self._slice_followers]
        slices += [self._slice_host, self._slice_tell]
        self._slices = slices
        self._slice_ms = [-1] * len(slices)
        self._slice = 0
        self._bank = 0

    def _slice_bank(self, now_ms: int) -> None:
        plant = self.plant
        assert plant is not None
        number = self._bank
        self._bank = number + 1 if number + 1 < len(plant.banks) else 0
        gate = plant.banks[number]
        gate.update(now_ms)
        plant.watches[number].update(now_ms)
        if self.queue is not None and self.queue.dispatch.hot:
            self.queue.dispatch.look_near(number, now_ms)
        # A bank that is held down is no longer charged, where a cut-off is fitted.
        wanted = plant.faults.codes[SCOPE_BANK][number] != HELD_DOWN
        if gate.charge_on != wanted:
            gate.charge_on = wanted
            self.board.charge(number, wanted)

    def _slice_contacts(self, now_ms: int) -> None:
        assert self.plant is not None and self._contacts is not None
        self.plant.motors.sweep(now_ms)
        if self._contacts.tick(now_ms):
            self._inputs_changed = True
            # A key may bar a throw, or no longer.
            self.plant.changes.happened = True

    def _slice_panel(self, now_ms: int) -> None:
        buttons = self._buttons
        assert self.plant is not None and buttons is not None and self.queue is not None and self._firing is not None
        buttons.tick(now_ms, self._inputs_changed, self._firing.busy)
        self._inputs_changed = False
        if buttons.wants_stop or buttons.wants_release or buttons.wants_clear:
            self._board_buttons(buttons, now_ms)
        self.lies.tick(self.plant, self.queue, now_ms, self.leaving)

    def _slice_followers(self, now_ms: int) -> None:
        assert self._followers is not None
        self._followers.tick(now_ms)

    def _slice_host(self, now_ms: int) -> None:
        self.board.feed_watchdog()
        self._light.tick(self.plant, now_ms)
        self._watch_host(now_ms)
        self.endpoint.sweep(now_ms)
        self.teller.sweep(now_ms)
        self.teller.bad_lines = self.endpoint.bad_lines

    def _slice_tell(self, now_ms: int) -> None:
        if self.outbox.open and not self.teller.telling:
            self._tell(now_ms)

    def _tell(self, now_ms: int) -> None:
        self.teller.tick(self.plant, self.queue, now_ms)
        self.outbox.tick(now_ms)

    def _board_buttons(self, buttons: Buttons, now_ms: int) -> None:
        if buttons.wants_stop:
            self.stop(now_ms)
        elif buttons.wants_release:
            self.release()
        if buttons.wants_clear:
            self.clear_all()
        buttons.wants_stop = False
        buttons.wants_release = False
        buttons.wants_clear = False

    def _watch_host(self, now_ms: int) -> None:
        silence_ms = self.plant.silence_ms if self.plant is not None else 3000
        there = self.endpoint.silent_ms(now_ms) <= silence_ms
        if self._host_there and not there:
            self.outbox.open = False
            self.store.staging_lost = self.store.staging
            if self.queue is not None:
                self.queue.cancel_waiting(WHY_HOST_LOST, True, now_ms)
        self._host_there = there

    def _due_us(self, now_ms: int) -> int:
        """How long nothing is due, with no throw in the queue."""
        teller = self.teller
        if self.has_work or self.leaving or self.outbox.to_send or teller.telling or teller.telemetry:
            return 0
        due_us = teller.due_ms(self.plant, now_ms) * 1000
        if due_us > IDLE_US:
            due_us = IDLE_US
        if self._contacts is not None and self._contacts.sampling:
            return SOON_US
        if self._buttons is not None and self._buttons.watching:
            return SOON_US
        if self._followers is not None and self._followers.any and due_us > PERIOD_MS * 1000:
            due_us = PERIOD_MS * 1000
        return due_us

    # ---- what may allocate

    def work(self) -> None:
        """Handle the line that waits, and other work that may allocate."""
        now_ms = self.board.ticks_ms()
        self._litter = True
        if self.store.staging_lost:
            self.store.abandon()
        if self._staging_disturbed:
            self.requests.give_way()
        if self.endpoint.line_waiting:
            decoded = self.endpoint.take_line(now_ms)
            if decoded is not None:
                self._host_there = True
                self.requests.take(decoded, self.endpoint.body(), now_ms)
        if self.teller.wants_record:
            self.teller.give_record(self.store.next_record())
        if self.lies.wants_work and self.plant is not None:
            self.lies.work(self.plant, now_ms)
        self.has_work = False

    @property
    def _staging_disturbed(self) -> bool:
        """True if somebody asked at the panel for a throw while settings arrive: flash can't be written meanwhile."""
        return self.store.staging and self.busy

    def collected(self) -> None:
        """The loop has collected garbage."""
        self._litter = False
        self.may_collect = False

    # ---- requests of host and panel

    @property
    def busy(self) -> bool:
        """True while throws wait or run."""
        return self.queue is not None and self.queue.throws.count > 0

    def stop(self, now_ms: int) -> None:
        """The operator's stop."""
        if self.queue is not None:
            self.queue.stop(now_ms)

    def release(self) -> None:
        """Ends the stop."""
        if self.plant is not None:
            self.plant.stopped = False
            self.plant.changes.happened = True

    def clear(self, scope: int, number: int) -> bool:
        """Put one bank, junction or button back into use; False if it was not out."""
        plant = self.plant
        if plant is None or number >= len(plant.faults.codes[scope]):
            return False
        cleared = plant.faults.clear(scope, number)
        if cleared and scope == SCOPE_BANK:
            plant.watches[number].begin(False)
        return cleared

    def clear_all(self) -> bool:
        """Put everything back into use; False if nothing was out."""
        plant = self.plant
        cleared = False
        if plant is not None:
            for scope in range(3):
                for number in range(len(plant.faults.codes[scope])):
                    if self.clear(scope, number):
                        cleared = True
        return cleared

    def refuse(self, request: int, junction: int, lie: int, why: int) -> "list[object]":
        """Refuse a throw that the queue never sees; returns the values of the outcome."""
        values = self.outbox.kept(messages.OUTCOME)
        values[1] = request
        values[2] = 0
        values[3] = junction
        values[4] = lie
        values[5] = REFUSED
        values[6] = why
        for field in range(7, 11):
            values[field] = -1
        return values

    def refuse_route(self, request: int, route: int, why: int) -> "list[object]":
        """Refuse a route that the queue never sees; returns the values of its end."""
        values = self.outbox.kept(messages.ROUTE_END)
        values[1] = request
        values[2] = route
        values[3] = REFUSED
        values[4] = why
        values[5] = 0
        values[6] = 0
        return values

    def leave(self, reset: bool, now_ms: int) -> None:
        """Finish the running pulse, cancel the queue with outcomes, then leave the loop, or start again."""
        self.leaving = True
        self._reset_after = reset
        self._leave_ms = now_ms
        if self.queue is not None:
            self.queue.cancel_waiting(WHY_LEAVING, False, now_ms)

    def _go_on_leaving(self, now_ms: int) -> None:
        if self.busy:
            self._leave_ms = now_ms
            if self.plant is not None and self.queue is not None:
                self.plant.stopped = True
                self.queue.cancel_waiting(WHY_LEAVING, False, now_ms)
            return
        if self.outbox.to_send and elapsed(now_ms, self._leave_ms) < LEAVE_MS:
            return
        if self._reset_after:
            self.board.reset()
        else:
            self.left = True
