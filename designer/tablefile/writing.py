"""Payment tables out: the exact text of `transfers.csv`, streamed."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable
from typing import IO

import numpy as np

from designer.setting.profiles import strides
from designer.setting.setting import Setting
from designer.table import Table, columns, pot
from designer.tablefile.cells import Texts

CHUNK = 16_384


def transfers_csv(table: Table, setting: Setting) -> Callable[[IO[bytes]], None]:
    """Give the table as the content of `transfers.csv`, for `designer.files`.

    One row per profile: `type:NAME` per party, `probability`, `decides:OPTION` per option,
    `pays:NAME` per party, `pot`; every number exact, an integer or "p/q".
    """

    def write(file: IO[bytes]) -> None:
        pots, pot_den = pot(table, setting)
        lines = io.TextIOWrapper(file, encoding="utf-8", newline="")
        out = csv.writer(lines, lineterminator="\n")
        out.writerow(columns(setting))
        weights = setting.weights
        odds, chances = Texts(setting.total_weight), Texts(table.decides_den)
        amounts, rests = Texts(table.pays_den), Texts(pot_den)
        labels = [[kind.label for kind in party.types] for party in setting.parties]
        steps = strides(setting.shape)
        for start in range(0, setting.profiles, CHUNK):
            part = slice(start, min(start + CHUNK, setting.profiles))
            numbers = np.arange(part.start, part.stop)
            cells: list[list[str]] = []
            for names, step in zip(labels, steps, strict=True):
                cells.append([names[a] for a in ((numbers // step) % len(names)).tolist()])
            cells.append(odds.of(weights[part]))
            cells += [chances.of(table.decides[part, k]) for k in range(len(setting.options))]
            cells += [amounts.of(row[part]) for row in table.pays]
            cells.append(rests.of(pots[part]))
            out.writerows(zip(*cells, strict=True))
        lines.flush()
        lines.detach()

    return write
