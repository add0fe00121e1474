"""Check a proof document with integer arithmetic alone: the only code that has to be trusted.

FORMAT.md beside this file defines the document and says why each certificate is one; section
numbers below are its. `decode` vouches for every type, index and length; this file adds the
mathematics. There is no state, no file access, no fraction and no float: every comparison is
between products of integers. Nothing but the standard library is needed.
"""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass
from itertools import accumulate
from operator import mul

from designer.proof import decode
from designer.proof.decode import Fault, Program, Stage, Vector, need

LIMIT = 2 * 10**10
"""Units of work before the checker gives up; about two minutes (section 9)."""

Bounds = dict[int, int | None]


@dataclass(frozen=True)
class Finding:
    """What the checker found.

    holds    the document is well formed and everything it claims was proved
    verdict  the verdict the document states, None if it states none; proved only if `holds`
    claims   what exactly was proved, one sentence each; empty unless `holds`
    faults   what is wrong; empty if and only if `holds`
    open     the goals whose optimality the document does not claim
    reduced  the claims are about a reduced program (FORMAT 10 to 12): that they carry over to
             the scenario takes the scenario to check
    """

    holds: bool
    verdict: str | None
    claims: tuple[str, ...]
    faults: tuple[str, ...]
    open: tuple[str, ...] = ()
    reduced: bool = False


def recheck(document: object, *, limit: int = LIMIT) -> Finding:
    """Check a proof document, the parsed JSON value. Never raises, whatever the value.

    >>> recheck([]).faults
    ('the document: not an object',)
    """
    verdict: str | None = None
    claims: list[str] = []
    unclaimed: list[str] = []
    try:
        top, verdict = decode.document(document)
        program = decode.program(top["program"])
        stages = decode.stages(top["stages"], program, verdict)
        meter = _Meter(limit)
        if verdict == "impossible":
            nodes = top["tree"] if "tree" in top else [{"farkas": top["farkas"]}]
            cases = _tree(program, stages[0], nodes, None, meter, "impossible")
            split = f", in each of {cases} cases" if cases > 1 else ""
            claims.append(f"no table meets the first {stages[0].rows} rows and all bounds{split}")
        else:
            primal = decode.vector(top["primal"], program.columns, "primal")
            claims.append(_table(program, primal, meter))
            kept = _settled(program, stages, primal, meter, claims, unclaimed)
            if verdict == "unbounded":
                claims.append(_ray(program, stages, top["ray"], meter) + kept)
    except Fault as fault:
        return Finding(False, verdict, (), (str(fault),))
    return Finding(True, verdict, tuple(claims), (), tuple(unclaimed), "reduction" in top)


@dataclass
class _Meter:
    """The work still allowed for one document."""

    left: int

    def spend(self, products: int, words: int, others: int) -> None:
        self.left -= products * (16 + words * others)
        need(self.left >= 0, "the document asks for more arithmetic than the checker allows")


def _zeros(columns: int, used: int) -> list[int] | defaultdict[int, int]:
    """Zero for each column; sparse where a document only claims to have that many columns."""
    return [0] * columns if columns <= used else defaultdict(int)


def _keeps(
    program: Program, rows: int, v: Vector, scale: int, meter: _Meter, where: str
) -> list[int] | defaultdict[int, int]:
    """Numerators of v by column, once v keeps `scale` times every bound of these rows.

    `scale` is v's own denominator for a table, and 0 for a ray: where a bound is, a ray must
    not cross 0.
    """
    row_lo, row_hi, col_lo, col_hi = program.bounds
    products = len(program.data) + len(v.idx) + sum(map(len, program.bounds))
    meter.spend(products, v.words, program.words)
    at = _zeros(program.columns, products)
    for j, number in zip(v.idx, v.num, strict=True):
        at[j] = number
    # sums[k] is the sum of the first k products, all rows on end.
    sums = list(accumulate(map(mul, program.data, map(at.__getitem__, program.indices)), initial=0))
    for i in range(rows):
        level = sums[program.indptr[i + 1]] - sums[program.indptr[i]]
        lo, hi = row_lo.get(i), row_hi.get(i)
        if (lo is not None and level < lo * scale) or (hi is not None and level > hi * scale):
            raise Fault(f"{where}: row {i} is not kept")
    for sign, bounds in ((1, col_lo), (-1, col_hi)):
        for j, side in bounds.items():
            kept = sign * (at[j] * program.col_den - side * scale) >= 0
            need(kept, f"{where}: a bound of column {j} is not kept")
    return at


def _table(program: Program, primal: Vector, meter: _Meter) -> str:
    """Section 7: the table is within every row, bound and whole-number demand."""
    at = _keeps(program, program.rows, primal, primal.den, meter, "primal")
    whole = not any(at[j] % primal.den for j in program.integer)
    need(whole, "primal: a whole-number column is not whole")
    columns = f" and its {len(program.integer)} whole-number columns" if program.integer else ""
    return f"the table meets all {program.rows} rows, all bounds{columns}"


def _at(cost: Vector, v: Vector, meter: _Meter) -> int:
    """The number cost . v times both denominators."""
    meter.spend(len(cost.idx) + len(v.idx), cost.words, v.words)
    at = dict(zip(v.idx, v.num, strict=True))
    return sum(c * at.get(j, 0) for j, c in zip(cost.idx, cost.num, strict=True))


def _settled(
    program: Program,
    stages: list[Stage],
    primal: Vector,
    meter: _Meter,
    claims: list[str],
    unclaimed: list[str],
) -> str:
    """Each stage's value and why nothing does better (section 5); the values in words.

    A later stage's certificate need not look at the earlier values: it bounds all tables of its
    prefix, so also those among them with the earlier values, one of which is the primal.
    """
    kept = ""
    for s, stage in enumerate(stages):
        if "value" not in stage.found:  # the last stage of an unbounded program
            break
        where, cost, found = f"stages[{s}]", stage.cost, stage.found
        (p, q), (u, w) = decode.ratio(found["value"], f"{where}.value"), stage.const
        net, over = p * w - u * q, q * w  # the value without the constant: net / over
        reached = _at(cost, primal, meter) * over == net * cost.den * primal.den
        need(reached, f"{where}: the goal at primal is not the stated value")
        is_open = "tree" not in found and "dual" not in found
        if not is_open:
            nodes = found["tree"] if "tree" in found else [{"dual": found["dual"]}]
            _tree(program, stage, nodes, (stage.sign * net, over), meter, where)
        if cost.idx:  # a constant goal claims nothing
            value = found["value"] if len(found["value"]) <= 200 else "the stated value"
            what = "the table reaches" if is_open else f"no table{kept} does better than"
            claims.append(f"{what} {value} for {stage.goal}")
            unclaimed += [stage.goal] * is_open
            kept += f"{' and' if kept else ' among those with'} {stage.goal} = {value}"
    return kept


def _tree(
    program: Program,
    stage: Stage,
    nodes: object,
    target: tuple[int, int] | None,
    meter: _Meter,
    where: str,
) -> int:
    """Section 6: every leaf is empty or no better than the target. The number of leaves."""
    if not isinstance(nodes, list) or not nodes:
        raise Fault(f"{where}: a tree needs at least one node")
    lo: Bounds = dict(program.bounds[2])
    hi: Bounds = dict(program.bounds[3])
    seen, leaves = {0}, 0
    # To do, last first: a node to visit, or a bound to set before or to restore after one.
    todo: list[int | tuple[Bounds, int, int | None]] = [0]
    while todo:
        step = todo.pop()
        if isinstance(step, tuple):
            bounds, j, side = step
            bounds[j] = side
            continue
        node, here = nodes[step], f"{where} node {step}"
        if isinstance(node, dict) and len(node) == 1:
            _leaf(program, stage, node, target, (lo, hi), meter, here)
            leaves += 1
            continue
        decode.keys(node, here, "column", "floor", "down", "up")
        j, k = decode.count(node["column"], here, stage.columns), node["floor"]
        if j not in program.integer or type(k) is not int or k.bit_length() > 63:
            raise Fault(f"{here}: a branch needs a whole-number column and a 63-bit floor")
        down, up = (decode.count(node[way], here, len(nodes)) for way in ("down", "up"))
        need(len({down, up} - seen) == 2, f"{here}: a node with two parents")
        seen |= {down, up}
        was_lo, was_hi = lo.get(j), hi.get(j)
        least, most = (k + 1) * program.col_den, k * program.col_den
        least = least if was_lo is None else max(least, was_lo)
        most = most if was_hi is None else min(most, was_hi)
        todo += [(lo, j, was_lo), up, (lo, j, least), (hi, j, was_hi), down, (hi, j, most)]
    need(len(seen) == len(nodes), f"{where}: a node without a parent")
    return leaves


def _leaf(
    program: Program,
    stage: Stage,
    node: dict[str, object],
    target: tuple[int, int] | None,
    box: tuple[Bounds, Bounds],
    meter: _Meter,
    where: str,
) -> None:
    """One leaf: within the box nothing is better than the target, or nothing is at all."""
    kind, reason = next(iter(node.items()))
    if kind == "dual" and target is not None:
        y = decode.vector(reason, stage.rows, where)
        num, den = _floor(program, y, stage.cost, stage.sign, box, meter, where)
        good = num * target[1] >= target[0] * den
        need(good, f"{where}: the dual leaves room for something better")
    elif kind == "farkas":
        y = decode.vector(reason, stage.rows, where)
        num, _ = _floor(program, y, Vector(1, (), (), 1), 1, box, meter, where)
        need(num > 0, f"{where}: the derivation does not end in 0 >= a positive number")
    elif kind == "empty":
        j = decode.count(reason, where, stage.columns)
        least, most = box[0].get(j), box[1].get(j)
        if least is None or most is None or least <= most:
            raise Fault(f"{where}: the bounds of column {j} leave room")
    else:
        raise Fault(f"{where}: no reason of this kind is valid here")


def _floor(
    program: Program,
    y: Vector,
    cost: Vector,
    sign: int,
    box: tuple[Bounds, Bounds],
    meter: _Meter,
    where: str,
) -> tuple[int, int]:
    """L of section 6, numerator and positive denominator: sign . cost . x >= L in the box."""
    indptr, den = program.indptr, cost.den * program.col_den
    products = sum(indptr[i + 1] - indptr[i] for i in y.idx) + len(y.idx) + len(cost.idx)
    meter.spend(products, y.words + cost.words, program.words)
    reduced = _zeros(program.columns, products)
    for j, c in zip(cost.idx, cost.num, strict=True):
        reduced[j] = sign * c * y.den
    floor = 0
    for i, weight in zip(y.idx, y.num, strict=True):
        side = program.bounds[0 if weight > 0 else 1].get(i)
        if side is None:
            raise Fault(f"{where}: row {i} lacks the bound that its multiplier uses")
        floor += weight * side * den
        part, times = slice(indptr[i], indptr[i + 1]), weight * cost.den
        for j, entry in zip(program.indices[part], program.data[part], strict=True):
            reduced[j] -= times * entry
    columns = enumerate(reduced) if isinstance(reduced, list) else reduced.items()
    for j, d in columns:  # d is over cost.den * y.den
        if d:
            bound = box[0 if d > 0 else 1].get(j)
            if bound is None:
                raise Fault(f"{where}: column {j} lacks the bound that its reduced cost uses")
            floor += d * bound
    return floor, den * y.den


def _ray(program: Program, stages: list[Stage], value: object, meter: _Meter) -> str:
    """Section 7: along the ray every bound and earlier goal is kept, and the last improves."""
    *earlier, stage = stages
    ray = decode.vector(value, stage.columns, "ray")
    _keeps(program, stage.rows, ray, 0, meter, "ray")
    for before in earlier:
        need(_at(before.cost, ray, meter) == 0, f"ray: it changes the goal {before.goal}")
    need(_at(stage.cost, ray, meter) * stage.sign < 0, "ray: it does not improve the goal")
    return f"{stage.goal} improves without end along the ray"
