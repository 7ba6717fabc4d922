"""Writes tests/data/nist/Longley.dat: the Longley linear regression set of NIST's StRD.

The observations come from statsmodels (statsmodels.api.datasets.longley); they are the ones that NIST publishes.
Prints how many digits of the certified values statsmodels' own fit reproduces.

Needs: numpy, statsmodels. Written with statsmodels 0.15.0.
"""

import pathlib
import sys

import numpy as np
import statsmodels
import statsmodels.api as sm

CERTIFIED = [-3482258.63459582, 15.0618722713733, -0.0358191792925910, -2.02022980381683,
             -1.03322686717359, -0.0511041056535807, 1829.15146461355]


def main():
    data = sm.datasets.longley.load()
    y, x = np.asarray(data.endog, float), np.asarray(data.exog, float)
    fitted = np.asarray(sm.OLS(y, sm.add_constant(x)).fit().params)
    digits = -np.log10(np.abs(fitted / CERTIFIED - 1).max())
    print(f"statsmodels {statsmodels.__version__} reproduces {digits:.1f} digits", file=sys.stderr)
    lines = ["Dataset Name:  Longley",
             f"Observations from statsmodels {statsmodels.__version__}; NIST StRD, linear regression, higher difficulty",
             "Model:         y = B0 + B1*x1 + B2*x2 + B3*x3 + B4*x4 + B5*x5 + B6*x6 + e",
             "",
             "Data:       y      x1      x2      x3      x4      x5      x6"]
    lines += [" ".join(f"{value:.10g}" for value in (yi, *xi)) for yi, xi in zip(y, x)]
    target = pathlib.Path(__file__).parent.parent / "data" / "nist" / "Longley.dat"
    target.write_text("\n".join(lines) + "\n")


if __name__ == "__main__":
    main()
