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

from designer.demands.plain import from_plain
from designer.demands.terms import Terms
from designer.engines.watch import Watch
from designer.proof.compare import same_program
from designer.roads.product import as_independent
from designer.roads.typegraph.bases import Base
from designer.roads.typegraph.cases import Cases, cases_program
from designer.roads.typegraph.checkcuts import check_cuts
from designer.roads.typegraph.decided import Decided, decide
from designer.roads.typegraph.evidence import read_claim
from designer.roads.typegraph.fibers import Fibers, fibers
from designer.roads.typegraph.following import Rejected, at, measured, whole
from designer.roads.typegraph.mechanism import unrolled
from designer.roads.typegraph.pots import least_pot
from designer.roads.typegraph.prices import better, prices
from designer.roads.typegraph.road import TypeGraph, in_every_case
from designer.roads.typegraph.totals import Figures, spending, totals_program
from designer.setting.exact import number
from designer.setting.setting import Setting


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
            return check_cuts(self.setting, self.terms, self.document, decided, self.watch)
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
            measured(work, read_claim(plain, work), self.watch)
            for work, plain in zip(works, reduction["parties"], strict=True)
        ]

    def _rows(self, plain: Any) -> list[str]:
        """The document's program is the listed rows of the full one."""
        total, parties = self.setting.profiles, len(self.setting.parties)
        cases = Cases(
            tuple((at(i, parties), at(a, total), at(b, total)) for i, a, b in plain["lies"]),
            tuple((at(i, parties), at(p, total)) for i, p in plain["takes"]),
            tuple(at(p, total) for p in plain["pots"]),
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
        den = whole(vector["den"])
        dual = {
            row: Fraction(whole(top), den)
            for row, top in zip(vector["idx"], vector["num"], strict=True)
        }
        priced = prices(self.setting, decided, works, bases, program, dual)
        if (better(decided, priced) != decided.choices).any():
            return ["another choice at a tied profile may do better"]
        return []
