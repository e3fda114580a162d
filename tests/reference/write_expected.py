"""Solves every file in networks/, as written and in each of its cases, and writes the answers to expected/NAME.json."""

import json
from pathlib import Path

from read_system import System
from solve_reference import report

HERE = Path(__file__).parent

for path in sorted((HERE.parent.parent / "networks").glob("*.yaml")):
    answers = {"as written": report(System(path))}
    answers["cases"] = {case: report(System(path, case)) for case in System(path).file.get("cases", {})}
    (HERE / "expected").mkdir(exist_ok=True)
    (HERE / f"expected/{path.stem}.json").write_text(json.dumps(answers, indent=1) + "\n")
    print(path.stem, "and", len(answers["cases"]), "cases")
