"""Reference values of 200 Mueller matrices, and the check of the published ones.

Usage:  python fixtures.py              write fixtures.json
        python fixtures.py --check      compute all again and compare with fixtures.json
        python fixtures.py --published  compare every entry of published.json with the definitions

The comparison allows 1e-12, relative to the larger of 1 and the value. Exit code 1 at the first
difference.
"""

import json
import sys
from pathlib import Path

import numpy as np

from cases import SEED, cases
from definitions import check_nearest_by_search, examine

FILE = Path(__file__).resolve().parent / "fixtures.json"
ALLOWED = 1e-12


def main(arguments):
    if arguments == []:
        write()
    elif arguments == ["--check"]:
        sys.exit(check())
    elif arguments == ["--published"]:
        from published import check_published
        sys.exit(check_published())
    else:
        sys.exit(__doc__)


def write():
    lines = []
    for label, mueller, normalised in cases():
        given = mueller.ravel() + 0.0
        case = {"label": label, "mueller": given.tolist(), "normalised": normalised,
                **examine(given, normalised)}
        lines.append(json.dumps(case, ensure_ascii=False, allow_nan=False))
    head = json.dumps({"seed": SEED, "count": len(lines)})[:-1]
    FILE.write_text(head + ', "cases": [\n' + ",\n".join(lines) + "\n]}\n", encoding="utf-8", newline="\n")
    print(f"{len(lines)} cases written")


def check():
    """Inputs are made again and compared; expectations are computed from the committed inputs.

    So a last bit that another machine rounds differently in an input does no harm.
    """
    committed = json.loads(FILE.read_text(encoding="utf-8"))
    made = list(cases())
    if committed["count"] != len(made) or len(committed["cases"]) != len(made) or committed["seed"] != SEED:
        print("fixtures.json: the number of cases or the seed has changed")
        return 1
    searched = 0
    for case, (label, mueller, normalised) in zip(committed["cases"], made):
        given = np.array(case["mueller"])
        size = np.abs(given).max() or 1.0
        if case["label"] != label or case["normalised"] != normalised:
            print(f"{case['label']!r}: label or normalised differs, now {label!r}, {normalised}")
            return 1
        if np.abs(given - mueller.ravel()).max() > ALLOWED * size:
            print(f"{label!r}: the input matrix differs")
            return 1
        expected = examine(given, normalised)
        stored = {key: case[key] for key in case if key not in ("label", "mueller", "normalised")}
        problem = difference(stored, expected, "")
        if problem:
            print(f"{label!r}{problem}")
            return 1
        if given[0] > 0 and not expected["realizable"] and searched < 12 and hash_of(label) % 3 == 0:
            check_nearest_by_search(case["mueller"], normalised, expected["nearest"])
            searched += 1
    print(f"{len(made)} cases agree; {searched} nearest matrices confirmed by a search")
    return 0


def hash_of(label):
    return sum(label.encode())


def difference(stored, expected, where):
    """Empty when equal, else where and how the first difference shows."""
    if isinstance(stored, dict) and isinstance(expected, dict):
        if stored.keys() != expected.keys():
            return f"{where}: fields differ: {sorted(stored.keys() ^ expected.keys())}"
        return next(filter(None, (difference(stored[k], expected[k], f"{where}.{k}") for k in stored)), "")
    if isinstance(stored, list) and isinstance(expected, list):
        if len(stored) != len(expected):
            return f"{where}: {len(stored)} numbers, now {len(expected)}"
        if any(isinstance(x, dict) for x in stored + expected):
            pairs = enumerate(zip(stored, expected))
            return next(filter(None, (difference(a, b, f"{where}[{k}]") for k, (a, b) in pairs)), "")
        # A matrix has one scale, also at 1e-150.
        size = max([1e-300] + [abs(x) for x in expected])
        pairs = enumerate(zip(stored, expected))
        return next((f"{where}[{k}]: {a!r}, now {b!r}" for k, (a, b) in pairs if abs(a - b) > ALLOWED * size), "")
    if isinstance(stored, bool) or isinstance(expected, bool) or stored is None or expected is None:
        return "" if stored is expected else f"{where}: {stored!r}, now {expected!r}"
    return "" if abs(stored - expected) <= ALLOWED * max(1.0, abs(expected)) else f"{where}: {stored!r}, now {expected!r}"


if __name__ == "__main__":
    main(sys.argv[1:])
