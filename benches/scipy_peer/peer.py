"""The same equations solved with NumPy and SciPy beside dutybank, in one run. See README.md in this folder."""

import json
import os
import statistics
import subprocess
import sys
import time

import numpy as np
import scipy.optimize
import scipy.sparse as sp
import scipy.sparse.linalg as spla
from scipy.interpolate import PchipInterpolator

G, NU = 9.80665, 1.0034e-6
QUICK = "--quick" in sys.argv


class Pipes:
    """Darcy-Weisbach losses of many pipes with their slopes: 64/Re to Re 2000, Colebrook-White from 4000, a cubic between."""

    def __init__(self, length, bore, roughness):
        area = np.pi / 4 * bore**2
        self.re = bore / (area * NU)
        self.c = length / bore / (2 * G * area**2)
        self.e = roughness / bore
        self.laminar = 64 * self.c / self.re
        q4 = 4000 / self.re
        h4, s4 = self.turbulent(q4, slice(None))
        dq = 2000 / self.re
        h2 = self.laminar * dq
        self.cubic = (h2, h2, 3 * (h4 - h2) - 2 * h2 - s4 * dq, 2 * (h2 - h4) + h2 + s4 * dq)

    def turbulent(self, q, at):
        re, e, c = self.re[at] * q, self.e[at], self.c[at]
        x = -2 * np.log10(e / 3.7 + 5.74 / re**0.9)
        for _ in range(3):  # Newton on 1/sqrt f
            inner = e / 3.7 + 2.51 * x / re
            slope = 1 + 2 / np.log(10) * (2.51 / re) / inner
            x = x - (x + 2 * np.log10(inner)) / slope
        inner = e / 3.7 + 2.51 * x / re
        k = 2 / np.log(10) * (2.51 / re) / inner
        h = c * q * q / x**2
        return h, 2 * h / q / (1 + k)

    def __call__(self, q):
        flow = np.abs(q)
        re = self.re * flow
        head = self.laminar * flow
        slope = self.laminar.copy()
        at = re >= 4000
        if at.any():
            head[at], slope[at] = self.turbulent(flow[at], at)
        at = (re > 2000) & (re < 4000)
        if at.any():
            t = re[at] / 2000 - 1
            a, b, c, d = (part[at] for part in self.cubic)
            head[at] = a + t * (b + t * (c + t * d))
            slope[at] = (b + t * (2 * c + 3 * t * d)) * self.re[at] / 2000
        return np.copysign(head, q), slope


def station():
    """Twelve lines, unknown heads s, x, d1..d4 (0..5), fixed heads source, sink (6, 7); as in benches/station.rs."""
    ends = [(6, 0)] + [(0, 2 + k) for k in range(4)] + [(2 + k, 1) for k in range(4)] + [(1, 7), (1, 7), (1, 0)]
    length = np.array([30.0] + [3.0] * 4 + [8.0, 9.0, 10.0, 11.0] + [900.0, 900.0, 20.0])
    bore = np.array([0.4] + [0.2] * 8 + [0.35, 0.3, 0.1])
    minor = np.zeros(12)
    minor[1:5] = 2 / (2 * G * (np.pi / 4 * 0.2**2) ** 2)
    minor[11] = 150 / (2 * G * (np.pi / 4 * 0.1**2) ** 2)
    curve = PchipInterpolator([0, 0.02, 0.04, 0.06, 0.08, 0.1], [44.0, 43.2, 40.8, 36.8, 31.2, 24.0])
    # coefficients of the piecewise cubic, evaluated without the interpolator's overhead
    knots, cubic = curve.x, curve.c
    kept = 1 - 0.02 * np.arange(4)
    pipes = Pipes(length, bore, np.full(12, 1e-4))
    start = np.array([np.pi / 4 * 0.4**2] + [0.07] * 4 + list(np.pi / 4 * bore[5:] ** 2))

    def law(q):
        head, slope = pipes(q)
        head = head + minor * q * np.abs(q)
        slope = slope + 2 * minor * np.abs(q)
        p = q[1:5]
        i = np.clip(np.searchsorted(knots, p, side="right") - 1, 0, 4)
        t = p - knots[i]
        c = cubic[:, i]
        head[1:5] -= kept * (((c[0] * t + c[1]) * t + c[2]) * t + c[3])
        slope[1:5] -= kept * ((3 * c[0] * t + 2 * c[1]) * t + c[2])
        return head, slope

    a = np.zeros((12, 8))
    for j, (f, t) in enumerate(ends):
        a[j, f], a[j, t] = 1, -1
    return a[:, :6], a[:, 6:] @ np.array([3.0, 24.0]), law, start


def newton_station(a, fixed, law, q):
    """Hand-written Newton on heads, analytic Jacobian, dense solve."""
    h = np.full(6, 13.5)
    for iteration in range(30):
        g, s = law(q)
        r = g - a @ h - fixed
        e = -(a.T @ q)
        if np.max(np.abs(r)) < 1e-10 and np.max(np.abs(e)) < 1e-12:
            break
        y = 1 / s
        dh = np.linalg.solve(a.T * y @ a, e + a.T @ (y * r))
        h += dh
        q = q + y * (a @ dh - r)
    return h, q, iteration + 1


def root_station(a, fixed, law, q):
    """scipy.optimize.root (hybr) on heads and flows, with the analytic Jacobian."""

    def function(x):
        g, s = law(x[6:])
        jacobian = np.zeros((18, 18))
        jacobian[:12, :6], jacobian[:12, 6:] = -a, np.diag(s)
        jacobian[12:, 6:] = a.T
        return np.concatenate([g - a @ x[:6] - fixed, a.T @ x[6:]]), jacobian

    found = scipy.optimize.root(function, np.concatenate([np.full(6, 13.5), q]), jac=True, tol=1e-12)
    return found.x[:6], found.x[6:], found.nfev


class Random:
    def __init__(self):
        self.state = 1

    def unit(self):
        self.state = (self.state * 6364136223846793005 + 1442695040888963407) % 2**64
        return (self.state >> 32) / 2**32


def large(kind, count):
    """The network of benches/large.rs: same numbers, same order."""
    side = int(count**0.5)
    n = side * side
    random = Random()
    draws = np.array([0.0] + [random.unit() / n for _ in range(1, n)])
    lines = []
    for i in range(side):
        for j in range(side):
            here = i * side + j
            if j + 1 < side:
                lines.append((here, here + 1))
            if i + 1 < side:
                lines.append((here, here + side))
    if kind == "streets":
        for i in range(len(lines) - 1, 0, -1):
            j = int(random.unit() * (i + 1))
            lines[i], lines[j] = lines[j], lines[i]
        parent = list(range(n))

        def find(x):
            while parent[x] != x:
                parent[x] = parent[parent[x]]
                x = parent[x]
            return x

        tree, others = [], []
        for a, b in lines:
            ra, rb = find(a), find(b)
            if ra != rb:
                parent[ra] = rb
                tree.append((a, b))
            else:
                others.append((a, b))
        lines = sorted(tree + others[: n * 6 // 5 - len(tree)])
    sizes = np.array([(50 + 450 * random.unit(), 0.1 + 0.5 * random.unit()) for _ in lines])
    return n, draws, np.array(lines), sizes[:, 0], sizes[:, 1]


def newton_sparse(n, draws, lines, length, bore):
    """Vectorised laws, sparse heads system by splu each iteration; node 0 is held at 100 m."""
    law = Pipes(length, bore, np.full(len(length), 1e-4))
    m = len(lines)
    rows = np.repeat(np.arange(m), 2)
    full = sp.csr_matrix((np.tile([1.0, -1.0], m), (rows, lines.ravel())), shape=(m, n))
    a = full[:, 1:].tocsc()
    at, fixed = a.T.tocsr(), full[:, 0].toarray().ravel() * 100.0
    h, q = np.full(n - 1, 100.0), np.pi / 4 * bore**2
    start = time.perf_counter()
    for iteration in range(60):
        g, s = law(q)
        r = g - a @ h - fixed
        e = -(at @ q) - draws[1:]
        if np.max(np.abs(r)) < 1e-10 and np.max(np.abs(e)) < 1e-12:
            break
        y = 1 / np.maximum(s, 1e-7)
        system = (at @ sp.diags(y) @ a).tocsc()
        dh = spla.splu(system, permc_spec="MMD_AT_PLUS_A", options={"SymmetricMode": True}).solve(e + at @ (y * r))
        h += dh
        q = q + y * (a @ dh - r)
    return time.perf_counter() - start, iteration + 1, np.sum(np.abs(q))


def median(run, rounds):
    times = []
    for _ in range(rounds):
        start = time.perf_counter()
        run()
        times.append(time.perf_counter() - start)
    return statistics.median(times)


def main():
    nodes = 2500 if QUICK else 100_000
    ours = {}
    command = ["cargo", "bench", "--bench", "peer"]
    out = subprocess.run(command, env={**os.environ, "PEER_NODES": str(nodes)}, stdout=subprocess.PIPE, text=True, check=True)
    for line in out.stdout.splitlines():
        if line.startswith("{"):
            row = json.loads(line)
            ours[row["what"]] = row
    a, fixed, law, start = station()
    rows = []
    for name, solve in [("NumPy Newton", newton_station), ("scipy root", root_station)]:
        h, q, steps = solve(a, fixed, law, start.copy())
        seconds = median(lambda: solve(a, fixed, law, start.copy()), 20 if QUICK else 300)
        rows.append(("station", name, seconds, steps, np.sum(np.abs(q))))
    for kind in ["streets", "grid"]:
        seconds, steps, flows = newton_sparse(*large(kind, nodes))
        rows.append((kind, "SciPy sparse", seconds, steps, flows))
    print(f"{'network':10}{'peer':15}{'peer s':>12}{'steps':>7}{'dutybank s':>13}{'steps':>7}{'ratio':>8}  flows differ by")
    agree = True
    for what, name, seconds, steps, flows in rows:
        own = ours[what]
        off = abs(flows / own["flows"] - 1)
        agree &= off < 1e-8
        ratio = seconds / own["seconds"]
        print(f"{what:10}{name:15}{seconds:12.3e}{steps:7}{own['seconds']:13.3e}{own['iterations']:7}{ratio:8.1f}  {off:.1e}")
    sys.exit(0 if agree else 1)


if __name__ == "__main__":
    main()
