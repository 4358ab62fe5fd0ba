"""Measures held against limits: sheets of limits, verdicts, the risk region."""

from flicker.limits.known import Limits, all_rows, chosen_limits, default_limits, known_limits
from flicker.limits.limit import Band, Curve, Limit
from flicker.limits.margin import Margin, Tunable, margin, margin_of
from flicker.limits.region import RiskRegion, risk_curves, risk_region
from flicker.limits.verdict import DECISIONS, OUTCOMES, Conditions, Outcome, Verdict, judge, overall

__all__ = [
    "DECISIONS",
    "OUTCOMES",
    "Band",
    "Conditions",
    "Curve",
    "Limit",
    "Limits",
    "Margin",
    "Outcome",
    "RiskRegion",
    "Tunable",
    "Verdict",
    "all_rows",
    "chosen_limits",
    "default_limits",
    "judge",
    "known_limits",
    "margin",
    "margin_of",
    "overall",
    "risk_curves",
    "risk_region",
]
