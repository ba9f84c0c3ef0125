"""Outside check of the fit: the same problems solved by SciPy's least_squares with another model.

The model (titration_model.py) is written from the published equations, apart from the C sources.
The weights are frozen to the values that the fit ended with. Parameters agree to 1e-5 of their
size (of one, for those smaller than one) and to a thousandth of their uncertainty, covariances to
1e-5 of the product of the uncertainties. Usage: fit_against_scipy.py FIT_EXAMPLE
"""

import json
import subprocess
import sys

try:
    import numpy as np
    from scipy.optimize import least_squares
except ImportError:
    print("SciPy is missing: install the Debian package python3-scipy. This test was skipped.")
    sys.exit(77)

from titration_model import Model

CASES = (
    ("monoprotic", "60", "1"),
    ("diprotic", "60", "2"),
    ("triprotic", "80", "3"),
    ("base", "40", "4"),
    ("ampholyte", "60", "5"),
    ("diprotic", "50", "6", "20"),
)


def compare(program, case):
    run = json.loads(subprocess.run([program, *case], check=True, capture_output=True).stdout)
    name = " ".join(case)
    assert run["converged"], f"{name}: the fit did not converge"
    model = Model(run)
    found = least_squares(
        model.residuals,
        (model.start - model.prior_mean) / model.prior_u,
        jac=model.jacobian,
        xtol=1e-12,
        ftol=1e-12,
        gtol=1e-10,
        max_nfev=60,
    )
    value = np.array([p["value"] for p in run["parameters"]])
    u = np.array([p["u"] for p in run["parameters"]])
    off = np.abs(model.values(found.x) - value)
    relative = (off / np.maximum(np.abs(value), 1.0)).max()
    in_u = (off / u).max()
    jacobian = model.jacobian(found.x)
    covariance = np.linalg.inv(jacobian.T @ jacobian) * np.outer(model.prior_u, model.prior_u)
    theirs = np.array(run["covariance"]).reshape(covariance.shape)
    root = np.sqrt(np.diag(covariance))
    spread = (np.abs(theirs - covariance) / np.outer(root, root)).max()
    rows = [i for i, p in enumerate(run["outlier"]) if p > 0.5]
    print(
        f"{name}: parameters within {relative:.1e} of their size and {in_u:.1e} u, "
        f"covariance within {spread:.1e}, outliers {rows}"
    )
    good = relative < 1e-5 and in_u < 1e-3 and spread < 1e-5
    return good and rows == ([int(case[3])] if len(case) > 3 else [])


def main():
    results = [compare(sys.argv[1], case) for case in CASES]
    return 0 if all(results) else 1


sys.exit(main())
