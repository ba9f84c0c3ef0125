"""Outside check of the evidence: the same posteriors integrated by another program.

Model (titration_model.py) and likelihood (below) are written apart from the C sources. The noise
levels are held at known values on both sides. SciPy finds the optimum of the full posterior and the
evidence follows from a numerical Hessian there (Laplace's approximation); the fit takes its optimum
with the weights frozen and the Gauss-Newton matrix in the Hessian's place. What is left between
them is what those two approximations cost: TOLERANCE, in ln evidence. What turns it red: a lost
normalisation or determinant, another likelihood, another optimum.
Usage: evidence_against_scipy.py FIT_EXAMPLE
"""

import json
import subprocess
import sys

try:
    import numpy as np
    from scipy.optimize import least_squares, minimize
except ImportError:
    print("SciPy is missing: install the Debian package python3-scipy. This test was skipped.")
    sys.exit(77)

from titration_model import Model

TOLERANCE = 0.3
SLOPE_STEP_L = 2e-8
HESSIAN_STEP = 0.1  # posterior standard deviations

CASES = (
    ("monoprotic", "60", "1"),
    ("diprotic", "60", "2"),
    ("triprotic", "50", "3"),
    ("base", "40", "4"),
    ("diprotic", "50", "6", "20"),
)


def normal(x, variance):
    return np.exp(-0.5 * x * x / variance) / np.sqrt(2.0 * np.pi * variance)


class Posterior:
    """Prior times likelihood of one run, in deviations from the prior means in prior u."""

    def __init__(self, run):
        self.run = run
        self.here = Model(run)
        # Before the first drop the slope is that after it: no volume is below zero.
        volume = np.maximum(self.here.volume_L, 2.0 * SLOPE_STEP_L)
        self.beside = [Model(run), Model(run)]
        self.beside[0].volume_L = volume - SLOPE_STEP_L
        self.beside[1].volume_L = volume + SLOPE_STEP_L
        self.pK = [i for i, p in enumerate(run["parameters"]) if p["kind"] == "pK"]
        self.named = {p["kind"]: i for i, p in enumerate(run["parameters"])}

    def minus_log(self, deviations):
        """All factors normalised but the soft limit of the spacing, which is one when kept."""
        values = self.here.values(deviations)
        reading = self.here.expected(values)
        slope = (self.beside[1].expected(values) - self.beside[0].expected(values)) / (
            2e3 * SLOPE_STEP_L
        )
        pH = 7.0 + (reading - 7.0 - values[self.named["offset"]]) / values[self.named["slope"]]
        # Glass electrodes: 0.03 pH more for each pH below 2 and above 12.
        extreme = 0.03 * (np.maximum(2.0 - pH, 0.0) + np.maximum(pH - 12.0, 0.0))
        variance = (
            self.run["noise_reading"] ** 2 + extreme**2 + (slope * self.run["noise_volume"]) ** 2
        )
        residual = self.here.reading - reading
        # One row in fifty may be off by another 1 pH.
        likelihood = 0.98 * normal(residual, variance) + 0.02 * normal(residual, variance + 1.0)
        lacking = np.maximum(np.log10(4.0) - np.diff(values[self.pK]), 0.0) / 0.15
        return (
            -np.log(likelihood).sum()
            + 0.5 * (deviations @ deviations + len(deviations) * np.log(2.0 * np.pi))
            + 0.5 * (lacking @ lacking)
        )


def hessian(function, at):
    n = len(at)
    steps = HESSIAN_STEP * np.eye(n)
    matrix = np.empty((n, n))
    middle = function(at)
    for i in range(n):
        matrix[i, i] = function(at + steps[i]) - 2.0 * middle + function(at - steps[i])
        for j in range(i):
            matrix[i, j] = matrix[j, i] = 0.25 * (
                function(at + steps[i] + steps[j])
                - function(at + steps[i] - steps[j])
                - function(at - steps[i] + steps[j])
                + function(at - steps[i] - steps[j])
            )
    return matrix / HESSIAN_STEP**2


def log_evidence(run):
    """Laplace's approximation about SciPy's optimum."""
    posterior = Posterior(run)
    model = posterior.here
    near = least_squares(
        model.residuals,
        (model.start - model.prior_mean) / model.prior_u,
        jac=model.jacobian,
        max_nfev=60,
    )
    # Coordinates in which the posterior is about a standard normal suit both steps below.
    jacobian = model.jacobian(near.x)
    axes = np.linalg.inv(np.linalg.cholesky(jacobian.T @ jacobian)).T
    along = lambda y: posterior.minus_log(near.x + axes @ y)
    found = minimize(along, np.zeros(len(near.x)), method="BFGS", options={"gtol": 1e-4, "eps": 1e-4})
    curvature = np.linalg.slogdet(hessian(along, found.x))
    assert curvature[0] > 0, "the optimum is none"
    return (
        -found.fun
        + 0.5 * len(near.x) * np.log(2.0 * np.pi)
        - 0.5 * curvature[1]
        + np.linalg.slogdet(axes)[1]
    ), np.linalg.norm(found.jac)


def compare(program, case):
    run = json.loads(subprocess.run([program, *case], check=True, capture_output=True).stdout)
    name = " ".join(case)
    assert run["converged"], f"{name}: the fit did not converge"
    theirs, slope = log_evidence(run)
    off = run["log_evidence"] - theirs
    good = abs(off) < TOLERANCE and slope < 0.05
    print(
        f"{name}: ln evidence {run['log_evidence']:.4f}, SciPy {theirs:.4f}, off by {off:+.4f}, "
        f"limit {TOLERANCE}, gradient left {slope:.1e}{'' if good else ' FAILED'}"
    )
    return good


def main():
    results = [compare(sys.argv[1], case) for case in CASES]
    return 0 if all(results) else 1


sys.exit(main())
