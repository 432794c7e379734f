"""Compares two files made by make_open_ends.py.

    python compare_open_ends.py OLD NEW

Inputs must be the same to the last digit, energies within 1e-12 eV, widths, transmissions and strengths within 1e-9 of
themselves; exit code 1 when something is beyond.
"""

import json
import sys
from pathlib import Path

ENERGY_EV = 1e-12
RELATIVE = 1e-9


def main():
    if len(sys.argv) != 3:
        sys.exit(__doc__)
    old, new = (json.loads(Path(path).read_text(encoding="utf-8")) for path in sys.argv[1:])
    worst = {"energy eV": 0.0, "relative": 0.0}

    def same(name, kind, a, b):
        off = abs(a - b) if kind == "energy eV" or a == b else abs(a - b) / max(abs(a), abs(b))
        # `not <=` so that a NaN fails.
        if not off <= (ENERGY_EV if kind == "energy eV" else RELATIVE):
            sys.exit(f"FAILED: {name}: {b} instead of {a}")
        worst[kind] = max(worst[kind], off)

    for group, lists in (("stacks", ("states", "transmission")), ("wells", ("strengths",))):
        if [(s["name"], s["structure"]) for s in old[group]] != [(s["name"], s["structure"]) for s in new[group]]:
            sys.exit("FAILED: the stacks differ")
        for a, b in zip(old[group], new[group]):
            for key in lists:
                if len(a[key]) != len(b[key]):
                    sys.exit(f"FAILED: {a['name']}: another number of {key}")
                for (x, y), (v, w) in zip(a[key], b[key]):
                    same(a["name"], "energy eV", x, v)
                    same(a["name"], "relative", y, w)
    print(f"worst differences: {worst['energy eV']:.1e} eV and {worst['relative']:.1e} of widths, transmissions, strengths")


if __name__ == "__main__":
    main()
