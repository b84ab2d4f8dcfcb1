"""Puts the firmware on a board: copies what changed, in an order that leaves no half firmware that starts.

/main.py is set aside before anything else changes and put back last, after all files were read back: wherever the work
is broken off, the board starts either a whole firmware or only boot.py, which makes every coil-capable pin low.
"""

import contextlib
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field

from host.board import files as board_files
from host.board.errors import (
    LEAST_VERSION,
    BoardFull,
    BoardSays,
    DamagedCopy,
    ForeignFiles,
    FullWhileCopying,
    NotMicroPython,
    OldMicroPython,
    OtherFirmwareBack,
    WrongBytecode,
    WrongChip,
)
from host.board.files import BoardFile
from host.board.leaving import leave
from host.board.on_board import HELD_MAIN, HELPERS, SURVEY, TEMPORARY, Survey, copying, read_survey
from host.board.planning import BOOT, MAIN, Plan, plan
from host.board.restarting import BACK_S, restart
from host.board.transport import RawPrompt
from host.link import readable
from host.link_errors import LinkError
from host.views import BoardView
from shared_protocol import messages

CHIPS = ("RP2040", "RP2350")
# OSError of a full file system, as MicroPython prints it: by name, or by number.
_FULL = ("ENOSPC", "OSError: 28", "OSError: [Errno 28]")
_NAMES_A_STATEMENT = 16
Progress = Callable[[str], None]


@dataclass
class Installed:
    """How an install went. before, after: who answered; before is None where no firmware ran."""

    files: list[BoardFile]
    survey: Survey
    plan: Plan
    before: BoardView | None
    after: BoardView | None = None
    copied: list[str] = field(default_factory=list)
    removed: list[str] = field(default_factory=list)

    @property
    def settings_kept(self) -> bool | None:
        """Are the settings those from before? None if nobody could tell them then, or nobody was asked now."""
        if self.before is None or self.after is None:
            return None
        return self.before.settings_crc == self.after.settings_crc


def files_for(survey: Survey, port: str, uncompiled: bool) -> list[BoardFile]:
    """The firmware's files for this board. Raises NoCompiler, WrongBytecode."""
    if uncompiled:
        return board_files.plain_files()
    ours = board_files.compiler_version()
    # Without native code only the first number counts: later ones name the native code's form.
    if ours[0] != survey.mpy[0]:
        boards = f"{survey.mpy[0]}.{survey.mpy[1]}" if survey.mpy[0] else "none at all"
        raise WrongBytecode(port, boards, f"{ours[0]}.{ours[1]}")
    return board_files.compiled_files(survey.architecture)


class Installer:
    """One install. progress: told each step. files: what a board shall have (else: this program's firmware).

    replace: set somebody's own program on the board aside. patience: every wait is so many times longer.
    """

    def __init__(
        self,
        port: str,
        uncompiled: bool = False,
        replace: bool = False,
        progress: Progress = lambda text: None,
        files: Callable[[Survey, str, bool], list[BoardFile]] = files_for,
        patience: float = 1.0,
    ) -> None:
        self.port = port
        self._uncompiled = uncompiled
        self._replace = replace
        self._progress = progress
        self._files = files
        self._patience = patience

    def look(self) -> Installed:
        """What an install would do; writes nothing. The board runs on afterwards. Raises LinkError, NoCompiler."""
        with self._prompt() as (prompt, before):
            done = self._compare(prompt, before)
            prompt.restart()
        return done

    def install(self) -> Installed:
        """Install, restart, shake hands. Raises LinkError (see errors.py), NoCompiler."""
        with self._prompt() as (prompt, before):
            done = self._compare(prompt, before)
            error = self.refusal(done)
            if error is not None:
                raise error
            if not done.plan.nothing_to_do:
                self._change(prompt, done)
            self._progress("restarting the board")
            done.after = restart(prompt, BACK_S * self._patience)
        if done.after.firmware != messages.FIRMWARE.decode():
            raise OtherFirmwareBack(self.port, messages.FIRMWARE.decode(), done.after.firmware)
        return done

    @contextmanager
    def _prompt(self) -> Iterator[tuple[RawPrompt, BoardView | None]]:
        """The raw prompt. Whatever happens, the board starts anew afterwards, if it can be reached."""
        self._progress("asking the board for its prompt")
        before = leave(self.port, self._patience)
        with RawPrompt(self.port, self._patience) as prompt:
            try:
                yield prompt, before
            finally:
                prompt.restart()

    def _compare(self, prompt: RawPrompt, before: BoardView | None) -> Installed:
        prompt.doing = "reading what is on the board"
        self._progress(prompt.doing)
        survey = survey_of(prompt)
        check_board(survey, self.port)
        wanted = self._files(survey, self.port, self._uncompiled)
        return Installed(wanted, survey, plan(wanted, survey), before)

    def refusal(self, done: Installed) -> LinkError | None:
        """What speaks against it, before anything is changed."""
        if done.plan.foreign and not self._replace:
            return ForeignFiles(self.port, done.plan.foreign)
        missing = done.plan.blocks_needed - done.survey.blocks_free
        if missing > 0:
            block = done.survey.block
            return BoardFull(self.port, done.survey.blocks_free * block, missing * block)
        return None

    def _change(self, prompt: RawPrompt, done: Installed) -> None:
        made = done.plan
        prompt.run(HELPERS)
        prompt.doing = "setting main.py aside"
        prompt.changed = True
        for path in made.foreign:
            prompt.run(f"cw_aside({path!r})")
        self._set_main_aside(prompt, done)
        if made.folders:
            prompt.run(f"cw_dirs({made.folders!r})")
        numbered = [(file, f"file {number} of {len(made.copies)}") for number, file in enumerate(made.copies, 1)]
        if made.copies and made.copies[0].path == BOOT:
            self._copy(prompt, done, *numbered.pop(0))
        self._remove(prompt, done)
        for file, which in numbered:
            if file.path != MAIN:
                self._copy(prompt, done, file, which)
        self._check_all(prompt, done)
        self._put_main(prompt, done)

    def _set_main_aside(self, prompt: RawPrompt, done: Installed) -> None:
        if MAIN not in done.survey.files or MAIN in done.plan.foreign:
            return
        if done.plan.main_is_right:
            prompt.run(f"os.rename({MAIN!r},{HELD_MAIN!r})")
        else:
            prompt.run(f"os.remove({MAIN!r})")

    def _remove(self, prompt: RawPrompt, done: Installed) -> None:
        """What is not of this firmware, in the firmware's own folders."""
        made = done.plan
        prompt.doing = "removing old files"
        for at in range(0, len(made.remove), _NAMES_A_STATEMENT):
            some = made.remove[at : at + _NAMES_A_STATEMENT]
            prompt.run(f"cw_rm({some!r})")
            done.removed += some
        if made.remove_folders:
            prompt.run(f"cw_rmdirs({made.remove_folders!r})")
        if made.remove:
            self._progress(f"removed {len(made.remove)} old files")

    def _copy(self, prompt: RawPrompt, done: Installed, file: BoardFile, which: str) -> None:
        """One file: beside its place, read back, renamed into it. Raises DamagedCopy, FullWhileCopying."""
        prompt.doing = f"{which}: {file.path}"
        self._progress(f"{which}: {file.path}, {len(file.data)} bytes")
        try:
            for statement in copying(file):
                said = prompt.run(statement)
        except BoardSays as error:
            if not any(sign in error.text for sign in _FULL):
                raise
            with contextlib.suppress(BoardSays):
                prompt.run(f"cw_drop({file.path + TEMPORARY!r})")
            raise FullWhileCopying(self.port, file.path) from error
        if said.strip() != file.digest:
            raise DamagedCopy(self.port, file.path)
        done.copied.append(file.path)

    def _check_all(self, prompt: RawPrompt, done: Installed) -> None:
        """Read everything back once more before main.py makes it start. Raises DamagedCopy."""
        prompt.doing = "reading everything back"
        self._progress(prompt.doing)
        there = read_survey(prompt.run("cw_survey()")).files
        wanted = {file.path: file.digest for file in done.files if file.path != MAIN}
        if done.plan.hold_main:
            wanted[HELD_MAIN] = next(file.digest for file in done.files if file.path == MAIN)
        for path in sorted(set(wanted) | set(there) - {HELD_MAIN}):
            if there.get(path) != wanted.get(path):
                raise DamagedCopy(self.port, path)

    def _put_main(self, prompt: RawPrompt, done: Installed) -> None:
        if done.plan.main is not None:
            number = len(done.plan.copies)
            self._copy(prompt, done, done.plan.main, f"file {number} of {number}")
        else:
            prompt.doing = "putting main.py back"
            prompt.run(f"os.rename({HELD_MAIN!r},{MAIN!r})")


def survey_of(prompt: RawPrompt) -> Survey:
    """What is on the board. Raises NotMicroPython, BrokenOff, BoardSays."""
    said = prompt.run(SURVEY)
    try:
        return read_survey(said)
    except ValueError as error:
        raise NotMicroPython(prompt.port, f"something that answers '{readable(said.encode())}'") from error


def check_board(survey: Survey, port: str) -> None:
    """Raises NotMicroPython, OldMicroPython or WrongChip."""
    if survey.name != "micropython":
        raise NotMicroPython(port, survey.name)
    if survey.version < LEAST_VERSION:
        raise OldMicroPython(port, survey.version)
    if not any(chip in survey.machine for chip in CHIPS):
        raise WrongChip(port, survey.machine)
