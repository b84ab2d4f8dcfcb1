"""The hardware seam: the interface, and one module a kind of board."""
