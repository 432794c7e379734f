"""Compares two files made by make_stacks.py.

    python compare.py OLD NEW

Inputs must be the same to the last digit, levels within 1e-9 eV, dipoles within 1e-6 of their size (plus 1e-9 nm,
for those that are zero or nearly so). Prints the worst differences; exit code 1 when something is beyond.
"""

import json
import sys
from pathlib import Path

LEVEL_TOLERANCE_EV = 1e-9
DIPOLE_TOLERANCE = 1e-6
DIPOLE_FLOOR_NM = 1e-9
RESULTS = ("levels_ev", "dipoles_nm", "method")


def main():
    if len(sys.argv) != 3:
        sys.exit(__doc__)
    old, new = (json.loads(Path(path).read_text(encoding="utf-8")) for path in sys.argv[1:])
    failures = []
    if old["hbar2_over_2m0_ev_nm2"] != new["hbar2_over_2m0_ev_nm2"]:
        failures.append("the constants differ")
    old, new = ({stack["name"]: stack for stack in document["stacks"]} for document in (old, new))
    if list(old) != list(new):
        failures.append("the lists of stacks differ")
    worst_level, worst_dipole = (0.0, "all the same"), (0.0, "all the same")
    for name in old:
        if name not in new:
            continue
        a, b = old[name], new[name]
        inputs = [{key: value for key, value in stack.items() if key not in RESULTS} for stack in (a, b)]
        labels = [[row[:2] for row in stack["dipoles_nm"]] for stack in (a, b)]
        if inputs[0] != inputs[1] or labels[0] != labels[1] or len(a["levels_ev"]) != len(b["levels_ev"]):
            failures.append(f"{name}: another stack or another number of levels")
            continue
        for index, (x, y) in enumerate(zip(a["levels_ev"], b["levels_ev"]), 1):
            difference = abs(x - y)
            worst_level = max(worst_level, (difference, f"{name} level {index}"))
            # `not <=` so that a NaN fails.
            if not difference <= LEVEL_TOLERANCE_EV:
                failures.append(f"{name}: level {index} differs by {difference:.2e} eV")
        for (i, j, x), (_, _, y) in zip(a["dipoles_nm"], b["dipoles_nm"]):
            share = abs(x - y) / (DIPOLE_TOLERANCE * max(x, y) + DIPOLE_FLOOR_NM)
            worst_dipole = max(worst_dipole, (share, f"{name} z_{i}{j}"))
            if not share <= 1:
                failures.append(f"{name}: z_{i}{j} is {y!r} nm instead of {x!r} nm")
    print(f"worst level difference: {worst_level[0]:.2e} eV ({worst_level[1]}), allowed {LEVEL_TOLERANCE_EV:g} eV")
    print(
        f"worst dipole difference: {worst_dipole[0]:.2e} of the allowed {DIPOLE_TOLERANCE:g} |z| + {DIPOLE_FLOOR_NM:g} nm"
        f" ({worst_dipole[1]})"
    )
    for failure in failures:
        print(f"FAILED: {failure}")
    sys.exit(bool(failures))


if __name__ == "__main__":
    main()
