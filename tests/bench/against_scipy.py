"""Times of bench beside SciPy's least_squares on the same runs and the same model.

Usage: against_scipy.py BENCH FIT_EXAMPLE TABLE
SciPy's side is the vectorised model of titration_model.py with least_squares as it comes (trust
region, differences for the Jacobian, default tolerances), from the same start.
"""

import json
import pathlib
import statistics
import subprocess
import sys
import time

sys.path.insert(0, str(pathlib.Path(__file__).resolve().parent.parent))

from scipy.optimize import least_squares  # noqa: E402

from titration_model import Model  # noqa: E402

REPETITIONS = 5


def scipy_times(program, case):
    command = [program, case, "60", "1"]
    run = json.loads(subprocess.run(command, check=True, capture_output=True).stdout)
    times = []
    for _ in range(REPETITIONS):
        model = Model(run)
        start = (model.start - model.prior_mean) / model.prior_u
        began = time.perf_counter()
        least_squares(model.residuals, start)
        times.append(1e6 * (time.perf_counter() - began))
    return sorted(times)


def main():
    bench, example, table = sys.argv[1:4]
    lines = subprocess.run([bench, table], check=True, capture_output=True, text=True).stdout
    print(f"{'microseconds':<18}{'median':>10}{'quartiles':>24}{'SciPy':>12}{'ratio':>8}{'spread':>14}")
    for line in lines.splitlines():
        name, *figures = line.split()
        median, low, high = map(float, figures)
        row = f"{name:<18}{median:>10.4g}{f'{low:.4g} to {high:.4g}':>24}"
        if name.startswith("fit_"):
            theirs = scipy_times(example, name.removeprefix("fit_"))
            middle = statistics.median(theirs)
            spread = f"{theirs[0] / high:.0f} to {theirs[-1] / low:.0f}"
            row += f"{middle:>12.4g}{middle / median:>8.0f}{spread:>14}"
        print(row)


main()
