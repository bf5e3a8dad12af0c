"""Citations that several members share."""

AGRESTI_COULL = (
    "A. Agresti & B. A. Coull, \"Approximate is better than 'exact' for interval estimation of binomial proportions\", "
    "The American Statistician 52:119 (1998)"
)
BROWN_CAI_DASGUPTA = (
    'L. D. Brown, T. T. Cai & A. DasGupta, "Interval estimation for a binomial proportion", Statistical Science 16:101 '
    "(2001)"
)
NEWCOMBE = (
    'R. G. Newcombe, "Two-sided confidence intervals for the single proportion: comparison of seven methods", '
    "Statistics in Medicine 17:857 (1998)"
)
