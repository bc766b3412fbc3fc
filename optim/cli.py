"""The command line: reads what is asked for, calls what does it, prints what comes out.

No physics and no numerics here, and no heavy import before a command needs it. Exit codes: 0 done,
1 the answer is "no", 2 the input is wrong.
"""

from __future__ import annotations

import argparse
import contextlib
import os
import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, NoReturn

from optim.errors import RunError
from problems import CaseError

if TYPE_CHECKING:
    from optim.account import Account
    from optim.runs import RunFolder
    from problems.problem import Problem

DONE, NO, WRONG = 0, 1, 2
_INTERRUPTED, _PIPE_CLOSED = 130, 141  # as shells count signals 2 and 13
_RESULTS = Path("results")


class UsageError(Exception):
    """A command line that cannot be followed; the text says what is allowed."""


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command and return its exit code; faults end up as one message on stderr."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="replace")
    try:
        code = _run(argv)
        sys.stdout.flush()
        return code
    except (UsageError, CaseError, RunError) as fault:
        return _told(str(fault))
    except BrokenPipeError:
        with contextlib.suppress(OSError, ValueError):
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return _PIPE_CLOSED
    except OSError as fault:
        place = f"{fault.filename}: " if fault.filename else ""
        return _told(f"{place}{fault.strerror or fault}")
    except KeyboardInterrupt:
        sys.stderr.write("platewright: interrupted\n")
        return _INTERRUPTED


def _told(message: str) -> int:
    sys.stderr.write(f"platewright: {message}\n")
    return WRONG


def _run(argv: Sequence[str] | None) -> int:
    parser = _parser()
    try:
        asked = parser.parse_args(argv)
    except SystemExit as end:  # --help and --version have said their piece
        return int(end.code or 0)
    if asked.command is None:
        parser.print_help()
        return DONE
    command: Callable[[argparse.Namespace], int] = asked.command
    return command(asked)


class _Parser(argparse.ArgumentParser):
    def error(self, message: str) -> NoReturn:
        raise UsageError(f"{message}\n  see {self.prog} --help")


class _Version(argparse.Action):
    def __call__(self, parser: argparse.ArgumentParser, *_: Any, **__: Any) -> None:
        from importlib.metadata import PackageNotFoundError, version

        try:
            number = version("platewright")
        except PackageNotFoundError:
            number = "(not installed)"
        sys.stdout.write(f"platewright {number}\n")
        parser.exit()


def _parser() -> argparse.ArgumentParser:
    parser = _Parser(
        prog="platewright",
        description="Size air- and liquid-swept plates: heat against drag and fan power, with or "
        "without a trip wire.",
        epilog="Exit codes: 0 done, 1 the answer is no (no feasible design), 2 wrong input.",
    )
    parser.add_argument("--version", action=_Version, nargs=0, help="print the version and stop")
    parser.set_defaults(command=None)
    commands = parser.add_subparsers(title="commands", metavar="COMMAND")
    _add_cases(commands)
    _add_check(commands)
    _add_point(commands)
    _add_search(commands)
    _add_trips(commands)
    _add_robust(commands)
    return parser


def _add_cases(commands: Any) -> None:
    text = "list the ready-made cases, or copy one here to edit"
    cases = commands.add_parser("cases", help=text, description=f"{text[0].upper()}{text[1:]}.")
    cases.add_argument("--copy", metavar="NAME", help="write NAME.toml into the current folder")
    cases.add_argument("--force", action="store_true", help="replace a file of that name")
    _finish(cases, _cases)


def _add_check(commands: Any) -> None:
    text = "validate a case; print what will be searched, aimed at and limited, and cautions"
    check = commands.add_parser("check", help=text, description=f"{text[0].upper()}{text[1:]}.")
    _add_case(check)
    _finish(check, _check)


def _add_point(commands: Any) -> None:
    text = "one design in full, with a picture of what happens along the plate"
    point = commands.add_parser(
        "point",
        help=text,
        description=f"{text[0].upper()}{text[1:]}. A variable that is left free is taken at the "
        "middle of its range.",
    )
    _add_case(point)
    _add_set(point)
    point.add_argument(
        "--out", metavar="DIR", type=Path, help="where the picture goes (results/<case>-point)"
    )
    point.add_argument("--no-picture", action="store_true", help="print only")
    point.add_argument("--force", action="store_true", help="replace the picture that is there")
    _finish(point, _point)


def _add_search(commands: Any) -> None:
    text = "find the designs that nothing beats: table, pictures, run folder"
    search = commands.add_parser("search", help=text, description=f"{text[0].upper()}{text[1:]}.")
    _add_case(search)
    search.add_argument("--out", metavar="DIR", type=Path, help="the run folder (results/<case>)")
    _add_seed(search, "same seed, same front (1)")
    search.add_argument(
        "--evaluations", metavar="N", type=_whole_from(1), help="at most so many designs evaluated"
    )
    search.add_argument("--resume", action="store_true", help="go on with an unfinished search")
    search.add_argument("--force", action="store_true", help="replace the run that is there")
    _finish(search, _search)


def _add_trips(commands: Any) -> None:
    text = "does forcing transition pay here, where, and with which wire"
    trips = commands.add_parser(
        "trips",
        help=text,
        description=f"{text[0].upper()}{text[1:]}: plain plates, one wire to three and grit "
        "compared on equal terms, with a map, the wire itself and what the uncertain onset does.",
    )
    _add_case(trips)
    _add_set(trips)
    trips.add_argument(
        "--turbulence",
        metavar="LOW..HIGH",
        type=_levels,
        help="free-stream turbulence that may occur, such as 0.5%%..4%% (else the onset is taken "
        "as uncertain by a factor 1.5 either way)",
    )
    _add_seed(trips, "same seed, same answer (1)")
    trips.add_argument(
        "--out", metavar="DIR", type=Path, help="where table and pictures go (results/<case>-trips)"
    )
    trips.add_argument("--force", action="store_true", help="replace what is there")
    _finish(trips, _trips)


def _add_robust(commands: Any) -> None:
    text = "the front of a run under what is uncertain: bands, chances, a front at a confidence"
    robust = commands.add_parser(
        "robust",
        help=text,
        description=f"{text[0].upper()}{text[1:]}. What is uncertain stands in the table "
        "[uncertain] of the run's case.toml; without it what is usual is taken.",
    )
    robust.add_argument("run", metavar="RUN", type=Path, help="the folder that a search left")
    _add_set(
        robust,
        "what is uncertain, in place of the case's, such as uncertain.gap=5%% or "
        "uncertain.inlet=15degC..35degC; may be repeated",
    )
    robust.add_argument(
        "--samples", metavar="N", type=_power_of_2, help="draws that designs meet, a power of 2"
    )
    robust.add_argument(
        "--confidence", metavar="SHARE", type=_confidence, help="for limits and aims (90%%)"
    )
    _add_seed(robust, "same seed, same answer (1)")
    robust.add_argument(
        "--evaluations",
        metavar="N",
        type=_whole_from(1),
        help="at most so many designs searched at the confidence (12000)",
    )
    robust.add_argument(
        "--workers", metavar="N", type=_whole_from(1), default=1, help="processes side by side (1)"
    )
    robust.add_argument(
        "--out", metavar="DIR", type=Path, help="where table and pictures go (the run folder)"
    )
    robust.add_argument("--force", action="store_true", help="replace what is there")
    _finish(robust, _robust)


def _add_set(
    parser: argparse.ArgumentParser,
    text: str = "a value in place of the case's, such as length=0.3 or "
    'gap="8 mm"; may be repeated',
) -> None:
    parser.add_argument("--set", metavar="KEY=VALUE", action="append", default=[], help=text)


def _add_seed(parser: argparse.ArgumentParser, text: str) -> None:
    parser.add_argument("--seed", metavar="N", type=_whole_from(0), default=1, help=text)


def _add_case(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("case", metavar="CASE", help="a case file or the name of a ready-made case")


def _finish(parser: argparse.ArgumentParser, command: Callable[[argparse.Namespace], int]) -> None:
    parser.add_argument("--json", action="store_true", help="print JSON, SI values throughout")
    parser.set_defaults(command=command)


def _whole_from(least: int) -> Callable[[str], int]:
    def read(text: str) -> int:
        try:
            number = int(text)
        except ValueError:
            number = least - 1
        if number < least:
            raise argparse.ArgumentTypeError(f"{text!r} -- a whole number, {least} or more")
        return number

    return read


def _power_of_2(text: str) -> int:
    number = int(text) if text.isdecimal() and len(text) < 10 else 0
    if not 16 <= number <= 65536 or number & (number - 1):
        raise argparse.ArgumentTypeError(f"{text!r} -- a power of 2 from 16 to 65536, such as 1024")
    return number


def _confidence(text: str) -> float:
    """A share from 50 % to 99.9 %."""
    from problems.units import QuantityError, to_si

    try:
        share = to_si(text, "1")
    except QuantityError:
        share = 0.0
    if not 0.5 <= share <= 0.999:
        raise argparse.ArgumentTypeError(f"{text!r} -- a share from 50% to 99.9%, such as 90%")
    return share


def _levels(text: str) -> tuple[float, float]:
    """The ends of a band of turbulence levels, in percent."""
    from problems.units import QuantityError, to_si

    try:
        low, high = (100.0 * to_si(end.strip(), "1") for end in text.split(".."))
    except (QuantityError, ValueError):
        low, high = 0.0, 0.0
    if not 0.01 <= low < high <= 20.0:
        raise argparse.ArgumentTypeError(
            f"{text!r} -- two levels from 0.01 % to 20 %, the lower first, such as 0.5%..4%"
        )
    return low, high


def _print(account: Any, as_json: bool, text: Callable[[], str]) -> None:
    if as_json:
        import json

        print(json.dumps(account, indent=2, ensure_ascii=False, allow_nan=False))
    else:
        print(text())


def _cases(asked: argparse.Namespace) -> int:
    from optim import text
    from problems import ready_made

    known = [{"name": one.name, "kind": one.kind, "title": one.title} for one in ready_made()]
    if asked.copy is None:
        _print(known, asked.json, lambda: text.of_cases(known))
        return DONE
    path = _copied(asked.copy, [case["name"] for case in known], asked.force)
    _print(
        {"name": asked.copy, "file": str(path)},
        asked.json,
        lambda: f"{path} written; edit it, then: platewright check {path}",
    )
    return DONE


def _copied(name: str, known: list[str], force: bool) -> Path:
    import difflib

    from optim.files import written_whole
    from problems import load_case

    if name not in known:
        near = difflib.get_close_matches(name, known, n=1)
        hint = f"nearest: {near[0]}" if near else f"known: {', '.join(known)}"
        raise UsageError(f"--copy {name}: no ready-made case of that name -- {hint}")
    path = Path(f"{name}.toml")
    if path.exists() and not force:
        raise UsageError(f"{path}: is there already; nothing is replaced without --force")
    with written_whole(path) as stream:
        stream.write(load_case(name).source)
    return path


def _check(asked: argparse.Namespace) -> int:
    from optim import account, robust_text, text
    from problems import build, load_case

    case = load_case(asked.case)
    found = account.of_case(case, build(case))
    doubts = text.section("\n\nUncertain, for robust", robust_text.inputs(found["uncertain"]))
    _print(found, asked.json, lambda: f"{text.of_case(found)}{doubts}".rstrip())
    return DONE


def _point(asked: argparse.Namespace) -> int:
    from optim import account, text
    from problems import build, load_case

    case = load_case(asked.case, _overrides(asked.set))
    problem = build(case)
    design = account.middle(problem)
    found = account.of_design(problem, design)
    picture = None
    if found["possible"] and not asked.no_picture:
        from optim.plots import save_profile

        folder = asked.out or _RESULTS / f"{case.name}-point"
        picture = save_profile(problem, design, folder, force=asked.force)
    found["picture"] = None if picture is None else str(picture)
    where = "" if picture is None else f"\n\nPicture: {picture}"
    _print(found, asked.json, lambda: text.of_design(found, problem) + where)
    return DONE if found["possible"] else NO


def _overrides(settings: list[str]) -> dict[str, str | float]:
    found: dict[str, str | float] = {}
    for setting in settings:
        key, equals, value = (part.strip() for part in setting.partition("="))
        if not (key and equals and value):
            raise UsageError(f'--set {setting}: give KEY=VALUE, such as length=0.3 or gap="8 mm"')
        if key in found:
            raise UsageError(f"--set {key}: given twice, {found[key]} and {value}")
        found[key] = value
    return found


def _search(asked: argparse.Namespace) -> int:
    from optim import text
    from problems import build, load_case

    case = load_case(asked.case)
    problem = build(case)
    found, folder = _searched(asked, problem, asked.out or _RESULTS / case.name)
    if not found["designs"]:
        _print(found, asked.json, lambda: text.of_miss(found))
        return NO
    files = ", ".join(found["files"])
    _print(
        found,
        asked.json,
        lambda: f"{text.of_front(found, problem)}\n\nRun folder: {folder.path} ({files})",
    )
    if folder.checkpoint.exists():
        sys.stderr.write("--resume goes on with this search\n")
    return DONE


def _searched(asked: argparse.Namespace, problem: Problem, path: Path) -> tuple[Account, RunFolder]:
    """The account of a search that has left its run in the folder `path`."""
    from optim import account, progress, runs
    from optim.search import EVALUATIONS, search

    folder = runs.opened(path, resume=asked.resume, force=asked.force)
    if asked.resume and not folder.resume:
        sys.stderr.write(f"{path}: no unfinished search there; starting from the beginning\n")
    with progress.shown(sys.stderr, len(problem.aims) == 1) as told:
        front = search(
            problem,
            seed=asked.seed,
            evaluations=asked.evaluations or EVALUATIONS,
            on_progress=told,
            checkpoint=folder.checkpoint,
            resume=folder.resume,
        )
    files = runs.saved(front, problem, folder)
    found = account.of_front(front, problem)
    return {**found, "run": str(path) if files else None, "files": files}, folder


def _trips(asked: argparse.Namespace) -> int:
    from optim import progress, text, trip_account, trip_files, trip_study, trip_text
    from problems import load_case

    case = load_case(asked.case, _overrides(asked.set))
    folder = trip_files.opened(asked.out or _RESULTS / f"{case.name}-trips", force=asked.force)
    with progress.counted(sys.stderr, trip_study.STEPS, "comparisons") as told:
        study = trip_study.studied(case, asked.turbulence, asked.seed, told)
    found = trip_account.of_trips(study)
    files = trip_files.saved(study, found, folder)
    found = {**found, "run": str(folder) if files else None, "files": files}
    if not found["answered"]:
        _print(found, asked.json, lambda: text.of_miss(found))
        return NO
    where = f"\n\nRun folder: {folder} ({', '.join(files)})"
    _print(found, asked.json, lambda: trip_text.of_trips(found) + where)
    return DONE


def _robust(asked: argparse.Namespace) -> int:
    from optim import progress, robust, robust_account, robust_files, robust_text
    from optim.crew import crew
    from optim.front import Front
    from problems import build, load_case

    front = Front.load(asked.run)
    case = load_case(asked.run / "case.toml", _only_uncertain(_overrides(asked.set)))
    problem = build(case)
    folder = robust_files.opened(asked.out or asked.run, force=asked.force)
    with (
        crew(case, problem, asked.workers) as each,
        progress.counted(sys.stderr, robust.STEPS, "per cent") as told,
    ):
        study = robust.studied(
            problem,
            front,
            asked.samples or robust.SAMPLES,
            asked.confidence or robust.CONFIDENCE,
            asked.seed,
            each,
            told,
            asked.evaluations or robust.EVALUATIONS,
        )
    found = robust_account.of_study(study)
    files = robust_files.saved(study, found, folder)
    found = {**found, "run": str(folder), "files": files}
    where = f"\n\nFolder: {folder} ({', '.join(files)})"
    _print(found, asked.json, lambda: robust_text.of_study(found, problem) + where)
    return DONE if found["answered"] else NO


def _only_uncertain(overrides: dict[str, str | float]) -> dict[str, str | float]:
    """What may be set of a case whose front is given."""
    for key, value in overrides.items():
        if not key.startswith("uncertain."):
            raise UsageError(
                f"--set {key}={value}: the front is of the case as it is; only what is uncertain "
                "can be set here, such as uncertain.gap=5%"
            )
    return overrides


if __name__ == "__main__":
    sys.exit(main())
