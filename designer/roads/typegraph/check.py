"""Is a type-graph proof the scenario's? Small, exact, in blocks, and trusted.

The plain checker shows that the document's small program has the stated verdict. What is
shown here is that the verdict carries over to the full program:

1. the road applies, and the rule is the scenario's, with efficient choices at tied profiles;
2. where the document lists rows, its program is those rows of the full program, to the letter:
   what they exclude or bound, the full program does;
3. otherwise its program says that each party pays at most so much on average. The paths (or
   flows) of the document are followed: they must end where participation holds, and their
   lengths must add up to the bound. They are multipliers of the full program's lie and
   participation rows, one tree per class of the others' profiles;
4. the payments that these paths give are held against every lie row and participation row,
   and where it is asked against the pot at every profile: so the bounds are reached;
5. at tied profiles no efficient option has a lower price at the stated multipliers;
6. or, where the document lists cuts, the chances at tied profiles are columns of its program.
   Every listed tree is followed, the program is written anew from them and compared. The
   lotteries of the document's point are then taken, and its paths must give payments that
   keep every lie row and participation row and reach what the point says each party pays.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from designer.demands.plain import from_plain
from designer.demands.terms import Terms
from designer.engines.watch import Watch
from designer.proof.compare import same_program
from designer.proof.vector import Vector
from designer.roads.product import as_independent
from designer.roads.typegraph.bases import OWN, ZERO, Base, kind, outside_scope
from designer.roads.typegraph.cases import Cases, cases_program
from designer.roads.typegraph.decided import Decided, decide
from designer.roads.typegraph.evidence import Claim, read_claim, read_part
from designer.roads.typegraph.fibers import Fibers, Lengths, fibers
from designer.roads.typegraph.listing import rule_of, spelled_base, starts
from designer.roads.typegraph.lotteries import Bound, Lies, Opened, lottery_program, on_average
from designer.roads.typegraph.mechanism import unrolled
from designer.roads.typegraph.mixing import uncovered
from designer.roads.typegraph.openpots import Pot, pot_fault
from designer.roads.typegraph.paths import along
from designer.roads.typegraph.pots import least_pot
from designer.roads.typegraph.prices import better, prices
from designer.roads.typegraph.road import TypeGraph, in_every_case
from designer.roads.typegraph.torn import Torn, even_scope, fault, scope_at
from designer.roads.typegraph.totals import Figures, spending, totals_program
from designer.setting.exact import number
from designer.setting.setting import IntArray, Setting


class Rejected(ValueError):  # noqa: N818 - says what it means
    """What is wrong with the document, in words."""


def check(setting: Setting, document: dict[str, Any], watch: Watch | None = None) -> list[str]:
    """What keeps the document's verdict from being one about the full program; empty if nothing.

    The document must have passed the plain checker.
    """
    try:
        terms = from_plain(document["terms"], setting)
        why = TypeGraph().applies(setting, terms)
        if why is not None:
            return [f"the type-graph road does not apply: {why}"]
        own = as_independent(setting) or setting
        return _Check(own, terms, document, watch or Watch()).run()
    except Rejected as fault:
        return [str(fault)]
    except (KeyError, TypeError, ValueError, IndexError, OverflowError) as error:
        return [f"the reduction cannot be read: {error}"]


@dataclass(frozen=True, eq=False)
class _Check:
    setting: Setting
    terms: Terms
    document: dict[str, Any]
    watch: Watch

    def run(self) -> list[str]:
        """Every step in turn; the first fault ends it."""
        reduction, verdict = self.document["reduction"], self.document["verdict"]
        listed = "rows" in reduction
        if listed:
            faults = self._rows(reduction["rows"])
            if faults or verdict == "impossible":
                return faults
            if verdict != "possible":
                raise Rejected("listed rows cannot show that the goal has no end")
        decided = decide(self.setting, self.terms.decision, self.watch)
        if "cuts" in reduction:
            return self._cuts(decided, reduction)
        decided = decided.choosing(unrolled(reduction["ties"], len(decided.tied)))
        works = self._works(decided)
        bases = self._bases(works, reduction)
        if listed:
            self._pots(works, bases, number(self.document["stages"][0]["value"]))
            return []
        if in_every_case(self.terms):
            if self.terms.goals[0] in ("outside-money", "worst-pot"):
                raise Rejected("the goal is about single profiles and no rows are listed")
            if verdict == "possible":
                self._pots(works, bases, None)
        return self._totals(decided, works, bases)

    def _works(self, decided: Decided) -> list[Fibers]:
        parties = range(len(self.setting.parties))
        return [fibers(self.setting, self.terms, decided, i) for i in parties]

    def _bases(self, works: list[Fibers], reduction: dict[str, Any]) -> list[Base]:
        """The payments and bounds of the paths that a document gives."""
        if len(reduction["parties"]) != len(works):
            raise Rejected("the reduction does not fit the parties")
        return [
            _measured(work, read_claim(plain, work), self.watch)
            for work, plain in zip(works, reduction["parties"], strict=True)
        ]

    def _cuts(self, decided: Decided, reduction: dict[str, Any]) -> list[str]:
        """The document's program is that of the listed paths, and its point has a table."""
        why = uncovered(self.setting, self.terms, decided, limit=None)
        if why is not None:
            raise Rejected(f"paths are listed for open lotteries, but {why}")
        opened = Opened(self.setting, self.terms, self._works(decided))
        if len(reduction["cuts"]) != len(opened.works):
            raise Rejected("the reduction does not fit the parties")
        parts = [read_part(plain, opened, i) for i, plain in enumerate(reduction["cuts"])]
        for found, part in zip(opened.torn, parts, strict=True):
            _followed_part(found, part)
        pots = self._listed_pots(opened, reduction.get("pots", []))
        program = lottery_program(self.setting, self.terms, opened, parts, pots)
        faults = same_program(self.document, program)
        if faults or self.document["verdict"] == "impossible":
            return faults
        written = self.document["primal"]
        tops = [_whole(top) for top in written["num"]]
        primal = Vector(
            _whole(written["den"]), tuple(written["idx"]), tuple(tops), program.matrix.columns
        )
        works = self._works(rule_of(program, opened, primal))
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
                base = _measured(work, read_claim(reduction["parties"][i], work), self.watch)
            if base.most is not None and primal.value(i) > base.most:
                name = self.setting.parties[i].name
                raise Rejected(f"{name} cannot be made to pay what the point says")
            bases.append(base)
        if in_every_case(self.terms):
            self._pots(works, bases, None)
        return []

    def _listed_pots(self, opened: Opened, plain: Any) -> list[Pot]:
        """The listed pots and the paths into them, if each of these bounds a payment."""
        if plain and not in_every_case(self.terms):
            raise Rejected("a pot is listed that is not asked to balance")
        pots = []
        for profile, trails in plain:
            if len(trails) != len(opened.works):
                raise Rejected("the reduction does not fit the parties")
            paths = tuple(
                tuple(_at(a, work.types) for a in path)
                for work, path in zip(opened.works, trails, strict=True)
            )
            pots.append(Pot(_at(profile, self.setting.profiles), paths))
        for work in opened.works:
            wrong = pot_fault(work, pots)
            if wrong is not None:
                raise Rejected(wrong)
        return pots

    def _rows(self, plain: Any) -> list[str]:
        """The document's program is the listed rows of the full one."""
        total, parties = self.setting.profiles, len(self.setting.parties)
        cases = Cases(
            tuple((_at(i, parties), _at(a, total), _at(b, total)) for i, a, b in plain["lies"]),
            tuple((_at(i, parties), _at(p, total)) for i, p in plain["takes"]),
            tuple(_at(p, total) for p in plain["pots"]),
        )
        self._allowed(cases)
        goal = self.document["stages"][0]["goal"]
        possible = self.document["verdict"] == "possible"
        wanted = self.terms.goals if possible else ("any", self.terms.goals[0])
        if len(self.document["stages"]) != 1 or goal not in wanted:
            raise Rejected("the goal is not the one that was asked")
        if possible and goal not in ("outside-money", "worst-pot"):
            raise Rejected("listed rows do not bound this goal")
        return same_program(self.document, cases_program(self.setting, self.terms, cases, goal))

    def _allowed(self, cases: Cases) -> None:
        """Every listed row is one that the terms ask for."""
        setting, terms = self.setting, self.terms
        weights = setting.joint if setting.support_only else None
        for i, true, told in cases.lies:
            name = setting.parties[i].name
            one, two = list(setting.types_at(true)), list(setting.types_at(told))
            one[i] = two[i] = 0
            if one != two or true == told or name in terms.trusted:
                raise Rejected("a listed lie is none that honesty speaks of")
        for i, _ in cases.takes:
            if terms.ir != "ex-post" or setting.parties[i].name in terms.compelled:
                raise Rejected("participation is listed where it is not asked")
        if cases.pots and not in_every_case(terms):
            raise Rejected("a pot is listed that is not asked to balance")
        asked = [p for _, p, _ in cases.lies] + [p for _, p in cases.takes] + list(cases.pots)
        if weights is not None and any(not weights[p] for p in asked):
            raise Rejected("a row is listed for a profile at which nothing is asked")

    def _pots(self, works: list[Fibers], bases: list[Base], value: Fraction | None) -> None:
        """Every pot is as large as the demands and the stated value say."""
        least, _ = least_pot(works, bases, self.watch)
        terms, goal = self.terms, self.terms.goals[0]
        need = [] if terms.balance == "none" else [-terms.subsidy]
        if value is not None:
            need = [-value] if goal == "outside-money" else [*need, value]
        if any(least < wanted for wanted in need):
            raise Rejected("the payments leave a pot smaller than is stated")

    def _totals(self, decided: Decided, works: list[Fibers], bases: list[Base]) -> list[str]:
        """The document's program is about these bounds, and no choice at a tie does better."""
        outlay, designer = spending(self.setting, works[0])
        figures = Figures(
            tuple(found.most for found in bases),
            tuple(found.worth for found in bases),
            outlay,
            designer,
            bool(len(decided.tied)),
        )
        program = totals_program(self.setting, self.terms, figures)
        faults = same_program(self.document, program)
        if faults or self.document["verdict"] == "unbounded" or not len(decided.tied):
            return faults
        vector = self.document.get("farkas") or self.document["stages"][0]["dual"]
        den = _whole(vector["den"])
        dual = {
            row: Fraction(_whole(top), den)
            for row, top in zip(vector["idx"], vector["num"], strict=True)
        }
        priced = prices(self.setting, decided, works, bases, program, dual)
        if (better(decided, priced) != decided.choices).any():
            return ["another choice at a tied profile may do better"]
        return []


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
        _honest(work, lengths, here)
        mass = work.mass[start:stop].astype(object)[:, None]
        sums = [s + p for s, p in zip(sums, (mass * here).sum(axis=0), strict=True)]
        rooms = _added(rooms, work.shared(start, stop, lengths.room))
    if any(s > r for s, r in zip(sums, rooms, strict=True)):
        name = work.setting.parties[work.party].name
        raise Rejected(f"a type of {name} would rather stay out")
    return found


def _measured(work: Fibers, claim: Claim, watch: Watch) -> Base:
    """Follow the paths: the payments they give, the bound they prove, both as claimed."""
    held = kind(work)
    name = work.setting.parties[work.party].name
    trusted = name in work.terms.trusted
    if claim.flow is not None:
        if held != "types" or trusted:
            raise Rejected(f"{name} has multipliers of participation type by type")
        return _flowing(work, claim, watch)
    roots = {"free": ZERO, "mean": ZERO, "cases": OWN, "types": OWN if trusted else "type"}[held]
    if (claim.root if isinstance(claim.root, str) else "type") != roots:
        raise Rejected(f"the paths of {name} do not end where participation holds it")
    if claim.tree is None:
        raise Rejected(f"{name} has neither paths nor multipliers")
    if trusted and (claim.tree != np.arange(work.types)[None, :]).any():
        raise Rejected(f"{name} is trusted and tells no lies")
    pays = np.zeros((work.classes, work.types), dtype=work.dtype)
    sums, rooms = [0] * work.types, [0] * work.types
    total = worth = room = 0
    for start, lengths in work.blocks():
        watch.tell(f"following the paths of {name}", start)
        stop = start + len(lengths.room)
        pays[start:stop] = part = _followed(work, lengths, claim.root, claim.tree[start:stop])
        total += work.sum(lengths.sinks, part)
        worth += work.sum(lengths.sinks, lengths.worth)
        room += work.sum(lengths.sinks, lengths.room)
        if isinstance(claim.root, int):
            sums = _added(sums, work.shared(start, stop, part))
            rooms = _added(rooms, work.shared(start, stop, lengths.room))
    den = work.den * work.total
    average, mean = Fraction(total, den), Fraction(room, den)
    most: Fraction | None = {"free": None, "mean": mean}.get(held, average)
    if isinstance(claim.root, int):
        lift = rooms[claim.root]
        if any(s + lift > r for s, r in zip(sums, rooms, strict=True)):
            raise Rejected(f"a type of {name} would rather stay out")
        most = average + Fraction(lift, work.den * (work.total // int(work.own.sum())))
    return Base(pays, average, most, claim.root, claim.tree, None, Fraction(worth, den), mean)


def _followed(work: Fibers, lengths: Lengths, root: str | int, tree: IntArray) -> IntArray:
    """The lengths of the paths, held against every lie and every room."""
    name = work.setting.parties[work.party].name
    begin = lengths.room if root == OWN else np.zeros_like(lengths.room)
    pays, loops = along(lengths.cost, tree, begin)
    scope = lengths.scope
    if loops.any():
        raise Rejected(f"the paths of {name} go round in circles")
    if isinstance(root, int):
        at_root = tree == np.arange(work.types)[None, :]
        if (at_root.sum(axis=1) != 1).any() or not at_root[:, root].all():
            raise Rejected(f"the paths of {name} do not all start at one type")
    if scope is not None:
        inside = np.take_along_axis(scope, tree, axis=1)
        if (scope & ~inside).any():
            raise Rejected(f"a path of {name} passes where nothing is asked")
        pays[~scope] = work.far
        outside_scope(pays, lengths.cost, scope, work.far)
    _honest(work, lengths, pays)
    asked = np.ones(pays.shape, dtype=bool) if scope is None else scope
    if root == OWN and (asked & (pays > lengths.room).astype(bool)).any():
        raise Rejected(f"{name} would rather stay out in some case")
    return pays


def _honest(work: Fibers, lengths: Lengths, pays: IntArray) -> None:
    """pays[a] <= pays[b] + cost[a, b]; costs of what is not asked are out of reach."""
    if (pays[:, :, None] > pays[:, None, :] + lengths.cost).any():
        name = work.setting.parties[work.party].name
        raise Rejected(f"{name} gains by a lie at the stated payments")


def _flowing(work: Fibers, claim: Claim, watch: Watch) -> Base:
    """Payments and multipliers over classes: conservation, honesty, and equal values."""
    flow, name = claim.flow, work.setting.parties[work.party].name
    if flow is None:
        raise Rejected(f"{name} has no multipliers")
    pays = np.array(claim.pays, dtype=object).reshape(work.classes, work.types)
    own = int(work.own.sum())
    # Net flow into (g, a), times own: what its sink takes less what its root gives.
    net = np.zeros((work.classes, work.types), dtype=object)
    costs = 0
    by_class: dict[int, list[tuple[int, int, int]]] = {}
    for g, true, told, amount in flow.lies:
        net[g, true] += amount
        net[g, told] -= amount
        by_class.setdefault(g, []).append((true, told, amount))
    sums: list[Any] = [0] * work.types
    rooms = [0] * work.types
    worth = room = 0
    for start, lengths in work.blocks():
        watch.tell(f"following the multipliers of {name}", start)
        stop = start + len(lengths.room)
        _honest(work, lengths, pays[start:stop])
        mass = work.mass[start:stop].astype(object)[:, None]
        given = mass * np.array(flow.roots, dtype=object)[None, :] * own
        if (net[start:stop] * own + given != mass * work.own[None, :] * flow.den).any():
            raise Rejected(f"the multipliers of {name} do not add up at some type")
        for g in range(start, stop):
            for true, told, amount in by_class.get(g, ()):
                costs += amount * int(lengths.cost[g - start, true, told])
        sums = [s + p for s, p in zip(sums, (mass * pays[start:stop]).sum(axis=0), strict=True)]
        rooms = _added(rooms, work.shared(start, stop, lengths.room))
        worth += work.sum(lengths.sinks, lengths.worth)
        room += work.sum(lengths.sinks, lengths.room)
    if any(s > r for s, r in zip(sums, rooms, strict=True)):
        raise Rejected(f"a type of {name} would rather stay out")
    whole = work.total // own
    bound = sum(share * r for share, r in zip(flow.roots, rooms, strict=True)) + costs
    most = Fraction(bound, flow.den * work.den * whole)
    average = sum(Fraction(int(o)) * s for o, s in zip(work.own, sums, strict=True))
    average /= work.den * work.total
    if average != most:
        raise Rejected(f"the payments of {name} do not reach what the multipliers admit")
    den = work.den * work.total
    return Base(pays, most, most, 0, None, flow, Fraction(worth, den), Fraction(room, den))


def _added(one: list[int], two: list[int]) -> list[int]:
    return [a + b for a, b in zip(one, two, strict=True)]


def _at(value: Any, size: int) -> int:
    if type(value) is not int or not 0 <= value < size:
        raise Rejected("a listed row names what is not there")
    return value


def _whole(value: int | str) -> int:
    return int(value, 16) if isinstance(value, str) else value
