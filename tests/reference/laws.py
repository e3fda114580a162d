"""Head laws of the parts, written from the equations alone: loss in head (m) and its slope at a flow (m3/s).

For comparison with the program only; nothing here is taken from it, and nothing in it comes from here.
"""

from math import copysign, log, log10, pi, sqrt

import numpy as np
from scipy.interpolate import PchipInterpolator
from scipy.optimize import brentq


class Quadratic:
    """h = r q |q|: minor losses (r = K / (2 g A2)), valves, equipment (r = loss / at2), fixed friction factors."""

    def __init__(self, r):
        self.r = r

    def loss(self, q):
        return self.r * q * abs(q), 2 * self.r * abs(q)


class HazenWilliams:
    """h = 10.667 L q^1.852 / (C^1.852 D^4.871), m and m3/s (Williams & Hazen 1905, SI rounding of the format)."""

    def __init__(self, length, bore, c):
        self.r = 10.667 * length / (c**1.852 * bore**4.871)

    def loss(self, q):
        return self.r * q * abs(q) ** 0.852, 1.852 * self.r * abs(q) ** 0.852


class ColebrookWhite:
    """h = f L/D v2/2g; f = 64/Re to Re 2000; 1/sqrt f = -2 log10(e/3.7D + 2.51/(Re sqrt f)) from Re 4000
    (Colebrook 1939); between them the cubic in q that meets both in value and slope."""

    def __init__(self, length, bore, roughness, viscosity, gravity):
        area = pi * bore**2 / 4
        self.c = length / bore / (2 * gravity * area**2)  # h = c f q2
        self.reynolds = bore / (area * viscosity)  # Re = reynolds q
        self.a = roughness / (3.7 * bore)
        q0, q1 = 2000 / self.reynolds, 4000 / self.reynolds
        self.q0, self.q1 = q0, q1
        self.laminar = 64 * self.c / self.reynolds  # h = laminar q
        h0, s0 = self.laminar * q0, self.laminar
        h1, s1 = self.turbulent(q1)
        w = q1 - q0
        # h(t) = h0 + w s0 t + c2 t2 + c3 t3 with t = (q - q0)/w
        self.cubic = (h0, w * s0, 3 * (h1 - h0) - w * (2 * s0 + s1), 2 * (h0 - h1) + w * (s0 + s1))

    def turbulent(self, q):
        b = 2.51 / (self.reynolds * q)
        x = brentq(lambda x: x + 2 * log10(self.a + b * x), 1e-3, 1e3, xtol=1e-15, rtol=1e-15)
        f = 1 / x**2
        m = 2 / log(10) / (self.a + b * x)  # of x + 2 log10(a + b x) = 0, with b falling as 1/q
        dx = m * x * (b / q) / (1 + m * b)
        return self.c * f * q * q, self.c * q * (2 * f - 2 * q * dx / x**3)

    def loss(self, q):
        size = abs(q)
        if size <= self.q0:
            return self.laminar * q, self.laminar
        if size >= self.q1:
            h, slope = self.turbulent(size)
        else:
            w = self.q1 - self.q0
            t = (size - self.q0) / w
            c0, c1, c2, c3 = self.cubic
            h = c0 + t * (c1 + t * (c2 + t * c3))
            slope = (c1 + t * (2 * c2 + t * 3 * c3)) / w
        return copysign(h, q), slope


class Curve:
    """A pump column: points joined by SciPy's PCHIP, or a polynomial from 0 to a limit; straight outside."""

    def __init__(self, value, slope, low, high):
        self.value, self.slope, self.low, self.high = value, slope, low, high

    @classmethod
    def points(cls, flow, column):
        pchip = PchipInterpolator(flow, column)
        slope = pchip.derivative()
        return cls(lambda q: float(pchip(q)), lambda q: float(slope(q)), flow[0], flow[-1])

    @classmethod
    def polynomial(cls, coefficients, limit):
        poly = np.polynomial.Polynomial(coefficients)
        slope = poly.deriv()
        return cls(lambda q: float(poly(q)), lambda q: float(slope(q)), 0.0, limit)

    def at(self, q):
        end = min(max(q, self.low), self.high)
        slope = self.slope(end)
        return self.value(end) + slope * (q - end), slope


class Pump:
    """h = -(1 - wear) s2 H(q/s)."""

    def __init__(self, head, ratio, wear):
        self.head, self.ratio, self.wear = head, ratio, wear

    def loss(self, q):
        value, slope = self.head.at(q / self.ratio)
        kept = 1 - self.wear
        return -kept * self.ratio**2 * value, -kept * self.ratio * slope


class Viscosity:
    """Factors for a viscous liquid by ANSI/HI 9.6.7, ISO/TR 17766: nu m2/s, at best efficiency q m3/s, h m a stage, n rpm, npsh m or None."""

    def __init__(self, nu, q, h, n, npsh, a):
        q *= 3600
        b = 16.5 * sqrt(nu * 1e6) * h**0.0625 / (q**0.375 * n**0.25)
        self.q = 2.71 ** (-0.165 * log10(b) ** 3.15) if b > 1 else 1.0
        self.eta = b ** (-0.0547 * b**0.69) if b > 1 else 1.0
        self.npsh = 1 + a * (1 / self.q - 1) * 274000 * npsh / (q**0.667 * n**1.33) if npsh is not None else 1.0

    def head(self, x):
        """C_H and its slope at a share x of best-efficiency flow; below 2 % x^0.75 is rounded off as the program documents it."""
        if x < 0.02:
            t = x / 0.02
            return 1 - (1 - self.q) * 0.02**0.75 * (1.25 - 0.25 * t) * t, -(1 - self.q) * 0.02**-0.25 * (1.25 - 0.5 * t)
        return 1 - (1 - self.q) * x**0.75, -0.75 * (1 - self.q) * x**-0.25


class AlteredPump:
    """At flow x of the model's curves: h = (1 - wear) s2 C_H H(x), out go q = F C_Q x - leak sqrt(h / h_best), h above 0."""

    def __init__(self, head, ratio, wear, flow_ratio, factors, best, leakage):
        self.head, self.ratio, self.wear, self.factors = head, ratio, wear, factors
        self.flow = flow_ratio * factors.q
        self.power = flow_ratio * ratio**2
        self.best = best
        self.leak = leakage * best / sqrt(head.at(best)[0])

    def over(self, x):
        end = min(max(x, 0.0), self.head.high)
        value, slope = self.head.at(end)
        factor, bend = self.factors.head(end / self.best)
        kept = (1 - self.wear) * self.ratio**2
        slope = kept * (factor * slope + bend / self.best * value)
        return kept * factor * value + slope * (x - end), slope

    def inside(self, q):
        root = lambda h: copysign(sqrt(abs(h)), h)
        out = lambda x: self.flow * x - self.leak * root(self.over(x)[0]) - q
        x = q / self.flow
        return x if self.leak == 0 else brentq(out, x - 9 * self.best, x + 9 * self.best, xtol=1e-16, rtol=1e-15)

    def loss(self, q):
        h, slope = self.over(self.inside(q))
        return -h, -slope / (self.flow - 0.5 * self.leak / sqrt(abs(h)) * slope)


def minor(k, bore, gravity):
    return Quadratic(k / (2 * gravity * (pi * bore**2 / 4) ** 2))


def velocity(q, bore):
    return q / (pi * bore**2 / 4)


def fixed_factor(length, bore, f, gravity):
    return minor(f * length / bore, bore, gravity)


def flow_coefficient(k_flow, pressure, gravity):
    """Kv or Cv (as m3/s) at its pressure (Pa) with water of 1000 kg/m3: h = p/(1000 g) (q/Kv)2 (IEC 60534-2-1)."""
    return Quadratic(pressure / (1000 * gravity) / k_flow**2)
