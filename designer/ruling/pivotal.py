"""The pivotal rule: each pays what her presence costs the others.

    t_i(theta) = max over k of W_-i(k) - W_-i(k*(theta))

a Groves rule (see groves.py). The designer bears the outlay as one of 'the others', so that a
project can be carried out without its cost being covered; pivotal-equal-shares covers it.

Source: E. H. Clarke (1971), Multipart pricing of public goods, Public Choice 11:17-33; for one
item W. Vickrey (1961), Counterspeculation, auctions, and competitive sealed tenders, Journal of
Finance 16:8-37 (both from memory).
"""

from __future__ import annotations

from designer.ruling import checks
from designer.ruling.amounts import Amounts
from designer.ruling.groves import groves
from designer.ruling.kinds import Built, Rule
from designer.ruling.profiles import TIES
from designer.setting.setting import Setting


def best_without(rest: Amounts) -> Amounts:
    """The most the others, party 0 among them, could have by themselves: (N,) from (N, K)."""
    return Amounts(rest.num.max(axis=1), rest.den)


def build(setting: Setting) -> Built:
    """Build the Groves rule whose offset is what the others could have without one."""
    return Built(groves(setting, lambda _, rest: best_without(rest)), (TIES,))


RULE = Rule(
    name="pivotal",
    source="Vickrey 1961, Clarke 1971",
    assumes="private worths; the designer bears what the outlay leaves uncovered",
    checks=(checks.tabulated, checks.private),
    build=build,
)
