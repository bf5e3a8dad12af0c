"""The catalogue of interval methods, ordered by standing in published guidance; the order of every table and legend.

A member is a function `(events, trials, tail) -> (lower, upper)`: arrays in, arrays out, bounds as the formula gives
them. To add one, write its function and record in a family's file, and give it its line here.
"""

from __future__ import annotations

from coverage_lab.intervals import (
    bayes,
    exact,
    exact_shortest,
    exact_two_sided,
    likelihood,
    normal,
    score,
    transformed,
)
from coverage_lab.intervals.bayes import jeffreys as jeffreys
from coverage_lab.intervals.bayes import jeffreys_hpd as jeffreys_hpd
from coverage_lab.intervals.bayes import jeffreys_modified as jeffreys_modified
from coverage_lab.intervals.bayes import uniform_bayes as uniform_bayes
from coverage_lab.intervals.exact import clopper_pearson as clopper_pearson
from coverage_lab.intervals.exact import mid_p as mid_p
from coverage_lab.intervals.exact import poisson_exact as poisson_exact
from coverage_lab.intervals.exact_shortest import shortest_exact as shortest_exact
from coverage_lab.intervals.exact_two_sided import blaker as blaker
from coverage_lab.intervals.exact_two_sided import sterne as sterne
from coverage_lab.intervals.likelihood import likelihood_ratio as likelihood_ratio
from coverage_lab.intervals.normal import wald as wald
from coverage_lab.intervals.normal import wald_cc as wald_cc
from coverage_lab.intervals.score import agresti_coull as agresti_coull
from coverage_lab.intervals.score import plus_four as plus_four
from coverage_lab.intervals.score import second_order as second_order
from coverage_lab.intervals.score import wilson as wilson
from coverage_lab.intervals.score import wilson_cc as wilson_cc
from coverage_lab.intervals.transformed import arcsine as arcsine
from coverage_lab.intervals.transformed import cloglog as cloglog
from coverage_lab.intervals.transformed import logit as logit
from coverage_lab.intervals.transformed import logit_half as logit_half
from coverage_lab.records import Method

_BY_STANDING: tuple[Method, ...] = (
    score.WILSON,
    exact.CLOPPER_PEARSON,
    bayes.JEFFREYS,
    score.AGRESTI_COULL,
    exact.MID_P,
    exact_two_sided.BLAKER,
    exact_shortest.SHORTEST_EXACT,
    exact_two_sided.STERNE,
    score.SECOND_ORDER,
    likelihood.LIKELIHOOD_RATIO,
    bayes.JEFFREYS_MODIFIED,
    score.WILSON_CC,
    bayes.UNIFORM_BAYES,
    bayes.JEFFREYS_HPD,
    transformed.ARCSINE,
    transformed.LOGIT,
    transformed.LOGIT_HALF,
    transformed.CLOGLOG,
    score.PLUS_FOUR,
    exact.POISSON_EXACT,
    normal.WALD_CC,
    normal.WALD,
)

CATALOGUE: dict[str, Method] = {method.name: method for method in _BY_STANDING}
