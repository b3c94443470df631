"""Writes the invented measurements of this folder and their index.

Usage:  python make.py             write the files
        python make.py --verdicts  print eigenvalues and p of every file as written

Needs NumPy only. Every file has its own fixed seed, so a run gives the same bytes.
"""

import json
import re
import sys
from pathlib import Path

import numpy as np

FOLDER = Path(__file__).resolve().parent

PAULI = np.array(
    [[[1, 0], [0, 1]], [[1, 0], [0, -1]], [[0, 1], [1, 0]], [[0, -1j], [1j, 0]]], dtype=complex
)
# BASIS[i, j] = σi ⊗ σj*, so that H = ¼ Σ M_ij BASIS[i, j].
BASIS = np.array([[np.kron(PAULI[i], PAULI[j].conj()) for j in range(4)] for i in range(4)])


# Elements. Angles in degrees, counter-clockwise from x for an observer who faces the source.

def rotation(angle):
    c, s = np.cos(np.radians(2 * angle)), np.sin(np.radians(2 * angle))
    return np.array([[1, 0, 0, 0], [0, c, s, 0], [0, -s, c, 0], [0, 0, 0, 1.0]])


def turned(matrix, angle):
    return rotation(-angle) @ matrix @ rotation(angle)


def diattenuator(t_max, t_min, axis):
    a, b, g = (t_max + t_min) / 2, (t_max - t_min) / 2, np.sqrt(t_max * t_min)
    return turned(np.array([[a, b, 0, 0], [b, a, 0, 0], [0, 0, g, 0], [0, 0, 0, g]]), axis)


def retarder(retardance, axis):
    c, s = np.cos(np.radians(retardance)), np.sin(np.radians(retardance))
    return turned(np.array([[1, 0, 0, 0], [0, 1, 0, 0], [0, 0, c, s], [0, 0, -s, c]]), axis)


def rotator(angle):
    return rotation(-angle)


def depolarizer(d1, d2, d3):
    return np.diag([1, d1, d2, d3])


# Coherency matrix and the test that a violation is more than noise.

def coherency(mueller):
    return np.einsum("ij,ijkl->kl", mueller, BASIS) / 4


def nearest_spectrum(values, total, m00_exact):
    """Nearest non-negative spectrum; with `m00_exact` its sum is held at `total`."""
    if not m00_exact:
        return np.maximum(values, 0)
    ordered = np.sort(values)[::-1]
    shifts = (np.cumsum(ordered) - total) / np.arange(1, 5)
    last = np.nonzero(ordered - shifts > 0)[0][-1]
    return np.maximum(values - shifts[last], 0)


def statistic(mueller, sigma, m00_exact):
    values = np.linalg.eigvalsh(coherency(mueller))
    change = nearest_spectrum(values, mueller[0, 0], m00_exact) - values
    return 4 * np.sum(change**2) / sigma**2


def p_value(mueller, sigma, m00_exact, draws=999, seed=1):
    """Simulated under the nearest matrix, small eigenvalues set to zero (Andrews & Soares 2010)."""
    values, vectors = np.linalg.eigh(coherency(mueller))
    values = nearest_spectrum(values, mueller[0, 0], m00_exact)
    error = sigma * (np.sqrt(3) / 4 if m00_exact else 0.5)
    kept = np.where(values < 3 * error, 0, values)
    kept[-1] = values[-1]
    if m00_exact:
        kept *= mueller[0, 0] / kept.sum()
    h = (vectors * kept) @ vectors.conj().T
    truth = np.einsum("kl,ijlk->ij", h, BASIS).real
    rng = np.random.default_rng(seed)
    observed = statistic(mueller, sigma, m00_exact)
    above = 0
    for _ in range(draws):
        noise = rng.normal(0, sigma, (4, 4))
        if m00_exact:
            noise[0, 0] = 0
        above += statistic(truth + noise, sigma, m00_exact) >= observed
    return (1 + above) / (1 + draws)


# The bench.

def measured(truth, sigma, seed, normalised):
    noisy = truth + np.random.default_rng(seed).normal(0, sigma, (4, 4))
    if normalised:
        noisy[0, 0] = truth[0, 0]
    return noisy


def as_columns(matrix, decimals, separator, decimal_mark="."):
    rows = []
    for row in matrix:
        # Adding zero turns a -0.0000 into 0.0000.
        cells = [f"{round(value, decimals) + 0.0:.{decimals}f}" for value in row]
        rows.append(separator.join(cell.replace(".", decimal_mark) for cell in cells))
    return "\n".join(rows)


def as_aligned(matrix, decimals):
    return "\n".join(
        " ".join(f"{round(value, decimals) + 0.0:{decimals + 5}.{decimals}f}" for value in row)
        for row in matrix
    )


def as_numpy_print(matrix, decimals):
    rounded = np.round(matrix, decimals) + 0.0
    return np.array2string(rounded, precision=decimals, suppress_small=True)


def as_matlab(matrix, decimals):
    return "M = [" + ";\n     ".join(as_columns(matrix, decimals, " ").split("\n")) + "];"


def uniform(sigma):
    return {"kind": "uniform", "sigma": sigma}


def entries():
    """(file, title, story, normalised, absolute, noise, matrix as text)"""
    yield (
        "air.txt",
        "air, nothing in the beam",
        "The first reading of the morning, with no film in the holder, divided by its first element. "
        "Every number should be 0 or 1, and each one is off by about 0.003. "
        "Even so good a reading of air fails the plain test of realizability: noise does that.",
        True, False, uniform(0.003),
        as_columns(measured(np.eye(4), 0.003, 11, True), 4, "\t"),
    )
    film = 0.861 * retarder(88.5, 33)
    yield (
        "quarter-wave-film.txt",
        "stretched tunicate film, near a quarter wave",
        "A tunicate-cellulose film was stretched while it dried, to make a quarter-wave film for 590 nm. "
        "The fast axis was meant to stand at 33 degrees. "
        "The readings are absolute transmittances, taken against the open beam.",
        False, True, uniform(0.002),
        as_aligned(measured(film, 0.002, 20, False), 4),
    )
    film = diattenuator(0.712, 0.418, 118) @ retarder(24, 118)
    yield (
        "kelp-diattenuating-film.txt",
        "dyed kelp film that prefers one direction",
        "A kelp-cellulose film was dyed with iodine and rolled, so that light along 118 degrees passes better. "
        "The table comes from a spreadsheet with decimal commas. "
        "The readings are absolute transmittances.",
        False, True, uniform(0.003),
        as_columns(measured(film, 0.003, 34, False), 4, ";", ","),
    )
    film = depolarizer(0.64, 0.61, 0.47) @ retarder(140, 62)
    yield (
        "scattering-film.txt",
        "cloudy kelp film that scatters",
        "This kelp film went cloudy because air stayed in it while it dried. "
        "It retards by about 140 degrees and mixes the polarization strongly, the circular part most. "
        "The matrix was printed from a notebook and is divided by its first element.",
        True, False, uniform(0.004),
        as_numpy_print(measured(film, 0.004, 45, True), 4),
    )
    film = depolarizer(0.95, 0.95, 0.93) @ rotator(6) @ retarder(71, 20)
    film = np.diag([1, 1, 1, -1.0]) @ film
    yield (
        "wrong-sign-one-side.txt",
        "tunicate film, one sign wrong on the analyser side",
        "After a repair the analyser's retarder was put back with its fast and slow axes exchanged, "
        "and nobody told the program. "
        "The last row has come out with the opposite sign, and no element can do to light what this matrix says.",
        True, False, uniform(0.003),
        as_columns(measured(film, 0.003, 56, True), 4, "\t"),
    )
    film = diattenuator(0.652, 0.583, 14) @ retarder(52, 14)
    film[0, 0] -= 0.035
    yield (
        "over-subtracted.txt",
        "clear kelp film, too much background taken away",
        "The background was taken with a lamp on in the room, the film with the lamp off, and one was subtracted from the other. "
        "So the first element is too small by about 0.035, and the film seems to polarize better than light allows. "
        "The readings are absolute transmittances.",
        False, True, uniform(0.002),
        as_columns(measured(film, 0.002, 67, False), 4, ", "),
    )
    yield (
        "textbook-quarter-wave.txt",
        "a quarter-wave plate as a book would print it",
        "Not a reading at all: an ideal quarter-wave plate with its fast axis at 36 degrees, rounded to four decimals. "
        "It hangs on the workshop wall as a reminder. "
        "Rounding alone makes it look slightly impossible.",
        True, False, {"kind": "rounding", "decimals": 4},
        as_matlab(retarder(90, 36), 4),
    )
    film = diattenuator(0.834, 0.0004, 0.8)
    yield (
        "polarizer-sheet.txt",
        "polarizer sheet from the drawer",
        "The sheet that the workshop uses to set its zero of angle, measured like a film. "
        "It passes 83 percent of one direction and almost nothing of the other. "
        "So the matrix is nearly singular, and what the sheet does besides polarizing can't be told.",
        False, True, uniform(0.002),
        as_columns(measured(film, 0.002, 19, False), 4, "  "),
    )
    film = 0.9 * retarder(64, 105) + 0.1 * retarder(36, 97)
    yield (
        "tunicate-uneven-film.txt",
        "uneven tunicate film, not quite possible and yet within noise",
        "The beam covers two thicknesses of the same tunicate film, so that two retarders mix. "
        "One eigenvalue comes out a little below zero. "
        "With an error of 0.005 on each element that is what chance does.",
        True, False, uniform(0.005),
        as_aligned(measured(film, 0.005, 6, True), 3),
    )
    film = 18420 * (depolarizer(0.9, 0.9, 0.86) @ rotator(-11) @ retarder(115, 150))
    yield (
        "twisted-film-counts.txt",
        "two tunicate layers laid crosswise, in counts of the detector",
        "Two stretched tunicate layers were glued at an angle, so that the stack retards and turns the plane as well. "
        "The numbers are detector counts, not divided by anything. "
        "An error of 55 counts sits on each.",
        False, False, uniform(55),
        as_columns(measured(film, 55, 90, False), 0, "\t"),
    )


def write():
    index = []
    for file, title, story, normalised, absolute, noise, rows in entries():
        lines = [f"# Invented measurement: {title}"]
        lines += [f"# {sentence}" for sentence in re.split(r"(?<=\.) (?=[A-Z])", story)]
        (FOLDER / file).write_text("\n".join(lines + [rows]) + "\n", encoding="utf-8", newline="\n")
        index.append(
            {"file": file, "title": title[0].upper() + title[1:], "story": story, "normalised": normalised,
             "absolute": absolute, "noise": noise}
        )
    text = json.dumps(index, indent=2, ensure_ascii=False) + "\n"
    (FOLDER / "index.json").write_text(text, encoding="utf-8", newline="\n")


def read(text):
    """The 16 numbers of one of our own files."""
    body = "\n".join(line for line in text.splitlines() if not line.startswith("#"))
    if ";" in body and "," in body:
        body = body.replace(",", ".")
    return np.array([float(x) for x in re.findall(r"-?\d+\.?\d*", body)]).reshape(4, 4)


def verdicts():
    for entry in json.loads((FOLDER / "index.json").read_text(encoding="utf-8")):
        matrix = read((FOLDER / entry["file"]).read_text(encoding="utf-8"))
        noise = entry["noise"]
        sigma = noise["sigma"] if noise["kind"] == "uniform" else 10.0 ** -noise["decimals"] / np.sqrt(12)
        values = np.linalg.eigvalsh(coherency(matrix))[::-1] / matrix[0, 0]
        p = p_value(matrix, sigma, entry["normalised"])
        print(f"{entry['file']:30s} p {p:.3f}  eigenvalues", " ".join(f"{v:9.6f}" for v in values))


if __name__ == "__main__":
    if sys.argv[1:] == ["--verdicts"]:
        verdicts()
    else:
        write()
