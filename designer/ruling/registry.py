"""The register of rules, in the order in which they are shown. A test holds it to the folder."""

from __future__ import annotations

from designer.ruling import (
    bailey_rebate,
    bayesian_full_extraction,
    cavallo_rebate,
    equal_shares_with_unanimity,
    expected_externality,
    full_extraction,
    groves,
    k_double_auction,
    linear_double_auction,
    marginal_product,
    optimal_auction,
    partnership_split,
    pivotal,
    pivotal_equal_shares,
    posted_price,
    posted_price_sale,
    proportional_to_report,
    revenue_greatest_efficient,
    second_best,
    worst_case_linear_rebate,
)
from designer.ruling.kinds import Rule

RULES: dict[str, Rule] = {
    rule.name: rule
    for rule in (
        expected_externality.RULE,
        pivotal.RULE,
        pivotal_equal_shares.RULE,
        marginal_product.RULE,
        groves.RULE,
        revenue_greatest_efficient.RULE,
        cavallo_rebate.RULE,
        bailey_rebate.RULE,
        worst_case_linear_rebate.RULE,
        second_best.RULE,
        posted_price.RULE,
        k_double_auction.RULE,
        linear_double_auction.RULE,
        equal_shares_with_unanimity.RULE,
        proportional_to_report.RULE,
        posted_price_sale.RULE,
        optimal_auction.RULE,
        full_extraction.RULE,
        bayesian_full_extraction.RULE,
        partnership_split.RULE,
    )
}
