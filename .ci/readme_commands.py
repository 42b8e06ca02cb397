"""Print the commands of README.md: the fenced `sh` blocks of its section "Two commands", one a line."""

from __future__ import annotations

import re
import sys
from pathlib import Path

text = (Path(__file__).parent.parent / "README.md").read_text(encoding="utf-8")
section = re.search(r"^## Two commands\n(.*?)(?=^## |\Z)", text, re.MULTILINE | re.DOTALL)
commands = re.findall(r"^```sh\n(.*?)^```$", section[1], re.MULTILINE | re.DOTALL) if section else []
if len(commands) != 2 or any(len(command.splitlines()) != 1 for command in commands):
    sys.exit('README.md must hold exactly two commands of one line under "Two commands"')
print("".join(commands), end="")
