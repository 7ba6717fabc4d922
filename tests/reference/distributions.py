"""Reference values for coverage factors and tail probabilities, from scipy.stats. Prints JSON.

    python tests/reference/distributions.py > tests/data/distributions.json

Needs: scipy. Written with SciPy 1.17.1.
"""

import json
import sys

import scipy
from scipy.stats import chi2, norm, t

DEGREES = [0.5, 1, 1.5, 2, 3, 4, 5, 7.3, 10, 16, 16.7, 25.6, 50, 100, 400, 999, 5000, 20000]
COVERAGES = [0.1, 0.5, 0.6826894921370859, 0.9, 0.95, 0.9545, 0.99, 0.9973, 0.9999]


def main():
    result = {
        "library": "scipy", "version": scipy.__version__, "script": "tests/reference/distributions.py",
        "student": [[p, nu, float(t.isf((1 - p) / 2, nu))] for nu in DEGREES for p in COVERAGES],
        "normal": [[z, float(norm.cdf(z))] for z in (-20, -8, -4, -1.645, -1, -0.1, 0, 0.5, 1.96, 3, 6)],
        "normal_quantile": [[p, float(norm.ppf(p))] for p in (1e-12, 1e-6, 0.01, 0.15, 0.5, 0.6, 0.975, 0.9999)],
        "chi_square": [[x, nu, float(chi2.sf(x, nu))]
                       for x, nu in ((0.001, 1), (0.5, 1), (10, 5), (80, 5), (12, 16.7), (250, 250), (320, 250), (2800, 3000), (3200, 3000))],
    }
    json.dump(result, sys.stdout, indent=1)
    print()


if __name__ == "__main__":
    main()
