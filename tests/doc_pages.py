"""Pages of docs/ that are played: their files are written, their commands run, their output looked for.

A fenced block says what it is by the words after the fence:

- ``toml NAME``, ``csv NAME``, ``text NAME``: a file of that name;
- ``toml more NAME``: lines that are put at the end of that file;
- ``commands``: commands, one a line (a backslash goes on); ``commands exit 1`` with that exit code, else 0;
- ``output``: what the commands before it print, among other things. Every paragraph of it has to be there,
  whatever the line breaks; a line of dots stands for what is left out.

Commands are run in this process, and only these: ``tcplan``, ``cp -r`` and ``cd``.
"""

from __future__ import annotations

import os
import re
import shlex
import shutil
from dataclasses import dataclass, field
from pathlib import Path

from click.testing import CliRunner

from tcplan.cli.main import cli

ROOT = Path(__file__).parents[1]
FILE_KINDS = ("toml", "csv", "text")


@dataclass(frozen=True, slots=True, kw_only=True)
class Block:
    """One fenced block: the words after the fence, and what it holds."""

    words: tuple[str, ...]
    content: str


def blocks_of(text: str) -> list[Block]:
    found = re.findall(r"^```([^\n]*)\n(.*?)^```$", text, re.M | re.S)
    return [Block(words=tuple(head.split()), content=content) for head, content in found]


def paragraphs(content: str) -> list[str]:
    """Return the parts of an output between blank lines and lines of dots, each in one line."""
    parts = re.split(r"^\s*(?:\.\.\.)?\s*$", content, flags=re.M)
    return [" ".join(part.split()) for part in parts if part.strip()]


@dataclass(slots=True)
class Player:
    """Plays a page in a folder of its own, and counts what it did."""

    folder: Path
    printed: str = ""
    files: int = 0
    commands: list[str] = field(default_factory=list)
    outputs: int = 0

    def play(self, text: str) -> Player:
        for block in blocks_of(text):
            kind = block.words[0] if block.words else ""
            if kind in FILE_KINDS and len(block.words) > 1:
                self.write(block)
            elif kind == "commands":
                self.run(block)
            elif kind == "output":
                self.look_for(block)
            else:
                raise AssertionError(f"a block that is not played: ```{' '.join(block.words)}")
        return self

    def write(self, block: Block) -> None:
        path = self.folder / block.words[-1]
        adds = block.words[1:-1] == ("more",)
        assert path.exists() == adds, path.name
        path.write_text((path.read_text(encoding="utf-8") if adds else "") + block.content, encoding="utf-8")
        self.files += 1

    def run(self, block: Block) -> None:
        code = int(block.words[2]) if block.words[1:2] == ("exit",) else 0
        self.printed = ""
        lines = block.content.replace("\\\n", " ").splitlines()
        for line in lines:
            self.commands.append(line)
            assert self._one(shlex.split(line)) == code, f"{line}\n{self.printed}"

    def _one(self, words: list[str]) -> int:
        if words[0] == "cd":
            self.folder = self.folder / words[1]
            return 0
        if words[:2] == ["cp", "-r"]:
            # What the reader's own commands left beside an example is not part of it.
            left = shutil.ignore_patterns("fitted", "*-plan")
            shutil.copytree(ROOT / words[2], self.folder / words[3], ignore=left)
            return 0
        assert words[0] == "tcplan", words
        target = words[words.index(">") + 1] if ">" in words else None
        return self._tcplan(words[1 : words.index(">")] if target else words[1:], target)

    def _tcplan(self, words: list[str], target: str | None) -> int:
        before = Path.cwd()
        os.chdir(self.folder)
        try:
            result = CliRunner().invoke(cli, words, env={"COLUMNS": "80"})
            if target:
                Path(target).write_text(result.stdout, encoding="utf-8")
        finally:
            os.chdir(before)
        self.printed += result.output
        return result.exit_code

    def look_for(self, block: Block) -> None:
        said = " ".join(self.printed.split())
        for part in paragraphs(block.content):
            assert part in said, f"not printed: {part}\nprinted: {self.printed}"
            self.outputs += 1
