# Runs in real MicroPython: what a board has beside the interpreter, and a loop that runs what the prompt was given.
import builtins
import io
import os as real_os
import sys as real_sys

from host import call

facts = eval(call("facts", ""))
real_open = builtins.open


class Made:
    pass


def change(what):
    answer = call("change", what)
    if answer == "full":
        raise OSError(28)
    return answer


class File:
    """A file that asks before each change."""

    def __init__(self, path, mode):
        self.spoil = change(f"open {path}") == "spoil"
        self.file = real_open(path, mode)

    def write(self, data):
        change(f"write {len(data)}")
        if self.spoil:
            data = bytes([data[0] ^ 1]) + data[1:]
        return self.file.write(data)

    def read(self, *size):
        return self.file.read(*size)

    def close(self):
        self.file.close()
        call("changed", "")

    def __enter__(self):
        return self

    def __exit__(self, *why):
        self.close()


def open(path, mode="r"):
    return File(path, mode) if "w" in mode or "a" in mode else real_open(path, mode)


def changing(name, function):
    def asked(*paths):
        change(name + " " + " ".join(paths))
        result = function(*paths)
        call("changed", "")
        return result

    return asked


fake_os = Made()
for each in ("ilistdir", "listdir", "stat", "urandom", "getcwd"):
    setattr(fake_os, each, getattr(real_os, each))
for each in ("remove", "rename", "mkdir", "rmdir"):
    setattr(fake_os, each, changing(each, getattr(real_os, each)))
fake_os.statvfs = lambda path: (facts["block"], facts["block"], 352, int(call("statvfs", "")), 0, 0, 0, 0, 0, 255)

fake_sys = Made()
fake_sys.implementation = Made()
fake_sys.implementation.name = facts["name"]
fake_sys.implementation.version = facts["version"] + ("",)
fake_sys.implementation._machine = facts["machine"]
fake_sys.implementation._mpy = facts["mpy"]
# Not rp2: on that main.py sets a threshold, and this build must not collect garbage by itself.
fake_sys.platform = "bridge"
for each in ("print_exception", "modules", "path", "stdin", "stdout", "exit"):
    setattr(fake_sys, each, getattr(real_sys, each))


class Pin:
    OUT = 1
    IN = 0
    PULL_DOWN = 2

    def __init__(self, number, mode=-1, pull=-1, value=-1):
        call("pin", f"{number} {mode} {value}")


machine = Made()
machine.Pin = Pin
machine.reset = lambda: call("reset", "")

for name, module in (("os", fake_os), ("sys", fake_sys), ("machine", machine)):
    real_sys.modules[name] = module


def make_board():
    """The firmware's board: a bench board whose link is the port."""
    space = {"__name__": "bench_board"}
    exec(call("bench", ""), space)
    Bench = space["BenchBoard"]

    class PortBoard(Bench):
        kind = b"rp2040"
        uid = b"e6605838834a2b2c"
        caps = b"3 banks"
        stay_at_prompt = False

        def before_tick(self, due_us):
            self.pass_us(2000)
            came = call("bytes", "")
            if came:
                self.say(bytes.fromhex(came))
            if self.out_count:
                call("send", self.heard().hex())

        def begin(self):
            pass

        def end(self):
            if self.out_count:
                call("send", self.heard().hex())

        def collect(self):
            pass

        def reset(self):
            call("reset", "")

    board = PortBoard(3)
    for slot in range(2):
        try:
            with real_open(f"/slot{slot}.txt", "rb") as file:
                board.slots[slot] = [line for line in file.read().split(b"\n") if line]
        except OSError:
            pass
    return board


def run_file(path, space):
    with real_open(path) as file:
        text = file.read()
    exec(text, space)


def serve():
    space = {"__name__": "__main__", "open": open}
    error = ""
    while True:
        what = call("next", error)
        error = ""
        try:
            if what == "boot":
                run_file("/boot.py", space)
            elif what == "main":
                choice = Made()
                choice.make_board = make_board
                real_sys.modules["board_choice"] = choice
                run_file("/main.py", space)
            else:
                exec(what[4:], space)
        except Exception as caught:  # noqa: BLE001 - a prompt shows whatever it is
            text = io.StringIO()
            real_sys.print_exception(caught, text)
            error = text.getvalue()


serve()
