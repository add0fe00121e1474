"""Random small settings for hypothesis: every form of the scenario file, read through the door.

    @given(small_settings())                                   any small setting
    @given(small_settings(correlated=False, interdependent=False, rule=True))
    @given(scenario_texts())                             the same as text

Each switch is True (always), False (never) or None (sometimes). The text is written here,
apart from `dump`, in whatever form the draw picks: prior or weights, numbers, expressions or
lists, entries inline. Amounts are small with small denominators, so that exact programs over
them stay cheap.
"""

from __future__ import annotations

from fractions import Fraction

from hypothesis import strategies as st

from designer.setting.scenario import parse_scenario
from designer.setting.setting import Setting

NAMES = ("Norhaven", "Suth", "Old Quay", "Åby-7", "worth of 'x'")
OPTIONS = ("build", "leave", "build later", "0.5", "Ünder")
LABELS = ("low", "mid", "high", "née", "1 a")


def amounts(low: int = -4, high: int = 12) -> st.SearchStrategy[Fraction]:
    """Exact amounts between two integers, over denominators 1, 2, 3 and 10."""
    return st.builds(
        Fraction,
        st.integers(low, high),
        st.sampled_from((1, 1, 1, 2, 3, 10)),
    )


def small_settings(
    *,
    min_parties: int = 1,
    max_parties: int = 3,
    max_types: int = 3,
    min_options: int = 1,
    max_options: int = 3,
    correlated: bool | None = None,
    interdependent: bool | None = None,
    rule: bool | None = None,
    outlay: bool | None = None,
    outside: bool | None = None,
    compelled: bool | None = None,
    extras: bool | None = False,
) -> st.SearchStrategy[Setting]:
    """Random small settings; `extras` adds limits, side demands, demands and notes."""
    texts = scenario_texts(
        min_parties=min_parties,
        max_parties=max_parties,
        max_types=max_types,
        min_options=min_options,
        max_options=max_options,
        correlated=correlated,
        interdependent=interdependent,
        rule=rule,
        outlay=outlay,
        outside=outside,
        compelled=compelled,
        extras=extras,
    )
    return texts.map(parse_scenario)


@st.composite
def scenario_texts(
    draw: st.DrawFn,
    *,
    min_parties: int = 1,
    max_parties: int = 3,
    max_types: int = 3,
    min_options: int = 1,
    max_options: int = 3,
    correlated: bool | None = None,
    interdependent: bool | None = None,
    rule: bool | None = None,
    outlay: bool | None = None,
    outside: bool | None = None,
    compelled: bool | None = None,
    extras: bool | None = True,
) -> str:
    """Random small scenario files, as text without a mistake in it."""

    def switch(wanted: bool | None) -> bool:
        return draw(st.booleans()) if wanted is None else wanted

    count = draw(st.integers(min_parties, max_parties))
    names = list(NAMES[:count])
    options = list(OPTIONS[: draw(st.integers(min_options, max_options))])
    sketch = _Sketch(draw, names, options, max_types)
    lines = ['title = "Drawn"']
    with_extras = switch(extras)
    if with_extras:
        lines += ['money = "crowns"', "note = '''\nTwo \"lines\",\nno more'''"]
        lines.append(draw(st.sampled_from(('profiles = "all"', 'profiles = "support"'))))
    lines.append(f"decisions.options = {_list(options)}")
    if switch(outlay):
        shares = ", ".join(f"{_quoted(k)} = {sketch.number(0, 9)}" for k in options)
        lines.append(f"[designer]\noutlay = {{ {shares} }}")
        lines.append(f"worth = {{ {_quoted(options[-1])} = {sketch.number(0, 9)} }}")
    joint = switch(correlated)
    others = switch(interdependent)
    for i in range(count):
        lines += sketch.party(i, joint, others, switch(outside), switch(compelled))
    if joint:
        lines += sketch.joint()
    if switch(rule):
        lines += sketch.rule()
    if with_extras:
        lines += sketch.extras()
    return "\n".join(lines) + "\n"


class _Sketch:
    """One draw: the parties and options so far, and the pieces of text drawn from them."""

    def __init__(
        self, draw: st.DrawFn, names: list[str], options: list[str], max_types: int
    ) -> None:
        self.draw = draw
        self.names = names
        self.options = options
        self.numeric = [draw(st.booleans()) for _ in names]
        self.labels: list[list[str]] = []
        for numeric in self.numeric:
            size = draw(st.integers(1, max_types))
            if numeric:
                drawn = draw(st.lists(amounts(), min_size=size, max_size=size, unique=True))
                self.labels.append([_exact(value) for value in drawn])
            else:
                self.labels.append([_quoted(label) for label in LABELS[:size]])

    def number(self, low: int, high: int) -> str:
        return _exact(self.draw(amounts(low, high)))

    def party(self, i: int, joint: bool, others: bool, outside: bool, compelled: bool) -> list[str]:
        labels = self.labels[i]
        lines = ["[[party]]", f"name = {_quoted(self.names[i])}"]
        if self.numeric[i]:
            lines.append(f"types = [{', '.join(labels)}]")
        else:  # named types carry a number and a field for the expressions
            tables = (
                f"{{ name = {label}, number = {self.number(-4, 12)}, b = {self.number(0, 4)} }}"
                for label in labels
            )
            lines.append(f"types = [{', '.join(tables)}]")
        if not joint:
            weights = [self.draw(st.integers(1, 4)) for _ in labels]
            if self.draw(st.booleans()):
                lines.append(f"weights = {weights}")
            else:
                shares = (_exact(Fraction(weight, sum(weights))) for weight in weights)
                lines.append(f"prior = [{', '.join(shares)}]")
        worths = (f"{_quoted(option)} = {self.worth(i, others)}" for option in self.options)
        lines.append(f"value = {{ {', '.join(worths)} }}")
        if outside:
            lines.append(f"outside = {self.worth(i, others)}")
        if compelled:
            lines.append("compelled = true")
        return lines

    def worth(self, i: int, others: bool) -> str:
        form = self.draw(
            st.sampled_from(("number", "own", "list", *(("other",) if others else ())))
        )
        if form == "number":
            return self.number(-4, 12)
        if form == "list":
            return f"[{', '.join(self.number(-4, 12) for _ in self.labels[i])}]"
        terms = ["type", "max(type, 2) / 3", "abs(type - 5)", "type if type > 2 else -1"]
        if not self.numeric[i]:
            terms += ["type * b", "b ** 2"]
        if form == "other":
            j = self.draw(st.integers(0, len(self.names) - 1))
            other = f'types["{self.names[j]}"]'
            terms = [f"type + 0.5 * {other}", f"min(type, {other})", f"{other} / 3 + 1"]
        return f"'''{self.draw(st.sampled_from(terms))}'''"

    def at(self, positions: tuple[int, ...]) -> str:
        pairs = zip(self.names, positions, self.labels, strict=True)
        return ", ".join(f"{_quoted(name)} = {labels[a]}" for name, a, labels in pairs)

    def profiles(self) -> list[tuple[int, ...]]:
        found: list[tuple[int, ...]] = [()]
        for labels in self.labels:
            found = [(*start, a) for start in found for a in range(len(labels))]
        return found

    def joint(self) -> list[str]:
        """Weights with holes, but none that would leave a type without probability."""
        lines = []
        seen: list[set[int]] = [set() for _ in self.names]
        for positions in self.profiles():
            fresh = any(a not in seen[i] for i, a in enumerate(positions))
            weight = self.draw(st.integers(1 if fresh else 0, 4))
            if weight:
                for i, a in enumerate(positions):
                    seen[i].add(a)
                lines.append(f"[[joint]]\nat = {{ {self.at(positions)} }}\nweight = {weight}")
        return lines

    def rule(self) -> list[str]:
        lines = []
        profiles = self.draw(st.permutations(self.profiles()))
        rest = self.draw(st.booleans())
        for positions in profiles[: -1 if rest else None]:
            lines.append(f"[[rule]]\nat = {{ {self.at(positions)} }}\ntake = {self.take()}")
        if rest:
            lines.append(f"[[rule]]\ntake = {self.take()}")
        return lines

    def take(self) -> str:
        option = self.draw(st.sampled_from(self.options))
        if self.draw(st.booleans()):
            return _quoted(option)
        shares = [self.draw(st.integers(0, 2)) for _ in self.options]
        shares[0] += 1
        pairs = zip(self.options, shares, strict=True)
        lottery = (f"{_quoted(k)} = {_exact(Fraction(s, sum(shares)))}" for k, s in pairs)
        return f"{{ {', '.join(lottery)} }}"

    def extras(self) -> list[str]:
        pick = self.draw
        words = {
            "ic": ("none", "bayesian", "dominant"),
            "ir": ("none", "ex-ante", "interim", "ex-post"),
            "balance": ("none", "ex-ante", "ex-post"),
            "budget": ("exact", "no-deficit"),
        }
        lines = ["[demands]"]
        lines += [f'{key} = "{pick(st.sampled_from(choice))}"' for key, choice in words.items()]
        goals = ('"floor, swing"', '["any"]', '"blend"')
        lines.append(f"goal = {pick(st.sampled_from(goals))}")
        lines.append(f"subsidy = {self.number(0, 3)}")
        lines.append(f"[goal]\nblend = {{ pot = -1, {_quoted(self.names[0])} = 2 }}")
        lines.append(f"[limits]\npays_at_most = {self.number(20, 30)}\nwithin_worth = true")
        lines.append(f"[side]\nwelfare_at_least = {self.number(-9, 0)}")
        lines.append(f"[[side.chance]]\nparty = {_quoted(self.names[0])}")
        lines.append(f"type = {self.labels[0][0]}\noption = {_quoted(self.options[0])}")
        lines.append(pick(st.sampled_from(('exactly = "1/3"', "at_least = 0.25\nat_most = 1"))))
        return lines


def _exact(value: Fraction) -> str:
    """An integer, a decimal where there is one, or a fraction in quotes."""
    if value.denominator == 1:
        return str(value.numerator)
    if 10 % value.denominator == 0:
        tenths = value * 10
        sign = "-" if tenths < 0 else ""
        whole, part = divmod(abs(tenths.numerator), 10)
        return f"{sign}{whole}.{part}"
    return f'"{value}"'


def _list(texts: list[str]) -> str:
    return f"[{', '.join(map(_quoted, texts))}]"


def _quoted(text: str) -> str:
    return f'"{text}"'
