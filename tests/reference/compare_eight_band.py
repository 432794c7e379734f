"""Compares two files made by make_eight_band.py.

    python compare_eight_band.py OLD NEW

Inputs must be the same to the last digit and levels within 1e-7 eV; exit code 1 when something is beyond.
"""

import json
import sys
from pathlib import Path

TOLERANCE_EV = 1e-7


def main():
    if len(sys.argv) != 3:
        sys.exit(__doc__)
    old, new = (json.loads(Path(path).read_text(encoding="utf-8"))["stacks"] for path in sys.argv[1:])
    inputs = [[(s["name"], s["structure"], [r["k_per_nm"] for r in s["solved"]]) for s in stacks] for stacks in (old, new)]
    if inputs[0] != inputs[1]:
        sys.exit("FAILED: the stacks differ")
    worst = 0.0
    for a, b in zip(old, new):
        for x, y in zip(a["solved"], b["solved"]):
            for key in ("conduction_ev", "valence_ev"):
                if len(x[key]) != len(y[key]):
                    sys.exit(f"FAILED: {a['name']}: another number of levels")
                for e, f in zip(x[key], y[key]):
                    # `not <=` so that a NaN fails.
                    if not abs(e - f) <= TOLERANCE_EV:
                        sys.exit(f"FAILED: {a['name']}: {f} eV instead of {e} eV")
                    worst = max(worst, abs(e - f))
    print(f"worst level difference: {worst:.1e} eV, allowed {TOLERANCE_EV:g} eV")


if __name__ == "__main__":
    main()
