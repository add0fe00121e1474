"""Terms as JSON-ready values and back: what `--json` prints and proof documents carry."""

from __future__ import annotations

from dataclasses import fields
from fractions import Fraction
from typing import Any, cast

from designer.demands.terms import Terms
from designer.setting.exact import number, text
from designer.setting.setting import Chance, Limits, Setting, Side


def as_plain(terms: Terms) -> dict[str, Any]:
    """The terms as plain values, amounts as exact text; what is at its default may be left out."""
    plain: dict[str, Any] = {
        "decision": terms.decision,
        "ic": terms.ic,
        "ir": terms.ir,
        "balance": terms.balance,
        "budget": terms.budget,
        "goal": list(terms.goals),
        "subsidy": text(terms.subsidy),
        "slack": text(terms.slack),
        "tidy": terms.tidy,
        "even_handed": terms.even_handed,
        "compelled": sorted(terms.compelled),
    }
    if terms.shortfall:
        plain["shortfall"] = text(terms.shortfall)
    if terms.trusted:
        plain["trusted"] = sorted(terms.trusted)
    if terms.blend:
        plain["blend"] = {name: text(weight) for name, weight in terms.blend}
    for name in ("limits", "side"):
        part = getattr(terms, name)
        if part != type(part)():
            plain[name] = _plain(part)
    return plain


def _plain(value: object) -> object:
    if isinstance(value, Fraction):
        return text(value)
    if isinstance(value, tuple):
        return [_plain(item) for item in value]
    if hasattr(value, "__dataclass_fields__"):
        return {
            entry.name: _plain(getattr(value, entry.name))
            for entry in fields(cast(Any, value))
            if getattr(value, entry.name) is not None
        }
    return value


def from_plain(plain: dict[str, Any], setting: Setting) -> Terms:
    """The terms that `as_plain` wrote for this setting.

    Raises ValueError when the values are not such terms (a proof file may hold anything).
    """
    try:
        return Terms(
            decision=str(plain["decision"]),
            ic=str(plain["ic"]),
            ir=str(plain["ir"]),
            balance=str(plain["balance"]),
            budget=str(plain["budget"]),
            goals=tuple(str(name) for name in plain["goal"]),
            subsidy=number(plain["subsidy"]),
            slack=number(plain["slack"]),
            shortfall=number(plain.get("shortfall", "0")),
            tidy=str(plain["tidy"]),
            even_handed=plain["even_handed"] is True,
            compelled=frozenset(str(name) for name in plain["compelled"]),
            trusted=frozenset(str(name) for name in plain.get("trusted", [])),
            limits=_limits(plain.get("limits", {})),
            side=_side(plain.get("side", {}), setting),
            blend=tuple((str(k), number(v)) for k, v in plain.get("blend", {}).items()),
        )
    except (KeyError, TypeError, AttributeError, IndexError) as error:
        raise ValueError(f"not the terms of a scenario: {error}") from None


def _maybe(value: Any) -> Fraction | None:
    return None if value is None else number(value)


def _limits(plain: dict[str, Any]) -> Limits:
    return Limits(
        pays_at_most=_maybe(plain.get("pays_at_most")),
        pays_at_least=_maybe(plain.get("pays_at_least")),
        only_when_served=plain.get("only_when_served") is True,
        within_worth=plain.get("within_worth") is True,
    )


def _side(plain: dict[str, Any], setting: Setting) -> Side:
    chances = []
    for entry in plain.get("chances", []):
        party, position, option = (int(entry[key]) for key in ("party", "type", "option"))
        if not (
            0 <= party < len(setting.parties)
            and 0 <= position < setting.parties[party].size
            and 0 <= option < len(setting.options)
        ):
            raise IndexError("a side demand names a type that the scenario does not have")
        chances.append(
            Chance(
                party,
                position,
                option,
                _maybe(entry.get("at_least")),
                _maybe(entry.get("at_most")),
            )
        )
    return Side(
        welfare_at_least=_maybe(plain.get("welfare_at_least")),
        revenue_at_least=_maybe(plain.get("revenue_at_least")),
        chances=tuple(chances),
    )
