"""An invented kelp film behind a depolarizing window and in front of a mirror.

Usage:  python train.py          write demo-data/train/ and train.json
        python train.py --check  compute all again and compare

The light meets the window, the film, the mirror. Window and mirror were measured alone, so
that they can be taken away. What ignoring the window does to the film's parameters is
computed here, without noise, by SciPy: `bias` in train.json.
"""

import json
import sys
from pathlib import Path

import numpy as np
from scipy.optimize import least_squares

from elements import aligned_diattenuating_retarder, diagonal_depolarizer, linear_retarder, turned

HERE = Path(__file__).resolve().parent
FOLDER = HERE.parents[1] / "demo-data" / "train"
FILE = HERE / "train.json"
SEED = 4129
DECIMALS = 5

NAMES = ["transmittance", "diattenuation", "retardanceDeg", "axisDeg", "alpha"]
FILM = [0.83, 0.06, 64.0, 31.0, 0.05]


def film(parameters):
    transmittance, diattenuation, retardance, axis, alpha = parameters
    keeps = 1 - alpha
    return diagonal_depolarizer(keeps, keeps, keeps) @ aligned_diattenuating_retarder(
        transmittance, diattenuation, retardance, axis
    )


def window():
    """Fogged, and a little strained by its holder."""
    return 0.91 * diagonal_depolarizer(0.92, 0.92, 0.92) @ linear_retarder(5, 75)


def mirror():
    """An aluminium-like reflection: Ψ = 43.2°, Δ = 171°, R = 0.87; x in the plane of incidence."""
    psi, delta = np.radians(43.2), np.radians(171)
    n, c, s = np.cos(2 * psi), np.sin(2 * psi) * np.cos(delta), np.sin(2 * psi) * np.sin(delta)
    return turned(0.87 * np.array([[1, -n, 0, 0], [-n, 1, 0, 0], [0, 0, c, s], [0, 0, -s, c]]), 0)


PIECES = [
    (
        "film-with-window-and-mirror.txt",
        "kelp film behind a window, in front of a mirror",
        "A kelp film hangs in a humid cell. "
        "The light comes in through the cell's fogged window, passes the film and leaves by a mirror. "
        "What is measured is all three together.",
        0.0015,
        lambda: mirror() @ film(FILM) @ window(),
    ),
    (
        "window-alone.txt",
        "the window of the cell, alone",
        "The fogged window, measured alone in the open beam. "
        "It depolarizes, and its holder strains it a little.",
        0.0008,
        window,
    ),
    (
        "mirror-alone.txt",
        "the mirror behind the cell, alone",
        "The mirror, measured alone at the angle at which it stands behind the cell. "
        "It reflects one direction a little better than the other. "
        "Azimuths behind it are counted facing the reflected beam.",
        0.0008,
        mirror,
    ),
]


def measured():
    rng = np.random.default_rng(SEED)
    return [np.round(make() + rng.normal(0, sigma, (4, 4)), DECIMALS) + 0.0 for *_, sigma, make in PIECES]


def biases():
    """What is fitted to the film and the window together, less the truth, without noise."""
    without_mirror = film(FILM) @ window()
    found = least_squares(
        lambda at: (film(at) - without_mirror).ravel(), FILM, xtol=1e-15, ftol=1e-15, gtol=1e-15,
        x_scale=[1, 1, 50, 50, 1],
    )
    return (found.x - FILM).tolist()


def measurement(matrix, sigma):
    return {
        "mueller": matrix.ravel().tolist(),
        "normalised": False,
        "absolute": True,
        "noise": {"kind": "uniform", "sigma": sigma},
    }


def free(value):
    return {"value": value, "free": True}


def configuration(matrices):
    whole, alone, reflecting = (
        measurement(matrix, sigma) for matrix, (*_, sigma, _) in zip(matrices, PIECES)
    )
    return {
        "v": 1,
        "task": "train",
        "label": "invented: kelp film behind a window",
        "measurement": whole,
        "source": [1, 1, 0, 0],
        "pre": alone,
        "post": reflecting,
        "train": [
            {"kind": "measured", "label": "window", "measurement": alone},
            {
                "kind": "alignedDiattenuatingRetarder",
                "label": "film",
                "parameters": {
                    "transmittance": free(0.8),
                    "diattenuation": free(0.1),
                    "retardanceDeg": free(60),
                    "axisDeg": free(30),
                },
            },
            {"kind": "isotropicDepolarizer", "label": "haze of the film", "parameters": {"alpha": free(0.1)}},
            {"kind": "measured", "label": "mirror", "measurement": reflecting},
        ],
    }


def outputs():
    matrices = measured()
    for matrix, (file, title, story, _, _) in zip(matrices, PIECES):
        lines = [f"# Invented measurement: {title}"] + [f"# {one.rstrip('.')}." for one in story.split(". ")]
        rows = ["  ".join(f"{value:8.{DECIMALS}f}" for value in row) for row in matrix]
        yield FOLDER / file, "\n".join(lines + rows) + "\n"
    index = [
        {
            "file": file, "title": title[0].upper() + title[1:], "story": story, "normalised": False,
            "absolute": True, "noise": {"kind": "uniform", "sigma": sigma},
        }
        for file, title, story, sigma, _ in PIECES
    ]
    yield FOLDER / "index.json", json.dumps(index, indent=2, ensure_ascii=False) + "\n"
    yield FOLDER / "kelp-film-behind-a-window.json", json.dumps(configuration(matrices), indent=2) + "\n"
    expected = {"names": NAMES, "truth": FILM, "bias": biases()}
    yield FILE, json.dumps(expected, indent=2) + "\n"


def close(one, other):
    """The same, numbers to 1e-7: SciPy's last digits depend on the machine."""
    if isinstance(one, dict):
        return one.keys() == other.keys() and all(close(one[key], other[key]) for key in one)
    if isinstance(one, list):
        return len(one) == len(other) and all(map(close, one, other))
    if isinstance(one, float):
        return abs(one - other) <= 1e-7 * max(1, abs(one))
    return one == other


def main():
    FOLDER.mkdir(exist_ok=True)
    for path, text in outputs():
        if sys.argv[1:] != ["--check"]:
            path.write_text(text, encoding="utf-8", newline="\n")
            continue
        old = path.read_text(encoding="utf-8")
        same = close(json.loads(text), json.loads(old)) if path.suffix == ".json" else text == old
        if not same:
            sys.exit(f"{path.name} comes out differently")
    if sys.argv[1:] == ["--check"]:
        print("The film behind the window: all files come out the same.")


if __name__ == "__main__":
    main()
