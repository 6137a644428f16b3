"""Are doubles in a file normal? Prints the probability of Kolmogorov's
distance (scipy.stats.kstest) and the worst standardised count in the tails."""
import sys

import numpy as np
from scipy import stats

x = np.fromfile(sys.argv[1])
worst = 0.0
for level in (1.0, 2.0, 3.0, 4.0):
    share = stats.norm.sf(level)
    deviation = np.sqrt(len(x) * share * (1 - share))
    for count in (np.sum(x > level), np.sum(x < -level)):
        worst = max(worst, abs(count - len(x) * share) / deviation)
print(stats.kstest(x, "norm").pvalue, worst)
