"""The value language: text to a small frozen tree of our own; nothing is ever run by Python.

    worth  = number | name | worth op worth | -worth | min(...) | max(...) | abs(worth)
           | worth if test else worth               op: + - * / **
    name   = type            the party's own type, as a number
           | FIELD           a field of the party's own type
           | types.PARTY     another party's type;  types["North Haven"] for any name
           | types.PARTY.FIELD
    test   = worth < worth [< worth ...] | test and test | test or test | not test
                                             comparisons: < <= > >= == !=

Numbers are exact: 0.1 is 1/10. Conditions are no numbers and numbers no conditions.
Python's `ast` module splits the text; every node is then checked and copied, and anything
outside the language is refused with its reason.
"""

from __future__ import annotations

import ast
import unicodedata
import warnings
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from typing import NoReturn, TypeAlias

from designer.setting import exact
from designer.setting.reading import suggestion

MAX_LENGTH = 4000
MAX_DEPTH = 100

RESERVED = frozenset({"type", "types", "min", "max", "abs", "name", "number"})
"""Words the language or the file keeps; no field may be called so."""


class ExpressionError(Exception):
    """Why an expression cannot be read or evaluated: found, expected, remedy."""

    def __init__(self, found: str, expected: str, remedy: str) -> None:
        """Keep the three parts; whoever reads the file adds the place."""
        super().__init__(found)
        self.found = found
        self.expected = expected
        self.remedy = remedy


@dataclass(frozen=True)
class Names:
    """What an expression may name: the parties, and the fields of each one's types.

    own      the position of the party whose worth it is; None for the designer
    fields   per party the names of its types' fields; None where they could not be read
    groups   per name that stands for several parties alike their positions
    """

    own: int | None
    parties: tuple[str | None, ...]
    fields: tuple[frozenset[str] | None, ...]
    groups: Mapping[str, tuple[int, ...]] = field(default_factory=dict)


@dataclass(frozen=True)
class Number:
    """A literal."""

    value: Fraction


@dataclass(frozen=True)
class TypeOf:
    """The number (`field` None) or a field of a party's type."""

    party: int
    field: str | None


@dataclass(frozen=True)
class Negate:
    """Minus a worth."""

    part: Worth


@dataclass(frozen=True)
class Arithmetic:
    """left op right; `text` is the source, for messages."""

    op: str
    left: Worth
    right: Worth
    text: str


@dataclass(frozen=True)
class Extreme:
    """The smallest (`largest` False) or largest of several worths."""

    largest: bool
    parts: tuple[Worth, ...]


@dataclass(frozen=True)
class Absolute:
    """The absolute value of a worth."""

    part: Worth


@dataclass(frozen=True)
class Choice:
    """yes if test else no; only the branch taken at a profile is evaluated there."""

    test: Test
    yes: Worth
    no: Worth


@dataclass(frozen=True)
class Comparison:
    """parts[0] ops[0] parts[1] ops[1] ...: every neighbouring pair must hold."""

    parts: tuple[Worth, ...]
    ops: tuple[str, ...]


@dataclass(frozen=True)
class Logic:
    """All (`every` True) or any of several tests, from left to right until decided."""

    every: bool
    parts: tuple[Test, ...]


@dataclass(frozen=True)
class Not:
    """The opposite of a test."""

    part: Test


Worth: TypeAlias = Number | TypeOf | Negate | Arithmetic | Extreme | Absolute | Choice
Test: TypeAlias = Comparison | Logic | Not

_ARITHMETIC: dict[type[ast.operator], str] = {
    ast.Add: "+",
    ast.Sub: "-",
    ast.Mult: "*",
    ast.Div: "/",
    ast.Pow: "**",
}
_COMPARE: dict[type[ast.cmpop], str] = {
    ast.Lt: "<",
    ast.LtE: "<=",
    ast.Gt: ">",
    ast.GtE: ">=",
    ast.Eq: "==",
    ast.NotEq: "!=",
}
_LANGUAGE = "numbers, type, fields, types.PARTY, + - * / **, min, max, abs, comparisons, if-else"


def parse(text: str, names: Names) -> Worth:
    """The tree of an expression; ExpressionError when it is not in the language.

    >>> names = Names(0, ("Suth",), (frozenset({"a"}),))
    >>> parse("0.1 * a", names).right
    TypeOf(party=0, field='a')
    """
    source = text.strip()
    if len(source) > MAX_LENGTH:
        raise ExpressionError(
            f"an expression of {len(source):,} characters",
            f"at most {MAX_LENGTH:,}",
            "Give a list with one worth per type instead.",
        )
    if "\n" in source and "#" in source:
        raise ExpressionError(
            "a '#' in an expression of several lines",
            "an expression alone",
            "Move the comment outside the quotes.",
        )
    source = " ".join(source.splitlines())
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # Python's advice on odd spacing is not for our users
            tree = ast.parse(source, mode="eval")
        return _Copier(source, names).worth(tree.body)
    except (SyntaxError, ValueError, MemoryError, RecursionError) as failure:
        reason = failure.msg if isinstance(failure, SyntaxError) else "it cannot be split"
        raise ExpressionError(
            f"{shorten(source)}, which does not read as an expression ({reason})",
            f"an expression of {_LANGUAGE}",
            'Names that are not plain words are written types["North Haven"].',
        ) from None


def references(tree: Worth | Test) -> frozenset[int]:
    """The parties whose types a tree mentions."""
    match tree:
        case Number():
            return frozenset()
        case TypeOf():
            return frozenset({tree.party})
        case Negate() | Absolute() | Not():
            return references(tree.part)
        case Arithmetic():
            return references(tree.left) | references(tree.right)
        case Extreme() | Comparison() | Logic():
            return frozenset[int]().union(*map(references, tree.parts))
        case Choice():
            return references(tree.test) | references(tree.yes) | references(tree.no)


def shorten(source: str) -> str:
    """The source in quotes, cut when long."""
    return repr(source) if len(source) <= 60 else f"{source[:57]!r}…"


class _Copier:
    """Copies Python's tree into ours, refusing what is not in the language."""

    def __init__(self, source: str, names: Names) -> None:
        self.source = source
        self.names = names
        self.depth = 0

    def worth(self, node: ast.expr) -> Worth:
        """A node that must be a number."""
        self.depth += 1
        if self.depth > MAX_DEPTH:
            self.refuse(
                f"more than {MAX_DEPTH} levels are nested", "Simplify it, or give a list of worths."
            )
        tree = self._worth(node)
        self.depth -= 1
        return tree

    def _worth(self, node: ast.expr) -> Worth:
        match node:
            case ast.Constant(value=bool() | None):
                self.refuse(f"{self.segment(node)} is no number", "Write a number or an if-else.")
            case ast.Constant(value=int() | float()):
                return self.literal(node)
            case ast.Name(id=name):
                return self.own_name(name)
            case ast.Attribute() | ast.Subscript():
                return self.other_type(node)
            case ast.UnaryOp(op=ast.USub()):
                return Negate(self.worth(node.operand))
            case ast.UnaryOp(op=ast.UAdd()):
                return self.worth(node.operand)
            case ast.BinOp() if type(node.op) in _ARITHMETIC:
                op = _ARITHMETIC[type(node.op)]
                left, right = self.worth(node.left), self.worth(node.right)
                return Arithmetic(op, left, right, self.segment(node))
            case ast.Call():
                return self.call(node)
            case ast.IfExp():
                return Choice(self.test(node.test), self.worth(node.body), self.worth(node.orelse))
            case ast.Compare() | ast.BoolOp() | ast.UnaryOp(op=ast.Not()):
                self.refuse(
                    f"{shorten(self.segment(node))} is a condition where a number belongs",
                    "Write: 1 if CONDITION else 0.",
                )
        return self.refuse(
            f"{shorten(self.segment(node))} is not in the language", f"It has {_LANGUAGE}."
        )

    def test(self, node: ast.expr) -> Test:
        """A node that must be a condition."""
        self.depth += 1
        if self.depth > MAX_DEPTH:
            self.refuse(
                f"more than {MAX_DEPTH} levels are nested", "Simplify it, or give a list of worths."
            )
        tree = self._test(node)
        self.depth -= 1
        return tree

    def _test(self, node: ast.expr) -> Test:
        match node:
            case ast.Compare() if all(type(op) in _COMPARE for op in node.ops):
                parts = tuple(self.worth(part) for part in (node.left, *node.comparators))
                return Comparison(parts, tuple(_COMPARE[type(op)] for op in node.ops))
            case ast.BoolOp():
                every = isinstance(node.op, ast.And)
                return Logic(every, tuple(self.test(part) for part in node.values))
            case ast.UnaryOp(op=ast.Not()):
                return Not(self.test(node.operand))
        return self.refuse(
            f"{shorten(self.segment(node))} is no condition",
            "Conditions are comparisons (< <= > >= == !=) joined by and, or, not.",
        )

    def literal(self, node: ast.Constant) -> Number:
        if isinstance(node.value, int):
            return Number(Fraction(node.value))
        # Python has already rounded node.value: the exact number is in the source.
        try:
            return Number(exact.number(self.segment(node).replace("_", "")))
        except ValueError:
            return self.refuse(
                f"{shorten(self.segment(node))} is no exact number", "Write fewer digits."
            )

    def own_name(self, name: str) -> TypeOf:
        own = self.names.own
        if own is None:
            return self.refuse(
                f"'{name}' has no meaning here", "The designer has no type: write a number."
            )
        if name == "type":
            return TypeOf(own, None)
        return TypeOf(own, self.field(own, name, ("type", "types")))

    def other_type(self, node: ast.Attribute | ast.Subscript) -> TypeOf:
        """types.X, types["X"], and either with .FIELD behind it."""
        steps: list[str] = []
        base: ast.expr = node
        while isinstance(base, (ast.Attribute, ast.Subscript)):
            if isinstance(base, ast.Attribute):
                steps.append(base.attr)
            elif isinstance(base.slice, ast.Constant) and isinstance(base.slice.value, str):
                steps.append(base.slice.value)
            else:
                break
            base = base.value
        if not (isinstance(base, ast.Name) and base.id == "types" and 1 <= len(steps) <= 2):
            return self.refuse(
                f"{shorten(self.segment(node))} is not in the language",
                'Write types.PARTY, types["PARTY"] or types.PARTY.FIELD.',
            )
        steps.reverse()
        party = self.party(steps[0])
        return TypeOf(party, self.field(party, steps[1], ()) if len(steps) == 2 else None)

    def party(self, name: str) -> int:
        parties = self.names.parties
        if self.names.own is None:
            self.refuse("'types' has no meaning here", "The designer's amounts depend on no type.")
        # Python folds plain words to NFKC; an exact match wins over a folded one.
        for fold in (str, lambda text: unicodedata.normalize("NFKC", text)):
            for index, known in enumerate(parties):
                if known is not None and fold(known) == fold(name):
                    return index
        if name in self.names.groups:
            members = [parties[index] for index in self.names.groups[name]]
            self.refuse(
                f"{shorten(name)} stands for {len(members)} parties alike",
                f'Name one of them: types["{members[0]}"].',
            )
        known_names = [known for known in parties if known is not None]
        return self.refuse(
            f"no party is called {shorten(name)}",
            suggestion(name, known_names) or f"The parties are {', '.join(known_names[:12])}.",
        )

    def field(self, party: int, name: str, also: Sequence[str]) -> str:
        known = self.names.fields[party]
        folded = unicodedata.normalize("NFKC", name)
        if known is None:
            return folded
        for candidate in sorted(known):
            if unicodedata.normalize("NFKC", candidate) == folded:
                return candidate
        choices = [*also, *sorted(known)]
        return self.refuse(
            f"the name {shorten(name)} is unknown",
            suggestion(name, choices)
            or (
                f"Known here: {', '.join(choices[:12])}."
                if choices
                else "Its types have no fields."
            ),
        )

    def call(self, node: ast.Call) -> Worth:
        name = node.func.id if isinstance(node.func, ast.Name) else ""
        plain = not node.keywords and not any(isinstance(arg, ast.Starred) for arg in node.args)
        if name == "abs" and plain and len(node.args) == 1:
            return Absolute(self.worth(node.args[0]))
        if name in ("min", "max") and plain and len(node.args) >= 2:
            return Extreme(name == "max", tuple(self.worth(arg) for arg in node.args))
        return self.refuse(
            f"{shorten(self.segment(node))} is not in the language",
            "Functions are abs(x), min(x, y, …) and max(x, y, …).",
        )

    def segment(self, node: ast.expr) -> str:
        return ast.get_source_segment(self.source, node) or self.source

    def refuse(self, why: str, remedy: str) -> NoReturn:
        raise ExpressionError(
            f"{shorten(self.source)}, where {why}",
            "an amount in the value language",
            remedy,
        )
