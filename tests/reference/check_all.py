"""Makes stored references anew and compares them with what is stored.

Works on a copy, so nothing here is overwritten. All closed forms and the small
eigenvalue case are made anew; of the membrane cases, two (the whole set takes
minutes: `python check_all.py --all`). Numbers must agree to 1e-6 relative, or
1e-9 of the largest number in their list. Ends with a line "N passed, N failed".
"""

import json
import math
import pathlib
import shutil
import subprocess
import sys
import tempfile

HERE = pathlib.Path(__file__).parent
RELATIVE = 1e-6
OF_LARGEST = 1e-9
SKIPPED = {"made_with", "versions", "python", "numpy", "scipy", "scikit-fem"}
# Residuals and differences between routes are noise around zero.
NOISE = ("difference", "residual", "error", "change", "apart")


def differences(stored, made, path=""):
    """Places where two JSON values part."""
    if isinstance(stored, dict) and isinstance(made, dict):
        if stored.keys() != made.keys():
            yield f"{path}: other keys"
            return
        for key in stored:
            if key not in SKIPPED and not any(word in key for word in NOISE):
                yield from differences(stored[key], made[key], f"{path}.{key}")
    elif isinstance(stored, list) and isinstance(made, list):
        if len(stored) != len(made):
            yield f"{path}: {len(stored)} entries against {len(made)}"
            return
        numbers = [abs(x) for x in stored if isinstance(x, (int, float))]
        largest = max(numbers, default=0.0)
        for index, (a, b) in enumerate(zip(stored, made)):
            both = all(isinstance(x, (int, float)) for x in (a, b))
            if not (both and abs(a - b) <= OF_LARGEST * largest):
                yield from differences(a, b, f"{path}[{index}]")
    elif isinstance(stored, float) or isinstance(made, float):
        if not math.isclose(stored, made, rel_tol=RELATIVE, abs_tol=1e-12):
            yield f"{path}: {stored} stored, {made} made"
    elif stored != made:
        yield f"{path}: {stored!r} stored, {made!r} made"


def main():
    membrane = [] if "--all" in sys.argv else ["closed_box", "box_one_door"]
    jobs = [
        ("closed_form", ["make.py"]),
        ("eigen", ["make_cantilever.py"]),
        ("eigen", ["solve_modes.py", "cantilever"]),
        ("spectrum", ["make_reference.py"]),
        ("membrane", ["make_reference.py", *membrane]),
    ]
    passed = failed = 0
    with tempfile.TemporaryDirectory() as folder:
        copy = pathlib.Path(folder) / "reference"
        shutil.copytree(HERE, copy)
        for place, command in jobs:
            print("running", place, *command, flush=True)
            subprocess.run([sys.executable, *command], cwd=copy / place, check=True,
                           stdout=subprocess.DEVNULL)
        for stored in sorted(HERE.rglob("*.json")):
            made = copy / stored.relative_to(HERE)
            found = list(differences(json.loads(stored.read_text()), json.loads(made.read_text())))
            for line in found[:5]:
                print(f"{stored.relative_to(HERE)}{line}")
            failed += bool(found)
            passed += not found
    print(f"references: {passed} passed, {failed} failed")
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main())
