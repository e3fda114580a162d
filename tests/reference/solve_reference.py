"""Solves a system file at one moment, apart from the program: `solve_reference.py FILE [CASE]` prints the answer as JSON.

Method: the content (the integral of each line's loss over its flow, less the work of the fixed heads) is minimised over the
flows by scipy.optimize.minimize (SLSQP), subject to the balance at each point and to the sign of the flow in one-way lines;
the bounds that bind are the lines held shut. Then heads and flows of the open lines are refined together by
scipy.optimize.root, and a line wrongly open or shut is turned over.
Source of the principle: Collins, Cooper, Helgason, Kennington & LeBlanc, Management Science 24 (1978).
"""

import json
import sys

import numpy as np
from scipy.integrate import quad
from scipy.optimize import brentq, minimize, root

import laws
from read_system import System


class Line:
    def __init__(self, system, name, spec):
        self.name, self.system = name, system
        self.ends = (spec["from"], spec["to"])
        self.pumps, self.parts = [], []  # parts: laws in order; pumps: (position among them, name, its figures)
        self.shut = self.stopped = self.checks = False
        bores = [self.length(body, "bore") for part in spec["parts"] for k, body in part.items() if k == "pipe"]
        self.bore = bores[0] if bores else None
        last = bores[0] if bores else None
        for part in spec["parts"]:
            (kind, body), = part.items()
            bore = self.length(body, "bore") if "bore" in body else last
            last = bore
            self.add(kind, body, bore, spec)
        self.sign = 1 if self.checks else 0
        for sign, end in ((1, self.ends[1]), (-1, self.ends[0])):
            if "outlet" in system.file["nodes"][end]:
                self.sign = sign

    def length(self, body, key):
        return self.system.number(body[key], "bore")

    def add(self, kind, body, bore, spec):
        system, g = self.system, self.system.gravity
        number = system.number
        if kind == "pipe":
            length = number(body["length"], "length")
            if "roughness" in body:
                rough = number(body["roughness"], "bore")
                self.parts.append(laws.ColebrookWhite(length, bore, rough, system.viscosity, g))
            elif "c_factor" in body:
                self.parts.append(laws.HazenWilliams(length, bore, body["c_factor"]))
            else:
                self.parts.append(laws.fixed_factor(length, bore, body["friction_factor"], g))
            self.parts.append(laws.minor(body.get("k", 0), bore, g))
        elif kind in ("loss", "valve", "check_valve"):
            opening = number(body.get("opening", "100 %"), "share")
            self.shut |= body.get("open") is False or opening == 0
            self.checks |= kind == "check_valve"
            if "kv" in body:
                law = laws.flow_coefficient(body["kv"] / 3600, 1e5, g)
            elif "cv" in body:
                law = laws.flow_coefficient(number(f"{body['cv']} gpm", "flow"), number("1 psi", "pressure"), g)
            else:
                law = laws.minor(body["k"], bore, g) if body["k"] else laws.Quadratic(0)
            share = opening if body.get("characteristic", "linear") == "linear" else 50 ** (opening - 1)
            self.parts.append(laws.Quadratic(law.r / share**2 if share else 0))
        elif kind == "equipment":
            at = number(body["at"], "flow")
            loss = body["loss"]
            pressure = isinstance(loss, str) and loss.split()[-1] in ("Pa", "kPa", "bar", "mbar", "psi")
            head = number(loss, "pressure") / (system.density * g) if pressure else number(loss, "length")
            self.parts.append(laws.Quadratic(head / at**2))
        elif kind == "pump":
            self.add_pump(body, bore, spec)

    def add_pump(self, body, bore, spec):
        system = self.system
        if body.get("running") is False:
            if "when_stopped" in body:
                self.parts.append(laws.minor(body["when_stopped"]["k"], bore, system.gravity))
            else:
                self.stopped = True
            return
        model = system.file["pump_models"][body["model"]]
        ratio = 1.0
        if "speed" in body:
            speed = body["speed"]
            if isinstance(speed, str) and speed.endswith("%"):
                ratio = system.number(speed, "share")
            else:
                ratio = system.number(speed, "speed") / system.number(model["speed"], "speed")
        if "impeller" in body:
            ratio *= self.length(body, "impeller") / self.length(model, "impeller")
        curve = model.get("curve", {})
        flow = [system.number(q, "flow") for q in curve.get("flow", [])]
        if "head_polynomial" in model:
            unit = system.number(1.0, "flow")
            coefficients = [c * system.number(1.0, "length") / unit**i for i, c in enumerate(model["head_polynomial"])]
            head = laws.Curve.polynomial(coefficients, system.number(model["flow_limit"], "flow"))
        else:
            head = laws.Curve.points(flow, [system.number(h, "length") for h in curve["head"]])
        columns = {
            name: laws.Curve.points(flow, [system.number(x, kind) for x in curve[name]])
            for name, kind in (("efficiency", "share"), ("power", "power"), ("npsh_required", "length"))
            if name in curve
        }
        wear = system.number(body.get("wear", 0), "share")
        leakage = system.number(body.get("leakage", 0), "share")
        law = laws.Pump(head, ratio, wear)
        if model.get("viscous") == "corrected" or leakage or "trim_exponent" in model:
            law = self.altered(body, model, law, columns, flow[int(np.argmax(curve["efficiency"]))], leakage)
        name = System.pump_name(self.name, spec, body)
        elevation = system.number(body["elevation"], "length") if "elevation" in body else None
        self.pumps.append((len(self.parts), name, law, columns, elevation, (flow, curve)))
        self.parts.append(law)

    def altered(self, body, model, plain, columns, best, leakage):
        """A pump in a viscous liquid, leaking inside, trimmed or slowed by other rules than the plain ones."""
        system = self.system
        speed = system.number(body["speed"], "share") if "speed" in body else 1.0
        trim = plain.ratio / speed
        flow = speed * trim ** model.get("trim_exponent", 1)
        npsh = columns["npsh_required"].at(best)[0] * plain.ratio**2 if "npsh_required" in columns else None
        viscous = model.get("viscous") == "corrected"
        factors = laws.Viscosity(
            system.viscosity if viscous else 0.0,
            flow * best,
            plain.ratio**2 * plain.head.at(best)[0] / model.get("stages", 1),
            speed * system.number(model["speed"], "speed"),
            npsh,
            dict(end=0.1, side=0.5)[model.get("inlet", "end")],
        )
        law = laws.AlteredPump(plain.head, plain.ratio, plain.wear, flow, factors, best, leakage)
        law.gain = 1.0
        if model.get("efficiency_with_speed") == "scaled":
            e = columns["efficiency"].at(best)[0]
            law.gain = (1 - (1 - e) * (1 / speed) ** 0.1) / e
        return law

    def loss(self, q, parts=None):
        pairs = [part.loss(q) for part in (self.parts if parts is None else parts)]
        return sum(h for h, _ in pairs), sum(s for _, s in pairs)

    def flow_losing(self, span):
        """The flow whose loss is `span` above that at no flow."""
        rise = lambda q: self.loss(q)[0] - self.loss(0.0)[0] - span
        reach = 1e-6
        while rise(reach) < 0:
            reach *= 2
        return brentq(rise, 0.0, reach)

    def content(self, q):
        return quad(lambda x: self.loss(x)[0], 0.0, q, epsabs=0, epsrel=1e-10, limit=200)[0] if q else 0.0


def fixed_head(system, node):
    (kind, body), = node.items()
    read = lambda key: system.number(body[key], "length")
    if kind == "reservoir" and isinstance(body, dict):
        pressure = system.number(body.get("pressure", 0), "pressure")
        return read("surface") + pressure / (system.density * system.gravity)
    if kind == "tank":
        return read("floor") + read("level")
    if kind in ("reservoir", "outlet"):
        return system.number(body["elevation"] if isinstance(body, dict) else body, "length")
    return None


def elevation(system, node):
    (kind, body), = node.items()
    key = {"reservoir": "surface", "tank": "floor"}.get(kind, "elevation")
    return system.number(body[key] if isinstance(body, dict) else body, "length")


def solve(system):
    nodes = system.file["nodes"]
    heads = {name: fixed_head(system, node) for name, node in nodes.items()}
    lines = [Line(system, name, spec) for name, spec in system.lines.items()]
    passing = [line for line in lines if not (line.shut or line.stopped)]
    reached = {name for name, head in heads.items() if head is not None}
    while new := {e for line in passing for e in line.ends if set(line.ends) & reached} - reached:
        reached |= new
    points = [name for name in nodes if heads[name] is None and name in reached]
    at = {name: i for i, name in enumerate(points)}
    passing = [line for line in passing if line.ends[0] in reached]
    draw = np.zeros(len(points))
    for name, i in at.items():
        body = nodes[name]["point"]
        draw[i] = system.number(body.get("draw", 0), "flow") if isinstance(body, dict) else 0
    known = [h for h in heads.values() if h is not None]

    def drop(line, x):
        end = lambda name: x[at[name]] if name in at else heads[name]
        return end(line.ends[0]) - end(line.ends[1])

    def incidence(chosen):
        a = np.zeros((len(points), len(chosen)))
        for j, line in enumerate(chosen):
            for sign, end in ((1, line.ends[0]), (-1, line.ends[1])):
                if end in at:
                    a[at[end], j] += sign
        return a

    start = least_content(heads, passing, incidence(passing), draw)
    return polish(system, nodes, heads, lines, passing, at, start, draw, drop, incidence)


def least_content(heads, passing, a, draw):
    """Flows of least content: the sum over lines of the integral of the loss from 0 to q, less the work of the fixed heads,
    subject to the balance at every point and, in one-way lines, to the sign of the flow."""
    pull = np.array([(heads[line.ends[0]] or 0) - (heads[line.ends[1]] or 0) for line in passing])
    known = [h for h in heads.values() if h is not None]
    span = max(known) - min(known) + max(abs(line.loss(0.0)[0]) for line in passing) + 1.0
    scale = float(np.median([line.flow_losing(span) for line in passing]))

    def content(z):
        return (sum(line.content(q) for line, q in zip(passing, z * scale)) - pull @ z * scale) / (scale * span)

    def losses(z):
        return (np.array([line.loss(q)[0] for line, q in zip(passing, z * scale)]) - pull) / span

    bounds = [(0 if line.sign > 0 else None, 0 if line.sign < 0 else None) for line in passing]
    balance = dict(type="eq", fun=lambda z: a @ z + draw / scale, jac=lambda z: a)
    first = np.array([0.1 * (line.sign or 1) for line in passing])
    found = minimize(content, first, jac=losses, bounds=bounds, constraints=[balance] if len(a) else [],
                     method="SLSQP", options=dict(ftol=1e-13, maxiter=500))
    return found.x * scale, scale


def polish(system, nodes, heads, lines, passing, at, start, draw, drop, incidence):
    """Heads and flows together by scipy.optimize.root with the plain laws; then the answer's own residuals."""
    first, scale = start
    n = len(at)
    shut = {line.name for line, q in zip(passing, first) if line.sign * q <= 1e-5 * scale and line.sign}
    for _ in range(len(passing) + 1):
        opened = [line for line in passing if line.name not in shut]
        a = incidence(opened)

        def residual(z):
            lost = [line.loss(q)[0] - drop(line, z[:n]) for line, q in zip(opened, z[n:] * scale)]
            return np.concatenate([a @ z[n:] + draw / scale, lost])

        def jacobian(z):
            slopes = [line.loss(q)[1] * scale for line, q in zip(opened, z[n:] * scale)]
            return np.block([[np.zeros((n, n)), a], [-a.T, np.diag(slopes)]])

        q = np.array([q for line, q in zip(passing, first) if line.name not in shut])
        # Heads from the flows: A' H = loss less the pull of the fixed heads, in the least-squares sense.
        lost = [line.loss(x)[0] - drop(line, np.zeros(n)) for line, x in zip(opened, q)]
        z = np.concatenate([np.linalg.lstsq(a.T, lost, rcond=None)[0], q / scale])
        if len(z):
            z = root(residual, z, jac=jacobian, method="hybr", options=dict(xtol=1e-15)).x
        against = {line.name: line.sign * (drop(line, z[:n]) - line.loss(0.0)[0]) for line in passing if line.name in shut}
        wrong_way = {line.name for line, q in zip(opened, z[n:]) if line.sign * q < 0}
        wrongly_shut = {name for name, push in against.items() if push > 1e-9}
        if not wrong_way | wrongly_shut:
            break
        shut = shut ^ (wrong_way | wrongly_shut)
    flows = {line.name: 0.0 for line in lines}
    flows.update({line.name: float(q * scale) for line, q in zip(opened, z[n:])})
    answer = {**heads, **{name: float(z[i]) for name, i in at.items()}}
    rest = residual(z) if len(z) else np.zeros(1)
    worst = dict(node=float(abs(rest[:n]).max(initial=0) * scale), line=float(abs(rest[n:]).max(initial=0)))
    if worst["node"] > 1e-10 * max(scale, 1e-3) or worst["line"] > 1e-9 or wrong_way | wrongly_shut:
        raise ArithmeticError(f"not solved: {worst}, {wrong_way}, {wrongly_shut}")
    return answer, flows, lines, worst


def report(system):
    heads, flows, lines, worst = solve(system)
    g, density, out = system.gravity, system.density, system.out
    nodes = {}
    for name, node in system.file["nodes"].items():
        (kind, body), = node.items()
        pressure = None
        if heads[name] is not None:
            above = 0.0 if kind == "outlet" else heads[name] - elevation(system, node)
            pressure = density * g * above
        nodes[name] = dict(head=out(heads[name], "length"), pressure=out(pressure, "pressure"))
    listed, pumps = {}, {}
    for line in lines:
        q = flows[line.name]
        held = line.sign != 0 and q == 0
        state = "closed" if line.shut else "stopped" if line.stopped else "checked" if held else "open"
        listed[line.name] = dict(flow=out(q, "flow"), state=state)
        for pump in line.pumps:
            pumps[pump[1]] = operation(system, line, pump, q, heads)
    return dict(nodes=nodes, lines=listed, pumps=pumps, balance=worst)


def operation(system, line, pump, q, heads):
    position, _, law, columns, height, (flow, curve) = pump
    g, density, out, s = system.gravity, system.density, system.out, law.ratio
    head = -law.loss(q)[0]
    lost_before, _ = line.loss(q, line.parts[:position])
    start = heads[line.ends[0]]
    if height is None:
        height = elevation(system, system.file["nodes"][line.ends[0]])
    inlet = None if start is None else start - lost_before - height
    figures = dict(flow=out(q, "flow"), head=out(head, "length"))
    if isinstance(law, laws.AlteredPump):
        x, factors = law.inside(q), law.factors
        e = columns["efficiency"].at(x)[0]
        water = density * g * x * law.head.at(x)[0] / e * law.power / law.gain
        shaft = water * factors.q * factors.head(min(max(x, 0.0), law.head.high) / law.best)[0] / factors.eta
        figures.update(efficiency=100 * density * g * q * head / shaft, shaft_power=out(shaft, "power"), share_of_bep=x / law.best)
        figures["npsh_required"] = out(factors.npsh * s**2 * columns["npsh_required"].at(x)[0], "length")
        figures["npsh_available"] = out((system.barometer - system.vapour_pressure) / (density * g) + inlet, "length")
        return figures
    new_head = s**2 * law.head.at(q / s)[0]
    if "efficiency" in columns:
        e, slope = columns["efficiency"].at(q / s)
        flow_per_e = q / e if q else s / slope  # at no flow, the limit of q/E
        shaft = density * g * new_head * flow_per_e
        figures.update(efficiency=100 * e * (1 - law.wear), shaft_power=out(shaft, "power"))
        best = flow[int(np.argmax(curve["efficiency"]))]  # PCHIP rises no higher than its points
    if "power" in columns:
        shaft = s**3 * columns["power"].at(q / s)[0] * density / 1000
        figures.update(efficiency=100 * density * g * q * head / shaft, shaft_power=out(shaft, "power"))
        hydraulic = [x * law.head.at(x)[0] for x in flow]  # best point of flow x head / power, among the points
        best = flow[int(np.argmax(np.divide(hydraulic, [system.number(p, "power") for p in curve["power"]])))]
    if "efficiency" in columns or "power" in columns:
        figures["share_of_bep"] = q / (s * best)
    if "npsh_required" in columns:
        figures["npsh_required"] = out(s**2 * columns["npsh_required"].at(q / s)[0], "length")
    if inlet is not None:
        available = (system.barometer - system.vapour_pressure) / (density * g) + inlet
        figures["npsh_available"] = out(available, "length")
    return figures


if __name__ == "__main__":
    print(json.dumps(report(System(*sys.argv[1:3])), indent=1))
