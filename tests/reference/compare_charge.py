"""Compares two files made by make_charge.py.

    python compare_charge.py OLD NEW

Inputs must be the same to the last digit, energies within 1e-5 meV and densities within 1e-7 of a case's largest; exit code
1 when something is beyond.
"""

import json
import sys
from pathlib import Path


def main():
    if len(sys.argv) != 3:
        sys.exit(__doc__)
    old, new = (json.loads(Path(path).read_text(encoding="utf-8")) for path in sys.argv[1:])
    if [(c["name"], c["structure"]) for c in old] != [(c["name"], c["structure"]) for c in new]:
        sys.exit("FAILED: the cases differ")
    worst = 0.0
    for a, b in zip(old, new):
        energies = lambda case: case["levels_mev"] + [case["fermi_mev"]] + case["edges_mev"]
        # In units in which both kinds share a tolerance.
        scale = 1e2 / max(a["densities_cm2"])
        pairs = list(zip(energies(a), energies(b)))
        pairs += [(scale * x, scale * y) for x, y in zip(a["densities_cm2"], b["densities_cm2"])]
        for x, y in pairs:
            # `not <=` so that a NaN fails.
            if not abs(x - y) <= 1e-5:
                sys.exit(f"FAILED: {a['name']}: {y} instead of {x}")
            worst = max(worst, abs(x - y))
    print(f"worst difference: {worst:.1e} meV, allowed 1e-05 meV")


if __name__ == "__main__":
    main()
