"""Hold a proof document against the program that its scenario leads to."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Mapping
from fractions import Fraction
from typing import TYPE_CHECKING, Any

from designer.errors import Mistake, ProofError
from designer.proof import decode
from designer.proof.document import plain_program, plain_stage

if TYPE_CHECKING:
    from designer.demands.terms import Terms
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


def rebuild(document: object, setting: Setting, terms: Terms) -> Program:
    """The program that the scenario and the terms lead to, with the document's stages.

    Goals are posed in the document's order and pinned at the document's values; nothing else
    is taken from it. Raises ProofError for malformed stages or goals that do not exist.
    """
    from designer.demands.formulate import Formulation
    from designer.demands.registry import GOALS

    _, stages = _decoded(document)
    work = Formulation(setting, terms)
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
    plain: dict[str, Any] = {"program": plain_program(program), "verdict": "impossible"}
    plain["stages"] = [plain_stage(stage) for stage in program.stages]
    ours, our_stages = _decoded(plain)
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
        if _goal(stage) != _goal(own):
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


def _goal(stage: decode.Stage) -> tuple[Any, ...]:
    terms = zip(stage.cost.idx, stage.cost.num, strict=True)
    cost = {j: Fraction(number, stage.cost.den) for j, number in terms}
    return stage.goal, stage.sign, stage.columns, stage.rows, cost, Fraction(*stage.const)


def _listed(what: str, places: list[int], axis: Axis) -> list[str]:
    lines = [f"{what} {place}, {axis.label(place)}, differs" for place in places[:SHOWN]]
    if len(places) > SHOWN:
        lines.append(f"and {len(places) - SHOWN} more {what}s")
    return lines
