"""Bank gate, queue, junctions, faults, settings and link endpoint: decides everything, touches no hardware."""
