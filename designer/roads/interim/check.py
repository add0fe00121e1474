"""Is a reduced proof the scenario's? Small, exact, in blocks, and trusted.

A document of the interim road carries the last master program and the rules behind its share
columns. The plain checker shows that the master's verdict is right. What is shown here is
that the verdict carries over to the full program:

1. the demands can be written in interim quantities at all (the road applies);
2. every listed rule is one the decision demand allows, and its counts are recounted;
3. the master's rows and columns are those that the scenario and the terms give, and no lie
   that has no row gains at its point;
4. at the stated multipliers no rule whatever does better: the best one is found and counted
   exactly (`counting.py`), or there is no other rule, since no profile is tied.

By 3 and the balance lift (`mechanism.py`) a point of the master is a table of the full
program; by 4 its multipliers are multipliers of the full program.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from designer.demands.formulate import amounts_of
from designer.demands.plain import from_plain
from designer.demands.terms import Terms
from designer.engines.watch import Interrupted, Watch
from designer.program.program import Program
from designer.proof.compare import rebuild, same_program
from designer.proof.vector import Vector
from designer.roads.interim.counting import count, counts_of, tied
from designer.roads.interim.draft import InterimDraft, Lies
from designer.roads.interim.lies import broken
from designer.roads.interim.master import averaged, exact_prices, rule_for
from designer.roads.interim.mechanism import rules_from_plain
from designer.roads.interim.merged import merged
from designer.roads.interim.road import Interim
from designer.roads.interim.rule import Counts, Index, Rule, welfare_index
from designer.roads.product import as_independent
from designer.setting.setting import Setting


def check(setting: Setting, document: dict[str, Any], watch: Watch | None = None) -> list[str]:
    """What keeps the document's verdict from being one about the full program; empty if nothing.

    The document must have passed the plain checker. Raises Stopped as `watch` says, and where
    somebody presses Ctrl-C.
    """
    try:
        return _check(setting, document, watch or Watch())
    except KeyboardInterrupt:
        raise Interrupted from None


def _check(setting: Setting, document: dict[str, Any], watch: Watch) -> list[str]:
    try:
        terms = from_plain(document["terms"], setting)
        reduction = document["reduction"]
        lead, shares = reduction["lead"], reduction["shares"]
        why = Interim().applies(setting, terms)
        own = as_independent(setting)
        if why is not None or own is None:
            return [f"the interim road does not apply: {why}"]
        rules = rules_from_plain(reduction["rules"], own)
        lies = _read_lies(reduction["lies"], own)
        if not (
            (lead is None or (type(lead) is int and 0 <= lead < len(own.parties)))
            and all(
                0 <= g < (1 if lead is None else own.shape[lead]) and 0 <= r < len(rules)
                for g, r in shares
            )
            and _asked(document, terms)
        ):
            return ["the reduction does not fit the scenario"]
    except (KeyError, TypeError, ValueError) as error:
        return [f"the reduction cannot be read: {error}"]
    faults = [fault for rule in rules if (fault := _forbidden(own, terms, rule))]
    if faults:
        return faults[:1]
    counts = counts_of(own, rules, lead, watch)
    draft, program = _program(own, terms, lead, lies, [(g, counts[r]) for g, r in shares], document)
    differences = same_program(document, program)
    if differences:
        return differences
    if document["verdict"] != "impossible":
        for key, ray in (("primal", False), ("ray", True)):
            if key in document and any(_told(own, terms, draft, document[key], program, ray)):
                return ["a lie that is not written gains more than the terms allow"]
    if terms.decision == "table":
        return []
    if terms.decision == "efficient" and lead is None and len(rules) == 1:
        plain = Rule((welfare_index(own),))
        whole = counts[0] if len(rules[0].indices) == 1 else count(own, plain, None, watch)
        if not tied(own, plain, whole, watch):
            return []  # no other rule is efficient
    for multipliers in _multipliers(document, program):
        found = _better(own, terms, lead, program, multipliers, watch)
        if found:
            return found
    return []


def _asked(document: dict[str, Any], terms: Terms) -> bool:
    """Whether the stages are the goals in order: all of them, or up to where it ends early."""
    names, stages = [stage["goal"] for stage in document["stages"]], document["stages"]
    if document["verdict"] == "possible":
        return names == list(terms.goals) and all("dual" in stage for stage in stages)
    if document["verdict"] == "impossible" and "farkas" not in document:
        return False
    first = names == list(terms.goals[: len(names)])
    return first and bool(names) and all("dual" in stage for stage in stages[:-1])


def _read_lies(plain: Any, setting: Setting) -> Lies | None:
    """The lies that are written, of a reduction. Raises ValueError or TypeError."""
    if plain is None:
        return None
    lies = tuple(tuple((true, told) for true, told in pairs) for pairs in plain)
    if len(lies) != len(setting.parties):
        raise ValueError("the lies do not fit the parties")
    for party, pairs in zip(setting.parties, lies, strict=True):
        whole = all(type(a) is int and 0 <= a < party.size for pair in pairs for a in pair)
        if not whole or len(set(pairs)) != len(pairs) or any(a == b for a, b in pairs):
            raise ValueError("a lie is not one of a party's")
    return lies


def _told(
    setting: Setting,
    terms: Terms,
    draft: InterimDraft,
    vector: dict[str, Any],
    program: Program,
    ray: bool,
) -> Lies:
    """The lies that gain at a point or a ray of the document."""
    x = _vector(vector, program.matrix.columns)
    return broken(setting, averaged(terms), draft, x, ray)


def _forbidden(setting: Setting, terms: Terms, rule: Rule) -> str | None:
    """Why the decision demand does not allow a rule."""
    if terms.decision == "table":
        return "a rule other than the given table is listed" if rule.indices else None
    if not rule.indices:
        return "the given table is listed, but is not what the terms ask for"
    if terms.decision == "efficient" and not _same(rule.indices[0], welfare_index(setting)):
        return "a listed rule does not start with welfare"
    if terms.decision == "efficient" and rule.exceptions:
        types = np.array([at for at, _ in rule.exceptions], dtype=np.int64)
        score = rule.indices[0].at(types)
        taken = [option for _, option in rule.exceptions]
        if np.any(score[np.arange(len(taken)), taken] < score.max(axis=1)):
            return "a listed rule makes an exception that is not efficient"
    return None


def _same(one: Index, two: Index) -> bool:
    return np.array_equal(one.options, two.options) and all(
        np.array_equal(a, b) for a, b in zip(one.parties, two.parties, strict=True)
    )


def _program(
    setting: Setting,
    terms: Terms,
    lead: int | None,
    lies: Lies | None,
    columns: list[tuple[int, Counts]],
    document: dict[str, Any],
) -> tuple[InterimDraft, Program]:
    """The master that the scenario, the terms and the counts give, pinned at stated values."""
    inner = averaged(terms)
    draft = InterimDraft(
        setting,
        terms.decision,
        amounts_of(inner),
        lead=lead,
        columns=tuple(columns),
        lies=lies,
        chances=terms.side.chances,
    )
    return draft, rebuild(document, setting, inner, draft)


def _multipliers(document: dict[str, Any], program: Program) -> list[Vector]:
    """The multipliers over rows: of impossibility, or of every stage that is said to be settled.

    Those that are all 0 bound the goal without looking at decisions.
    """
    plain = [document["farkas"]] if "farkas" in document else []
    plain += [stage["dual"] for stage in document["stages"] if "dual" in stage]
    return [_vector(vector, program.matrix.rows) for vector in plain if vector["idx"]]


def _vector(plain: dict[str, Any], size: int) -> Vector:
    numbers = tuple(map(_whole, plain["num"]))
    return Vector(_whole(plain["den"]), tuple(plain["idx"]), numbers, size)


def _whole(value: int | str) -> int:
    return int(value, 16) if isinstance(value, str) else value


def _better(
    setting: Setting,
    terms: Terms,
    lead: int | None,
    program: Program,
    multipliers: Vector,
    watch: Watch,
) -> list[str]:
    """A slice in which some rule does better than the multipliers admit."""
    classes = merged(setting, terms.side.chances)
    prices = exact_prices(setting, lead, program, multipliers, classes)
    first = (welfare_index(setting),) if terms.decision == "efficient" else ()
    best = count(setting, rule_for(setting, first, prices.parties), lead, watch)
    return [
        "an unlisted rule does better"
        + ("" if lead is None else f" where {party.name} has type {party.types[g].label}")
        for g, party in enumerate([setting.parties[lead or 0]] * len(best.taken))
        if prices.worth(best, g) > prices.slices[g]
    ][:1]
