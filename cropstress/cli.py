"""The command line. Heavy imports wait until a command needs them."""

from __future__ import annotations

import io
import os
import sys
import traceback
from pathlib import Path
from typing import Annotated

import typer

INTERRUPTED = 130  # exit code of a program stopped by Ctrl-C; common practice of shells
TRACEBACK = "CROPSTRESS_TRACEBACK"  # set, a fault of the program itself is printed in full

app = typer.Typer(
    add_completion=False,
    no_args_is_help=True,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    help="What heat and photorespiration cost a crop, cell by cell, from daily weather grids.",
    epilog="Exit codes: 0 done; 2 the run file or the grids are at fault; 130 interrupted; 1 a fault of the program.",
)


@app.command()
def run(
    runfile: Annotated[Path, typer.Argument(help="The run file (TOML).")],
    out: Annotated[Path | None, typer.Option(help="Folder for the results, instead of the run file's.")] = None,
    only: Annotated[str | None, typer.Option(help="Compute one crop entry: crop=NAME.")] = None,
    threads: Annotated[int | None, typer.Option(min=1, help="Threads to use; all cores by default.")] = None,
    quiet: Annotated[bool, typer.Option("--quiet", help="Print only errors.")] = False,
) -> None:
    """Compute the seasons and write grids, maps, tables and the record."""
    from rich.console import Console
    from rich.progress import BarColumn, Progress, TextColumn, TimeRemainingColumn

    from cropstress.job import run as run_job

    console = Console(quiet=quiet, highlight=False)
    with Progress(
        TextColumn("{task.description:<10}"), BarColumn(), TextColumn("{task.percentage:>3.0f} %"),
        TimeRemainingColumn(), console=console, transient=True,
    ) as bar:  # fmt: skip
        tasks: dict[str, int] = {}
        bar.console.print(
            "Opening the grids; the first run after an installation also compiles the model (about a minute).",
            soft_wrap=True,
        )

        def progress(what: str, share: float) -> None:
            if what not in tasks:
                tasks[what] = bar.add_task(what, total=1.0)
            bar.update(tasks[what], completed=share)  # type: ignore[arg-type]

        outcome = run_job(runfile, out, threads=threads, only=_crop_name(only), progress=progress)
    for remark in outcome.remarks:
        console.print(f"- {remark}", markup=False, soft_wrap=True)
    console.print()
    console.print(outcome.summary, markup=False, soft_wrap=True)
    console.print(f"\nResults: {outcome.folder}", markup=False, soft_wrap=True)


def _crop_name(only: str | None) -> str | None:
    from cropstress.errors import fail

    if only is None:
        return None
    kind, equals, name = only.partition("=")
    if kind != "crop" or not equals or not name:
        raise fail(f"'{only}' does not say what to compute", "--only", "Write --only crop=NAME.")
    return name


@app.command()
def check(runfile: Annotated[Path, typer.Argument(help="The run file (TOML).")]) -> None:
    """Say what was found, what is wrong and what would be computed; computes nothing."""
    from cropstress.check import check as check_job

    for line in check_job(runfile):
        typer.echo(line)


@app.command()
def trace(
    runfile: Annotated[Path, typer.Argument(help="The run file (TOML).")],
    at: Annotated[str, typer.Option(help="Latitude and longitude in degrees, as 42.5,-33.1.")],
    out: Annotated[Path | None, typer.Option(help="Folder for the files.")] = None,
) -> None:
    """Follow one place through the season, day by day, as CSV and figure."""
    from cropstress.errors import fail
    from cropstress.place import trace as trace_place

    try:
        latitude, longitude = (float(part) for part in at.split(","))
    except ValueError:
        latitude = longitude = float("nan")
    if not (-90.0 <= latitude <= 90.0 and -180.0 <= longitude <= 360.0):
        raise fail(f"'{at}' is not a place", "--at", "Write latitude and longitude as --at 42.5,-33.1.")
    for path in trace_place(runfile, (latitude, longitude), out):
        typer.echo(str(path))


@app.command()
def crops(
    name: Annotated[str | None, typer.Argument(help="A crop, or a profile file of your own.")] = None,
) -> None:
    """List the crop profiles, or one with every value, range, source and status."""
    from cropstress.crops import describe_crop, describe_crops, load_crop

    for line in describe_crops() if name is None else describe_crop(load_crop(name)):
        typer.echo(line)


@app.command()
def leaf(
    crop: Annotated[str, typer.Argument(help="A crop, or a profile file of your own.")],
    out: Annotated[Path, typer.Option(help="Folder for the table and the figure.")] = Path("."),
    photons: Annotated[float, typer.Option(help="Photons on the leaf [umol m-2 s-1].")] = 1500.0,
    humidity: Annotated[float, typer.Option(help="Relative humidity of the air [%].")] = 50.0,
) -> None:
    """Draw response curves of one leaf to air temperature at several CO2, as a table and a figure."""
    from cropstress.curves import leaf_curves

    for line in leaf_curves(crop, out, photons, humidity):
        typer.echo(line)


def main() -> None:
    """Run the command line and turn errors into exit codes."""
    from cropstress.errors import InputError

    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="replace")  # a terminal without "×" or "é" shows "?" and goes on
    try:
        code = app(standalone_mode=False)
    except InputError as error:
        print(error, file=sys.stderr)
        sys.exit(2)
    except (KeyboardInterrupt, typer.Abort):
        code = INTERRUPTED
    except Exception as error:
        # A wrong option or argument: click's own error, or that of the copy of click inside newer releases of typer.
        show, exit_code = getattr(error, "show", None), getattr(error, "exit_code", None)
        if show is None or exit_code is None:
            print(_own_fault(error), file=sys.stderr)
            sys.exit(1)
        show()
        sys.exit(exit_code)
    if code == INTERRUPTED:  # newer releases of typer return it
        print("Interrupted. Every file under a final name is whole; the same command starts again.", file=sys.stderr)
    sys.exit(code if isinstance(code, int) else 0)


def _own_fault(error: Exception) -> str:
    """Return what to tell when the program itself fails: a short instruction, or the traceback where asked for."""
    if os.environ.get(TRACEBACK):
        return "".join(traceback.format_exception(error))
    words = f"{type(error).__name__}: {error}" if str(error) else type(error).__name__
    if isinstance(error, MemoryError):
        return f"The memory was not enough ({words}).\n  Run with --threads 1, or cut the grids into parts."
    return (
        f"cropstress stopped at a fault of its own ({words}); your files need not be wrong.\n"
        f"  Set {TRACEBACK}=1, run the same command again and report what it prints. Every file under a final "
        "name is whole."
    )


if __name__ == "__main__":
    main()
