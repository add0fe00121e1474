"""Files beside the scenario: bytes, text and CSV sheets, with every mishap named."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator
from pathlib import Path

from designer.setting.reading import Report, describe

MAX_BYTES = 64 * 2**20
"""Largest file read."""


def read_text(path: Path, place: str, report: Report, name: str = "file") -> str | None:
    """The UTF-8 text of a file, or None and a mistake.

    place  where the file is asked for; name  what it is called when its inside is wrong
    """
    try:
        with path.open("rb") as stream:
            data = stream.read(MAX_BYTES + 1)
    except (OSError, ValueError) as failure:  # ValueError: a null character in the path
        reason = getattr(failure, "strerror", None) or "not a possible path"
        report.add(
            place,
            f"{str(path)[-300:]!r}, which cannot be read ({reason})",
            "a readable file",
            "Check the path and its permissions.",
        )
        return None
    if len(data) > MAX_BYTES:
        report.add(
            place,
            f"a file of more than {MAX_BYTES // 2**20} MiB",
            "a smaller one",
            "Use independent priors or coarser types.",
        )
        return None
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as failure:
        line = data.count(b"\n", 0, failure.start) + 1
        report.add(
            f"{name}, line {line}",
            f"the byte 0x{data[failure.start]:02x}, which is not UTF-8",
            "text in UTF-8",
            "Save the file with the encoding UTF-8.",
        )
        return None


class Sheet:
    """A CSV file: its name, its header, and its rows with their line numbers."""

    def __init__(self, name: str, header: list[str], lines: Iterator[list[str]]) -> None:
        """Keep the parts; `read_sheet` makes them."""
        self.name = name
        self.header = header
        self._lines = lines

    def rows(self, report: Report) -> Iterator[tuple[str, list[str]]]:
        """(place, cells) of each row; rows of the wrong length are noted and left out."""
        while True:
            number = getattr(self._lines, "line_num", 0) + 1
            try:
                cells = next(self._lines)
            except StopIteration:
                return
            except csv.Error as failure:
                report.add(
                    f"{self.name}, line {number}",
                    f"a row that is not CSV ({failure})",
                    "cells separated by commas, quoted with double quotes where needed",
                    "Mend the quotes of that row; the rows after it were not read.",
                )
                return
            if not any(cell.strip() for cell in cells):
                continue
            if len(cells) != len(self.header):
                report.add(
                    f"{self.name}, line {number}",
                    f"{len(cells)} cell{'s' if len(cells) != 1 else ''}",
                    f"{len(self.header)}, as in the header",
                    "Add or remove cells; quote a cell that contains a comma.",
                )
                continue
            yield f"{self.name}, line {number}", [cell.strip() for cell in cells]


def read_sheet(written: str, folder: Path | None, place: str, report: Report) -> Sheet | None:
    """Open a CSV file named in the scenario, relative to the scenario's own folder."""
    if folder is None and not Path(written).is_absolute():
        report.add(
            place,
            f"the file {describe(written)}",
            "entries in the scenario itself, which was not read from a folder",
            "Read the scenario from a file, or write the entries in it.",
        )
        return None
    name = written if written.isprintable() and len(written) <= 60 else describe(written)
    text = read_text((folder or Path()) / written, place, report, name)
    if text is None:
        return None
    lines = csv.reader(io.StringIO(text, newline=""), strict=True, skipinitialspace=True)
    try:
        header = [cell.strip() for cell in next(lines)]
    except (StopIteration, csv.Error):
        header = []
    if not any(header):
        report.add(
            f"{name}, line 1", "no header", "a row of column names", "Name the columns first."
        )
        return None
    other = next((mark for mark in (";", "\t", "|") if mark in header[0]), None)
    if len(header) == 1 and other:
        report.add(
            f"{name}, line 1",
            f"columns separated by {other!r}",
            "columns separated by commas",
            "Save the sheet as CSV with commas (and a point in decimals).",
        )
        return None
    sound = True
    for column in sorted({cell for cell in header if header.count(cell) > 1 or not cell}):
        sound = False
        report.add(
            f"{name}, line 1",
            f"the column {describe(column)} twice" if column else "a column without a name",
            "each column once, with its name",
            "Rename or remove it.",
        )
    return Sheet(name, header, lines) if sound else None
