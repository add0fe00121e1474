"""The value language, against Python's own evaluation with fractions, and its borders."""

from __future__ import annotations

import itertools
from fractions import Fraction
from types import MappingProxyType

import pytest
from hypothesis import given
from hypothesis import settings as effort
from hypothesis import strategies as st

from designer.setting import profiles
from designer.setting.evaluate import Amounts, evaluate
from designer.setting.expression import (
    MAX_DEPTH,
    Arithmetic,
    ExpressionError,
    Names,
    Number,
    TypeOf,
    parse,
    references,
)
from designer.setting.setting import Type


def kind(label: str, number: int | Fraction | None, **fields: int | Fraction) -> Type:
    named = {name: Fraction(value) for name, value in fields.items()}
    return Type(label, None if number is None else Fraction(number), MappingProxyType(named))


TYPES = (
    (kind("0", 0, a=2), kind("1/2", Fraction(1, 2), a=-1), kind("3", 3, a=0)),
    (kind("low", -2, b=1), kind("high", 5, b=3)),
    (kind("named", None), kind("7", 7)),
)
PARTIES = ("Norhaven", "Suth", "Old Quay")
NAMES = Names(0, PARTIES, (frozenset({"a"}), frozenset({"b"}), frozenset()))


def worths(text: str, names: Names = NAMES) -> list[Fraction]:
    """The worth at every profile of the parties mentioned, in row-major order."""
    return listed(evaluate(parse(text, names), TYPES, PARTIES))


def listed(amounts: Amounts) -> list[Fraction]:
    return [Fraction(int(num), amounts.den) for num in amounts.num.ravel()]


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("type", [0, "1/2", 3]),
        ("0.1 + 0.2", ["3/10"]),
        ("1e-3 * 1_000", [1]),
        ("-type + +1", [1, "1/2", -2]),
        ("2 ** 3 ** 2", [512]),
        ("(type + 1) ** -2", [1, "4/9", "1/16"]),
        ("0 ** 0", [1]),
        ("7 / 2 - 1 / 2", [3]),
        ("min(type, 1, a)", [0, -1, 0]),
        ("max(type, 1)", [1, 1, 3]),
        ("abs(a - type)", [2, "3/2", 3]),
        ("1 if 0 < type < 3 else 2", [2, 1, 2]),
        ("1 if type == 0 or not a < 0 else 2", [1, 2, 1]),
        ("1 / type if type != 0 else 0", [0, 2, "1/3"]),
        ("1 if type != 0 and 1 / type > 1 else 0", [0, 1, 0]),
        ("1 if type == 0 or 1 / type > 1 else 0", [1, 1, 0]),
        ("types.Suth", [-2, 5]),
        ("types.Suth.b", [1, 3]),
        ('types["Suth"].b', [1, 3]),
        ("types.Norhaven", [0, "1/2", 3]),
        ("types.Suth * type", [0, 0, -1, "5/2", -6, 15]),
        ("1\n + 1", [2]),
    ],
)
def test_worths(text: str, expected: list[int | str]) -> None:
    assert worths(text) == [Fraction(value) for value in expected]


def test_the_tree_is_our_own_and_exact() -> None:
    tree = parse("0.1 * a", NAMES)
    assert tree == Arithmetic("*", Number(Fraction(1, 10)), TypeOf(0, "a"), "0.1 * a")
    assert references(parse("type + types.Suth if types['Old Quay'] > 1 else 2", NAMES)) == {
        0,
        1,
        2,
    }


def test_a_missing_number_counts_only_where_it_is_taken() -> None:
    assert worths('types["Old Quay"] if type < 0 else 4')[:2] == [4, 4]
    with pytest.raises(ExpressionError, match="a type of Old Quay, 'named', that has no number"):
        worths('types["Old Quay"]')


def test_faults_name_the_first_profile_that_has_them() -> None:
    with pytest.raises(ExpressionError, match=r"a division by zero at Norhaven = 3, Suth = high$"):
        worths("1 / (15 - type * types.Suth)")


def test_a_party_is_found_by_its_exact_name_before_its_folded_one() -> None:
    # Python folds identifiers to NFKC: "ﬁ" (a ligature) becomes "fi".
    folded = Names(0, ("\ufb01n",), (frozenset(),))
    assert parse("types.\ufb01n", folded) == TypeOf(0, None)
    both = Names(0, ("\ufb01n", "fin"), (frozenset(), frozenset()))
    assert parse("types.fin", both) == TypeOf(1, None)
    assert parse('types["\ufb01n"]', both) == TypeOf(0, None)


@pytest.mark.parametrize(
    "text",
    [
        "",
        "type type",
        "1) + (2",
        "type # a comment\n + 1",
        "f'{type}'",
        "'low'",
        "1j",
        "True",
        "None",
        "...",
        "type // 2",
        "type % 2",
        "type @ 2",
        "~type",
        "type | 1",
        "[type]",
        "(type, 1)",
        "{type}",
        "lambda: 1",
        "[x for x in (1,)]",
        "(x := 3)",
        "type if type else 1",
        "1 if type is 0 else 1",
        "1 if type in (0, 1) else 1",
        "type < 3",
        "(type < 3) + 1",
        "not type",
        "min(type)",
        "max(*type)",
        "abs(type, 1)",
        "abs(x=type)",
        "sum(type, 1)",
        "type.real",
        "type()",
        "types",
        "types()",
        "types.Suth.b.c",
        "types.Suth[0]",
        "types[0]",
        "types[type]",
        "types['Suth'].__class__",
        "a.b",
        "__import__('os').system('true')",
        "().__class__",
        "open('x')",
        "1e9999",
        "0777",
        "a" * 5000,
        "(" * 300 + "1" + ")" * 300,
        "-" * 3999 + "1",
        "not " * 900 + "1",
        "[" * 3000,
        "lambda:" * 500 + "1",
        "x." * 1900 + "x",
        " + ".join(["1"] * 400),
        "1 if " * 300 + "1" + " else 1" * 300,
        "\0",
        "\ud800",
    ],
)
def test_what_is_not_in_the_language_is_refused(text: str) -> None:
    with pytest.raises(ExpressionError):
        parse(text, NAMES)


@pytest.mark.parametrize(
    "text",
    [
        "9 ** 9 ** 9",
        "10 ** 1001",
        "2 ** 0.5",
        "(2 ** 1000) ** 11",
        "(((2 ** 900) ** 10) + 1) * 2 ** 999 * 2 ** 999",
        "1 / 3 ** 1000 / 7 ** 1000 / 11 ** 1000 / 13 ** 1000",
    ],
)
def test_numbers_that_would_grow_without_bound_are_refused(text: str) -> None:
    with pytest.raises(ExpressionError):
        worths(text)


def test_depth_is_bounded_and_what_is_within_is_read() -> None:
    deep = "+".join(["1"] * (MAX_DEPTH - 1))
    assert worths(deep) == [MAX_DEPTH - 1]


def test_numbers_beyond_64_bits_stay_exact() -> None:
    big = 2**61
    assert worths(f"{big} * {big} + type") == [
        big * big + Fraction(value) for value in (0, "1/2", 3)
    ]
    assert worths(f"{2**62 - 1} + {2**62 - 1} + {2**62}") == [2**63 + 2**62 - 2]


# The same expression in two spellings: ours, and Python's with every literal a Fraction.
Twin = tuple[str, str]
LEAVES: list[Twin] = [
    ("type", "own"),
    ("a", "field"),
    ("types.Suth", "other"),
    ("types.Suth.b", "other_field"),
    *((str(number), f"F({number})") for number in (0, 1, 2, 7, 2**40)),
    ("0.1", "F('0.1')"),
    ("2.5e-3", "F('2.5e-3')"),
]


def twins(leaf: st.SearchStrategy[Twin]) -> st.SearchStrategy[Twin]:
    def join(pattern: str, *parts: Twin) -> Twin:
        return pattern.format(*(p[0] for p in parts)), pattern.format(*(p[1] for p in parts))

    pair = st.tuples(leaf, leaf)
    binary = st.sampled_from(("({} + {})", "({} - {})", "({} * {})", "({} / {})", "min({}, {})"))
    test = st.sampled_from(
        ("{} < {}", "{} <= {} < 3", "{} == {}", "not {} > {}", "{} != 1 and {} >= 0 or 1 > 2")
    )
    return st.one_of(
        st.builds(lambda form, two: join(form, *two), binary, pair),
        st.builds(lambda part, power: join(f"({{}} ** {power})", part), leaf, st.integers(-2, 3)),
        st.builds(lambda part: join("(-{})", part), leaf),
        st.builds(lambda part: join("abs({})", part), leaf),
        st.builds(
            lambda form, two, yes, no: join(f"({{}} if {form} else {{}})", yes, *two, no),
            test,
            pair,
            leaf,
            leaf,
        ),
    )


@given(st.recursive(st.sampled_from(LEAVES), twins, max_leaves=12))
@effort(max_examples=300, deadline=None)
def test_python_with_fractions_gives_the_same_worths(twin: Twin) -> None:
    ours, python = twin
    tree = parse(ours, NAMES)
    expected = []
    by_zero = False
    for own, other in itertools.product(TYPES[0], TYPES[1]):
        known = {
            "F": Fraction,
            "own": own.number,
            "field": own.fields["a"],
            "other": other.number,
            "other_field": other.fields["b"],
        }
        try:
            expected.append(Fraction(eval(python, known)))  # noqa: S307  the reference
        except ZeroDivisionError:
            by_zero = True
    if by_zero:
        with pytest.raises(ExpressionError, match=r"a division by zero|binary digits"):
            evaluate(tree, TYPES, PARTIES)
    elif max(abs(worth.numerator).bit_length() for worth in expected) < 200:
        amounts = evaluate(tree, TYPES, PARTIES)
        spread = profiles.spread(amounts.num, amounts.axes, (3, 2))
        assert [Fraction(int(num), amounts.den) for num in spread] == expected


@given(st.text(alphabet="typesSuthab0123.+-*/()<>=, \"'[]ifelsmnx_\n#λ", max_size=60))
@effort(max_examples=500, deadline=None)
def test_no_text_does_more_than_be_refused(text: str) -> None:
    refused = None
    try:
        amounts = evaluate(parse(text, NAMES), TYPES, PARTIES)
    except ExpressionError as caught:
        refused = caught
    if refused is None:
        assert amounts.den >= 1
    else:
        assert all((refused.found, refused.expected, refused.remedy))
