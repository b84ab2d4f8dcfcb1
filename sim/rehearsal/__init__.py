"""Rehearsals: the real logic on the simulated layout, by a script, in virtual time."""

from sim.rehearsal.running import Report, run_rehearsal
from sim.rehearsal.scenario import Scenario, load_scenario, shipped

__all__ = ["Report", "Scenario", "load_scenario", "run_rehearsal", "shipped"]
