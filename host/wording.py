"""Messages in plain words, from the shared tables of reasons and faults."""

from host.views import FaultView, GoLine, Names, OutcomeView
from shared_protocol.sentences import FAULT_TEXTS, REASON_REMEDIES, REASON_TEXTS
from shared_protocol.words import FAULTS, REASONS

# What `which` of an outcome means, by reason; a reason that is not here names nothing.
_BANK_REASONS = ("below_ready", "gap", "pulse_running", "stale", "bank_out", "longest_wait")
_JUNCTION_REASONS = ("junction_out", "forbidden")
_MOTOR_REASONS = ("no_contact", "one_of_two", "no_drop", "kept_on", "contacts_disagree")

# The go line has one row: what is wrong and what to do, in a few words.
_SHORT_FAULTS = {
    "recharge_stalled": "does not recharge, look at its charge resistor",
    "supply_missing": "nothing charges it, look at the supply and its fuse",
    "no_drop": "coil open, move it by hand",
    "held_down": "driver or coil shorted: switch the supply off now",
    "sense_range": "its voltage reading is not possible, look at the divider",
    "contacts_disagree": "its contacts disagree, look at them",
    "button_stuck": "held too long, free it",
}


def volts(mv: int) -> str:
    """Millivolts as volts: '9.8 V'; '?' below 0."""
    return f"{mv / 1000:.1f} V" if mv >= 0 else "? V"


def duration(ms: int) -> str:
    """Milliseconds: '640 ms' below a second, then '1.2 s'."""
    if ms < 0:
        return "an unknown time"
    if ms < 1000:
        return f"{ms} ms"
    return f"{ms / 1000:.1f} s" if ms < 100_000 else f"{ms // 1000} s"


def reason_text(why: str) -> str:
    """What happened. Raises ValueError for a word that is not in the table."""
    return REASON_TEXTS[REASONS.index(why)]


def remedy_text(why: str, which: int = -1, ms: int = -1, names: Names | None = None) -> str:
    """What to do, with numbers filled in; without them the bare advice. Raises ValueError as reason_text does."""
    remedy = REASON_REMEDIES[REASONS.index(why)]
    if "{ms}" in remedy:
        remedy = remedy.replace("{ms} ms", duration(ms)) if ms >= 0 else remedy.replace("{ms} ms", "a little")
    if "{i}" in remedy:
        remedy = remedy.replace("{i}", (names or Names()).input(which)) if which >= 0 else remedy.replace(" {i}", "")
    return remedy


def outcome_text(ended: OutcomeView, names: Names) -> str:
    """One throw's end: 'refused: bank East is at 9.8 V, below the ready voltage; would pass in 640 ms'."""
    why = ended.why
    parts = [_cause(ended, names)]
    if ended.outcome == "refused" and ended.ms >= 0:
        parts.append("would pass now" if ended.ms == 0 else f"would pass in {duration(ended.ms)}")
    elif ended.outcome not in ("done", "refused") and ended.ms >= 0:
        parts.append(f"after {duration(ended.ms)}")
    remedy = ""
    if "{ms}" not in REASON_REMEDIES[REASONS.index(why)]:
        remedy = remedy_text(why, ended.which, ended.ms, names)
    if remedy and ended.outcome != "done":
        parts.append(remedy)
    return f"{ended.outcome}: " + "; ".join(part for part in parts if part)


def _cause(ended: OutcomeView, names: Names) -> str:
    why = ended.why
    text = reason_text(why)
    if why == "below_ready" and ended.which >= 0 and ended.mv >= 0:
        return f"{names.bank(ended.which)} is at {volts(ended.mv)}, below the ready voltage"
    if why == "longest_wait" and ended.which >= 0 and ended.mv >= 0:
        return f"{text}: {names.bank(ended.which)} is at {volts(ended.mv)}"
    if ended.which < 0:
        return text
    if why in _BANK_REASONS:
        return f"{text} ({names.bank(ended.which)})"
    if why in _JUNCTION_REASONS:
        return f"{text} ({names.junction(ended.which)})"
    if why in _MOTOR_REASONS:
        return f"{text} (motor {ended.which + 1})"
    return text


def throw_text(ended: OutcomeView, names: Names) -> str:
    """Junction, lie wanted, and how it ended."""
    return f"{names.junction(ended.junction)}, {names.lie(ended.junction, ended.lie)}: {outcome_text(ended, names)}"


def route_text(ended: OutcomeView, names: Names) -> str:
    """Route and how it ended: 'route Up main done: 5 of 5 throws'."""
    count = f"{ended.done} of {ended.of} throws"
    if ended.outcome == "done":
        return f"{names.route(ended.route)} done: {count}"
    text = f"{names.route(ended.route)} {ended.outcome}: {reason_text(ended.why)}; {count} done"
    return _with_remedy(text, ended.why)


def answer_text(request: str, ok: bool, why: str, which: int) -> str:
    """The board's answer to a request that is no throw."""
    return f"{request}: done" if ok else _with_remedy(f"{request} refused: {reason_text(why)}", why, which)


def rejected_text(record: int, field: str, why: str, label: str = "") -> str:
    """Why settings were not taken. `label` names the record; without it its number (from 0) does."""
    where = label or (f"record {record}" if record >= 0 else "the settings as a whole")
    if field:
        where += f", field {field}"
    return _with_remedy(f"settings not taken: {where}: {reason_text(why)}", why)


def _with_remedy(text: str, why: str, which: int = -1) -> str:
    remedy = remedy_text(why, which)
    return f"{text}; {remedy}" if remedy else text


def fault_row(code: str) -> tuple[str, str, str, str, str]:
    """Word, reason, remedy and the two names of evidence. Raises ValueError for an unknown code."""
    return FAULT_TEXTS[FAULTS.index(code)]


def evidence_text(code: str, first: int, second: int) -> str:
    """The two figures of a fault in words: '0.3 V dropped, 7.9 V expected'."""
    row = fault_row(code)
    return ", ".join(text for text in (_evidence(row[3], first), _evidence(row[4], second)) if text)


def _evidence(label: str, value: int) -> str:
    unit, _, rest = label.partition(" ")
    if unit == "mV":
        return f"{'-' if value < 0 else ''}{volts(abs(value))} {rest}"
    if unit == "ms":
        return f"{duration(max(0, value))} {rest}"
    if unit == "contact":
        return f"{label} {'closed' if value else 'open'}"
    return f"{label} {value}" if label else ""


def fault_text(fault: FaultView) -> str:
    """A fault in one sentence, with evidence and remedy."""
    near = f" ({fault.near_name})" if fault.near_name else ""
    evidence = f": {fault.evidence_text}" if fault.evidence_text else ""
    return f"{fault.who} out{near}: {fault.what}{evidence}; {fault.remedy}"


def out_line(fault: FaultView, others: int) -> GoLine:
    """The go line while something is out."""
    # The junction thrown last is evidence for its driver or coil, not for the supply or the sense.
    at_coil = fault.scope == "bank" and fault.code in ("no_drop", "held_down")
    near = f"{fault.near_name} " if fault.near_name and at_coil else ""
    more = f" (and {others} more)" if others else ""
    return GoLine("out", f"{fault.who} out: {near}{_SHORT_FAULTS.get(fault.code, fault.what)}{more}")
