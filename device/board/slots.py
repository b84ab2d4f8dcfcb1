"""Slots as files on the board's file system: `slot0.txt` and so on."""

TYPE_CHECKING = False
if TYPE_CHECKING:
    from typing import Any


LONGEST_LINE = 250


class FileSlots:
    """Keeps lines in slots. `address` 1 to 3: the slots of the board that this spare stands in for."""

    def __init__(self, opener: "Any", folder: str = "/", address: int = 0) -> None:
        self._opener = opener
        self._path = folder + "slot%d" + ("-%d" % address if address else "") + ".txt"
        self._file: "Any" = None
        self._read: "Any" = None

    def rewind(self, slot: int) -> bool:
        """Begin to read a slot; False if there is none, or it can't be read."""
        self._close_read()
        try:
            self._read = self._opener(self._path % slot, "rb")
        except OSError:
            return False
        return True

    def line(self) -> bytes:
        """Its next line without the newline; empty at the end, and for what can't be a line of ours."""
        if self._read is None:
            return b""
        try:
            line = self._read.readline(LONGEST_LINE + 2)
        except OSError:
            line = b""
        if not line.endswith(b"\n") or len(line) > LONGEST_LINE + 1:
            # The end, or a line that was cut off, or one too long.
            self._close_read()
            return b""
        return line[:-1]  # type: ignore[no-any-return]

    def _close_read(self) -> None:
        file, self._read = self._read, None
        if file is not None:
            try:
                file.close()
            except OSError:
                pass

    def begin(self, slot: int) -> bool:
        """Empty a slot and write to it."""
        self._close_read()
        self.end()
        try:
            self._file = self._opener(self._path % slot, "wb")
        except OSError:
            return False
        return True

    def write(self, line: bytes) -> bool:
        """Append to the slot that is open."""
        if self._file is None:
            return False
        try:
            self._file.write(line + b"\n")
        except OSError:
            return False
        return True

    def end(self) -> bool:
        """Close it."""
        file, self._file = self._file, None
        if file is not None:
            try:
                file.close()
            except OSError:
                return False
        return True

    def append(self, slot: int, line: bytes) -> bool:
        """Append to a closed slot."""
        try:
            with self._opener(self._path % slot, "ab") as file:
                file.write(line + b"\n")
        except OSError:
            return False
        return True
