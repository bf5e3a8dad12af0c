"""The catalogue of interval methods, ordered by standing in published guidance; the order of every table and legend.

A member is a function `(events, trials, tail) -> (lower, upper)`, or of the columns that it needs: arrays in, arrays
out, bounds as the formula gives them. Members that need to know the design come after those that do not. To add one,
write its function and record in a family's file, and give it its line here.
"""

from __future__ import annotations

from coverage_lab.intervals import (
    bayes,
    cluster,
    corrected,
    exact,
    exact_shortest,
    exact_two_sided,
    finite,
    likelihood,
    normal,
    score,
    strata,
    transformed,
)
from coverage_lab.intervals.bayes import jeffreys as jeffreys
from coverage_lab.intervals.bayes import jeffreys_hpd as jeffreys_hpd
from coverage_lab.intervals.bayes import jeffreys_modified as jeffreys_modified
from coverage_lab.intervals.bayes import uniform_bayes as uniform_bayes
from coverage_lab.intervals.cluster import clopper_pearson_deff_planned as clopper_pearson_deff_planned
from coverage_lab.intervals.cluster import cluster_logit as cluster_logit
from coverage_lab.intervals.cluster import cluster_wald as cluster_wald
from coverage_lab.intervals.cluster import korn_graubard as korn_graubard
from coverage_lab.intervals.cluster import wilson_deff_estimated as wilson_deff_estimated
from coverage_lab.intervals.cluster import wilson_deff_planned as wilson_deff_planned
from coverage_lab.intervals.corrected import corrected_adjusted as corrected_adjusted
from coverage_lab.intervals.corrected import corrected_delta as corrected_delta
from coverage_lab.intervals.exact import clopper_pearson as clopper_pearson
from coverage_lab.intervals.exact import mid_p as mid_p
from coverage_lab.intervals.exact import poisson_exact as poisson_exact
from coverage_lab.intervals.exact_shortest import shortest_exact as shortest_exact
from coverage_lab.intervals.exact_two_sided import blaker as blaker
from coverage_lab.intervals.exact_two_sided import sterne as sterne
from coverage_lab.intervals.finite import hypergeometric_exact as hypergeometric_exact
from coverage_lab.intervals.finite import hypergeometric_mid_p as hypergeometric_mid_p
from coverage_lab.intervals.finite import wald_fpc as wald_fpc
from coverage_lab.intervals.finite import wilson_fpc as wilson_fpc
from coverage_lab.intervals.likelihood import likelihood_ratio as likelihood_ratio
from coverage_lab.intervals.normal import wald as wald
from coverage_lab.intervals.normal import wald_cc as wald_cc
from coverage_lab.intervals.score import agresti_coull as agresti_coull
from coverage_lab.intervals.score import plus_four as plus_four
from coverage_lab.intervals.score import second_order as second_order
from coverage_lab.intervals.score import wilson as wilson
from coverage_lab.intervals.score import wilson_cc as wilson_cc
from coverage_lab.intervals.strata import stratified_korn_graubard as stratified_korn_graubard
from coverage_lab.intervals.strata import stratified_wald as stratified_wald
from coverage_lab.intervals.strata import stratified_wilson as stratified_wilson
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

_OF_CLUSTERS: tuple[Method, ...] = (
    cluster.WILSON_DEFF_ESTIMATED,
    cluster.KORN_GRAUBARD_LIMITS,
    cluster.WILSON_DEFF_PLANNED,
    cluster.CLOPPER_PEARSON_DEFF_PLANNED,
    cluster.CLUSTER_LOGIT,
    cluster.CLUSTER_WALD,
)

_OF_STRATA: tuple[Method, ...] = (
    strata.STRATIFIED_WILSON,
    strata.STRATIFIED_KORN_GRAUBARD,
    strata.STRATIFIED_WALD,
)

_BY_DESIGN: tuple[Method, ...] = (
    finite.WILSON_FPC,
    finite.HYPERGEOMETRIC_EXACT,
    finite.HYPERGEOMETRIC_MID_P,
    finite.WALD_FPC,
    *_OF_CLUSTERS,
    *_OF_STRATA,
    corrected.CORRECTED_ADJUSTED,
    corrected.CORRECTED_DELTA,
    *corrected.corrected_all(
        (score.WILSON, exact.CLOPPER_PEARSON, bayes.JEFFREYS, exact.MID_P, exact_two_sided.BLAKER)
    ),
    *corrected.corrected_all((*_OF_CLUSTERS, *_OF_STRATA)),
)

# Methods of events and trials alone.
CATALOGUE: dict[str, Method] = {method.name: method for method in _BY_STANDING}
# Those that need to know the design too, in the order of their standing within each design.
DESIGN_AWARE: dict[str, Method] = {method.name: method for method in _BY_DESIGN}
EVERY: dict[str, Method] = {**CATALOGUE, **DESIGN_AWARE}
