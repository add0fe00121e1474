"""A program as an MPS or LP file, the open formats every engine reads.

Written by HiGHS with 17 digits, so coefficients below 2**53 come back as they were; rows
and columns are not scaled. The exact program has no such file: what is written is its
nearest float copy.
"""

from __future__ import annotations

import re
import tempfile
from collections.abc import Iterable, Sequence
from pathlib import Path

import numpy as np

from designer.engines.floats import FloatProgram
from designer.engines.model import load, quiet_highs
from designer.engines.report import FloatArray
from designer.errors import Mistake, UsageError
from designer.files import write_atomic
from designer.program.linear import Bound, LinearProgram

SUFFIXES = (".mps", ".lp")
LONGEST = 200
"""Letters of a name; the LP format ends at 255."""


def export(
    lp: LinearProgram,
    row_names: Sequence[str],
    column_names: Sequence[str],
    path: str | Path,
) -> None:
    """Write the program to `path`, whose ending says how: .mps or .lp.

    Names are made safe for both formats and unique, see `safe_names`. The objective is
    cost . x / cost_den, minimised or maximised as the program says, with its constant. The
    file appears whole or not at all. Raises UsageError for another ending, for numbers no
    float can hold, or when the file cannot be written.
    """
    path = Path(path)
    if path.suffix.lower() not in SUFFIXES:
        raise _mistake(str(path), "a file name ending in .mps or .lp", "Rename it.")
    try:
        program, constant = _as_it_is(lp), float(lp.cost_const)
    except OverflowError:
        raise _mistake(
            str(path), "numbers that a float can hold", "State smaller amounts."
        ) from None
    import highspy

    model = quiet_highs()
    if not load(model, program):
        raise _mistake(str(path), "numbers HiGHS accepts (below 1e15)", "State smaller amounts.")
    if lp.sense == "max":
        model.changeObjectiveSense(highspy.ObjSense.kMaximize)
    model.changeObjectiveOffset(constant)
    for k, name in enumerate(safe_names(column_names, "c")):
        model.passColName(k, name)
    for k, name in enumerate(safe_names(row_names, "r")):
        model.passRowName(k, name)
    with tempfile.TemporaryDirectory() as folder:
        written = Path(folder) / f"program{path.suffix.lower()}"
        status = model.writeModel(str(written))
        if int(status) == -1 or not written.exists():
            raise _mistake(str(path), "a program HiGHS can write", "Try the other format.")
        content = written.read_bytes()
    if path.suffix.lower() == ".lp":
        # HiGHS heads sections that hold nothing; GLPK reads an empty "semi" as a column
        content = re.sub(rb"(?m)^(bin|gen|semi)\n(?=(bin|gen|semi|end)$)", b"", content)
    write_atomic(path, content)


def safe_names(names: Iterable[str], first: str) -> list[str]:
    """Make names that MPS and LP readers accept, one for each: [A-Za-z_][A-Za-z0-9_.]*, unique.

    Other characters become '_'; a name that would not start well gets `first` in front; a
    repeated one gets a number behind. Unsafe names would be replaced wholesale by readers.

    >>> safe_names(["pays[a,1]", "pays a 1", "2nd", ""], "c")
    ['pays_a_1_', 'pays_a_1', 'c2nd', 'c']
    """
    taken: set[str] = set()
    safe = []
    for name in names:
        base = re.sub(r"[^A-Za-z0-9_.]", "_", name)[:LONGEST]
        if not re.match(r"[A-Za-z_]", base) or _AMBIGUOUS.fullmatch(base):
            base = first + base
        chosen, number = base, 2
        while chosen.lower() in taken:
            chosen, number = f"{base}_{number}", number + 1
        taken.add(chosen.lower())
        safe.append(chosen)
    return safe


_AMBIGUOUS = re.compile(
    # words of the LP format, and what its readers take for numbers
    r"(?i:e\d*|inf(inity)?|free|st|s\.t\.|subject|to|such|that|bounds?|min|max|minimi[sz]e|"
    r"maximi[sz]e|obj|minimum|maximum|gen(eral)?s?|int(eger)?s?|bin(ary|aries)?|semi|sos\d?|end)"
)


def _as_it_is(lp: LinearProgram) -> FloatProgram:
    """The program in floats without any scaling; OverflowError beyond their range."""
    zeros = np.zeros(lp.rows, dtype=np.int64), np.zeros(lp.columns, dtype=np.int64)
    return FloatProgram(
        indptr=lp.indptr,
        indices=lp.indices,
        data=_divided(lp.data.tolist(), 1),
        cost=_divided(lp.cost.tolist(), lp.cost_den),
        row_lo=_bound(lp.row_lo, 1, -np.inf),
        row_hi=_bound(lp.row_hi, 1, np.inf),
        col_lo=_bound(lp.col_lo, lp.col_den, -np.inf),
        col_hi=_bound(lp.col_hi, lp.col_den, np.inf),
        integer=lp.integer,
        row_exp=zeros[0],
        col_exp=zeros[1],
        cost_exp=0,
    )


def _divided(numbers: list[int], den: int) -> FloatArray:
    # int / int rounds correctly whatever the sizes
    return np.array([number / den for number in numbers], dtype=np.float64)


def _bound(bound: Bound, den: int, absent: float) -> FloatArray:
    return np.where(bound.finite, _divided(bound.num.tolist(), den), absent)


def _mistake(found: str, expected: str, remedy: str) -> UsageError:
    return UsageError([Mistake("--export", repr(found), expected, remedy)])
