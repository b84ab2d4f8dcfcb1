"""The command line: one small module a group of commands. Nothing heavy is imported before a command needs it."""

from host.cli.main import main

__all__ = ["main"]
