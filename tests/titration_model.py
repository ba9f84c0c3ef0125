"""The model of a titration, written apart from the C sources, from the published equations alone.

It is the second opinion of fit_against_scipy.py and what SciPy is timed with by the benchmark.
"""

import numpy as np

LN10 = np.log(10.0)

# Carbonic acid at 25 degrees: Harned and Davis 1943, Harned and Scholes 1941; enthalpies in J/mol
# and heat capacities in J/(K mol): Goldberg, Kishore and Lennen 2002.
CARBONIC = ((6.352, 9150.0, -371.0), (10.329, 14700.0, -249.0))


class Water:
    """Kell 1975, Malmberg and Maryott 1956, Marshall and Franck 1981."""

    def __init__(self, celsius):
        t = celsius
        kelvin = t + 273.15
        self.density = (
            np.polyval(
                [-280.54253e-12, 105.56302e-9, -46.170461e-6, -7.9870401e-3, 16.945176, 999.83952],
                t,
            )
            / (1.0 + 16.879850e-3 * t)
            / 1000.0
        )
        permittivity = np.polyval([-1.410e-6, 9.398e-4, -0.40008, 87.740], t)
        self.slope = 1.82481e6 * np.sqrt(self.density) / (permittivity * kelvin) ** 1.5
        lg_density = np.log10(self.density)
        self.pKw = (
            4.098
            + 3245.2 / kelvin
            - 2.2362e5 / kelvin**2
            + 3.984e7 / kelvin**3
            - (13.957 - 1262.3 / kelvin + 8.5641e5 / kelvin**2) * lg_density
        )


def pK_at(celsius, pK, enthalpy, heat_capacity):
    """Clarke and Glew 1966 with a constant heat capacity."""
    R, T0, T = 8.314462618, 298.15, celsius + 273.15
    change = enthalpy / R * (1 / T0 - 1 / T) + heat_capacity / R * (T0 / T - 1 + np.log(T / T0))
    return pK - change / LN10


def charges(pH, lg_gamma, z0, pKs):
    """Mean charge, mean squared charge and variance of the charge of one acid system."""
    z = z0 - np.arange(len(pKs) + 1)
    lg_beta = -np.concatenate(([0.0], np.cumsum(pKs)))
    lost = z0 - z
    lg = lg_beta + np.outer(pH, lost) + np.outer(lg_gamma, z0 * z0 - z * z)
    share = 10.0 ** (lg - lg.max(axis=1, keepdims=True))
    share /= share.sum(axis=1, keepdims=True)
    mean = share @ z
    square = share @ (z * z)
    return mean, square, square - mean * mean


class Model:
    """One run as fit_example prints it."""

    def __init__(self, run):
        self.run = run
        self.volume_L = 1e-3 * np.array(run["volume_mL"])
        self.reading = np.array(run["reading"])
        self.root_precision = np.sqrt(np.array(run["precision"]))
        self.prior_mean = np.array([p["prior_mean"] for p in run["parameters"]])
        self.prior_u = np.array([p["prior_u"] for p in run["parameters"]])
        self.start = np.array([p["start"] for p in run["parameters"]])
        self.water = Water(run["temperature_C"])
        self.carbonic = [pK_at(run["temperature_C"], *row) for row in CARBONIC]
        self.warm = None

    def composition(self, values):
        """Systems as (z0, pKs, concentrations), spectator charge, spectator ionic strength."""
        run = self.run
        named = {p["kind"]: v for p, v in zip(run["parameters"], values) if p["kind"] != "pK"}
        pKs = [v for p, v in zip(run["parameters"], values) if p["kind"] == "pK"]
        start_L = np.exp(named.get("ln_volume", np.log(run["solution_volume_L"])))
        total_L = start_L + self.volume_L
        moles = np.exp(named["ln_amount"])
        titrant = np.exp(named["ln_titrant"])
        spectator = run["lost"] - run["charge"]
        carbonate = 0.5 * np.exp(named["ln_carbonate"]) * titrant if "ln_carbonate" in named else 0.0
        dissolved = np.exp(named["ln_carbon_dioxide"]) * start_L
        systems = (
            (run["charge"], pKs, moles / total_L),
            (0, self.carbonic, (dissolved + carbonate * self.volume_L) / total_L),
        )
        by_titrant = run["titrant_charge"] * titrant * self.volume_L
        charge = (moles * spectator + by_titrant) / total_L
        ionic = (
            0.5 * moles * abs(spectator) + run["background"] * start_L + 0.5 * np.abs(by_titrant)
        ) / total_L
        return systems, charge, ionic, named

    def balance(self, pH, strength, composition):
        """Net charge, its absolute terms, its slope by -ln a(H+) and the next ionic strength."""
        systems, charge, spectators, named = composition
        water, root = self.water, np.sqrt(strength)
        lg_gamma = -water.slope * (root / (1.0 + root) - named["davies"] * strength)
        h = water.density * 10.0 ** (-pH - lg_gamma)
        oh = water.density * 10.0 ** (pH - water.pKw - lg_gamma)
        net, scale, capacity = h - oh + charge, h + oh + np.abs(charge), h + oh
        ionic = 0.5 * (h + oh) + spectators
        for z0, pKs, c in systems:
            mean, square, variance = charges(pH, lg_gamma, z0, pKs)
            net = net + c * mean
            scale = scale + c * np.sqrt(square)
            capacity = capacity + c * variance
            ionic = ionic + 0.5 * c * square
        return net, scale, capacity, ionic

    def solve_pH(self, pH, strength, composition, tolerance):
        """Newton's method within a bracket, at given ionic strength; the charge falls with pH."""
        low, high = np.full_like(pH, -2.0), np.full_like(pH, 16.0)
        for _ in range(100):
            net, scale, capacity, ionic = self.balance(pH, strength, composition)
            low, high = np.where(net > 0, pH, low), np.where(net <= 0, pH, high)
            moved = pH + net / (capacity * LN10)
            outside = (moved <= low) | (moved >= high)
            moved = np.where(outside, 0.5 * (low + high), moved)
            done = (np.abs(net) < 1e-15 * scale) | (np.abs(moved - pH) < tolerance)
            pH = np.where(done & outside, pH, moved)
            if done.all():
                break
        return pH, ionic

    def expected(self, values):
        """Readings at all volumes."""
        composition = self.composition(values)
        named = composition[3]
        if self.warm is None:
            guess = 7.0 + (self.reading - 7.0 - named["offset"]) / named["slope"]
            self.warm = (guess, np.full_like(guess, 0.02))
        pH, strength = self.warm
        tolerance = 1e-3
        for _ in range(100):
            pH, ionic = self.solve_pH(pH, strength, composition, tolerance)
            change = np.abs(ionic / strength - 1.0).max()
            strength = ionic
            if change < 1e-13:
                break
            tolerance = max(1e-3 * change, 1e-13)
        self.warm = (pH, strength) if np.isfinite(strength).all() else None
        return 7.0 + named["slope"] * (pH - 7.0) + named["offset"]

    def values(self, deviations):
        """Parameters from deviations of their prior means in prior uncertainties."""
        return self.prior_mean + self.prior_u * deviations

    def residuals(self, deviations):
        """Weighted differences, then one residual for each prior."""
        data = self.root_precision * (self.expected(self.values(deviations)) - self.reading)
        return np.concatenate((data, deviations))

    def jacobian(self, deviations):
        """Central differences of fourth order; a jump is narrow, and so is the step."""
        columns = []
        for i in range(len(deviations)):
            step = 2e-5 / self.prior_u[i]
            moved = []
            for k in (-2, -1, 1, 2):
                shifted = deviations.copy()
                shifted[i] += k * step
                moved.append(self.residuals(shifted))
            columns.append((moved[0] - 8 * moved[1] + 8 * moved[2] - moved[3]) / (12 * step))
        return np.column_stack(columns)
