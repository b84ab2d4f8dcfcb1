"""What each action of a scenario does to host, hands, layout and board."""

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from shared_protocol import messages
from sim.circuit import Circuit
from sim.circuit_parameters import CoilFaults
from sim.engine import Restart

if TYPE_CHECKING:
    from sim.rehearsal.running import Rehearsal

SIDES = ("normal", "reverse")


class Actions:
    """Carries out actions by their words."""

    def __init__(self, rehearsal: "Rehearsal") -> None:
        self._run = rehearsal
        self._host = rehearsal.host
        self._world = rehearsal.world

    def do(self, word: str, values: dict[str, Any]) -> None:
        """Carry out one action. Raises Restart for a power cut."""
        action: Callable[[dict[str, Any]], None] = getattr(self, f"_{word}")
        action(values)

    @property
    def _circuit(self) -> Circuit:
        return self._world.circuit

    # ---- the host

    def _throw(self, values: dict[str, Any]) -> None:
        self._host.request(
            values["label"], messages.THROW, j=values["junction"], lie=values["lie"], wait=values["wait_ms"]
        )

    def _route(self, values: dict[str, Any]) -> None:
        self._host.request(values["label"], messages.ROUTE, r=values["route"], wait=values["wait_ms"])

    def _cancel(self, values: dict[str, Any]) -> None:
        number = self._host.requests[values["label"]][0]
        self._host.say(messages.CANCEL, boot=max(1, self._host.boot), id=number)

    def _repeat(self, values: dict[str, Any]) -> None:
        self._host.repeat(values["label"])

    def _stop(self, _values: dict[str, Any]) -> None:
        self._host.say(messages.STOP)

    def _release(self, _values: dict[str, Any]) -> None:
        self._run.stop_watch.release_asked()
        self._host.say(messages.RELEASE, boot=max(1, self._host.boot))

    def _clear(self, values: dict[str, Any]) -> None:
        scope, number = "all", 0
        for key in ("bank", "junction"):
            if key in values:
                scope, number = key, values[key]
        if "button" in values:
            scope, number = "button", values["button"] - 1
        self._host.say(messages.CLEAR, boot=max(1, self._host.boot), scope=scope, i=number)

    def _tune(self, values: dict[str, Any]) -> None:
        self._host.tune(values["junction"], values.get("lie"), round(values["ready_v"] * 1000))

    def _ask_restart(self, _values: dict[str, Any]) -> None:
        self._host.say(messages.RESTART, boot=max(1, self._host.boot))

    def _host_lost(self, _values: dict[str, Any]) -> None:
        self._host.lose_link()

    def _host_back(self, _values: dict[str, Any]) -> None:
        self._host.connect(self._world.now_us)

    def _host_stops_reading(self, _values: dict[str, Any]) -> None:
        self._host.reads = False

    def _host_reads(self, _values: dict[str, Any]) -> None:
        self._host.reads = True

    def _damage_lines(self, values: dict[str, Any]) -> None:
        self._host.damage = values["count"]

    def _double_lines(self, values: dict[str, Any]) -> None:
        self._host.double = values["count"]

    def _lose_lines(self, values: dict[str, Any]) -> None:
        self._host.lose = values["count"]

    # ---- board and hands

    def _restart(self, _values: dict[str, Any]) -> None:
        raise Restart("the power failed")

    def _press(self, values: dict[str, Any]) -> None:
        self._hold(values["input"], True, values["for_ms"] * 1000)

    def _close(self, values: dict[str, Any]) -> None:
        self._hold(values["input"], True, None)

    def _open(self, values: dict[str, Any]) -> None:
        self._hold(values["input"], False, None)

    def _hand(self, values: dict[str, Any]) -> None:
        self._world.move_by_hand(values["junction"], values["lie"])

    def _hold(self, number: int, closed: bool, for_us: int | None) -> None:
        self._run.stop_watch.touched(number)
        self._world.inputs.hold(number, closed, self._world.now_us, for_us)

    # ---- faults

    def _coil(self, values: dict[str, Any]) -> CoilFaults:
        return self._circuit.coil_faults[values["motor"], SIDES.index(values["side"])]

    def _supply_off(self, _values: dict[str, Any]) -> None:
        self._circuit.supply_on = False

    def _supply_on(self, _values: dict[str, Any]) -> None:
        self._circuit.supply_on = True

    def _driver_stuck(self, values: dict[str, Any]) -> None:
        self._coil(values).driver_stuck = True

    def _driver_mended(self, values: dict[str, Any]) -> None:
        self._coil(values).driver_stuck = False

    def _coil_open(self, values: dict[str, Any]) -> None:
        self._coil(values).open = True

    def _coil_shorted(self, values: dict[str, Any]) -> None:
        self._coil(values).short_ohm = values["ohm"]

    def _joint_bad(self, values: dict[str, Any]) -> None:
        self._coil(values).joint_ohm = values["ohm"]

    def _coil_mended(self, values: dict[str, Any]) -> None:
        coil = self._coil(values)
        coil.open = False
        coil.short_ohm = None
        coil.joint_ohm = 0.0

    def _jammed(self, values: dict[str, Any]) -> None:
        self._world.motors[values["motor"]].jammed = True

    def _freed(self, values: dict[str, Any]) -> None:
        self._world.motors[values["motor"]].jammed = False

    def _capacitor_faded(self, values: dict[str, Any]) -> None:
        self._circuit.bank_faults[values["bank"]].capacitance_factor = values["factor"]

    def _leakage_high(self, values: dict[str, Any]) -> None:
        self._circuit.bank_faults[values["bank"]].extra_leak_ohm = values["ohm"]

    def _divider_broken(self, values: dict[str, Any]) -> None:
        self._world.sense[values["bank"]].fault = f"{values['leg']}_open"

    def _bank_mended(self, values: dict[str, Any]) -> None:
        faults = self._circuit.bank_faults[values["bank"]]
        faults.capacitance_factor = 1.0
        faults.extra_leak_ohm = float("inf")
        self._world.sense[values["bank"]].fault = "none"

    def _contact_stuck(self, values: dict[str, Any]) -> None:
        self._run.stop_watch.touched(values["input"])
        self._world.inputs.stuck[values["input"]] = values["closed"]

    def _contact_freed(self, values: dict[str, Any]) -> None:
        self._run.stop_watch.touched(values["input"])
        self._world.inputs.stuck.pop(values["input"], None)
