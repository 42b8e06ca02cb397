"""How a command ends: interrupted, wrongly called, on a narrow terminal, or by a fault of the program itself."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest
from spoilt_season import Command, Season

PACKAGE = Path(__file__).parents[2]


def _shell(*arguments: object, **environment: str) -> subprocess.CompletedProcess[bytes]:
    """Run the command in a process of its own."""
    return subprocess.run(
        [sys.executable, "-m", "cropstress.cli", *map(str, arguments)],
        env=os.environ | {"PYTHONPATH": str(PACKAGE)} | environment,
        capture_output=True,
        check=False,
    )


def test_exit_codes_in_a_shell(season: Season) -> None:
    sound = _shell("check", season.run_file)
    assert (sound.returncode, sound.stderr) == (0, b"")
    season.rewrite("[2021]", "[2019]")
    spoilt = _shell("check", season.run_file)
    assert spoilt.returncode == 2
    assert spoilt.stderr.startswith(b"2 faults found:") and b"Traceback" not in spoilt.stderr
    assert spoilt.stdout == b""


def test_a_terminal_that_cannot_print_every_letter(season: Season) -> None:
    season.rewrite('title = "Bad input"', 'title = "Été 夏"')
    said = _shell("check", season.run_file, PYTHONIOENCODING="latin-1")
    assert (said.returncode, said.stderr) == (0, b"")
    assert said.stdout.startswith("Été ?".encode("latin-1"))


@pytest.mark.parametrize("command_name", ["check", "run"])
def test_interrupted(season: Season, command: Command, monkeypatch: pytest.MonkeyPatch, command_name: str) -> None:
    def stop(*_: object, **__: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("cropstress.job.read_weather", stop)
    said = command(command_name, season.run_file)
    assert said.code == 130
    assert said.err == "Interrupted. Every file under a final name is whole; the same command starts again.\n"


def test_interrupted_while_writing(season: Season, command: Command, monkeypatch: pytest.MonkeyPatch) -> None:
    real = os.replace
    renamed: list[str] = []

    def replace(source: Path, target: Path) -> None:
        if len(renamed) == 3:
            raise KeyboardInterrupt
        real(source, target)
        renamed.append(Path(target).relative_to(season.results).as_posix())

    with monkeypatch.context() as patch:
        patch.setattr(os, "replace", replace)
        assert command("run", season.run_file).code == 130
    assert season.final_files() == set(renamed)  # no unfinished file is left either
    assert command("run", season.run_file).code == 0


def test_a_fault_of_the_program_itself(season: Season, command: Command, monkeypatch: pytest.MonkeyPatch) -> None:
    def broken(*_: object, **__: object) -> None:
        raise KeyError("tmax")

    monkeypatch.delenv("CROPSTRESS_TRACEBACK", raising=False)
    monkeypatch.setattr("cropstress.job.read_weather", broken)
    said = command("run", season.run_file)
    assert said.code == 1
    assert "cropstress stopped at a fault of its own (KeyError: 'tmax')" in said.err
    assert "Set CROPSTRESS_TRACEBACK=1, run the same command again and report what it prints." in said.err
    assert "Traceback" not in said.err and len(said.err.splitlines()) == 2
    monkeypatch.setenv("CROPSTRESS_TRACEBACK", "1")
    said = command("run", season.run_file)
    assert said.code == 1
    assert said.err.startswith("Traceback") and 'raise KeyError("tmax")' in said.err


def test_too_little_memory(season: Season, command: Command, monkeypatch: pytest.MonkeyPatch) -> None:
    def full(*_: object, **__: object) -> None:
        raise MemoryError

    monkeypatch.setattr("cropstress.job.compute_results", full)
    said = command("run", season.run_file)
    assert said.code == 1
    assert "The memory was not enough (MemoryError)." in said.err and "--threads 1" in said.err


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["run"], "Missing argument"),
        (["chek", "season.toml"], "chek"),
        (["check", "--fast", "season.toml"], "--fast"),
        (["run", "season.toml", "--threads", "0"], "--threads"),
        (["run", "season.toml", "--only", "maize"], "--only: 'maize' does not say what to compute"),
        (["trace", "season.toml", "--at", "here"], "--at: 'here' is not a place"),
        (["trace", "season.toml", "--at", "nan,nan"], "--at: 'nan,nan' is not a place"),
        (["crops", "maze"], "Did you mean 'maize'?"),
    ],
)
def test_wrongly_called(command: Command, arguments: list[str], words: str) -> None:
    said = command(*arguments)
    assert said.code == 2
    assert words in said.err
    assert "Traceback" not in said.err
