"""The register of demands and goals: one entry per file. A test holds it against the folder."""

from __future__ import annotations

from designer.demands import (
    balance_ex_ante,
    balance_ex_post,
    even_handed,
    honesty_bayesian,
    honesty_dominant,
    limit_only_when_served,
    limit_payments,
    limit_within_worth,
    participation_ex_ante,
    participation_ex_post,
    participation_interim,
    side_chance,
    side_revenue,
    side_welfare,
)
from designer.demands.goals import (
    any,
    blend,
    floor,
    margin,
    outside_money,
    parties,
    returned_share,
    revenue,
    swing,
    welfare,
    worst_pot,
)
from designer.demands.kinds import Demand, Goal

DEMANDS: tuple[Demand, ...] = (
    honesty_bayesian.DEMAND,
    honesty_dominant.DEMAND,
    participation_ex_ante.DEMAND,
    participation_interim.DEMAND,
    participation_ex_post.DEMAND,
    balance_ex_ante.DEMAND,
    balance_ex_post.DEMAND,
    limit_payments.DEMAND,
    limit_within_worth.DEMAND,
    limit_only_when_served.DEMAND,
    even_handed.DEMAND,
    side_welfare.DEMAND,
    side_revenue.DEMAND,
    side_chance.DEMAND,
)

GOALS: dict[str, Goal] = {
    goal.name: goal
    for goal in (
        any.GOAL,
        outside_money.GOAL,
        revenue.GOAL,
        welfare.GOAL,
        parties.GOAL,
        floor.GOAL,
        swing.GOAL,
        margin.GOAL,
        worst_pot.GOAL,
        returned_share.GOAL,
        blend.GOAL,
    )
}
