"""The README keeps its promises: its output is real, its commands exist."""

from __future__ import annotations

import re
import shlex
import shutil
from pathlib import Path

import pytest
from helpers import REFERENCE, ROOT

from latticefit.cli import COMMANDS, main

README = (ROOT / "README.md").read_text(encoding="utf-8")


def fit_command() -> list[str]:
    """The words of the README's first fit command."""
    text = re.search(r"^    (latticefit fit run\.csv.*?[^\\])$", README, re.MULTILINE | re.DOTALL)
    assert text
    return shlex.split(text[1].replace("\\\n", " "))[1:]


def test_the_output_shown_is_the_real_one(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """The fit command of the README prints what the README shows, line for line."""
    shutil.copy(REFERENCE / "copper_white_collocott_1984.csv", tmp_path / "run.csv")
    monkeypatch.chdir(tmp_path)
    assert main([*fit_command(), "--figures", "none"]) == 0
    printed = capsys.readouterr().out.rstrip().splitlines()
    block = README[README.index("    sample ") :]
    shown = [line.removeprefix("    ") for line in block.splitlines()[: len(printed)]]
    assert printed == shown


def test_every_command_is_mentioned() -> None:
    """Each command stands in the README, and both set-up commands name scripts that exist."""
    for name in COMMANDS:
        assert f"latticefit {name}" in README
    for script in re.findall(r"sh (scripts/\w+\.sh)", README):
        assert (ROOT / script).is_file()


def test_the_caution_stands_near_the_top() -> None:
    """The caution on extrapolated values and cryogens stands on the first screen."""
    assert 0 < README.index("no substitute for measured data") < 1800
