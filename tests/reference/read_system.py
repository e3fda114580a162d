"""A system file as plain numbers: units resolved to SI, banks opened, a case's changes made."""

import copy
import csv
import re
from pathlib import Path

import yaml

GALLON, PSI, FOOT = 231 * 0.0254**3, 0.45359237 * 9.80665 / 0.0254**2, 0.3048
UNITS = {
    "length": {"m": 1, "mm": 1e-3, "cm": 1e-2, "km": 1e3, "ft": FOOT, "in": 0.0254},
    "flow": {"m3/s": 1, "m3/h": 1 / 3600, "L/s": 1e-3, "L/min": 1e-3 / 60, "gpm": GALLON / 60, "ft3/s": FOOT**3},
    "pressure": {"Pa": 1, "kPa": 1e3, "bar": 1e5, "mbar": 100, "psi": PSI},
    "power": {"W": 1, "kW": 1e3, "hp": 550 * FOOT * 0.45359237 * 9.80665},
    "area": {"m2": 1, "ft2": FOOT**2},
    "volume": {"m3": 1, "L": 1e-3, "gal": GALLON},
    "density": {"kg/m3": 1, "lb/ft3": 0.45359237 / FOOT**3},
    "viscosity": {"m2/s": 1, "cSt": 1e-6, "mm2/s": 1e-6},
    "dynamic": {"Pa.s": 1, "mPa.s": 1e-3, "cP": 1e-3},
    "share": {"%": 1e-2},
    "speed": {"rpm": 1},
    "temperature": {"C": 1},
    "acceleration": {"m/s2": 1},
    "velocity": {"m/s": 1, "ft/s": FOOT},
}
UNITS["bore"] = UNITS["length"]
BASE = {
    "metric": dict(length="m", bore="mm", flow="m3/h", pressure="bar", power="kW", volume="m3", area="m2",
                   density="kg/m3", viscosity="cSt", temperature="C", share="%", speed="rpm"),
    "us": dict(length="ft", bore="in", flow="gpm", pressure="psi", power="hp", volume="gal", area="ft2",
               density="lb/ft3", viscosity="cSt", temperature="F", share="%", speed="rpm"),
    "si": dict(length="m", bore="m", flow="m3/s", pressure="Pa", power="W", volume="m3", area="m2",
               density="kg/m3", viscosity="m2/s", temperature="C", share="%", speed="rpm"),
}
# Keys that each kind of part may carry; a case finds the part it means by them.
KEYS = {
    "pipe": {"length", "bore", "roughness", "material", "c_factor", "friction_factor", "fittings", "k"},
    "loss": {"k", "fittings", "bore"},
    "valve": {"k", "kv", "cv", "bore", "open", "opening", "characteristic"},
    "check_valve": {"k", "kv", "cv", "bore", "opening", "characteristic"},
    "equipment": {"loss", "at"},
    "pump": {"model", "elevation", "speed", "impeller", "wear", "leakage", "running", "name", "when_stopped"},
}
WALL = ("roughness", "material", "c_factor", "friction_factor")


def unit_factor(kind, unit):
    return UNITS[kind][unit]


class System:
    """The file's content with quantities still as written, and the means to turn each into SI."""

    def __init__(self, path, case=None):
        self.folder = Path(path).parent
        self.file = yaml.safe_load(Path(path).read_text())
        units = self.file.get("units", "metric")
        units = {"base": units} if isinstance(units, str) else units
        self.units = {**BASE[units.get("base", "metric")], **{k: v for k, v in units.items() if k != "base"}}
        self.lines = self.open_banks()
        for target, value in (self.file["cases"][case] if case else {}).items():
            self.change(target.split("."), value)
        self.gravity = self.number(self.file.get("site", {}).get("gravity", 9.80665), "acceleration")
        self.density, self.viscosity, self.vapour_pressure = self.fluid()
        # ISO 2533: p = 101325 (1 - 0.0065 H / 288.15)^5.25588, geopotential height H = r z / (r + z), r = 6356766 m
        site = self.file.get("site", {})
        z = self.number(site.get("elevation", 0), "length")
        geopotential = 6356766 * z / (6356766 + z)
        standard = 101325 * (1 - 0.0065 * geopotential / 288.15) ** (9.80665 / (287.05287 * 0.0065))
        self.barometer = self.number(site["barometer"], "pressure") if "barometer" in site else standard

    def number(self, value, kind):
        """A quantity in SI; a bare number is in the file's unit for its kind."""
        if isinstance(value, (int, float)):
            return value * UNITS[kind][self.units[kind]] if kind in self.units else value
        number, unit = re.fullmatch(r"\s*([-+0-9.eE]+)\s*(\S+)\s*", value).groups()
        return float(number) * UNITS[kind][unit]

    def out(self, value, kind):
        return None if value is None else value / UNITS[kind][self.units[kind]]

    def fluid(self):
        fluid = self.file.get("fluid", {"water": "20 C"})
        if "water" in fluid:
            celsius = self.number(fluid["water"], "temperature")
            table = Path(__file__).parent.parent / "published/tables/water.csv"  # its rows only: no interpolation
            rows = csv.reader(line for line in table.open() if not line.startswith("#"))
            row = next(row for row in rows if row[0].replace(".", "").isdigit() and float(row[0]) == celsius)
            density, dynamic = float(row[4]), float(row[2])  # density at 1 atm
            return density, dynamic / density, float(row[3])
        density = self.number(fluid["density"], "density")
        viscosity = fluid["viscosity"]
        if isinstance(viscosity, str) and viscosity.split()[-1] in UNITS["dynamic"]:
            viscosity = self.number(viscosity, "dynamic") / density
        else:
            viscosity = self.number(viscosity, "viscosity")
        return density, viscosity, self.number(fluid.get("vapour_pressure", 0), "pressure")

    def open_banks(self):
        lines = {}
        for name, line in self.file["lines"].items():
            shape = {k: v for k, v in line.items() if k in ("from", "to")}
            parts = line.get("parts") or [{k: v} for k, v in line.items() if k in KEYS]
            for i in range(1, line.get("count", 0) + 1):
                member = {**shape, "parts": copy.deepcopy(parts), "number": i}
                lines[f"{name}.{i}"] = member
            if "count" not in line:
                lines[name] = {**shape, "parts": copy.deepcopy(parts)}
        return lines

    def change(self, target, value):
        """`NAME.key`, `NAME.PART.key`; NAME a node, line, bank, member, pump, model, `fluid` or `site`."""
        *path, key = target
        if path[0] in ("fluid", "site"):
            fluid = self.file.get("fluid", {"water": "20 C"})
            if path[0] == "fluid":
                self.file["fluid"] = {key: value} if "water" in fluid or key == "water" else {**fluid, key: value}
            else:
                self.file.setdefault("site", {})[key] = value
            return
        name = path[0]
        if name in self.file["nodes"]:
            node = self.file["nodes"][name]
            (kind,) = node
            if not isinstance(node[kind], dict):
                node[kind] = {{"reservoir": "surface"}.get(kind, "elevation"): node[kind]}
            node[kind][key] = value
            return
        if name in self.file.get("pump_models", {}):
            self.file["pump_models"][name][key] = value
            return
        if len(path) > 1 and path[1].isdigit():
            name, path = f"{path[0]}.{path[1]}", path[1:]
        wanted = path[1] if len(path) > 1 else None
        changed = 0
        for line_name, line in self.lines.items():
            inside = line_name == name or re.fullmatch(re.escape(name) + r"\.\d+", line_name)
            for part in line["parts"]:
                (kind, body), = part.items()
                pump = kind == "pump" and self.pump_name(line_name, line, body) == name
                if key in KEYS[kind] and (pump or inside and wanted in (None, kind, body.get("name"))):
                    if key in WALL:
                        for other in WALL:
                            body.pop(other, None)
                    body[key] = value
                    changed += 1
        if not changed:
            raise ValueError(f"nothing to change at {'.'.join(target)}")

    @staticmethod
    def pump_name(line_name, line, pump):
        if "name" not in pump:
            return line_name
        return f"{pump['name']}.{line['number']}" if "number" in line else pump["name"]
