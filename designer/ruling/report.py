"""The classic rules of a setting, built, audited and set beside the proved optimum."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from designer.demands.terms import Demands, Terms
from designer.engines.watch import Progress
from designer.errors import Mistake, UsageError
from designer.ruling.judged import Judged, judged
from designer.ruling.kinds import Refusal, Rule
from designer.ruling.registry import RULES
from designer.setting.setting import Setting
from designer.table import Table
from designer.verdict import Verdict


@dataclass(frozen=True, eq=False)
class RuleResult:
    """One rule on one setting: either why it does not apply, or its judged table.

    notes  what its making settled: how ties were broken, the price, the size of a bet
    """

    rule: Rule
    why_not: Refusal | None = None
    judged: Judged | None = None
    notes: tuple[str, ...] = ()

    @property
    def name(self) -> str:
        """The rule's published name, in kebab case."""
        return self.rule.name

    @property
    def applies(self) -> bool:
        """Whether the rule's assumptions hold here."""
        return self.why_not is None

    @property
    def table(self) -> Table | None:
        """The rule's table; None where it does not apply."""
        return self.judged.table if self.judged else None


@dataclass(frozen=True, eq=False)
class RulesReport:
    """What `rules` returns.

    terms    the demands the tables are held to
    results  one per rule asked for, in the order of the register
    optimum  the verdict of `pose` under the same terms; None if it was not asked for
    beside   the optimum's own table in the same columns; None where there is none
    """

    setting: Setting
    terms: Terms
    results: tuple[RuleResult, ...]
    optimum: Verdict | None = None
    beside: Judged | None = None

    def __getitem__(self, name: str) -> RuleResult:
        """Look up a rule's result by its name; KeyError if it was not asked for."""
        for result in self.results:
            if result.name == name:
                return result
        raise KeyError(name)


def rules(
    setting: Setting | str | Path,
    only: Sequence[str] | None = None,
    demands: Demands | None = None,
    *,
    optimum: bool = True,
    time_limit: float | None = None,
    progress: Progress | None = None,
) -> RulesReport:
    """Build, audit and compare the classic rules.

    setting   a Setting, or the path of a scenario file
    only      names of rules; None: all of them, those that do not apply with the reason why
    demands   overrides of the scenario's own demands, for judging and for the optimum
    optimum   whether to pose the scenario as well; `time_limit` and `progress` go to `pose`

    Raises UsageError for names that are no rules, and for rules asked for by name whose
    assumptions fail here, all at once (place, found, expected, remedy).

    >>> rules("scenarios/lock-sale.toml", ["posted-price"], optimum=False).results[0].notes
    ('Prices of the deal: Guild 50, Mill -50.',)
    """
    if not isinstance(setting, Setting):
        from designer.setting.scenario import read_scenario

        setting = read_scenario(setting)
    terms = (demands or Demands()).over(setting)
    chosen = [rule for name, rule in RULES.items() if only is None or name in set(only)]
    tell = progress or _silent
    results: list[RuleResult] = []
    mistakes = _unknown(only or ())
    for step, rule in enumerate(chosen):
        tell(f"building {rule.name}", 0.0, step)
        refusal = rule.applies(setting)
        if refusal is None and not mistakes:
            built = rule.build(setting)
            found = judged(setting, built.table, terms)
            results.append(RuleResult(rule, None, found, built.notes))
            continue
        results.append(RuleResult(rule, refusal))
        if only is not None and refusal is not None:
            mistakes.append(
                Mistake(f"rule {rule.name}", refusal.found, refusal.needs, refusal.remedy)
            )
    if mistakes:
        raise UsageError(mistakes)
    verdict = beside = None
    if optimum:
        from designer.posing import pose_terms

        verdict = pose_terms(setting, terms, time_limit=time_limit, progress=progress)
        if verdict.table is not None:
            beside = judged(setting, verdict.table, terms)
    return RulesReport(setting, terms, tuple(results), verdict, beside)


def _unknown(names: Sequence[str]) -> list[Mistake]:
    """A mistake for every name that is no rule."""
    from designer.setting.reading import suggestion

    return [
        Mistake(
            "rules",
            repr(name),
            f"one of {', '.join(RULES)}",
            suggestion(name, RULES) or "Pick from the list.",
        )
        for name in sorted(set(names) - set(RULES))
    ]


def _silent(doing: str, seconds: float, steps: int) -> None:
    """Tell nobody."""
