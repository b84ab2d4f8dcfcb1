"""`rehearse`: scenarios in virtual time, judged."""

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from host.cli.common import DONE, NO, Wrong, readable_file, say, say_json

if TYPE_CHECKING:
    from sim.rehearsal import Report


def add(commands: Any, shared: argparse.ArgumentParser) -> None:
    """Add the command to the parser."""
    parser = commands.add_parser("rehearse", help="run scenarios in virtual time and judge their expectations")
    parser.add_argument("scenario", nargs="*", type=Path, help="scenario files")
    parser.add_argument("--all", action="store_true", help="the scenarios that come with the program")
    parser.add_argument("--on", choices=("cpython", "micropython"), default="cpython", help="what runs the firmware")
    parser.add_argument("--log", type=Path, metavar="FILE", help="write the event log (of one scenario) to this file")
    parser.add_argument("--quiet", action="store_true", help="no timeline, only the judgement")
    parser.add_argument("--json", action="store_true", help="print one JSON document")
    parser.set_defaults(run=run)


def run(args: argparse.Namespace) -> int:
    """All scenarios are read before the first one runs: a bad file changes nothing."""
    from sim.rehearsal import load_scenario, run_rehearsal, shipped

    paths = [*args.scenario, *(shipped() if args.all else [])]
    if not paths:
        raise Wrong("rehearse: name a scenario file, or say --all")
    if args.log is not None and len(paths) > 1:
        raise Wrong("rehearse: --log takes one scenario")
    scenarios = [(path, load_scenario(readable_file(path))) for path in paths]
    rows: list[dict[str, Any]] = []
    failed = 0
    for path, scenario in scenarios:
        report = run_rehearsal(scenario, on=args.on)
        failed += not report.passed
        if args.log is not None:
            _write(args.log, report.log)
        if args.json:
            rows.append(_row(path, report))
        else:
            _tell(path, report, args.quiet)
    if args.json:
        say_json({"passed": failed == 0, "on": args.on, "scenarios": rows})
    elif len(paths) > 1:
        say(f"{len(paths) - failed} of {len(paths)} scenarios as expected")
    return NO if failed else DONE


def _write(path: Path, log: str) -> None:
    try:
        path.write_text(log, "ascii")
    except OSError as error:
        raise Wrong(f"{path}: {error.strerror or error}") from error


def _row(path: Path, report: "Report") -> dict[str, Any]:
    return {
        "file": str(path),
        "title": report.title,
        "passed": report.passed,
        "broken": report.broken,
        "pulses": report.pulses,
        "virtual_s": report.virtual_s,
        "wall_s": report.wall_s,
        "timeline": list(report.timeline),
        "results": [{"ok": each.ok, "text": each.text, "line": each.line} for each in report.results],
    }


def _tell(path: Path, report: "Report", quiet: bool) -> None:
    if not quiet:
        for line in report.timeline:
            say(line)
    for each in report.results:
        if not each.ok:
            say(f"{path}:{each.line}: not as expected: {each.text}")
    if report.broken:
        say(f"{path}: what must always hold was broken: {report.broken}")
    speed = report.virtual_s / report.wall_s if report.wall_s > 0 else 0.0
    say(
        f"{path.name}: {'as expected' if report.passed else 'NOT as expected'}: {report.title}; "
        f"{sum(each.ok for each in report.results)} of {len(report.results)} expectations, {report.pulses} pulses, "
        f"{report.virtual_s:.1f} s in {report.wall_s:.2f} s ({speed:.0f} times real time)"
    )
