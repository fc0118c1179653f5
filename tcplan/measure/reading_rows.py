"""Blocks of plain numbers put together into a sweep in SI, with the rows that are no readings."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import BoolArray, FloatArray
from tcplan.errors import InputError, Problem
from tcplan.measure.model import RefusedRow, Sweep
from tcplan.measure.reading_cells import Block, NotAReading
from tcplan.measure.reading_header import EXAMPLE, Columns
from tcplan.names import shown

MOST_REFUSED = 1000
"""Refused rows that are listed; of more, the number is told."""

MAX_ROWS = 5_000_000
_FIRST_FEW = 5
_PHYSICAL: Mapping[str, str] = {
    "T": "a temperature above 0 K",
    "R": "a resistance above zero",
    "u(T)": "an uncertainty of zero or more",
    "u(R)": "an uncertainty of zero or more",
}


@dataclass(frozen=True, slots=True, kw_only=True)
class ReadSweep:
    """A sweep as read from a file, and what its reader should be told.

    Parameters
    ----------
    sweep : Sweep
        The readings. Of more than 1000 refused rows, its last record says how many more there are.
    notes : tuple of str
        Columns and sheets that are not used, comment lines among the readings: nothing is dropped
        silently.
    refused : int
        How many rows are refused in all.
    """

    sweep: Sweep
    notes: tuple[str, ...] = ()
    refused: int = 0


class Gathering:
    """The readings of one file, taken block by block."""

    def __init__(self, columns: Columns, source: str) -> None:
        self.columns = columns
        self.source = source
        self.numbers: list[FloatArray] = []
        self.lines: list[Sequence[int]] = []
        self.devices: dict[tuple[str, str], int] = {}
        self.device: list[list[int]] = []
        self.faults: list[RefusedRow] = []
        self.refused = 0
        self.comments: list[int] = []

    def add(self, block: Block) -> None:
        """Take a block: its numbers to SI, the rows that cannot be measured to the refused ones."""
        values = si_values(block.numbers, self.columns)
        wrong = _wrong(values)
        faults = list(block.faults)
        lines, names = block.lines, block.names
        if wrong.any():
            good = np.flatnonzero(~wrong.any(axis=0)).tolist()
            faults.extend(self._unphysical(block, wrong))
            values = values[:, good]
            lines = [lines[k] for k in good]
            names = [names[k] for k in good] if names else ()
        self.numbers.append(values)
        self.lines.append(lines)
        self.device.append([self._position(name) for name in names])
        self.comments.extend(block.comments)
        self._refuse(faults)

    def result(self, notes: tuple[str, ...] = ()) -> ReadSweep:
        """Return all that was taken.

        Raises
        ------
        InputError
            When there is no reading, with the first rows that are none.
        """
        line = np.concatenate([np.zeros(0, np.intp), *(np.asarray(lines, np.intp) for lines in self.lines)])
        if not line.size:
            raise InputError(self._nothing_read())
        quantities = list(self.columns.numbers)
        numbers = np.concatenate(self.numbers, axis=1)
        by_name = {quantity: numbers[k].copy() for k, quantity in enumerate(quantities)}
        pairs = tuple(self.devices) or (("", ""),)
        lots = tuple(dict.fromkeys(lot for lot, _ in pairs))
        place = {lot: k for k, lot in enumerate(lots)}
        device = np.array([k for part in self.device for k in part], dtype=np.intp)
        device = device if self.devices else np.zeros(line.size, np.intp)
        sweep = Sweep(
            source=self.source,
            T=by_name["T"],
            R=by_name["R"],
            u_T=by_name.get("u(T)"),
            u_R=by_name.get("u(R)"),
            device=device,
            lot=np.array([place[lot] for lot, _ in pairs], dtype=np.intp)[device],
            devices=_device_names(pairs, self.source),
            lots=lots,
            line=line,
            refused=self._listed(),
        )
        return ReadSweep(sweep=sweep, notes=(*self._notes(), *notes), refused=self.refused)

    def _position(self, name: tuple[str, str]) -> int:
        return self.devices.setdefault(name, len(self.devices))

    def _refuse(self, faults: Sequence[tuple[int, NotAReading]]) -> None:
        self.refused += len(faults)
        room = MOST_REFUSED - len(self.faults)
        for line, fault in sorted(faults, key=lambda item: item[0])[: max(room, 0)]:
            self.faults.append(RefusedRow(line=line, found=fault.found, expected=fault.expected))

    def _unphysical(self, block: Block, wrong: BoolArray) -> Iterator[tuple[int, NotAReading]]:
        for k in np.flatnonzero(wrong.any(axis=0)).tolist():
            row = int(np.argmax(wrong[:, k]))  # the first that is wrong
            quantity, column = list(self.columns.numbers.items())[row]
            found = f"{float(block.numbers[row, k])!r} under {column.head}"
            yield block.lines[k], NotAReading(found, _PHYSICAL[quantity])

    def _listed(self) -> tuple[RefusedRow, ...]:
        more = self.refused - len(self.faults)
        if not more:
            return tuple(self.faults)
        last = RefusedRow(
            line=self.faults[-1].line, found=f"{more} more such rows below this one", expected="readings"
        )
        return (*self.faults, last)

    def _notes(self) -> Iterator[str]:
        unused = self.columns.unused
        if unused:
            more = f" and {len(unused) - 20} more" if len(unused) > 20 else ""
            yield f"Columns that are not used: {', '.join(unused[:20])}{more}."
        if self.comments:
            count = len(self.comments)
            what = "1 row starts" if count == 1 else f"{count} rows start"
            yield f"Among the readings {what} with # and counts as a comment: line {self.comments[0]}" + (
                " first." if count > 1 else "."
            )

    def _nothing_read(self) -> list[Problem]:
        problems = [
            Problem(where=f"{self.source}, line {row.line}", found=row.found, expected=row.expected)
            for row in self.faults[:_FIRST_FEW]
        ]
        found = f"no readings among {self.refused} rows" if self.refused else "no rows below the header"
        more = " The first of them are told above." if self.refused > _FIRST_FEW else ""
        return [
            *problems,
            Problem(
                where=self.source,
                found=found,
                expected="one reading or more",
                todo=f"Write one number under each head, such as 25.0 and 1000.2 under {EXAMPLE}.{more}",
            ),
        ]


def si_values(numbers: FloatArray, columns: Columns) -> FloatArray:
    """Return plain numbers in SI, shape (quantity, reading); T from degC to a nanokelvin."""
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):  # what overflows is refused after
        values = np.empty_like(numbers)
        for k, column in enumerate(columns.numbers.values()):
            values[k] = numbers[k] * column.scale
            if column.offset:
                values[k] = np.round(values[k] + column.offset, 9)
            if column.of_R:
                values[k] *= values[list(columns.numbers).index("R")]
    return values


def _wrong(values: FloatArray) -> BoolArray:
    """Return which values cannot be measured: T and R come first, and must be above zero."""
    wrong = ~np.isfinite(values)
    wrong[:2] |= values[:2] <= 0.0
    wrong[2:] |= values[2:] < 0.0
    return wrong


def _device_names(pairs: Sequence[tuple[str, str]], source: str) -> tuple[str, ...]:
    """Return a name for each (lot, device): with its lot where two lots have a device of that name."""
    plain = [device for _, device in pairs]
    if not any(plain):
        return tuple(lot for lot, _ in pairs)
    if len(set(plain)) == len(plain):
        return tuple(plain)
    twice = {name for name, count in Counter(plain).items() if count > 1}
    names = tuple(f"{lot}/{device}" if device in twice else device for lot, device in pairs)
    if same := [name for name, count in Counter(names).items() if count > 1]:
        raise InputError(
            Problem(
                where=source,
                found=f"two devices that would both be called {shown(same[0])}",
                expected="names that stay different with their lot before them",
                todo="Use no / in the names of devices and lots.",
            )
        )
    return names
