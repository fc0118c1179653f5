"""Names and text from a file of parameter lines, made harmless: on one line, allowed, free."""

from __future__ import annotations

import re
from dataclasses import dataclass, field

from tcplan.names import shown

_LONGEST = 40


@dataclass(slots=True)
class Names:
    """Names for materials: letters, digits and _, 40 at most, each one once whatever its case."""

    taken: set[str] = field(default_factory=set)
    counts: dict[str, int] = field(default_factory=dict)

    def free(self, name: str) -> tuple[str, str]:
        """Return an allowed name that is not taken, and what there is to say of it, or ""."""
        plain = re.sub(r"[^A-Za-z0-9_]+", "_", name[:200]).strip("_") or "film"
        plain = (plain if plain[0].isalpha() else f"m_{plain}")[:_LONGEST]
        free, count = plain, self.counts.get(plain.lower(), 1)
        while free.lower() in self.taken:
            count += 1
            free = f"{plain[: _LONGEST - 1 - len(str(count))]}_{count}"
        self.counts[plain.lower()] = count
        if free == name:
            return free, ""
        why = "that name is taken" if count > 1 else "names are letters, digits and _, 40 at most"
        return free, f"{shown(name)} is called {free}: {why}"

    def take(self, name: str) -> None:
        """Let no other material have this name."""
        self.taken.add(name.lower())


def printable(text: str, most: int) -> str:
    """Return text on one line, what does not print as ?, cut to a length; never empty."""
    one_line = "".join(mark if mark.isprintable() else "?" for mark in text[: most + 1].replace("\t", " "))
    whole = " ".join(one_line.split())
    return (whole if len(whole) <= most else f"{whole[: most - 3]}...") or "?"
