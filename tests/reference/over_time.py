"""The meadow station over a day by scipy.integrate.solve_ivp: event times to compare the program with.

The station is scalar: with n pumps running, the flow Q solves head of one pump at Q/n = static + losses, by brentq on the laws of laws.py. Between
switches and corners of the inflow the level follows DOP853 at rtol 1e-10; switches are solve_ivp's own events.
"""

import json
import sys
import time
from pathlib import Path

import numpy as np
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from laws import ColebrookWhite, Curve, minor
from read_system import System

G, FLOOR_AREA, OUTFALL, START_LEVEL = 9.80665, np.pi / 4 * 36.0, 10.2, 1.3
NU = System(Path(__file__).parent / "../../networks/meadow_lift_station.yaml").viscosity
PUMP = Curve.points(
    np.array([0, 11, 22, 33, 44, 55, 66, 77]) * 1e-3, np.array([22.0, 21.7, 20.8, 19.3, 17.3, 14.6, 11.3, 7.5])
)
MAIN, BRANCH = ColebrookWhite(900, 0.3127, 0.6e-3, NU, G), ColebrookWhite(6, 0.2027, 0.3e-3, NU, G)
MAIN_K, BRANCH_K = minor(6, 0.3127, G), minor(3.5, 0.2027, G)
HOURS = [0, 2, 4, 6, 7.5, 9, 12, 15, 18, 20, 22, 24]
INFLOW = [26, 18, 14, 22, 52, 62, 45, 38, 50, 58, 42, 26]


def flow(level, n):
    """Flow of n pumps at a level."""
    if n == 0:
        return 0.0

    def excess(q):
        lost = MAIN.loss(q)[0] + MAIN_K.loss(q)[0] + BRANCH.loss(q / n)[0] + BRANCH_K.loss(q / n)[0]
        return OUTFALL + lost - level - PUMP.at(q / n)[0]

    return brentq(excess, 1e-6, 0.3, xtol=1e-16, rtol=1e-14)


def inflow(t):
    return np.interp(t / 3600, HOURS, INFLOW) * 1e-3


def run(starts, stop, lasts):
    """Common stop: step k starts at starts[k], all stop at `stop`."""
    t, level, running, events = 0.0, START_LEVEL, 0, []
    corners = [h * 3600.0 for h in HOURS if 0 < h * 3600 < lasts] + [lasts]
    while t < lasts:
        end = next(corner for corner in corners if corner > t)
        marks = []
        if running < len(starts):
            marks.append(lambda _, y: y[0] - starts[running])
            marks[-1].direction = 1
        if running:
            marks.append(lambda _, y: y[0] - stop)
            marks[-1].direction = -1
        for mark in marks:
            mark.terminal = True
        found = solve_ivp(
            lambda t, y: [(inflow(t) - flow(y[0], running)) / FLOOR_AREA],
            (t, end), [level], method="DOP853", rtol=1e-10, atol=1e-12, events=marks,
        )
        t, level = found.t[-1], found.y[0, -1]
        if found.status == 1:
            up = running < len(starts) and len(found.t_events[0]) > 0
            running = running + 1 if up else 0
            level = starts[running - 1] if up else stop
            events.append({"time": t, "running": running})
    return events, level


def main():
    lasts = 86_400.0 if "--quick" not in sys.argv else 7_200.0
    start = time.perf_counter()
    events, level = run([1.5, 1.8, 2.1], 0.9, lasts)
    took = time.perf_counter() - start
    result = {"plan": "wide_common_stop", "end_level": level, "events": events}
    if "--write" in sys.argv:
        path = Path(__file__).parent / "expected_over_time/meadow_wide_common_stop.json"
        path.write_text(json.dumps(result, indent=1) + "\n")
    print(f"{len(events)} switches, level at the end {level:.9f} m, {took:.2f} s")


if __name__ == "__main__":
    main()
