"""Assumptions that several rules share, each a check with its remedy."""

from __future__ import annotations

from designer.ruling.kinds import Check, Refusal
from designer.ruling.profiles import independent
from designer.setting.profiles import MOST
from designer.setting.setting import Setting


def tabulated(setting: Setting) -> Refusal | None:
    """Check that the table over all profiles is of a size to be written out."""
    if setting.profiles <= MOST:
        return None
    return Refusal(
        f"a table of at most {MOST:,} profiles",
        f"{setting.profiles:,}",
        "Give the parties fewer types, or ask `designer pose`.",
    )


def private(setting: Setting) -> Refusal | None:
    """Check that every worth, and every worth of staying out, is one's own affair."""
    for party in setting.parties:
        if party.depends or party.outside_depends:
            return Refusal(
                "private worths, each depending on the party's own type alone",
                f"{party.name}'s, which depend on the others' types",
                "State worths by own type, or ask `designer pose`, which takes such worths.",
            )
    return None


def independent_types(setting: Setting) -> Refusal | None:
    """Check that the types are independent."""
    if independent(setting):
        return None
    return Refusal(
        "independent types",
        "a joint prior that is not a product",
        "Use full-extraction, made for correlated types, or ask `designer pose`.",
    )


def at_least(count: int) -> Check:
    """Make the check that there are so many parties."""

    def check(setting: Setting) -> Refusal | None:
        found = len(setting.parties)
        if found >= count:
            return None
        return Refusal(
            f"{count} parties or more",
            str(found),
            "With so few there is no one to share with: use pivotal, or ask `designer pose`.",
        )

    return check


def some_outlay(setting: Setting) -> Refusal | None:
    """Check that there is a cost to share."""
    if any(cost > 0 for cost in setting.outlay) and not any(cost < 0 for cost in setting.outlay):
        return None
    return Refusal(
        "an outlay to share among the parties",
        "no decision with a cost" if not any(setting.outlay) else "a decision that brings money in",
        "State the cost in [designer] outlay, or use expected-externality.",
    )


def pure_transfer(setting: Setting) -> Refusal | None:
    """Check that decisions cost nothing and mean nothing to the designer."""
    for what, amounts in (("outlay", setting.outlay), ("worth", setting.worth)):
        if any(amounts):
            return Refusal(
                "decisions that neither cost the pot anything nor matter to the designer",
                f"a designer's {what} other than 0",
                "Leave it out, or use pivotal and expected-externality, which take it in.",
            )
    return None
