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
COCHRAN = "W. G. Cochran, Sampling Techniques, 3rd edition, Wiley (1977)"
KORN_GRAUBARD = (
    'E. L. Korn & B. I. Graubard, "Confidence intervals for proportions with small expected number of positive counts '
    'estimated from survey data", Survey Methodology 24:193 (1998)'
)
FRANCO = (
    'C. Franco, R. J. A. Little, T. A. Louis & E. V. Slud, "Comparative study of confidence intervals for proportions '
    'in complex sample surveys", Journal of Survey Statistics and Methodology 7:334 (2019)'
)
ROGAN_GLADEN = (
    'W. J. Rogan & B. Gladen, "Estimating prevalence from the results of a screening test", American Journal of '
    "Epidemiology 107:71 (1978)"
)
