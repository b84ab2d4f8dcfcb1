"""What an install will do, decided before anything is changed."""

from dataclasses import dataclass, field

from host.board.files import AT_TOP, BoardFile
from host.board.on_board import HELD_MAIN, Survey

MAIN = "/main.py"
BOOT = "/boot.py"
# littlefs keeps a folder in a pair of blocks, and needs some to work with.
_FOLDER_BLOCKS = 2
_SPARE_BLOCKS = 4


@dataclass
class Plan:
    """In the order of doing: set main.py aside, make folders, boot.py, remove, copy, at last main.py.

    hold_main: the right main.py is there (main_is_right), or an earlier install has set it aside: it is put back at the
    end instead of copied. foreign: files that are somebody's own.
    """

    folders: list[str] = field(default_factory=list)
    copy: list[BoardFile] = field(default_factory=list)
    remove: list[str] = field(default_factory=list)
    remove_folders: list[str] = field(default_factory=list)
    main: BoardFile | None = None
    hold_main: bool = False
    main_is_right: bool = False
    foreign: list[str] = field(default_factory=list)
    blocks_needed: int = 0

    @property
    def nothing_to_do(self) -> bool:
        """True if the board has exactly these files."""
        return self.main is None and not self.hold_main

    @property
    def copies(self) -> list[BoardFile]:
        """What will be copied: boot.py first, main.py last."""
        return self.copy + ([self.main] if self.main is not None else [])

    @property
    def bytes_to_copy(self) -> int:
        """Bytes of the files that will be copied."""
        return sum(len(file.data) for file in self.copies)


def plan(wanted: list[BoardFile], survey: Survey) -> Plan:
    """Compare what is on the board with what shall be there."""
    made = Plan()
    names = {file.path for file in wanted}
    changed = [file for file in wanted if survey.files.get(file.path) != file.digest]
    made.foreign = [path for path in AT_TOP if _is_foreign(path, changed, survey)]
    made.copy = sorted((file for file in changed if file.path != MAIN), key=lambda file: (file.path != BOOT, file.path))
    made.remove = sorted(path for path in survey.files if path not in names and path != HELD_MAIN)
    folders = sorted({folder for file in wanted for folder in _folders_of(file.path)})
    made.folders = [folder for folder in folders if folder not in survey.folders]
    made.remove_folders = sorted((name for name in survey.folders if name not in folders), reverse=True)
    main = next(file for file in wanted if file.path == MAIN)
    made.main_is_right = survey.files.get(MAIN) == main.digest
    unfinished = bool(made.copy or made.remove or made.folders or made.remove_folders) or HELD_MAIN in survey.files
    if unfinished or not made.main_is_right:
        made.hold_main = made.main_is_right or survey.files.get(HELD_MAIN) == main.digest
        made.main = None if made.hold_main else main
    made.blocks_needed = _most_blocks(made, survey)
    return made


def _is_foreign(path: str, changed: list[BoardFile], survey: Survey) -> bool:
    return path in survey.files and path not in survey.own and path in [file.path for file in changed]


def _folders_of(path: str) -> list[str]:
    parts = path.split("/")[1:-1]
    return ["/" + "/".join(parts[: place + 1]) for place in range(len(parts))]


def _most_blocks(made: Plan, survey: Survey) -> int:
    """The most blocks that are taken at once, above what is taken now."""

    def blocks(size: int) -> int:
        return max(1, -(-size // survey.block))

    taken = _FOLDER_BLOCKS * len(made.folders)
    most = taken
    freed = {path: blocks(survey.sizes[path]) for path in survey.sizes}
    for path in made.remove:
        taken -= freed[path]
    if made.main is not None:
        taken -= freed.get(MAIN, 0)
    for file in made.copies:
        taken += blocks(len(file.data))
        most = max(most, taken)
        if file.path != MAIN:
            taken -= freed.get(file.path, 0)
    return most + _SPARE_BLOCKS if made.copies else 0
