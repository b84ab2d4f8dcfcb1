"""What is wrong with a file: always file, line, field and one plain sentence."""

from dataclasses import dataclass

# More than this are counted, not listed: nobody mends them one by one.
MOST_LISTED = 50


@dataclass(frozen=True, order=True)
class FileProblem:
    """One finding: the file's name, the line (from 1; 0 where none can be named), the field, what is wrong."""

    file: str
    line: int
    field: str
    message: str

    def __str__(self) -> str:
        return f"{self.file}:{self.line}: {self.field}: {self.message}"


class BadFile(Exception):
    """A file that can't be used, with what was found, in the order of its lines, each finding once."""

    def __init__(self, problems: list[FileProblem]) -> None:
        found = sorted(set(problems))
        if len(found) > MOST_LISTED:
            rest = found[MOST_LISTED:]
            found = found[:MOST_LISTED]
            found.append(FileProblem(rest[0].file, rest[0].line, "file", f"and {len(rest)} more problems from here on"))
        self.problems = found
        super().__init__("\n".join(str(problem) for problem in self.problems))
