"""The simulator: circuit, motors, faults, the virtual board and rehearsals."""
