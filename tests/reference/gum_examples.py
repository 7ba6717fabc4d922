"""Worked examples of JCGM 100:2008 Annex H by other people's code. Prints JSON.

H.1 and H.2 by the package `uncertainties` (linear propagation with correlations), H.3 by `statsmodels` (ordinary least squares).
Input data as in Tables H.1, H.2 and H.6 of the GUM.

    python tests/reference/gum_examples.py > tests/data/gum_examples.json

Needs: numpy, uncertainties, statsmodels. Written with uncertainties 3.2.3 and statsmodels 0.15.0.
"""

import json
import sys

import numpy as np
import statsmodels
import statsmodels.api as sm
import uncertainties
from uncertainties import correlated_values, correlation_matrix, ufloat, umath

H2_V = [5.007, 4.994, 5.005, 4.990, 4.999]
H2_I_MA = [19.663, 19.639, 19.640, 19.685, 19.678]
H2_PHI = [1.0456, 1.0438, 1.0468, 1.0428, 1.0433]
H3_T = [21.521, 22.012, 22.512, 23.003, 23.507, 23.999, 24.513, 25.002, 25.503, 26.010, 26.511]
H3_B = [-0.171, -0.169, -0.166, -0.159, -0.164, -0.165, -0.156, -0.157, -0.159, -0.161, -0.160]


def h1():
    standard, difference = ufloat(50000623, 25), ufloat(215, 9.7)
    alpha, theta = ufloat(11.5e-6, 1.2e-6), ufloat(-0.1, 0.41)
    d_alpha, d_theta = ufloat(0, 0.58e-6), ufloat(0, 0.029)
    length = standard + difference - standard * (d_alpha * theta + alpha * d_theta)
    return {"length_nm": length.n, "u_nm": length.s}


def h2():
    readings = np.array([H2_V, np.array(H2_I_MA) * 1e-3, H2_PHI]).T
    covariance = np.cov(readings.T) / len(readings)
    volt, ampere, phase = correlated_values(readings.mean(0), covariance)
    results = [volt / ampere * umath.cos(phase), volt / ampere * umath.sin(phase), volt / ampere]
    r = correlation_matrix(results)
    return {"values_ohm": [x.n for x in results], "u_ohm": [x.s for x in results], "r_RX_RZ_XZ": [float(r[0, 1]), float(r[0, 2]), float(r[1, 2])]}


def h3():
    fit = sm.OLS(np.array(H3_B), sm.add_constant(np.array(H3_T) - 20)).fit()
    covariance = fit.cov_params()
    at_30 = np.array([1, 10.0])
    return {"y": fit.params.tolist(), "u": fit.bse.tolist(), "r": float(covariance[0, 1] / np.prod(fit.bse)),
            "s": float(np.sqrt(fit.scale)), "b30": float(at_30 @ fit.params), "u_b30": float(np.sqrt(at_30 @ covariance @ at_30))}


def main():
    result = {"libraries": {"uncertainties": uncertainties.__version__, "statsmodels": statsmodels.__version__},
              "script": "tests/reference/gum_examples.py", "h1": h1(), "h2": h2(), "h3": h3()}
    json.dump(result, sys.stdout, indent=1)
    print()


if __name__ == "__main__":
    main()
