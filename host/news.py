"""What each message of the board changes in the model."""

from typing import TYPE_CHECKING

from host import wording
from host.views import AnswerView, BankView, BoardView, FaultView, OutcomeView, QueueItem
from shared_protocol import messages
from shared_protocol.codec import Received
from shared_protocol.fields import INT_MAX
from shared_protocol.words import FAULTS

if TYPE_CHECKING:
    from host.model import LayoutModel

MOST_NUMBER = INT_MAX - 1_000_000
_LEVELS = {"done": "good", "refused": "warn", "expired": "warn", "cancelled": "warn", "failed": "bad"}


def take(model: "LayoutModel", received: Received, at_s: float) -> None:
    """Apply one message that is no settings record."""
    message = received.message
    if message is messages.BANK:
        _bank(model, received, at_s)
    elif message is messages.STATE:
        _state(model, received, at_s)
    elif message is messages.LIE:
        _lie(model, received, at_s)
    elif message is messages.TAKEN or message is messages.EXPECT:
        _queued(model, received, at_s)
    elif message is messages.OUTCOME:
        _outcome(model, received, at_s)
    elif message is messages.ROUTE_END:
        _route_end(model, received, at_s)
    elif message is messages.FAULT:
        _fault(model, received, at_s)
    elif message is messages.CLEARED:
        _cleared(model, received, at_s)
    elif message is messages.PULSE:
        _pulse(model, received, at_s)
    else:
        _answers(model, received, at_s)


def _answers(model: "LayoutModel", received: Received, at_s: float) -> None:
    message = received.message
    if message is messages.BOARD:
        _board(model, received, at_s)
    elif message is messages.WRONG_VERSION:
        model.note(at_s, "bad", f"the board speaks version {received.number('v')} of the protocol")
    elif message is messages.ANSWER:
        _answer(model, received, at_s)
    elif message is messages.ACCEPTED:
        model.settings_changed(received.name("crc"))
        model.note(at_s, "good", f"settings taken, number {received.number('seq')}")
    elif message is messages.REJECTED:
        text = wording.rejected_text(received.number("n"), received.name("field"), received.word("why"))
        model.note(at_s, "bad", text)
    elif message is messages.END:
        if received.word("what") == "status":
            model.end_of_status()
        else:
            model.end_of_settings(at_s)


def board_of(received: Received) -> BoardView:
    """Who a board says that it is."""
    return BoardView(
        received.name("kind"),
        received.name("uid"),
        received.name("fw"),
        received.number("boot"),
        received.name("crc"),
        received.number("v"),
        received.name("caps"),
    )


def _board(model: "LayoutModel", received: Received, at_s: float) -> None:
    before, now = model.board, board_of(received)
    model.board = now
    if before is None or (before.boot, before.uid) != (now.boot, now.uid):
        if before is not None:
            model.note(at_s, "warn", "the board has restarted: what it was asked before is void; look at the lies")
        model.new_boot()
    if before is not None and before.settings_crc != now.settings_crc:
        model.settings_changed(now.settings_crc)
    if model.settings_match is False:
        text = "the board has no settings: send it the layout"
        if now.settings_crc:
            text = "the board's settings differ from the layout file; shown is what the board holds"
        if before is None or before.settings_crc != now.settings_crc:
            model.note(at_s, "warn", text)


def _bank(model: "LayoutModel", received: Received, at_s: float) -> None:
    number = received.number("b")
    fact = BankView(number, "", 0, received.number("mv"), received.number("age"), received.word("state"))
    fact.ready_ms, fact.heard_at_s = received.number("ready"), at_s
    model.bank_facts[number] = fact
    model.refresh()


def _state(model: "LayoutModel", received: Received, at_s: float) -> None:
    stopped = bool(received.number("stop"))
    if stopped != model.stopped:
        model.note(at_s, "warn" if stopped else "good", "stopped" if stopped else "released")
    model.stopped = stopped
    telemetry = model.telemetry
    telemetry.queue = received.number("queue")
    telemetry.up_s = received.number("up")
    telemetry.dropped = received.number("dropped")
    telemetry.bad_lines = received.number("bad")
    telemetry.inputs = received.number("in1") | received.number("in2") << 24
    telemetry.heard_at_s = at_s
    if telemetry.queue == 0 and model.queue:
        model.queue = []
        model.refresh()
    model.forget_finished(at_s)


def _lie(model: "LayoutModel", received: Received, at_s: float) -> None:
    model.lie_facts[received.number("j")] = (received.number("lie"), received.word("src"), at_s)
    model.refresh()


def _queued(model: "LayoutModel", received: Received, at_s: float) -> None:
    number, step, junction = received.number("id"), received.number("step"), received.number("j")
    _number_used(model, number)
    ended = model.outcomes.get((number, step))
    if number and ended is not None and ended.outcome != "unknown":
        return
    model.told_throw((number, step, junction))
    state = received.word("st") if received.message is messages.EXPECT else "waiting"
    item = QueueItem(
        number, step, junction, received.number("lie"), received.word("by"), state, received.number("due"), at_s
    )
    for place, other in enumerate(model.queue):
        if (other.id, other.step, other.junction) == (number, step, junction):
            model.queue[place] = item
            break
    else:
        model.queue.append(item)
    model.refresh()


def _number_used(model: "LayoutModel", number: int) -> None:
    """Requests to come get larger numbers. One near the end of the range is nobody's: there must be room above it."""
    if number <= MOST_NUMBER:
        model.highest_id = max(model.highest_id, number)


def _outcome(model: "LayoutModel", received: Received, at_s: float) -> None:
    number, step, junction = received.number("id"), received.number("step"), received.number("j")
    _number_used(model, number)
    ended = OutcomeView(
        number, step, "throw", received.word("o"), received.word("why"), "", at_s, junction, received.number("lie")
    )
    ended.ms, ended.which = received.number("ms"), received.number("i")
    ended.mv, ended.after_mv = received.number("mv"), received.number("after")
    ended.text = wording.throw_text(ended, model.names)
    if number:
        model.keep_outcome(ended)
    model.queue = [item for item in model.queue if (item.id, item.step, item.junction) != (number, step, junction)]
    model.note(at_s, _LEVELS[ended.outcome], ended.text)
    model.refresh()


def _route_end(model: "LayoutModel", received: Received, at_s: float) -> None:
    number = received.number("id")
    _number_used(model, number)
    ended = OutcomeView(number, 0, "route", received.word("o"), received.word("why"), "", at_s)
    ended.route, ended.done, ended.of = received.number("r"), received.number("done"), received.number("of")
    ended.text = wording.route_text(ended, model.names)
    if number:
        model.keep_outcome(ended)
    model.note(at_s, _LEVELS[ended.outcome], ended.text)


def _fault(model: "LayoutModel", received: Received, at_s: float) -> None:
    scope, number, code = received.word("scope"), received.number("i"), received.word("code")
    row = wording.fault_row(code)
    evidence = wording.evidence_text(code, received.number("e1"), received.number("e2"))
    fault = FaultView(scope, number, code, row[1], row[2], evidence, received.number("near"), at_s)
    fault.blink = FAULTS.index(code)
    name_fault(model, fault)
    model.told_fault(scope, number)
    kept = model.fault_facts.get((scope, number))
    if code == "none":
        model.fault_facts.pop((scope, number), None)
    elif kept is None or kept.code != code:
        model.note(at_s, "bad", wording.fault_text(fault))
        model.fault_facts[(scope, number)] = fault
    else:
        model.fault_facts[(scope, number)] = fault
    model.refresh()


def name_fault(model: "LayoutModel", fault: FaultView) -> None:
    """Fill in the names that a fault's numbers stand for."""
    names = model.names
    who = {"bank": names.bank, "junction": names.junction}.get(fault.scope)
    fault.who = who(fault.number) if who is not None else f"{fault.scope} {fault.number + 1}"
    fault.near_name = ""
    if fault.near >= 0:
        fault.near_name = names.junction(fault.near) if fault.scope == "bank" else f"motor {fault.near + 1}"


def _cleared(model: "LayoutModel", received: Received, at_s: float) -> None:
    scope, number = received.word("scope"), received.number("i")
    fault = model.fault_facts.pop((scope, number), None)
    if scope == "all":
        model.fault_facts.clear()
    who = fault.who if fault is not None else f"{scope} {number + 1}"
    model.note(at_s, "good", f"{who} is in use again")
    model.refresh()


def _pulse(model: "LayoutModel", received: Received, at_s: float) -> None:
    width_us = received.number("us")
    where = model.names.bank(received.number("b"))
    who = model.names.junction(received.number("j"))
    text = f"pulse for {who}: {width_us / 1000:.1f} ms on {where} at {wording.volts(received.number('mv'))}"
    model.note(at_s, "info", text)


def _answer(model: "LayoutModel", received: Received, at_s: float) -> None:
    request, ok = received.word("to"), bool(received.number("ok"))
    why, which = received.word("why"), received.number("i")
    text = wording.answer_text(request, ok, why, which)
    before = model.answers.get(request)
    model.answers[request] = AnswerView(ok, why, which, text, before.count + 1 if before else 1, at_s)
    if ok and request == "stage":
        return
    model.note(at_s, "info" if ok else "bad", text)
