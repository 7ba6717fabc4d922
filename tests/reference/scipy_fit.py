"""A small weighted fit with priors, by scipy.optimize.least_squares (MINPACK, x_scale="jac"). Prints JSON.

The model is y_i = k t_i q / sqrt(1 - (t_i q)^2) + c with weak priors on k and q: nonlinear, strongly correlated
parameters of very different size. Also a singular variant (priors dropped, t so small that only k q is seen).

    python tests/reference/scipy_fit.py > tests/data/scipy_fit.json

Needs: numpy, scipy. Written with SciPy 1.17.1.
"""

import json
import sys

import numpy as np
import scipy
from scipy.optimize import least_squares

ORDERS = np.array([-3, -2, -1, 0, 1, 2, 3], float)
TRUTH = np.array([512.3, 0.2418, 1.75])  # k / mm, q, c / mm
U_READING = 0.05
PRIORS = [[510.0, 3.0], [0.24, 0.01]]  # mean and u of k and of q


def residuals(p, readings):
    k, q, c = p
    u = ORDERS * q
    model = k * u / np.sqrt(1 - u**2) + c
    prior = [(p[i] - mean) / sd for i, (mean, sd) in enumerate(PRIORS)]
    return np.concatenate([(model - readings) / U_READING, prior])


def jacobian(p, readings):
    k, q, _ = p
    u = ORDERS * q
    root = np.sqrt(1 - u**2)
    rows = np.column_stack([u / root, k * ORDERS / root**3, np.ones_like(u)]) / U_READING
    prior = np.zeros((2, 3))
    prior[0, 0], prior[1, 1] = 1 / PRIORS[0][1], 1 / PRIORS[1][1]
    return np.vstack([rows, prior])


def main():
    u = ORDERS * TRUTH[1]
    noise = U_READING * np.random.default_rng(7).standard_normal(ORDERS.size)
    readings = np.round(TRUTH[0] * u / np.sqrt(1 - u**2) + TRUTH[2] + noise, 4)
    start = np.array([500.0, 0.25, 0.0])
    fit = least_squares(residuals, start, jacobian, args=(readings,), method="lm", x_scale="jac", xtol=1e-15, ftol=1e-15, gtol=1e-15)
    covariance = np.linalg.inv(fit.jac.T @ fit.jac)
    result = {
        "library": "scipy", "version": scipy.__version__, "script": "tests/reference/scipy_fit.py",
        "orders": ORDERS.tolist(), "readings": readings.tolist(), "u_reading": U_READING, "priors": PRIORS, "start": start.tolist(),
        "parameters": fit.x.tolist(), "covariance": covariance.tolist(), "chi_square": float(2 * fit.cost),
        "singular_values_of_scaled_jacobian": np.linalg.svd(fit.jac / np.linalg.norm(fit.jac, axis=0), compute_uv=False).tolist(),
    }
    json.dump(result, sys.stdout, indent=1)
    print()


if __name__ == "__main__":
    main()
