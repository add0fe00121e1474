"""Groups of parties that are alike in the setting and in everything that is asked.

Trading places within the groups is a finite group of symmetries of the whole program: averaging
a table over it keeps every demand (they are linear) and every goal's value, and gives a table
that treats the alike parties alike. So the program may take payments and probabilities that
only differ by such trades as one unknown, and lose nothing.
"""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from designer.demands.terms import Terms
from designer.program.linear import IndexArray
from designer.setting.likeness import Twins, swapped, twins
from designer.setting.setting import Setting


@dataclass(frozen=True, eq=False)
class Likeness:
    """Who may trade places, and what becomes of the options then.

    groups  every party once, single ones too; members in file order
    moves   per pair of neighbours (i, j) in a group, int (K,): x_k(theta) = x_moves[k](theta with
            the types of i and j traded)
    """

    groups: tuple[tuple[int, ...], ...]
    moves: dict[tuple[int, int], IndexArray]

    @property
    def steps(self) -> list[tuple[int, int]]:
        """The pairs of neighbours, group by group."""
        return [(i, j) for group in self.groups for i, j in itertools.pairwise(group)]

    @property
    def still(self) -> bool:
        """Whether no option ever moves."""
        return all(np.array_equal(move, np.arange(len(move))) for move in self.moves.values())

    def group_of(self, party: int) -> tuple[int, ...]:
        """The group that a party is in."""
        return next(group for group in self.groups if party in group)

    def trade(self, group: tuple[int, ...], p: int, q: int) -> IndexArray:
        """What becomes of the options when the members at places p < q of a group trade, (K,)."""
        move = self.moves[group[q - 1], group[q]]
        for r in range(q - 2, p - 1, -1):
            step = self.moves[group[r], group[r + 1]]
            move = step[move[step]]
        return move

    def same_to(self, party: int, options: int) -> tuple[IndexArray, IndexArray]:
        """Options that trades among all others make of one another: the first, and how many.

        Both int (K,): a party of given type meets all of them with the same probability.
        """
        first = np.arange(options, dtype=np.int64)
        trades = []
        for group in self.groups:
            others = [place for place, member in enumerate(group) if member != party]
            trades += [self.trade(group, p, q) for p, q in itertools.pairwise(others)]
        before = None
        while before is None or not np.array_equal(before, first):
            before = first
            for trade in trades:
                first = np.minimum(first, first[trade])
        return first, np.bincount(first, minlength=options)[first]

    def plain(self) -> dict[str, Any]:
        """As JSON-ready values."""
        return {
            "groups": [list(group) for group in self.groups],
            "moves": [[i, j, self.moves[i, j].tolist()] for i, j in self.steps],
        }


def likeness(setting: Setting, terms: Terms) -> Likeness | str:
    """The groups of alike parties under some demands, or why there is nothing to gain.

    The setting must have independent priors and private worths.
    """

    def asked_alike(pair: Twins) -> bool:
        return _same_terms(setting, terms, pair) and _same_rule(setting, terms, pair)

    found = _grouped(len(setting.parties), list(twins(setting, asked_alike)))
    if not found.moves:
        return "no two parties are alike"
    if not coherent(found):
        return "options that nothing tells apart leave open what a trade of places does to them"
    return found


def from_plain(plain: dict[str, Any], setting: Setting) -> Likeness:
    """The groups that `Likeness.plain` wrote. Raises ValueError where they make no sense."""
    parties, options = len(setting.parties), len(setting.options)
    groups = tuple(tuple(int(i) for i in group) for group in plain["groups"])
    moves = {
        (int(i), int(j)): np.array([int(k) for k in move], dtype=np.int64)
        for i, j, move in plain["moves"]
    }
    found = Likeness(groups, moves)
    shapes = [{setting.shape[i] for i in group} for group in groups]
    sound = (
        sorted(i for group in groups for i in group) == list(range(parties))
        and all(len(shape) == 1 for shape in shapes)
        and sorted(found.steps) == sorted(moves)
        and all(sorted(move.tolist()) == list(range(options)) for move in moves.values())
        and coherent(found)
    )
    if not sound:
        raise ValueError("the groups of alike parties make no sense")
    return found


def coherent(found: Likeness) -> bool:
    """Whether the moves of the options obey the rules that trades of neighbours obey.

    s s = 1,  s t s = t s t for neighbouring trades,  s t = t s for others (Coxeter): then every
    way of putting parties in order moves the options alike.
    """
    steps = found.steps
    for place, pair in enumerate(steps):
        s = found.moves[pair]
        if not np.array_equal(s[s], np.arange(len(s))):
            return False
        for other in steps[place + 1 :]:
            t = found.moves[other]
            near = bool(set(pair) & set(other))
            if not np.array_equal(s[t[s]] if near else s[t], t[s[t]] if near else t[s]):
                return False
    return True


def _grouped(parties: int, pairs: Sequence[Twins]) -> Likeness:
    follows = {i: j for i, j, _ in pairs}
    groups = []
    for first in sorted(set(range(parties)) - set(follows.values())):
        group = [first]
        while group[-1] in follows:
            group.append(follows[group[-1]])
        groups.append(tuple(group))
    return Likeness(tuple(groups), {(i, j): move for i, j, move in pairs})


def _same_terms(setting: Setting, terms: Terms, pair: Twins) -> bool:
    """Whether everything asked by name is asked of both alike."""
    i, j, move = pair
    one, two = setting.parties[i].name, setting.parties[j].name
    for named in (terms.trusted, terms.compelled):
        if (one in named) != (two in named):
            return False
    weights = [sum(w for name, w in terms.blend if name == party) for party in (one, two)]
    if weights[0] != weights[1]:
        return False
    order = {i: j, j: i}
    traded = [
        replace(
            chance, party=order.get(chance.party, chance.party), option=int(move[chance.option])
        )
        for chance in terms.side.chances
    ]
    return sorted(map(repr, traded)) == sorted(map(repr, terms.side.chances))


def _same_rule(setting: Setting, terms: Terms, pair: Twins) -> bool:
    """Whether the given rule, where there is one, does not tell the two apart."""
    if terms.decision != "table" or setting.rule is None:
        return True
    i, j, move = pair
    return np.array_equal(setting.rule, setting.rule[swapped(setting, i, j)][:, move])
