"""Are listed paths and lotteries at ties the scenario's? Small, exact, and trusted.

Every listed tree is followed and the program written anew from them: what it excludes or
bounds holds for every choice at ties. Then the lotteries of the document's point are taken, and
its paths must give payments that keep every lie row and participation row, reach what the
point says each party pays and, where it is asked, fill every pot.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from designer.demands.terms import Terms
from designer.engines.watch import Watch
from designer.proof.compare import same_program
from designer.proof.vector import Vector
from designer.roads.typegraph.bases import OWN, Base, kind
from designer.roads.typegraph.decided import Decided
from designer.roads.typegraph.evidence import read_claim, read_part
from designer.roads.typegraph.fibers import Fibers, fibers
from designer.roads.typegraph.following import Rejected, added, at, honest, measured, whole
from designer.roads.typegraph.listing import rule_of, spelled_base, starts
from designer.roads.typegraph.lotteries import Bound, Lies, Opened, lottery_program, on_average
from designer.roads.typegraph.mixing import uncovered
from designer.roads.typegraph.openpots import Pot, pot_fault
from designer.roads.typegraph.pots import least_pot
from designer.roads.typegraph.road import in_every_case
from designer.roads.typegraph.torn import Torn, even_scope, fault, scope_at
from designer.setting.setting import Setting


def check_cuts(
    setting: Setting, terms: Terms, document: dict[str, Any], decided: Decided, watch: Watch
) -> list[str]:
    """The document's program is that of the listed paths, and its point has a table.

    `decided` takes the option first listed at ties. Raises Rejected, or what cannot be read.
    """
    reduction = document["reduction"]
    why = uncovered(setting, terms, decided, limit=None)
    if why is not None:
        raise Rejected(f"paths are listed for open lotteries, but {why}")
    opened = Opened(setting, terms, _works(setting, terms, decided))
    if len(reduction["cuts"]) != len(opened.works):
        raise Rejected("the reduction does not fit the parties")
    parts = [read_part(plain, opened, i) for i, plain in enumerate(reduction["cuts"])]
    for found, part in zip(opened.torn, parts, strict=True):
        _followed_part(found, part)
    pots = _listed_pots(opened, reduction.get("pots", []))
    program = lottery_program(setting, terms, opened, parts, pots)
    faults = same_program(document, program)
    if faults or document["verdict"] == "impossible":
        return faults
    written = document["primal"]
    tops = [whole(top) for top in written["num"]]
    primal = Vector(
        whole(written["den"]), tuple(written["idx"]), tuple(tops), program.matrix.columns
    )
    works = _works(setting, terms, rule_of(program, opened, primal))
    if len(reduction["parties"]) != len(works):
        raise Rejected("the reduction does not fit the parties")
    values = np.array(primal.numerators(), dtype=object)
    firsts = iter(starts(program))
    bases = []
    for i, (work, part) in enumerate(zip(works, parts, strict=True)):
        if isinstance(part, Lies):
            first = next(firsts)
            paid = values[first : first + opened.spelled(i).place.size]
            base = _spelled(work, spelled_base(opened, i, work, paid, primal.den))
        else:
            for _ in part:
                next(firsts)
            base = measured(work, read_claim(reduction["parties"][i], work), watch)
        if base.most is not None and primal.value(i) > base.most:
            name = setting.parties[i].name
            raise Rejected(f"{name} cannot be made to pay what the point says")
        bases.append(base)
    if in_every_case(terms):
        least, _ = least_pot(works, bases, watch)
        if terms.balance != "none" and least < -terms.subsidy:
            raise Rejected("the payments leave a pot smaller than is stated")
    return []


def _works(setting: Setting, terms: Terms, decided: Decided) -> list[Fibers]:
    return [fibers(setting, terms, decided, i) for i in range(len(setting.parties))]


def _listed_pots(opened: Opened, plain: Any) -> list[Pot]:
    """The listed pots and the paths into them, if each of these bounds a payment."""
    if plain and not in_every_case(opened.terms):
        raise Rejected("a pot is listed that is not asked to balance")
    pots = []
    for profile, trails in plain:
        if len(trails) != len(opened.works):
            raise Rejected("the reduction does not fit the parties")
        paths = tuple(
            tuple(at(a, work.types) for a in path)
            for work, path in zip(opened.works, trails, strict=True)
        )
        pots.append(Pot(at(profile, opened.setting.profiles), paths))
    for work in opened.works:
        wrong = pot_fault(work, pots)
        if wrong is not None:
            raise Rejected(wrong)
    return pots


def _followed_part(found: Torn, part: list[Bound] | Lies) -> None:
    """Every listed path bounds what the party pays; every listed lie is asked about."""
    work = found.work
    name = work.setting.parties[work.party].name
    held = kind(work)
    if held not in ("cases", "types") or on_average(work):
        if isinstance(part, Lies) or part:
            raise Rejected(f"no paths bound what {name} pays")
        return
    if isinstance(part, Lies):
        if held != "types":
            raise Rejected(f"{name} is not held type by type and its payments are spelled")
        return
    for bound in part:
        if (bound.root == OWN) != (held == "cases"):
            raise Rejected(f"the paths of {name} do not end where participation holds it")
        wrong = fault(work, bound.even, bound.root, even_scope(found))
        scope = scope_at(work, found.others[bound.graph])
        wrong = wrong or fault(work, bound.trees, bound.root, scope)
        if wrong is not None:
            raise Rejected(wrong)


def _spelled(work: Fibers, found: Base) -> Base:
    """The payments of a party that is spelled, held against every lie and type."""
    sums: list[Any] = [0] * work.types
    rooms = [0] * work.types
    for start, lengths in work.blocks():
        stop = start + len(lengths.room)
        here = found.pays[start:stop]
        honest(work, lengths, here)
        mass = work.mass[start:stop].astype(object)[:, None]
        sums = [s + p for s, p in zip(sums, (mass * here).sum(axis=0), strict=True)]
        rooms = added(rooms, work.shared(start, stop, lengths.room))
    if any(s > r for s, r in zip(sums, rooms, strict=True)):
        name = work.setting.parties[work.party].name
        raise Rejected(f"a type of {name} would rather stay out")
    return found
