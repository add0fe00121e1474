"""What the rebate rules share: the pivotal surplus, and the table after rebates.

The pivotal rule is the one over equal cost shares (pivotal_equal_shares.py; without an outlay it
is the pivotal rule itself), so that the surplus to be given back is never negative. A rebate
that one's own report does not move leaves honesty as it was.
"""

from __future__ import annotations

from collections.abc import Sequence

from designer.ruling.amounts import Amounts, stacked
from designer.ruling.pivotal_equal_shares import taxes
from designer.ruling.profiles import certain, chosen, efficient
from designer.ruling.shares import share
from designer.setting.setting import IntArray, Setting
from designer.table import Table


def with_rebates(
    setting: Setting, choice: IntArray, paid: Sequence[Amounts], rebates: Sequence[Amounts]
) -> Table:
    """Put the table together: share of the outlay, plus pivotal payment, minus rebate."""
    due = chosen(share(setting), choice)
    pays = [due + tax - back for tax, back in zip(paid, rebates, strict=True)]
    return Table(certain(setting, choice), 1, *stacked(pays))


def pivotal_parts(setting: Setting) -> tuple[IntArray, list[Amounts]]:
    """Find the efficient decision and each party's pivotal payment above her share."""
    choice = efficient(setting)
    return choice, taxes(setting, choice)
