"""Hold a proof document against the program that its scenario leads to."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Mapping
from fractions import Fraction
from typing import TYPE_CHECKING, Any

from designer.errors import Mistake, ProofError
from designer.proof import decode

if TYPE_CHECKING:
    from designer.demands.terms import Terms
    from designer.program.draft import Draft
    from designer.program.program import Axis, Program
    from designer.setting.setting import Setting

SHOWN = 5
"""Differences of one kind that are listed one by one."""


def program_digest(document: object) -> str:
    """SHA-256, hexadecimal, of a document's program and goals.

    The same for both spellings of an integer and for any order of keys; names, certificates
    and values play no part. Raises ProofError for a malformed program or malformed stages.
    """
    program, stages = _decoded(document)
    digest = hashlib.sha256()

    def feed(*lists: Iterable[int]) -> None:
        for numbers in lists:
            digest.update((" ".join(map(hex, numbers)) + "\n").encode("ascii"))

    feed([program.columns, program.rows, program.col_den], program.indptr, program.indices)
    feed(program.data, sorted(program.integer))
    for bounds in program.bounds:
        feed(bounds.keys(), bounds.values())
    for stage in stages:
        digest.update(json.dumps(stage.goal).encode("ascii"))
        const = Fraction(*stage.const)
        feed([stage.sign, stage.columns, stage.rows, stage.cost.den], stage.cost.idx)
        feed(stage.cost.num, [const.numerator, const.denominator])
    return digest.hexdigest()


def rebuild(
    document: object, setting: Setting, terms: Terms, draft: Draft | None = None
) -> Program:
    """The program that the scenario and the terms lead to, with the document's stages.

    Goals are posed in the document's order and pinned at the document's values; nothing else
    is taken from it. `draft` is where to write, a plain one by default. Raises ProofError for
    malformed stages or goals that do not exist.
    """
    from designer.demands.formulate import Formulation
    from designer.demands.registry import GOALS

    _, stages = _decoded(document)
    work = Formulation(setting, terms, draft=draft)
    program = work.program()
    for s, stage in enumerate(stages):
        if stage.goal not in GOALS:
            raise _malformed(f"the goal {stage.goal!r}")
        if s and work.stages[-1].cost.any():  # a constant goal needs no pin
            try:
                ratio = decode.ratio(stages[s - 1].found.get("value"), f"stages[{s - 1}].value")
            except decode.Fault as fault:
                raise _malformed(str(fault)) from None
            work.pin(Fraction(*ratio))
        program = work.pose(stage.goal)
    return program


def same_program(document: object, program: Program) -> list[str]:
    """How a document's program and goals differ from `program`; empty when they are the same.

    Compares every coefficient, bound, whole-number mark and goal. Raises ProofError for a
    malformed program or malformed stages.
    """
    theirs, their_stages = _decoded(document)
    ours, our_stages = _own(program)
    found = []
    for what, one, other in (
        ("columns", theirs.columns, ours.columns),
        ("rows", theirs.rows, ours.rows),
        ("goals", len(their_stages), len(our_stages)),
    ):
        if one != other:
            found.append(f"{one} {what} in the proof, {other} in the scenario")
    if found:
        return found
    if _rows(theirs) != _rows(ours):
        places = [i for i in range(ours.rows) if _row(theirs, i) != _row(ours, i)]
        found += _listed("row", places, program.row_axis)
    if _columns(theirs) != _columns(ours):
        places = [j for j in range(ours.columns) if _column(theirs, j) != _column(ours, j)]
        found += _listed("column", places, program.column_axis)
    for s, (stage, own) in enumerate(zip(their_stages, our_stages, strict=True)):
        if not _same_goal(stage, own):
            found.append(f"goal {s + 1}, {own.goal}, differs")
    return found


def _decoded(document: object) -> tuple[decode.Program, list[decode.Stage]]:
    try:
        if not isinstance(document, Mapping):
            raise decode.Fault("the document: not an object")
        program = decode.program(document.get("program"))
        return program, decode.stages(document.get("stages"), program, str(document.get("verdict")))
    except decode.Fault as fault:
        raise _malformed(str(fault)) from None


def _own(program: Program) -> tuple[decode.Program, list[decode.Stage]]:
    """The program in the shape that a document is decoded to."""
    matrix = program.matrix
    sides = (matrix.row_lo, matrix.row_hi, matrix.col_lo, matrix.col_hi)
    bounds = []
    for side in sides:
        idx = side.finite.nonzero()[0]
        bounds.append(dict(zip(idx.tolist(), side.num[idx].tolist(), strict=True)))
    arrays = (matrix.indptr.tolist(), matrix.indices.tolist(), matrix.data.tolist())
    integer = frozenset(matrix.integer.nonzero()[0].tolist())
    stages = []
    for stage in program.stages:
        idx = stage.cost.nonzero()[0]
        cost = decode.Vector(stage.cost_den, idx.tolist(), stage.cost[idx].tolist(), 1)
        const = stage.cost_const.as_integer_ratio()
        sign, size = 1 if stage.sense == "min" else -1, (stage.columns, stage.rows)
        stages.append(decode.Stage(stage.goal, sign, *size, cost, const, {}))
    den, size = matrix.col_den, (matrix.columns, matrix.rows)
    return decode.Program(*size, *arrays, den, integer, tuple(bounds), 1), stages


def _malformed(found: str) -> ProofError:
    expected = "a program as FORMAT.md describes it"
    remedy = "Save the proof again with `designer pose SCENARIO --save DIR`."
    return ProofError([Mistake("the proof", found, expected, remedy)])


def _rows(program: decode.Program) -> tuple[Any, ...]:
    return program.indptr, program.indices, program.data, program.bounds[:2]


def _row(program: decode.Program, i: int) -> tuple[Any, ...]:
    part = slice(program.indptr[i], program.indptr[i + 1])
    low, high = (program.bounds[side].get(i) for side in (0, 1))
    return program.indices[part], program.data[part], low, high


def _columns(program: decode.Program) -> tuple[Any, ...]:
    return program.integer, program.col_den, program.bounds[2:]


def _column(program: decode.Program, j: int) -> tuple[Any, ...]:
    sides = (program.bounds[side].get(j) for side in (2, 3))
    return j in program.integer, *(s if s is None else Fraction(s, program.col_den) for s in sides)


def _same_goal(one: decode.Stage, two: decode.Stage) -> bool:
    a, b = one.cost, two.cost
    return (
        (one.goal, one.sign, one.columns, one.rows) == (two.goal, two.sign, two.columns, two.rows)
        and a.idx == b.idx
        and all(p * b.den == q * a.den for p, q in zip(a.num, b.num, strict=True))
        and Fraction(*one.const) == Fraction(*two.const)
    )


def _listed(what: str, places: list[int], axis: Axis) -> list[str]:
    lines = [f"{what} {place}, {axis.label(place)}, differs" for place in places[:SHOWN]]
    if len(places) > SHOWN:
        lines.append(f"and {len(places) - SHOWN} more {what}s")
    return lines
