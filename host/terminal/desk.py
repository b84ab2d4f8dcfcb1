"""The desk without its screens: what a person asks for, what became of it, what is being typed."""

from dataclasses import dataclass

from host.model import LayoutModel
from host.terminal.caution_view import CautionMemory
from host.terminal.mode_view import Mode
from host.terminal.rows import seconds
from host.terminal.session_like import SessionLike
from host.terminal.typing_view import MOST_DIGITS, Throw, Typing, Wrong, lie_choices, lie_keys
from host.terminal.voltage_history import VoltageHistory

LEVELS = {"done": "good", "refused": "warn", "expired": "warn", "cancelled": "warn"}
_SIGNS = {"info": "", "good": "+ ", "warn": "! ", "bad": "X "}
NO_LINK = "there is no connection to the board"


@dataclass(frozen=True)
class Notice:
    """The answer line. level: 'info', 'good', 'warn' or 'bad'."""

    level: str
    text: str

    @property
    def shown(self) -> str:
        """With its sign, so that it can be read without colour."""
        return f"{_SIGNS[self.level]}{self.text}" if self.text else ""


@dataclass(frozen=True)
class Waiting:
    """A request in the queue that can be cancelled."""

    id: int
    text: str


class Desk:
    """One session, one person. Every request goes through here."""

    def __init__(
        self,
        session: SessionLike,
        cautions: CautionMemory | None = None,
    ) -> None:
        self.session = session
        self.cautions = cautions or CautionMemory()
        self.mode = Mode()
        self.typing = Typing()
        self.history = VoltageHistory()
        self.notice = Notice("info", "")
        # A junction whose lie is being chosen; -1: none.
        self.choosing = -1
        self.caution_wanted = False
        self._asked: dict[int, str] = {}
        # Requests that are no throw, with how many answers there had been when they were asked.
        self._unanswered: dict[str, int] = {}
        self._version = -1
        self._connected = False
        self._was_lost = False

    @property
    def model(self) -> LayoutModel:
        """What the board said."""
        return self.session.model

    def now_s(self) -> float:
        """The session's clock."""
        return self.session.clock()

    def poll(self) -> bool:
        """Take the news. True if something has changed since the last call."""
        self.session.poll()
        self.history.take(self.model)
        self._look_at_answers()
        self._look_at_other_answers()
        self._look_at_connection()
        changed = self.model.version != self._version
        self._version = self.model.version
        return changed

    def say(self, level: str, text: str) -> None:
        """Put something on the answer line."""
        self.notice = Notice(level, text)

    def acknowledge_cautions(self) -> None:
        """A person has read them, for every board that is there."""
        for board in self.model.boards:
            self.cautions.acknowledge(board)

    def use_settings_wait(self) -> None:
        """Begin with the wait that the settings give to buttons."""
        settings = self.model.settings
        if settings is not None and settings.timing is not None and settings.timing.wait_ms:
            self.mode.longest_ms = settings.timing.wait_ms

    @property
    def counts_down(self) -> bool:
        """True while something on the screen counts down."""
        return bool(self.model.queue) or any(bank.state != "ready" and not bank.lost for bank in self.model.banks)

    # ---- typing

    def typed(self, key: str, character: str | None) -> bool:
        """A key. True if it belonged to the number being typed, or to the choice of a lie."""
        self.typing.most_digits = max(MOST_DIGITS, len(str(len(self.model.junctions))))
        if self.choosing >= 0:
            return self._chosen(key, character)
        if key == "enter":
            self.enter()
            return True
        if key == "escape":
            self.typing.clear()
            self.notice = Notice("info", "")
            return True
        if key == "backspace":
            return self.typing.back()
        return character is not None and self.typing.add(character)

    def _chosen(self, key: str, character: str | None) -> bool:
        junction = self.model.junctions[self.choosing] if self.choosing < len(self.model.junctions) else None
        keys = lie_keys(junction) if junction is not None else []
        letter = (character or "").lower()
        if junction is not None and letter in keys:
            self.choosing = -1
            self.throw(junction.number, keys.index(letter))
            return True
        if key in ("escape", "backspace") or junction is None:
            self.choosing = -1
            self.say("info", "Nothing was chosen.")
            return True
        # Any other key would be a surprise while a choice is open.
        self.say("warn", f"press one of these: {lie_choices(junction)}   (Esc: none)")
        return True

    # ---- requests

    @property
    def caution_due(self) -> bool:
        """True if the cautions must be read before anything may fire."""
        return any(self.cautions.due(board) for board in self.model.boards)

    def throw(self, junction: int, lie: int) -> None:
        """Ask for a throw in the mode that is set."""
        who = f"{junction + 1} {self.model.names.junction(junction)} > {self.model.names.lie(junction, lie)}"
        if self._held_back(who):
            return
        self._ask(self.session.throw(junction, lie, self.mode.wait_ms), who)

    def route(self, number: int) -> None:
        """Ask for a route in the mode that is set."""
        who = self.model.names.route(number)
        if self._held_back(who):
            return
        self._ask(self.session.route(number, self.mode.wait_ms), who)

    def enter(self) -> None:
        """What Enter does with what was typed: throws, or lets the person choose a lie."""
        meaning = self.typing.meaning(self.model)
        if isinstance(meaning, Wrong):
            self.say("warn", meaning.text)
            if self.typing.digits and not self.typing.letter:
                self.typing.clear()
            return
        self.typing.clear()
        if isinstance(meaning, Throw):
            self.throw(meaning.junction, meaning.lie)
        else:
            self.choosing = meaning.junction
            self.say("info", f"{lie_choices(self.model.junctions[meaning.junction])}   (Esc: none)")

    def stop(self) -> None:
        """Stop, now."""
        self.typing.clear()
        self.choosing = -1
        self._expect_answer("stop")
        unreached = self.session.unreached
        if self.session.stop():
            self.say("bad" if unreached else "warn", f"STOP sent; {unreached}." if unreached else "STOP sent.")
        else:
            self.say("bad", f"STOP NOT SENT: {NO_LINK}. Use the panel's stop, or switch the coil supply off.")

    def release(self) -> None:
        """End the stop. Asked for even if no stop is known of: the board's news of one may be on its way."""
        self._expect_answer("release")
        if self.session.release():
            self.say("info", "release asked for")
        else:
            self.say("bad", f"not released: {NO_LINK}")

    def clear(self, scope: str, number: int, who: str) -> None:
        """Put what is out back into use."""
        self._expect_answer("clear")
        if self.session.clear(scope, number):
            self.say("info", f"asked to put {who} back into use")
        else:
            self.say("bad", f"not cleared: {NO_LINK}")

    def waiting(self) -> list[Waiting]:
        """Requests that can be cancelled: those from this side, each once."""
        names = self.model.names
        found: dict[int, str] = {}
        for item in self.model.queue:
            if item.id and item.state == "waiting" and item.id not in found:
                found[item.id] = f"{item.junction + 1} {names.junction(item.junction)}"
                if item.step:
                    found[item.id] = f"route: {found[item.id]} and what follows"
        return [Waiting(number, text) for number, text in found.items()]

    def cancel(self, numbers: list[int]) -> None:
        """Cancel these requests, as far as they have not fired."""
        if not numbers:
            by_button = any(item.state == "waiting" for item in self.model.queue)
            text = "What waits was asked for by a button: stop ends it." if by_button else "Nothing waits."
            self.say("info", text)
            return
        self._expect_answer("cancel")
        if all([self.session.cancel(number) for number in numbers]):
            self.say("info", "cancelling what has not fired")
        else:
            self.say("bad", f"not cancelled: {NO_LINK}")

    # ---- answers

    def _expect_answer(self, request: str) -> None:
        answer = self.model.answers.get(request)
        self._unanswered[request] = answer.count if answer is not None else 0

    def _look_at_other_answers(self) -> None:
        for request, count in list(self._unanswered.items()):
            answer = self.model.answers.get(request)
            if answer is None or answer.count == count:
                continue
            del self._unanswered[request]
            if request == "stop" and answer.ok:
                self.say("warn", "STOP is on: a running pulse ends by itself, nothing further fires. r releases.")
            else:
                self.say("good" if answer.ok else "bad", answer.text)

    def _look_at_connection(self) -> None:
        """Coming back is said: what did not leave before is not sent again by itself."""
        before, self._connected = self._connected, self.model.connection.state == "connected"
        if self._connected and not before and self._was_lost:
            self.say("info", "The board answers again. Nothing that was asked for meanwhile is repeated.")
        self._was_lost = self._was_lost or self.model.connection.state == "lost"

    def _held_back(self, who: str) -> bool:
        if self.caution_due:
            self.caution_wanted = True
            self.say("warn", f"{who}: not asked for yet; the cautions come first.")
            return True
        return False

    def _ask(self, number: int, who: str) -> None:
        self._asked[number] = who
        wait = f", may wait {seconds(self.mode.longest_ms)}" if self.mode.waits else ", now or not"
        self.say("info", f"{who}: asked for{wait}")
        self._look_at_answers()

    def _look_at_answers(self) -> None:
        for number in list(self._asked):
            ended = self.session.outcome_of(number)
            if ended is not None:
                del self._asked[number]
                self.say(LEVELS.get(ended.outcome, "bad"), ended.text)
