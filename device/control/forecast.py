"""When the pulses of the queue should come: bank by bank, each throw after those ahead of it."""

from device.control import recharge
from device.control.firing import Firing
from device.control.plant import Plant
from device.control.pulses import PulsePlan
from device.control.throws import Throw, Throws
from shared_protocol.words import THROW_WAITING


class Forecast:
    """`begin`, then `add` the waiting throws, oldest first: each answers when its next pulse is expected."""

    def __init__(self, plant: Plant, firing: Firing, throws: Throws) -> None:
        self._plant = plant
        self._firing = firing
        self._throws = throws
        self._plan = PulsePlan(plant)
        # What each bank should hold when its next pulse may begin (-1: can't be told), and when that is.
        self._mv = [-1] * len(plant.banks)
        self._ms = [0] * len(plant.banks)

    def begin(self, now_ms: int) -> None:
        """Start from how the banks are now."""
        for gate in self._plant.banks:
            bank = gate.number
            self._ms[bank] = 0
            self._mv[bank] = gate.mean_mv
            if self._plant.faults.bank_out(bank):
                self._mv[bank] = -1
            elif gate.running:
                self._ms[bank] = self._firing.running_left_ms(bank, now_ms)
                self._mv[bank] = self._firing.after_running_mv(bank)

    def add(self, throw: Throw, now_ms: int) -> int:
        """Milliseconds until the next pulse of `throw`, recharge.NEVER if that can't be told."""
        plan = self._plan
        plan.make(throw.junction, throw.lie, throw.place, throw.raise_mv)
        bank = plan.bank
        mv = self._mv[bank]
        if mv < 0:
            return recharge.NEVER
        settings = self._plant.banks[bank].settings
        time_ms = self._ms[bank]
        wait_ms = recharge.ms_until(settings, mv, plan.ready_mv)
        if wait_ms < 0:
            self._mv[bank] = -1
            return recharge.NEVER
        rest_ms = self._firing.rest_left_ms(throw, plan, now_ms) - time_ms
        if rest_ms > wait_ms:
            mv = recharge.charged_mv(settings, mv, rest_ms)
            wait_ms = rest_ms
        elif mv < plan.ready_mv:
            mv = plan.ready_mv
        time_ms += wait_ms
        width_us = plan.width_us(mv)
        self._mv[bank] = max(0, mv - recharge.drop_mv(settings, plan.cohm, mv, width_us))
        self._ms[bank] = time_ms + width_us // 1000 + settings.gap_ms
        return time_ms

    def of(self, throw: Throw, now_ms: int) -> int:
        """Milliseconds until the next pulse of one throw, after those ahead of it on its bank."""
        self.begin(now_ms)
        due_ms = recharge.NEVER
        for place in range(self._throws.count):
            other = self._throws.order[place]
            if other.state == THROW_WAITING and (other.bank == throw.bank or other is throw):
                due_ms = self.add(other, now_ms)
            if other is throw:
                break
        return due_ms
