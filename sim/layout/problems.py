"""What is wrong with a file: always file, line, field and one plain sentence."""

from dataclasses import dataclass


@dataclass(frozen=True, order=True)
class FileProblem:
    """One finding. `line` is 0 where none can be named."""

    file: str
    line: int
    field: str
    message: str

    def __str__(self) -> str:
        return f"{self.file}:{self.line}: {self.field}: {self.message}"


class BadFile(Exception):
    """A file that can't be used, with all that was found, in the order of its lines."""

    def __init__(self, problems: list[FileProblem]) -> None:
        self.problems = sorted(problems)
        super().__init__("\n".join(str(problem) for problem in self.problems))
