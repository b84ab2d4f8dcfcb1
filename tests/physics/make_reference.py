"""Make the reference tables of this folder anew: ``python tests/physics/make_reference.py`` (needs ngspice).

Each netlist writes its results where the word OUTPUT stands; the tables hold them at a few round times.
"""

import csv
import shutil
import subprocess
import tempfile
from pathlib import Path

HERE = Path(__file__).parent
# Name of a netlist: column names, then step and number of rows of the table, second.
TABLES: dict[str, tuple[list[str], float, int]] = {
    "charge": (["terminal_v"], 0.05, 41),
    "discharge": (["terminal_v", "coil_a"], 2e-3, 101),
    "plunger": (["capacitor_v", "coil_a", "position_m", "heat_j"], 5e-4, 79),
}
Row = tuple[float, ...]


def ngspice_version() -> str | None:
    """Return the name and version of the ngspice that is installed, or None."""
    program = shutil.which("ngspice")
    if program is None:
        return None
    shown = subprocess.run([program, "--version"], capture_output=True, text=True, check=True).stdout
    return next((word for word in shown.split() if word.startswith("ngspice-")), "ngspice, unknown version")


def recompute(name: str) -> list[Row]:
    """Run a netlist and return the rows (time, columns) of its table."""
    columns, step_s, count = TABLES[name]
    with tempfile.TemporaryDirectory() as folder:
        output = Path(folder) / "result.txt"
        netlist = Path(folder) / "run.cir"
        netlist.write_text((HERE / "netlists" / f"{name}.cir").read_text().replace("OUTPUT", str(output)))
        subprocess.run(["ngspice", "-b", str(netlist)], capture_output=True, check=True, timeout=120)
        lines = output.read_text().splitlines()[1:]
    points = [tuple(map(float, line.split())) for line in lines]
    rows: list[Row] = []
    at = 0
    for k in range(1, count):
        time_s = k * step_s
        while points[at + 1][0] < time_s and at + 2 < len(points):
            at += 1
        before, after = points[at], points[at + 1]
        share = (time_s - before[0]) / (after[0] - before[0])
        rows.append((time_s, *(b + share * (a - b) for b, a in zip(before[1:], after[1:], strict=True))))
    assert all(len(row) == len(columns) + 1 for row in rows)
    return rows


def committed(name: str) -> list[Row]:
    """Return the rows of a committed table."""
    with (HERE / "reference" / f"{name}.csv").open(newline="") as file:
        lines = [line for line in file if not line.startswith("#")]
    return [tuple(map(float, row)) for row in list(csv.reader(lines))[1:]]


def main() -> None:
    """Write all tables."""
    version = ngspice_version()
    if version is None:
        raise SystemExit("ngspice is not installed")
    for name, (columns, _, _) in TABLES.items():
        with (HERE / "reference" / f"{name}.csv").open("w", newline="") as file:
            file.write(f"# {version}, netlists/{name}.cir\n")
            writer = csv.writer(file, lineterminator="\n")
            writer.writerow(["time_s", *columns])
            writer.writerows([f"{value:.9g}" for value in row] for row in recompute(name))


if __name__ == "__main__":
    main()
