"""Operating point of the case beside this file: the points joined by SciPy's PCHIP, met with the system by brentq."""

from scipy.interpolate import PchipInterpolator
from scipy.optimize import brentq

FLOW, HEAD = [0, 110, 180, 250, 300, 340], [100, 90, 80, 60, 40, 20]  # gpm, ft
IN_SERIES, IN_PARALLEL = 1, 2

pump = PchipInterpolator(FLOW, HEAD)
flow = brentq(lambda q: IN_SERIES * pump(q / IN_PARALLEL) - 35 - 0.002 * q * q, 0, 340, xtol=1e-13, rtol=1e-15)
print(f"flow {flow:.9g} gpm, head {35 + 0.002 * flow * flow:.9g} ft")
