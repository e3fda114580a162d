"""Solves every case of tests/published with the reference solver and compares it with its expected.yaml."""

import sys
from math import pi
from pathlib import Path

import yaml

from read_system import System, unit_factor
from solve_reference import elevation, report, solve

PUBLISHED = Path(__file__).parent.parent / "published"
KINDS = {"flow": "flow", "head": "length", "pressure_head": "length", "head_loss": "length", "velocity": "velocity"}


def figure(system, answer, of):
    """The figure that `of` names, in SI."""
    heads, flows, lines, states, pumps = answer
    group, rest = of.split(".", 1)
    name, what = rest.rsplit(".", 1)
    if group == "nodes":
        return heads[name] - (elevation(system, system.file["nodes"][name]) if what == "pressure_head" else 0)
    if group == "pumps":
        return pumps[name]["head"]
    line = lines[name]
    return {
        "flow": lambda: flows[name],
        "state": lambda: states[name],
        "head_loss": lambda: heads[line.ends[0]] - heads[line.ends[1]],
        "velocity": lambda: flows[name] / (pi * line.bore**2 / 4),
    }[what]()


def check(folder):
    """Rows of the case that disagree, and how many there are."""
    system = System(folder / "network.yaml")
    heads, flows, lines, _ = solve(system)
    told = report(system)
    states = {name: line["state"] for name, line in told["lines"].items()}
    pumps = {name: {"head": system.number(p["head"], "length")} for name, p in told["pumps"].items()}
    answer = heads, flows, {line.name: line for line in lines}, states, pumps
    wrong = []
    rows = yaml.safe_load((folder / "expected.yaml").read_text())["expect"]
    for row in rows:
        found = figure(system, answer, row["of"])
        if "unit" not in row:
            if found != row["value"]:
                wrong.append(f"{row['of']}: {found}, not {row['value']}")
            continue
        found /= unit_factor(KINDS[row["of"].rsplit(".", 1)[1]], row["unit"])
        off = found - float(row["value"])
        if abs(off) > float(row["tolerance"]):
            wrong.append(f"{row['of']}: {found:.10g}, not {row['value']} {row['unit']} (off {off:.2g})")
    return wrong, len(rows)


if __name__ == "__main__":
    failed = 0
    for folder in sorted(path.parent for path in PUBLISHED.glob("*/network.yaml")):
        wrong, count = check(folder)
        failed += bool(wrong)
        print(f"{folder.name}: {count - len(wrong)} of {count} rows agree")
        for line in wrong:
            print("   ", line)
    sys.exit(1 if failed else 0)
