"""The nearest realizable Mueller matrix under any covariance: 60 cases, from the definition.

Usage:  python weighted.py          write weighted.json
        python weighted.py --check  compute all again from the committed inputs and compare

Minimises (m̂ − m)ᵀ Σ⁻¹ (m̂ − m) over H(m) ⪰ 0, exact elements held, by Newton's method on the
function with the barrier −μ log det H, μ going to zero: a primal method, where the engine's is
primal-dual. Each result is proved by what an optimum must satisfy (Boyd & Vandenberghe 2004,
section 5.9): Z = μ H⁻¹ is positive, the gradient over the free elements is tr(A_k Z), and
tr(H Z) = 4 μ bounds the distance from the least value.
"""

import json
import sys
from pathlib import Path

import numpy as np

from elements import PAULI, diagonal_depolarizer, elliptical_diattenuator, elliptical_retarder, linear_diattenuator, linear_retarder, of_jones

FILE = Path(__file__).resolve().parent / "weighted.json"
BASIS = np.array([np.kron(PAULI[i], PAULI[j].conj()) / 4 for i in range(4) for j in range(4)])
LAST_MU = 1e-10


def coherency(elements):
    return np.einsum("k,kab->ab", elements, BASIS)


def nearest(measured, covariance, start):
    """Elements, least value, and the bound on what is left above it."""
    free = np.flatnonzero(np.diag(covariance) > 0)
    inverse = np.linalg.inv(covariance[np.ix_(free, free)])
    basis = BASIS[free]
    if np.linalg.eigvalsh(coherency(measured))[0] >= 0:
        return measured, 0.0, 0.0
    elements = start.copy()

    def barrier(at, mu):
        values = np.linalg.eigvalsh(coherency(at))
        if values[0] <= 0:
            return np.inf
        off = (at - measured)[free]
        return off @ inverse @ off - mu * np.log(values).sum()

    off = (start - measured)[free]
    mu = max(1.0, off @ inverse @ off)
    while True:
        for _ in range(60):
            inner = np.linalg.inv(coherency(elements))
            products = np.einsum("kab,bc->kac", basis, inner)
            gradient = 2 * inverse @ (elements - measured)[free] - mu * np.einsum("kaa->k", products).real
            hessian = 2 * inverse + mu * np.einsum("kab,lba->kl", products, products).real
            step = np.linalg.solve(hessian, -gradient)
            decrement = -gradient @ step
            length = 1.0
            while True:
                tried = elements.copy()
                tried[free] += length * step
                if barrier(tried, mu) <= barrier(elements, mu) - 1e-4 * length * decrement or length < 1e-12:
                    break
                length /= 2
            if length >= 1e-12:
                elements = tried
            if decrement < 1e-13 * max(mu, 1e-10) or length < 1e-12:
                break
        if mu <= LAST_MU:
            off = (elements - measured)[free]
            return elements, off @ inverse @ off, 4 * mu
        mu = max(mu / 8, LAST_MU)


def random_covariance(rng, condition, sigma):
    basis, _ = np.linalg.qr(rng.normal(size=(16, 16)))
    return sigma**2 * (basis * np.geomspace(1, 1 / condition, 16)) @ basis.T


def analyser_covariance(rng, sigma):
    """Four generator and four analyser states: (WᵀW)⁻¹ σ², W = A ⊗ G."""
    def side():
        vectors = np.array([[1, 1, 1], [1, -1, -1], [-1, 1, -1], [-1, -1, 1]]) / np.sqrt(3) + 0.1 * rng.normal(size=(4, 3))
        vectors /= np.linalg.norm(vectors, axis=1)[:, None]
        return np.hstack([np.ones((4, 1)), vectors]) / 2
    w = np.kron(side(), side())
    covariance = np.linalg.inv(w.T @ w)
    return sigma**2 * covariance / covariance[0, 0]


def truths(rng):
    yield "retarder", linear_retarder(70, 20)
    yield "polarizer", linear_diattenuator(1, 0, 35)
    yield "diattenuator", linear_diattenuator(0.8, 0.3, 110)
    yield "elliptical", elliptical_retarder(100, [1, 2, -1]) @ elliptical_diattenuator(0.6, [0.2, -0.3, 0.4])
    jones = rng.normal(size=(2, 2)) + 1j * rng.normal(size=(2, 2))
    pure = of_jones(jones)
    yield "random pure", pure / pure[0, 0]
    yield "mildly depolarizing", diagonal_depolarizer(0.97, 0.96, 0.94) @ linear_retarder(50, 70)
    yield "two elements", 0.9 * linear_retarder(80, 10) + 0.1 * linear_diattenuator(1, 0, 60)
    mirrored = linear_retarder(70, 20) @ linear_diattenuator(0.9, 0.5, 30)
    mirrored[3] *= -1
    yield "mirrored", mirrored


def cases():
    rng = np.random.default_rng(7310)
    made = 0
    while made < 60:
        for name, truth in truths(rng):
            if made == 60:
                return
            sigma = [0.002, 0.01, 0.04][made % 3]
            kind = made % 6
            truth = np.asarray(truth, float)
            start = np.diag([1.0, 0, 0, 0]).ravel() * truth[0, 0]
            if kind == 0:
                label, covariance = "unequal", np.diag((sigma * rng.uniform(0.2, 3, 16)) ** 2)
            elif kind < 4:
                # A mirror is thousands of σ away already.
                condition = 10 if name == "mirrored" else [1, 1e3, 1e6][kind - 1]
                label, covariance = f"condition {condition:g}", random_covariance(rng, condition, sigma)
            elif kind == 4:
                label, covariance = "analyser", analyser_covariance(rng, sigma)
            else:
                label, covariance = "exact elements", random_covariance(rng, 1e2, sigma)
                held = [0] if made % 4 == 1 else [0, 5, 14]
                # With more of them there must be something inside.
                truth = truth if held == [0] and name != "mirrored" else 0.8 * truth + 0.2 * np.diag([truth[0, 0], 0, 0, 0])
                if name == "mirrored":
                    truth[3] *= -1
                covariance[held, :] = covariance[:, held] = 0
                start = 0.9 * truth.ravel() + 0.1 * start
                start[held] = truth.ravel()[held]
            covariance = (covariance + covariance.T) / 2
            values, vectors = np.linalg.eigh(covariance)
            noise = vectors @ (np.sqrt(np.maximum(values, 0)) * rng.normal(size=16))
            held = np.diag(covariance) == 0
            measured = truth.ravel() + np.where(held, 0, noise)
            yield f"{name}, {label}", measured, covariance, start
            made += 1


def solved(measured, covariance, start):
    elements, statistic, bound = nearest(measured, covariance, start)
    values = np.linalg.eigvalsh(coherency(elements))
    assert values[0] >= -1e-12 and bound <= 1e-9, (values, bound)
    return {"nearest": elements.tolist(), "statistic": float(statistic)}


def write():
    lines = []
    for label, measured, covariance, start in cases():
        case = {"label": label, "mueller": measured.tolist(), "covariance": covariance.ravel().tolist(), "start": start.tolist()}
        lines.append(json.dumps({**case, **solved(measured, covariance, start)}, ensure_ascii=False, allow_nan=False))
    FILE.write_text('{"cases": [\n' + ",\n".join(lines) + "\n]}\n", encoding="utf-8", newline="\n")
    print(f"{len(lines)} cases written")


def check():
    committed = json.loads(FILE.read_text(encoding="utf-8"))["cases"]
    if len(committed) != 60:
        print("weighted.json: not 60 cases")
        return 1
    for case in committed:
        covariance = np.array(case["covariance"]).reshape(16, 16)
        again = solved(np.array(case["mueller"]), covariance, np.array(case["start"]))
        sigma = np.sqrt(np.diag(covariance))
        off = np.abs(np.array(again["nearest"]) - case["nearest"])
        if np.any(off > 1e-6 * sigma + 1e-14) or abs(again["statistic"] - case["statistic"]) > 1e-7 * (1 + case["statistic"]):
            print(f"{case['label']!r} differs: {again['statistic']!r}, was {case['statistic']!r}")
            return 1
    print("60 nearest matrices under a covariance agree")
    return 0


if __name__ == "__main__":
    if sys.argv[1:] == ["--check"]:
        sys.exit(check())
    write()
