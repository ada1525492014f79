"""The command line: commands, exit codes and how errors are told."""

import argparse
import contextlib
import errno
import sys
import traceback
from collections.abc import Sequence

import cutblock
from cutblock.base.errors import Cancelled, CutblockError
from cutblock.cli.wire_words import add_coupon_words, add_wire_words

_FULL = {errno.ENOSPC, errno.EDQUOT, errno.EIO}  # of what is printed: no room, no quota, no disk
EXIT_CLEAN, EXIT_FINDINGS, EXIT_INPUT, EXIT_BUG, EXIT_CANCELLED = 0, 1, 2, 3, 130


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command.

    Args:
        arguments: Words after the program's name; None takes those of the process.

    Returns:
        0 clean, 1 findings of severity error, 2 unusable input, 3 a bug, 130 cancelled.
    """
    chosen = _parser().parse_args(arguments)
    try:
        return _printed(_run(chosen))
    except CutblockError as error:
        print(f"cutblock: {error}", file=sys.stderr)
        return EXIT_INPUT
    except (KeyboardInterrupt, Cancelled):
        print("cutblock: cancelled, nothing was written.", file=sys.stderr)
        return EXIT_CANCELLED
    except BrokenPipeError:
        sys.stderr.close()
        return EXIT_CLEAN
    except OSError as error:
        if error.errno not in _FULL:
            return _tell_bug()
        _close_output()
        print(f"cutblock: what it prints cannot be written ({error.strerror}).", file=sys.stderr)
        return EXIT_INPUT
    except Exception:  # noqa: BLE001 - the one place where a bug is caught and shown with its text
        return _tell_bug()


def _printed(code: int) -> int:
    """Return the exit code once all that was printed is out."""
    sys.stdout.flush()
    return code


def _tell_bug() -> int:
    traceback.print_exc()
    print("cutblock: this is a bug in the program, not in your files. Please report the text above.", file=sys.stderr)
    return EXIT_BUG


def _close_output() -> None:
    """Let go of what could not be printed, which the end of the program would try again."""
    with contextlib.suppress(OSError):
        sys.stdout.close()


def _run(chosen: argparse.Namespace) -> int:
    # Each command imports its own module only, so that help stays quick and no command needs Qt but `window`.
    match chosen.command:
        case "plan":
            from cutblock.cli.plan import run_plan

            return run_plan(chosen)
        case "check":
            from cutblock.cli.check import run_check

            return run_check(chosen)
        case "tags":
            from cutblock.cli.tags import run_tags

            return run_tags(chosen)
        case "export":
            from cutblock.cli.export import run_export

            return run_export(chosen)
        case "grid" | "stacks":
            return _run_search(chosen)
        case "coupons":
            from cutblock.cli.coupons import run_coupons

            return run_coupons(chosen)
        case "wire":
            from cutblock.cli.wire import run_wire

            return run_wire(chosen)
        case _:
            from cutblock.cli.window import run_window

            return run_window(chosen)


def _run_search(chosen: argparse.Namespace) -> int:
    """Run a command that looks for something better and changes nothing."""
    if chosen.command == "grid":
        from cutblock.cli.grid import run_grid

        return run_grid(chosen)
    from cutblock.cli.stacks import run_stacks

    return run_stacks(chosen)


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="cutblock",
        description="Plan hot-wire cut EPS formwork: ruled sweeps, both halves used, every litre accounted for.",
        epilog="Without a command the window opens. Exit: 0 clean, 1 errors found, 2 unusable input, 3 a bug.",
    )
    parser.add_argument("--version", action="version", version=f"cutblock {cutblock.__version__}")
    commands = parser.add_subparsers(dest="command", metavar="COMMAND")

    window = commands.add_parser(
        "window", help="open the window", description="Open the window, with a job if one is named."
    )
    window.add_argument("job", nargs="?", metavar="JOB", help="a job file, or a folder that holds job.toml")

    plan = commands.add_parser(
        "plan", help="make the plan of a job", description="Make the plan of a job and print its summary."
    )
    plan.add_argument("job", metavar="JOB", help="a job file, or a folder that holds job.toml")
    plan.add_argument("--out", metavar="DIR", help="write the plan folder here; without it nothing is written")
    plan.add_argument("--json", action="store_true", help="print the whole plan as JSON instead of the summary")
    plan.add_argument(
        "--curve",
        action="store_true",
        help="instead of one plan compare used and waste per cent, blocks, hours and cost over tolerances and panel"
        " sizes; --out then takes a table and a chart",
    )
    plan.add_argument(
        "--offcuts",
        action="append",
        default=[],
        metavar="DIR",
        help="use the offcuts that the plan in this folder kept; may be given again",
    )
    plan.add_argument("--seed", type=_count, default=0, metavar="N", help="seed of the packing search (0)")
    effort = plan.add_mutually_exclusive_group()
    effort.add_argument("--seconds", type=_seconds, metavar="S", help="search this long for a better packing")
    effort.add_argument("--moves", type=_count, metavar="N", help="search this many moves: the same answer every time")

    check = commands.add_parser(
        "check",
        help="prove a plan folder",
        description="Read every file of a plan folder again and prove it against the plan.",
    )
    check.add_argument("folder", metavar="DIR", help="a plan folder")
    check.add_argument("--json", action="store_true", help="print what was found as JSON")

    tags = commands.add_parser(
        "tags",
        help="write the tag sheets again",
        description="Write tags.pdf of a plan folder again, on another label sheet.",
    )
    tags.add_argument("folder", metavar="DIR", help="a plan folder")
    tags.add_argument("--sheet", metavar="NAME", default=None, help="label sheet; an unknown name lists them all")
    tags.add_argument("--start", type=_count, default=1, metavar="N", help="first free label of a part-used sheet (1)")

    export = commands.add_parser(
        "export",
        help="write solids or faces for other programs",
        description="Write the halves, the form's finished faces, the billets in their blocks or the foam melted"
        " as mesh files. Lengths are mm (glTF: metres), names are the ids of the plan.",
    )
    export.add_argument("folder", metavar="DIR", help="a plan folder")
    export.add_argument("--what", required=True, metavar="WHAT", help="halves, form, billets or kerf")
    export.add_argument("--as", required=True, dest="file_format", metavar="FORMAT", help="stl, obj, ply, 3mf or glb")
    export.add_argument(
        "--edges",
        default="square",
        metavar="EDGES",
        help="sides of halves: square, or mitred with the joints of the form (bench lay-up)",
    )
    export.add_argument(
        "--place",
        default="billet",
        metavar="PLACE",
        help="where halves and kerf lie: billet (each in its own frame), form or block",
    )
    export.add_argument(
        "--out", metavar="PATH", help="file to write, for stl and ply a folder; without it in DIR/solids"
    )

    grid = commands.add_parser(
        "grid",
        help="search the panel grid of a face",
        description="Look for the angle and the phase of a face's panel grid that need the fewest sweeps, then deviate "
        "least. Nothing is changed: it tells what to write in the job.",
    )
    grid.add_argument("job", metavar="JOB", help="a job file, or a folder that holds job.toml")
    grid.add_argument("--face", metavar="NAME", help="the face; needed where the job has several")
    grid.add_argument("--angles", type=_angles, default=12, metavar="N", help="angles tried at first (12)")
    grid.add_argument("--smaller", action="store_true", help="try smaller cells too, down to 60 %% of the job's")
    grid.add_argument(
        "--pairs", action="store_true", help="look for grids whose panels pair up, by the symmetries of the form"
    )
    grid.add_argument("--json", action="store_true", help="print what was found as JSON")

    stacks = commands.add_parser(
        "stacks",
        help="offer shells nested in depth",
        description="Look for similar moulds that, as shells of even thickness one above the other in one billet, take"
        " less foam than as they are cut now. Nothing is changed: it tells what is saved and what is given up.",
    )
    stacks.add_argument("job", metavar="JOB", help="a job file, or a folder that holds job.toml")
    stacks.add_argument(
        "--shell",
        type=_length,
        metavar="T",
        help="least thickness of a shell along its normal, in the job's unit; without it the job's wall",
    )
    stacks.add_argument("--even", action="store_true", help="cut the lowest shell off below too, so that all are alike")
    stacks.add_argument("--json", action="store_true", help="print what was found as JSON")
    stacks.add_argument("--out", metavar="DIR", help="write the table stacks.csv here")

    wire = commands.add_parser(
        "wire",
        help="kerf, speed window and currents of a wire",
        description="What a hot wire does in foam of a given density.",
    )
    add_wire_words(wire)
    add_coupon_words(commands.add_parser("coupons", help="plan test cuts and fit the kerf law to them"))
    return parser


def _count(text: str) -> int:
    try:
        value = int(text)
    except ValueError:
        raise argparse.ArgumentTypeError(f'"{text}" is no whole number') from None
    if value < 0:
        raise argparse.ArgumentTypeError(f"{text} is below 0")
    return value


def _length(text: str) -> float:
    try:
        value = float(text)
    except ValueError:
        raise argparse.ArgumentTypeError(f'"{text}" is no number') from None
    if not 0.0 < value < float("inf"):
        raise argparse.ArgumentTypeError(f"{text} is no length over 0")
    return value


def _angles(text: str) -> int:
    value = int(text)
    if not 1 <= value <= 360:
        raise argparse.ArgumentTypeError(f"{text} is not between 1 and 360")
    return value


def _seconds(text: str) -> float:
    value = float(text)
    if not 0.0 <= value <= 86_400.0:
        raise argparse.ArgumentTypeError(f"{text} is not between 0 and 86400 seconds")
    return value
