"""Random settings under random demands, limits, allowances and lists of goals."""

from __future__ import annotations

from fractions import Fraction

from hypothesis import HealthCheck, event, given, settings
from hypothesis import strategies as st

from designer import Demands, Limits, Setting, pose
from designer.errors import UsageError
from designer.setting.vocabulary import BALANCE, BUDGET, DECISIONS, GOALS, HONESTY, PARTICIPATION
from tests.everything import DEEP
from tests.everything.judged import hold
from tests.strategies import small_settings

LIMITS = (
    None,
    Limits(),
    Limits(Fraction(3), Fraction(-2), True, False),
    Limits(Fraction(30), None, True, True),
)


@st.composite
def demands(draw: st.DrawFn, setting: Setting) -> Demands:
    """Any demands that can be written, whether or not they can be asked."""
    everyone = frozenset(party.name for party in setting.parties)
    return Demands(
        decision=draw(st.sampled_from(DECISIONS)),
        ic=draw(st.sampled_from(HONESTY)),
        ir=draw(st.sampled_from(PARTICIPATION)),
        balance=draw(st.sampled_from(BALANCE)),
        budget=draw(st.sampled_from(BUDGET)),
        goal=draw(st.lists(st.sampled_from(GOALS), min_size=1, max_size=3, unique=True)),
        tidy=draw(st.sampled_from((None, "swing", "none"))),
        subsidy=draw(st.sampled_from((None, 0, -2, "7/3"))),
        slack=draw(st.sampled_from((None, 0, -1, "1/2"))),
        even_handed=draw(st.sampled_from((None, True, False))),
        compelled=draw(st.sampled_from((None, frozenset[str](), everyone))),
        limits=draw(st.sampled_from(LIMITS)),
    )


@settings(
    max_examples=2_000 if DEEP else 100,
    deadline=None,
    suppress_health_check=list(HealthCheck),
)
@given(st.data(), small_settings(max_types=2, extras=None))
def test_whatever_is_asked(data: st.DataObject, setting: Setting) -> None:
    try:
        verdict = pose(setting, data.draw(demands(setting)))
    except UsageError:
        event("cannot be asked")
        return
    event(verdict.status)
    hold(verdict)
