"""The one table of messages and settings, with framing and integrity: shared by board and host."""
