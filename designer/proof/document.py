"""Write proof documents as FORMAT.md describes them, and read the JSON back."""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, Protocol

from designer.errors import Mistake, ProofError
from designer.setting.exact import text

if TYPE_CHECKING:  # numpy stays out of `designer recheck`
    from designer.program.linear import Bound
    from designer.program.program import Axis, Program, Stage
    from designer.proof.outcome import GoalResult, Tree
    from designer.setting.setting import IntArray

FORMAT = "designer.proof/1"
MAX_BYTES = 1 << 30
"""Larger files are refused unread."""
_DECIMAL_BITS = 13_000  # a little under Python's 4,300 digits


class Sparse(Protocol):
    """Entry idx[k] is num[k] / den; every other entry is 0."""

    @property
    def den(self) -> int:
        """The common denominator, positive."""
        ...

    @property
    def idx(self) -> Sequence[int]:
        """Ascending positions of the nonzero entries."""
        ...

    @property
    def num(self) -> Sequence[int]:
        """Their numerators."""
        ...


# -- writing -----------------------------------------------------------------------------


def compose(
    program: Program,
    *,
    verdict: str,
    scenario: Mapping[str, str],
    terms: Mapping[str, object],
    path: str = "full",
    goals: Sequence[GoalResult] = (),
    primal: Sparse | None = None,
    farkas: Sparse | None = None,
    tree: Tree | None = None,
    ray: Sparse | None = None,
    reduction: Mapping[str, object] | None = None,
    plain: Mapping[str, Any] | None = None,
) -> dict[str, Any]:
    """The proof document made of its parts; `goals` run along the program's stages.

    `plain` is the program as `plain_program` writes it, where that is known already.
    """
    document: dict[str, Any] = {
        "format": FORMAT,
        "scenario": {"title": scenario["title"], "digest": scenario["digest"]},
        "terms": dict(terms),
        "path": path,
        "verdict": verdict,
        "program": plain or plain_program(program),
        "stages": [plain_stage(stage) for stage in program.stages],
    }
    if reduction is not None:
        document["reduction"] = dict(reduction)
    if verdict == "impossible":
        if tree is not None:
            document["tree"] = plain_tree(tree, "farkas")
        elif farkas is not None:
            document["farkas"] = plain_vector(farkas)
        return document
    if primal is None or verdict not in ("possible", "unbounded"):
        raise ValueError(f"no proof to write for the verdict {verdict!r}")
    valued = len(program.stages) - (verdict == "unbounded")
    for s in range(valued):
        document["stages"][s] |= _found(goals[s])
    document["primal"] = plain_vector(primal)
    if ray is not None and verdict == "unbounded":
        document["ray"] = plain_vector(ray)
    return document


def _found(goal: GoalResult) -> dict[str, Any]:
    """What is claimed of a stage: its value and why nothing does better."""
    if goal.value is None:
        raise ValueError(f"the goal {goal.goal!r} has no value")
    found: dict[str, Any] = {"value": text(goal.value)}
    if goal.proved and goal.tree is not None:
        found["tree"] = plain_tree(goal.tree, "dual")
    elif goal.proved and goal.dual is not None:
        found["dual"] = plain_vector(goal.dual)
    return found


def plain_program(program: Program) -> dict[str, Any]:
    """The exact program as JSON values (FORMAT 3)."""
    import numpy as np

    matrix = program.matrix
    return {
        "columns": matrix.columns,
        "rows": matrix.rows,
        "indptr": matrix.indptr.tolist(),
        "indices": matrix.indices.tolist(),
        "data": _numbers(matrix.data.tolist()),
        "row_lo": _bound(matrix.row_lo),
        "row_hi": _bound(matrix.row_hi),
        "col_den": _numbers([matrix.col_den])[0],
        "col_lo": _bound(matrix.col_lo),
        "col_hi": _bound(matrix.col_hi),
        "integer": np.flatnonzero(matrix.integer).tolist(),
        "names": {"columns": _names(program.column_axis), "rows": _names(program.row_axis)},
    }


def plain_stage(stage: Stage) -> dict[str, Any]:
    """A stage as JSON values, without what is claimed of it (FORMAT 4)."""
    idx, num = _nonzeros(stage.cost)
    den = _numbers([stage.cost_den])[0]
    return {
        "goal": stage.goal,
        "sense": stage.sense,
        "columns": stage.columns,
        "rows": stage.rows,
        "cost": {"den": den, "idx": idx, "num": num, "const": text(stage.cost_const)},
    }


def plain_vector(vector: Sparse) -> dict[str, Any]:
    """A sparse vector as JSON values (FORMAT 1)."""
    return {
        "den": _numbers([vector.den])[0],
        "idx": list(vector.idx),
        "num": _numbers(vector.num),
    }


def plain_tree(tree: Tree, bound: str) -> list[dict[str, Any]]:
    """A tree as a list of nodes, the root first (FORMAT 6); `bound` names a bounding leaf's key."""
    from designer.proof.outcome import Branch

    nodes: list[dict[str, Any]] = [{}]
    todo: list[tuple[int, Tree]] = [(0, tree)]
    while todo:
        place, node = todo.pop()
        if isinstance(node, Branch):
            down, up = len(nodes), len(nodes) + 1
            nodes[place] = {"column": node.column, "floor": node.value, "down": down, "up": up}
            nodes += [{}, {}]
            todo += [(up, node.right), (down, node.left)]
        else:
            key = "farkas" if node.kind == "infeasible" else bound
            nodes[place] = {key: plain_vector(node.dual)}
    return nodes


def _numbers(values: list[int] | Iterable[int]) -> list[int | str]:
    """Integers, as hexadecimal text where decimal text would be too long."""
    listed = values if isinstance(values, list) else [int(value) for value in values]
    if max(map(int.bit_length, listed), default=0) < _DECIMAL_BITS:
        return list(listed)
    return [v if v.bit_length() < _DECIMAL_BITS else hex(v) for v in listed]


def _nonzeros(dense: IntArray) -> tuple[list[int], list[int | str]]:
    import numpy as np

    idx = np.flatnonzero(dense != 0)
    return idx.tolist(), _numbers(dense[idx].tolist())


def _bound(bound: Bound) -> dict[str, Any]:
    import numpy as np

    idx = np.flatnonzero(bound.finite)
    return {"idx": idx.tolist(), "num": _numbers(bound.num[idx].tolist())}


def _names(axis: Axis) -> list[list[Any]]:
    return [[block.family, int(block.count)] for block in axis.blocks]


def as_bytes(document: Mapping[str, Any]) -> bytes:
    """The document as compact JSON, ASCII only, with a closing newline."""
    return (json.dumps(document, separators=(",", ":"), allow_nan=False) + "\n").encode("ascii")


# -- reading -----------------------------------------------------------------------------


def load_document(path: str | Path) -> object:
    """The JSON value in a file; `recheck` judges it.

    Raises ProofError when the file cannot be read, is larger than MAX_BYTES, is not UTF-8 or
    not JSON, repeats a key, or holds NaN or an infinity.
    """
    source = str(path)
    try:
        with Path(path).open("rb") as stream:
            raw = stream.read(MAX_BYTES + 1)
    except (OSError, ValueError) as failure:  # ValueError: a path with a null character
        reason = getattr(failure, "strerror", None) or str(failure)
        raise _unreadable(source, reason, "a file that can be read", "Check the path.") from None
    if len(raw) > MAX_BYTES:
        expected = f"at most {MAX_BYTES:,} bytes"
        raise _unreadable(source, "a larger file", expected, "Pose a smaller scenario.")
    try:
        return parse_document(raw)
    except ProofError as failure:
        raise ProofError(failure.mistakes, source) from None


def parse_document(raw: bytes) -> object:
    """The JSON value of the bytes; raises ProofError as `load_document` does."""
    again = "Save the proof again with `designer pose SCENARIO --save DIR`."
    try:
        parsed: object = json.loads(
            raw.decode("utf-8"), object_pairs_hook=_once, parse_constant=_no_constant
        )
    except UnicodeDecodeError as failure:
        found = f"a byte that is not UTF-8 at position {failure.start}"
        raise _unreadable("", found, "JSON in UTF-8", again) from None
    except RecursionError:
        raise _unreadable("", "objects or lists nested too deep", "a proof", again) from None
    except json.JSONDecodeError as failure:
        found = f"{failure.msg} at line {failure.lineno}, column {failure.colno}"
        raise _unreadable("", found, "JSON", again) from None
    except ValueError as failure:
        found = str(failure)[:200]
        if "int_max_str_digits" in found:  # Python's word for it, meant for programmers
            found = "a whole number of more digits than FORMAT.md writes in decimal"
        raise _unreadable("", found, "JSON as FORMAT.md describes it", again) from None
    return parsed


def _unreadable(source: str, found: str, expected: str, remedy: str) -> ProofError:
    return ProofError([Mistake("the proof", found, expected, remedy)], source)


def _once(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    entries = dict(pairs)
    if len(entries) < len(pairs):
        names = [name for name, _ in pairs]
        twice = next(name for name in names if names.count(name) > 1)
        raise ValueError(f"the key {twice[:40]!r} twice in one object")
    return entries


def _no_constant(name: str) -> None:
    raise ValueError(f"{name}, which is no exact number")
