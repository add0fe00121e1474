"""What is asked: `Demands` names the overrides, `Terms` is the full list they settle into."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, fields
from fractions import Fraction
from typing import Any

from designer.errors import Mistake, UsageError
from designer.setting.exact import number, text
from designer.setting.setting import Limits, Setting, Side
from designer.setting.vocabulary import CHOICES, GOALS

Amount = Fraction | int | str
SHOWN = 60
"""Characters of a mistaken word that are repeated to whoever wrote it."""


@dataclass(frozen=True)
class Terms:
    """Every demand and goal, settled; amounts are exact money in the scenario's unit.

    decision, ic, ir, balance, budget, tidy   one word each, see `designer.setting.vocabulary`
    goals      optimised one after the other (lexicographic)
    subsidy    outside money S: the pot must be -S (exact) or at least -S (no-deficit)
    slack      tolerated gain from a lie: honest minus lying >= -slack
    shortfall  tolerated loss from taking part: gain over staying out >= -shortfall
    compelled  parties of whom participation is not asked
    trusted    parties of whom honesty is not asked
    blend      weights of the goal `blend`, by "worth", "pot", "parties" or a party's name
    """

    decision: str = "efficient"
    ic: str = "bayesian"
    ir: str = "interim"
    balance: str = "ex-post"
    budget: str = "exact"
    goals: tuple[str, ...] = ("any",)
    subsidy: Fraction = Fraction(0)
    slack: Fraction = Fraction(0)
    shortfall: Fraction = Fraction(0)
    tidy: str = "auto"
    even_handed: bool = False
    compelled: frozenset[str] = frozenset()
    trusted: frozenset[str] = frozenset()
    limits: Limits = field(default_factory=Limits)
    side: Side = field(default_factory=Side)
    blend: tuple[tuple[str, Fraction], ...] = ()


@dataclass(frozen=True)
class Demands:
    """Overrides of a scenario's own demands; whatever is None stays as the scenario says.

    `goal` is a name, several separated by commas, or a sequence of names. Amounts may be
    int, Fraction or exact text such as "1/3" or "0.25"; floats are refused (convention 7).

    >>> Demands(ir="none", goal="welfare,swing").goal
    'welfare,swing'
    """

    decision: str | None = None
    ic: str | None = None
    ir: str | None = None
    balance: str | None = None
    budget: str | None = None
    goal: str | tuple[str, ...] | list[str] | None = None
    subsidy: Amount | None = None
    slack: Amount | None = None
    tidy: str | None = None
    even_handed: bool | None = None
    compelled: frozenset[str] | None = None
    limits: Limits | None = None
    side: Side | None = None
    blend: Mapping[str, Amount] | None = field(default=None, hash=False)

    def over(self, setting: Setting) -> Terms:
        """The full terms: these overrides on top of the scenario's own demands.

        Raises UsageError (all mistakes at once) for words, amounts or combinations that
        cannot be asked of this setting.
        """
        chosen: dict[str, Any] = dict(setting.asked)
        for entry in fields(self):
            value = getattr(self, entry.name)
            if value is not None:
                chosen[entry.name] = value
        mistakes: list[Mistake] = []
        settled = _settle(chosen, setting, mistakes)
        if not mistakes:
            mistakes = list(_clashes(settled, setting))
        if mistakes:
            raise UsageError(mistakes)
        return settled


def _settle(chosen: dict[str, Any], setting: Setting, mistakes: list[Mistake]) -> Terms:
    settled: dict[str, Any] = {
        "compelled": frozenset(p.name for p in setting.parties if p.compelled),
        "limits": setting.limits,
        "side": setting.side,
    }
    for key, value in chosen.items():
        place = f"demands.{key}"
        if key in CHOICES:
            if value not in (*CHOICES[key], *(("auto",) if key == "tidy" else ())):
                mistakes.append(
                    Mistake(place, _brief(value), f"one of {', '.join(CHOICES[key])}", "Pick one.")
                )
            settled[key] = value
        elif key == "goal":
            names = value.split(",") if isinstance(value, str) else list(value)
            settled["goals"] = tuple(str(name).strip() for name in names)
            mistakes.extend(_goal_mistakes(settled["goals"]))
        elif key in ("subsidy", "slack"):
            settled[key] = _amount(value, place, mistakes)
        elif key == "compelled":
            settled[key] = frozenset((value,) if isinstance(value, str) else value)
        elif key == "blend":
            settled[key] = tuple(
                (name, _amount(weight, f"goal.blend.{name}", mistakes))
                for name, weight in value.items()
            )
        else:
            settled[key] = value
    return Terms(**settled)


def _goal_mistakes(goals: tuple[str, ...]) -> list[Mistake]:
    mistakes = [
        Mistake(
            "demands.goal", _brief(name), f"names among {', '.join(GOALS)}", "Pick from the list."
        )
        for name in goals
        if name not in GOALS
    ]
    if len(set(goals)) < len(goals):
        mistakes.append(
            Mistake(
                "demands.goal", _brief(",".join(goals)), "each goal once", "Drop the repeated goal."
            )
        )
    if not goals:
        mistakes.append(Mistake("demands.goal", "an empty list", "a goal", 'Write "any".'))
    return mistakes


def _brief(value: object) -> str:
    """What was found, as written, cut where it gets long."""
    found = repr(value)
    return found if len(found) <= SHOWN else f"{found[:SHOWN]}…"


def _amount(value: object, place: str, mistakes: list[Mistake]) -> Fraction:
    if isinstance(value, (int, Fraction)) and not isinstance(value, bool):
        return Fraction(value)
    if isinstance(value, str):  # by the scenario's own reader: Fraction alone would sit
        try:  # for hours over "1e999999999"
            return number(value)
        except ValueError:
            pass
    mistakes.append(
        Mistake(
            place,
            _brief(value),
            "an exact amount: an integer, a decimal or a fraction as text",
            'Write 3, "0.25" or "1/4"; a Python float is not exact.',
        )
    )
    return Fraction(0)


def _clashes(terms: Terms, setting: Setting) -> list[Mistake]:
    """Combinations that cannot be asked, each with its remedy."""
    found: list[Mistake] = []
    if terms.decision == "table" and setting.rule is None:
        found.append(
            Mistake(
                "demands.decision",
                "'table' but the scenario gives no decision rule",
                '[[rule]] entries, or rule = "rule.csv"',
                "Give the rule, or ask for another decision.",
            )
        )
    if "outside-money" in terms.goals and terms.balance == "none":
        found.append(
            Mistake(
                "demands.goal",
                "'outside-money' with balance 'none'",
                "a balance demand, which outside money then relaxes",
                "Add --balance ex-ante or ex-post, or use the goal revenue.",
            )
        )
    if "margin" in terms.goals and terms.ic == "none":
        found.append(
            Mistake(
                "demands.goal",
                "'margin' with ic 'none'",
                "an honesty demand, whose margin is then widened",
                "Add --ic bayesian or dominant.",
            )
        )
    low, high = terms.limits.pays_at_least, terms.limits.pays_at_most
    if low is not None and high is not None and low > high:
        found.append(
            Mistake(
                "limits.pays_at_least",
                f"{text(low)}, above pays_at_most = {text(high)}",
                "a floor that is not above the cap",
                "Raise the cap or lower the floor.",
            )
        )
    if (
        terms.limits.only_when_served
        and terms.limits.pays_at_most is None
        and terms.decision != "table"
    ):
        found.append(
            Mistake(
                "limits.only_when_served",
                "no pays_at_most beside it",
                "a cap, which bounds what is collected upon service",
                "Add pays_at_most to [limits]; a generous one will do.",
            )
        )
    if "blend" in terms.goals and not terms.blend:
        found.append(
            Mistake(
                "demands.goal",
                "'blend' without weights",
                "[goal] blend = { worth = 1, pot = -1, … }",
                "Give the weights in the scenario's [goal] table.",
            )
        )
    names = {party.name for party in setting.parties}
    for name in sorted(terms.compelled - names):
        found.append(
            Mistake(
                "demands.compelled",
                repr(name),
                f"one of {', '.join(sorted(names))}",
                "Name a party.",
            )
        )
    for name, _ in terms.blend:
        if name not in names | {"worth", "pot", "parties"}:
            found.append(
                Mistake(
                    f"goal.blend.{name}",
                    repr(name),
                    f"worth, pot, parties or one of {', '.join(sorted(names))}",
                    "Name a party.",
                )
            )
    return found
