"""Quantiles and thresholds for honest intervals."""

from __future__ import annotations

import math


def student_quantile(degrees_of_freedom: float, coverage: float = 0.95) -> float:
    """Two-sided quantile of Student's t for the given coverage (`scipy.special.stdtrit`)."""
    from scipy.special import stdtrit

    return float(stdtrit(max(degrees_of_freedom, 1.0), 0.5 + coverage / 2))


def power_threshold(trials: int, false_alarms: float = 1e-3) -> float:
    """
    Power over its expectation that white noise exceeds anywhere among `trials` bins with the given probability.

    The power of one bin of white noise is exponentially distributed (Chi-squared with two degrees of freedom).
    """
    return math.log(max(trials, 1) / false_alarms)
