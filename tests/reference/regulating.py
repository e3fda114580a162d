"""Networks with parts that regulate themselves, solved apart from the program: `regulating.py` writes regulating.json.

Each network is drawn at random (all data invented): a tower and a pump at a sump feed a tree or a loop of points, losses are
quadratic (h = r q |q|), the pump's head is a - b q2. Regulating parts stand in some lines.

Method: nothing of the program's. Every combination of states of the regulating parts and of the one-way lines is tried; under each
the equations (flow balance, head balance, and one equation for each state) are solved by scipy.optimize.root (MINPACK hybr and lm) from
several starts, and a solution is kept if it meets the inequalities of its states. The network is written if exactly one answer, to
1e-7, is left. Signs and states: as in the file format.
"""

import itertools
import json
import math
import random

import numpy as np
from scipy.optimize import root

G, RHO = 9.80665, 998.2
AREA = math.pi / 4 * 0.1**2


def loss_k(r):
    return r * 2 * G * AREA**2  # h = K v2/2g


def draw_network(rng):
    points = [f"p{i}" for i in range(rng.randint(2, 4))]
    level = {p: round(rng.uniform(0, 10), 1) for p in points}
    draw = {p: round(rng.choice([0, 0, rng.uniform(2, 20)]), 1) for p in points}
    fixed = {"sump": round(rng.uniform(0, 2), 1), "tower": round(rng.uniform(20, 45), 1), "pond": round(rng.uniform(0, 8), 1)}
    lines = []

    def line(a, b, **more):
        lines.append(dict(name=f"l{len(lines)}", ends=(a, b), r=round(rng.uniform(2e3, 4e4), 0), part=None, pump=None, **more))
        return lines[-1]

    pump = line("sump", points[0])
    pump["pump"] = (round(rng.uniform(35, 70), 1), round(rng.uniform(0.002, 0.01), 5))  # a, b: m, m per (m3/h)2
    pump["r"] = 0.0
    line(points[-1], "pond")
    if rng.random() < 0.6:
        line("tower", points[rng.randrange(len(points))])
    for i in range(1, len(points)):
        line(points[i - 1], points[i])
    if rng.random() < 0.5 and len(points) > 2:
        line(points[0], points[-1])
    kinds = ["hold_downstream", "hold_upstream", "limit_flow", "minimum_flow"]
    rng.shuffle(kinds)
    held = set()
    for kind in kinds[: rng.randint(1, 3)]:
        if kind == "minimum_flow":
            back = line(points[0], "sump")
            back["part"] = (kind, round(rng.uniform(5, 50), 1))
            continue
        fits = [l for l in lines if not l["pump"] and not l["part"]]
        end = {"hold_downstream": 1, "hold_upstream": 0}.get(kind)
        if end is not None:
            fits = [l for l in fits if l["ends"][end] in points and l["ends"][end] not in held]
        if kind == "hold_upstream" and rng.random() < 0.5:
            relief = line(points[rng.randrange(len(points))], "sump")
            fits = [relief] if relief["ends"][0] not in held else []
        if not fits:
            continue
        chosen = rng.choice(fits)
        if end is None:
            chosen["part"] = (kind, round(rng.uniform(2, 30), 1))
        else:
            held.add(chosen["ends"][end])
            chosen["part"] = (kind, round(rng.uniform(0.3, 5), 2))
    return points, level, draw, fixed, lines


def solve(points, level, draw, fixed, lines, rng):
    n, m = len(points), len(lines)
    at = {p: i for i, p in enumerate(points)}
    one_way = [bool(l["part"]) and l["part"][0] != "limit_flow" for l in lines]
    choices = []
    for l, way in zip(lines, one_way):
        states = ["open"]
        if l["part"]:
            states.append("rules")
        if way:
            states.append("shut")
        choices.append(states)

    def head(x, node):
        return x[at[node]] * 10 if node in at else fixed[node]

    def loss(l, q):
        h = l["r"] * q * abs(q)
        if l["pump"]:
            a, b = l["pump"]
            h -= a - b * (3600 * q) * abs(3600 * q)
        return h

    def room(x, l, q):
        kind, value = l["part"]
        a, b = l["ends"]
        if kind == "hold_downstream":
            return (level[b] + value * 1e5 / (RHO * G)) - head(x, b)
        if kind == "hold_upstream":
            return head(x, a) - (level[a] + value * 1e5 / (RHO * G))
        felt = q if kind == "limit_flow" else x[n] / 100
        return (value / 3600 - felt) * 1000

    def spare(x, l, q):
        return head(x, l["ends"][0]) - head(x, l["ends"][1]) - loss(l, q)

    answers = []
    for states in itertools.product(*choices):

        def equations(x):
            q = x[n:] / 100
            balance = np.array([-draw[p] / 3600 for p in points])
            rest = []
            for l, state, flow in zip(lines, states, q):
                for sign, end in ((-1, l["ends"][0]), (1, l["ends"][1])):
                    if end in at:
                        balance[at[end]] += sign * flow
                rest.append({"open": spare, "rules": room}[state](x, l, flow) if state != "shut" else flow * 100)
            return np.concatenate([balance * 100, rest])

        for attempt in range(4):
            start = np.concatenate([[rng.uniform(1, 5) for _ in points], [rng.uniform(0.1, 2) for _ in lines]])
            found = root(equations, start, method=("hybr", "lm")[attempt % 2], options=dict(xtol=1e-14))
            x = found.x
            if np.abs(equations(x)).max() > 1e-9:
                continue
            fits = True
            for l, state, flow, way in zip(lines, states, x[n:] / 100, one_way):
                if way and flow < -1e-9:
                    fits = False
                if l["part"]:
                    r, s = room(x, l, flow), spare(x, l, flow)
                    fits &= {"open": r >= -1e-7, "rules": s >= -1e-7, "shut": min(r, s) <= 1e-7}[state]
            if fits:
                answers.append((x, states))
            break
    if not answers:
        return None
    x, states = answers[0]
    for other, _ in answers[1:]:
        # heads between lines that stand still may differ: such networks are left out
        if np.abs(other - x).max() > 1e-7:
            return None
    return {p: x[i] * 10 for p, i in at.items()}, x[n:] / 100, states


def text_of(points, level, draw, fixed, lines):
    nodes = [f"  {name}: {{reservoir: {h} m}}" for name, h in fixed.items() if any(name in l["ends"] for l in lines)]
    nodes += [f"  {p}: {{point: {{elevation: {level[p]} m, draw: {draw[p]} m3/h}}}}" for p in points]
    out = []
    for l in lines:
        if l["pump"]:
            a, b = l["pump"]
            part = "pump: {model: m, elevation: 0 m}"
            model = f"  m: {{head_polynomial: [{a}, 0, -{b}], flow_limit: 1000 m3/h}}"
        elif l["part"]:
            kind, value = l["part"]
            body = f"k: {loss_k(l['r'])!r}, bore: 100 mm"
            if kind == "minimum_flow":
                part = f"minimum_flow: {{pump: l0, flow: {value} m3/h, {body}}}"
            elif kind == "limit_flow":
                part = f"limit_flow: {{flow: {value} m3/h, {body}}}"
            else:
                part = f"{kind}: {{pressure: {value} bar, {body}}}"
        else:
            part = f"loss: {{k: {loss_k(l['r'])!r}, bore: 100 mm}}"
        out.append(f"  {l['name']}: {{from: {l['ends'][0]}, to: {l['ends'][1]}, {part}}}")
    fluid = f"fluid: {{density: {RHO} kg/m3, viscosity: 1 cSt, vapour_pressure: 23 mbar}}"
    return "\n".join([fluid, "nodes:", *nodes, "lines:", *out, "pump_models:", model, ""])


def main():
    rng = random.Random(1)
    cases = []
    while len(cases) < 40:
        network = draw_network(rng)
        answer = solve(*network, rng)
        if answer is None or not any(l["part"] for l in network[4]):
            continue
        heads, flows, states = answer
        word = {"open": "wide open", "rules": "regulating", "shut": "shut"}
        cases.append({
            "text": text_of(*network),
            "heads": heads,
            "flows": {l["name"]: q for l, q in zip(network[4], flows)},
            "states": {f"{l['name']}.{l['part'][0]}": word[s] for l, s in zip(network[4], states) if l["part"]},
        })
    with open("regulating.json", "w") as out:
        json.dump(cases, out, indent=1)
        out.write("\n")
    counts = {}
    for case in cases:
        for name, state in case["states"].items():
            key = (name.split(".")[1], state)
            counts[key] = counts.get(key, 0) + 1
    for key in sorted(counts):
        print(*key, counts[key])


if __name__ == "__main__":
    main()
