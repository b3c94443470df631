"""Second harmonic of partially polarized light: reference cases, from the definitions in NumPy.

Usage:  python harmonic.py          write harmonic.json
        python harmonic.py --check  compute all again from the committed inputs and compare

Everything is an explicit sum over fields: a light is a list of (weight, field), its coherency of
two photons the weighted sum of the products of four amplitudes. Gaussian fields are
Gauss-Hermite nodes in the four real amplitudes and scrambled ones nodes on the group of
retarders, both exact for fourth moments, so that neither the moment theorem of Gaussian fields nor
Schur's lemma enters. Diffusion is the exponential of its generator. Closed forms (the nine
elements from the moments, the multipole factors, the scan of a fibre) and printed numbers are
asserted against these sums (`harmonic_claims.py`) and are not what is stored.

Kind of all values: recomputed. The formulas: nine elements and 4×9 matrix after Samim, Krouglov &
Barzda 2015 (from memory, derived again); multipoles, laws of depolarization and bounds derived.
"""

import itertools
import json
import sys
from pathlib import Path

import numpy as np

from elements import PAULI, diagonal_depolarizer, elliptical_diattenuator, elliptical_retarder, linear_retarder, of_jones

FILE = Path(__file__).resolve().parent / "harmonic.json"
ALLOWED = 1e-12

ABOUT = {
    "convention": "E = (E_H, E_V), H = x, V = y; Pauli matrices in Stokes order, s_a = E+ sigma_a E, so s3 = 2 Im(E_H* E_V): the same S3 "
                  "as the canonical convention of the engine (exp(+iwt), angles counter-clockwise from x facing the source, S3 > 0 "
                  "clockwise facing the source), so no sign changes between the two. The other sign of S3 turns elements 7, 8, 9 "
                  "of the nine, those columns of a 4x9 matrix, and its last row. Angles in radians.",
    "complex": "a complex array is a list of [re, im], row by row",
    "state": "[azimuth, ellipticity] of pure light with s0 = 1: E = R(azimuth) (cos e, i sin e); stokes is the same state",
    "tensor": "2x3, row i = (chi_i11, chi_i22, chi_i12); P_i = chi_i11 E1 E1 + chi_i22 E2 E2 + chi_i12 (2 E1 E2)",
    "nine": "S_A = Tr(lambda_A <Psi Psi+>), Psi = (E1 E1, E2 E2, 2 E1 E2), lambda: sqrt(2/3) 1, diag(1,1,-2)/sqrt 3, diag(-1,1,0), "
            "real off-diagonals (12), (13), (23), then -i|j><k| + i|k><j| for (12), (13), (23)",
    "matrix": "4x9, row by row: M_aB = 1/2 Tr(sigma_a d lambda_B d+), Stokes vector of the harmonic s' = M S",
    "susceptibilityCoherency": "6x6, X = sum of weight vec(d) vec(d)+, vec row by row; eigenvalues ascending; purity^2 = (6 Tr X^2 / (Tr X)^2 - 1)/5",
    "coherency": "3x3, <psi psi+>, psi = (E_H^2, sqrt 2 E_H E_V, E_V^2); moments: 4x4, <s_a s_b>",
    "fibre": "R = chi_zzz/chi_zxx and K = chi_xxz/chi_zxx (complex: [re, im]), amplitude chi_zxx; axis counter-clockwise from H in the plane, tilt out of it",
    "lights": "pure: state; gaussian: Stokes vector of a zero-mean circular Gaussian field; coherentGaussian: state times the root of intensity, plus a zero-mean "
              "circular Gaussian field with Stokes vector diffuse; scrambled: constant intensity, uniform on the sphere; mixture: weights and states",
    "laws": "what the path before the sample does to pure light of linear Mueller matrix diag(1,a,a,a): none; haar: untouched with probability a, else scrambled; "
            "diffusion: many weak random retarders; gaussian: zero-mean Gaussian field; coherentGaussian: share a of the intensity untouched, the rest unpolarized "
            "Gaussian light; factors: multipole factors q0, q1, q2 themselves; mixture: Jones matrices with weights; gaussianPath: zero-mean Gaussian field "
            "behind the Mueller matrix given (16)",
    "multipoles": "factors: q of L = 0, 1, 2; weights: sum of |c_LM|^2 for each L, before and after, in an orthonormal basis",
    "scan": "intensities row by row, one row for each state in: I = 1/2 (1, analyser) . collection . s(d rho d+); analysers are states too; collection: 4x4; "
            "stokesOut: behind the collection, before the analyser",
    "sets": "singular values, rank and condition number of the N x 9 matrix of pure states with the Stokes vectors given, in any orthonormal basis "
            "(Tr T_A T_B = delta) of Hermitian 3x3 matrices; gellMannCondition: with the nine elements above instead. null where the rank is below 9",
    "tolerances": "1e-12, relative to the largest number of an array; eigenvalues and singular values to the largest one; condition numbers 1e-10",
}

# ψ of two equal photons is VS (E ⊗ E), and Ψ = TO_PRODUCTS ψ.
VS = np.array([[1, 0, 0, 0], [0, np.sqrt(0.5), np.sqrt(0.5), 0], [0, 0, 0, 1]])
TO_PRODUCTS = np.array([[1, 0, 0], [0, 0, 1], [0, np.sqrt(2), 0]])
SPIN = np.array([VS @ (np.kron(s, np.eye(2)) + np.kron(np.eye(2), s)) @ VS.T / 2 for s in PAULI[1:]])


def gell_mann():
    matrices = [np.sqrt(2 / 3) * np.eye(3), np.diag([1, 1, -2]) / np.sqrt(3), np.diag([-1, 1, 0])]
    pairs = [(0, 1), (0, 2), (1, 2)]
    for unit in (1, -1j):
        for j, k in pairs:
            one = np.zeros((3, 3), complex)
            one[j, k], one[k, j] = unit, np.conj(unit)
            matrices.append(one)
    return np.array(matrices, complex)


LAMBDA = gell_mann()


# Fields and lights.

def field_of_state(state):
    azimuth, ellipticity = state
    c, s = np.cos(azimuth), np.sin(azimuth)
    return np.array([[c, -s], [s, c]]) @ np.array([np.cos(ellipticity), 1j * np.sin(ellipticity)])


def stokes(field):
    return np.array([(field.conj() @ s @ field).real for s in PAULI])


def field_of_stokes(s):
    """Of pure light; the leading eigenvector of its coherency."""
    values, vectors = np.linalg.eigh(coherency_of_stokes(s))
    return np.sqrt(values[1]) * vectors[:, 1]


def coherency_of_stokes(s):
    return np.einsum("a,aij->ij", np.asarray(s, float), PAULI) / 2


def hermite_nodes():
    """Three nodes in each of four real numbers of variance ½: exact to degree five."""
    nodes, weights = np.polynomial.hermite.hermgauss(3)
    weights = weights / np.sqrt(np.pi)
    for picks in itertools.product(range(3), repeat=4):
        x = nodes[list(picks)]
        yield np.prod(weights[list(picks)]), np.array([x[0] + 1j * x[1], x[2] + 1j * x[3]])


def gaussian(coherency, mean=(0, 0)):
    values, vectors = np.linalg.eigh(coherency)
    assert values[0] > -1e-12 * max(values[1], 1), values
    root = vectors * np.sqrt(np.maximum(values, 0))
    return [(weight, np.asarray(mean) + root @ z) for weight, z in hermite_nodes()]


def group_nodes(rows=4, count=6):
    """Retarders, uniform: Euler angles; these counts are exact for products of four elements of J."""
    heights, weights = np.polynomial.legendre.leggauss(rows)
    turns = 2 * np.pi * np.arange(count) / count
    for (height, weight), first, last in itertools.product(zip(heights, weights / 2), turns, turns):
        half = np.arccos(height) / 2
        # Turns up to 2π are enough: J and −J count alike in even products.
        middle = np.array([[np.cos(half), -np.sin(half)], [np.sin(half), np.cos(half)]])
        yield weight / count**2, np.diag(np.exp([-0.5j * first, 0.5j * first])) @ middle @ np.diag(np.exp([-0.5j * last, 0.5j * last]))


def scrambled(field):
    return [(weight, jones @ field) for weight, jones in group_nodes()]


def light(case):
    kind = case["kind"]
    if kind == "pure":
        return [(1.0, np.sqrt(case["intensity"]) * field_of_state(case["state"]))]
    if kind == "gaussian":
        return gaussian(coherency_of_stokes(case["stokes"]))
    if kind == "coherentGaussian":
        return gaussian(coherency_of_stokes(case["diffuse"]), np.sqrt(case["intensity"]) * field_of_state(case["state"]))
    if kind == "scrambled":
        return scrambled(np.sqrt(case["intensity"]) * np.array([1, 0]))
    assert kind == "mixture"
    return [(p, np.sqrt(i) * field_of_state(s)) for p, i, s in zip(case["weights"], case["intensities"], case["states"])]


def two_photon(fields):
    """⟨ψψ†⟩ by the four-index sum over the fields."""
    moment = np.zeros((2, 2, 2, 2), complex)
    for weight, e in fields:
        moment += weight * np.einsum("i,j,k,l->ijkl", e, e, e.conj(), e.conj())
    return VS @ moment.reshape(4, 4) @ VS.T


def moments(fields):
    return sum(weight * np.outer(stokes(e), stokes(e)) for weight, e in fields)


def nine(rho):
    products = TO_PRODUCTS @ rho @ TO_PRODUCTS.T
    return np.einsum("aij,ji->a", LAMBDA, products).real


def nine_of_moments(m):
    """The published linear forms (Samim, Krouglov & Barzda 2015, from memory, derived again)."""
    return np.array([
        (3 * m[0, 0] - m[1, 1]) / np.sqrt(6), (5 * m[1, 1] - 3 * m[0, 0]) / np.sqrt(12), -m[0, 1], (m[2, 2] - m[3, 3]) / 2,
        m[1, 2] + m[0, 2], m[0, 2] - m[1, 2], m[2, 3], m[1, 3] + m[0, 3], m[1, 3] - m[0, 3]])


# Tensors.

def fibre_tensor(r, k, amplitude, axis, tilt):
    """All 27 elements in the frame of the fibre (its axis is z), turned into the frame of the light."""
    chi = np.zeros((3, 3, 3), complex)
    chi[2, 2, 2] = r
    for x in (0, 1):
        chi[2, x, x] = 1
        chi[x, x, 2] = chi[x, 2, x] = k
    along = np.array([np.cos(tilt) * np.cos(axis), np.cos(tilt) * np.sin(axis), np.sin(tilt)])
    first = np.array([-np.sin(axis), np.cos(axis), 0])
    frame = np.array([first, np.cross(along, first), along])
    turned = amplitude * np.einsum("abc,ai,bj,ck->ijk", chi, frame, frame, frame)
    plane = turned[:2, :2, :2]
    return np.stack([plane[:, 0, 0], plane[:, 1, 1], plane[:, 0, 1]], axis=1)


def matrix_and_coherency(weights, tensors):
    matrix = np.zeros((4, 9))
    x = np.zeros((6, 6), complex)
    for weight, d in zip(weights, tensors):
        x += weight * np.outer(d.ravel(), d.ravel().conj())
        for a, b in itertools.product(range(4), range(9)):
            matrix[a, b] += weight * 0.5 * np.trace(PAULI[a] @ d @ LAMBDA[b] @ d.conj().T).real
    back = 0.5 * sum(matrix[a, b] * np.kron(PAULI[a], LAMBDA[b].conj()) for a in range(4) for b in range(9))
    assert np.abs(back - x).max() < 1e-13 * np.abs(x).max()
    return matrix, x


# Paths before the sample.

def commutators():
    """ρ → [J_i, ρ] on the nine elements of ρ, row by row."""
    return [np.kron(j, np.eye(3)) - np.kron(np.eye(3), j.T) for j in SPIN]


def casimir():
    """Its eigenvalues L(L+1) tell the multipoles apart."""
    return np.linalg.eigh(sum(c @ c for c in commutators()))


def multipole_parts(rho):
    values, vectors = casimir()
    parts = []
    for level in range(3):
        chosen = vectors[:, np.abs(values - level * (level + 1)) < 1e-9]
        assert chosen.shape[1] == 2 * level + 1
        parts.append((chosen @ (chosen.conj().T @ rho.ravel())).reshape(3, 3))
    return parts


def behind(law, field):
    """Coherency of two photons behind the path, for a field before it."""
    kind = law["kind"]
    if kind == "none":
        return two_photon([(1.0, field)])
    if kind == "haar":
        a = law["a"]
        return a * two_photon([(1.0, field)]) + (1 - a) * two_photon(scrambled(field))
    if kind == "diffusion":
        # One photon: the commutators with σ/2 have the eigenvalue 2 on the Stokes vector, so a = exp(−2t).
        time = -np.log(law["a"]) / 2
        values, vectors = casimir()
        start = two_photon([(1.0, field)]).ravel()
        return (vectors @ (np.exp(-time * values) * (vectors.conj().T @ start))).reshape(3, 3)
    if kind in ("gaussian", "gaussianPath"):
        path = np.diag([1, *[law["a"]] * 3]) if kind == "gaussian" else np.array(law["mueller"]).reshape(4, 4)
        return two_photon(gaussian(coherency_of_stokes(path @ stokes(field))))
    if kind == "coherentGaussian":
        a = law["a"]
        diffuse = (1 - a) * np.vdot(field, field).real * np.eye(2) / 2
        return two_photon(gaussian(diffuse, np.sqrt(a) * field))
    if kind == "factors":
        return sum(q * part for q, part in zip(law["factors"], multipole_parts(two_photon([(1.0, field)]))))
    assert kind == "mixture"
    return two_photon([(p, of_pairs(j, (2, 2)) @ field) for p, j in zip(law["weights"], law["jones"])])


def table_factors(kind, a):
    """The closed forms, for the assertions (derived)."""
    return {"haar": (1, a, a), "diffusion": (1, a, a**3), "gaussian": ((3 + a * a) / 2, 2 * a, 2 * a * a),
            "coherentGaussian": ((3 - a * a) / 2, 2 * a - a * a, a * a)}[kind]


def scan(tensor, law, fields, collection, analysers):
    out = []
    for field in fields:
        polarized = tensor @ TO_PRODUCTS @ behind(law, field) @ TO_PRODUCTS.T @ tensor.conj().T
        out.append(collection @ np.array([np.trace(s @ polarized).real for s in PAULI]))
    return np.array(out), np.array(out) @ np.array(analysers).T / 2


# The numbers in the file.

def pairs(array):
    return [[float(z.real), float(z.imag)] for z in np.asarray(array, complex).ravel()]


def of_pairs(values, shape):
    return (np.array(values)[:, 0] + 1j * np.array(values)[:, 1]).reshape(shape)


def number(pair):
    return complex(*pair)


def tensor_of(given):
    if "fibre" in given:
        f = given["fibre"]
        return fibre_tensor(number(f["R"]), number(f["K"]), f["amplitude"], f["axis"], f["tilt"])
    return of_pairs(given["tensor"], (2, 3))


def expect_tensor(case):
    tensors = [tensor_of(one) for one in case["parts"]]
    matrix, x = matrix_and_coherency(case["weights"], tensors)
    trace = np.trace(x).real
    return {"tensors": [pairs(d) for d in tensors], "matrix": matrix.ravel().tolist(), "susceptibilityCoherency": pairs(x),
            "eigenvalues": np.linalg.eigvalsh(x).tolist(), "purity": float(np.sqrt((6 * np.trace(x @ x).real / trace**2 - 1) / 5))}


def expect_light(case):
    fields = light(case)
    rho, m = two_photon(fields), moments(fields)
    elements = nine(rho)
    assert np.abs(elements - nine_of_moments(m)).max() < 1e-13 * np.abs(elements).max()
    mean = sum(weight * stokes(e) for weight, e in fields)
    return {"meanStokes": mean.tolist(), "coherency": pairs(rho), "moments": m.ravel().tolist(), "nine": elements.tolist()}


def expect_law(case):
    field = field_of_state(case["state"])
    before, after = two_photon([(1.0, field)]), behind(case["law"], field)
    parts_before, parts_after = multipole_parts(before), multipole_parts(after)
    # What stays of each multipole; the direction within it stays as well.
    factors = [np.vdot(p, q).real / np.vdot(p, p).real for p, q in zip(parts_before, parts_after)]
    for q, p, part in zip(factors, parts_before, parts_after):
        assert np.abs(q * p - part).max() < 1e-13
    if "a" in case["law"]:
        assert np.abs(np.array(factors) - table_factors(case["law"]["kind"], case["law"]["a"])).max() < 1e-12
    sizes = [[float(np.vdot(p, p).real) for p in parts] for parts in (parts_before, parts_after)]
    return {"stokes": stokes(field).tolist(), "factors": [float(q) for q in factors], "weightsBefore": sizes[0], "weightsAfter": sizes[1],
            "coherency": pairs(after), "nine": nine(after).tolist()}


def expect_scan(case):
    fields = [field_of_state(state) for state in case["states"]]
    analysers = [stokes(field_of_state(state)) for state in case["analysers"]]
    out, intensities = scan(tensor_of(case), case["law"], fields, np.array(case["collection"]).reshape(4, 4), analysers)
    assert intensities.min() > -1e-12
    return {"stokes": np.array([stokes(e) for e in fields]).ravel().tolist(), "stokesOut": out.ravel().tolist(),
            "intensities": intensities.ravel().tolist()}


def set_matrices(vectors):
    rhos = [two_photon([(1.0, field_of_stokes(s))]) for s in vectors]
    # The elements of ρ themselves are an orthonormal basis once their off-diagonal parts count √2.
    upper = np.triu_indices(3, 1)
    orthonormal = np.array([[*np.diag(r).real, *(np.sqrt(2) * r[upper].real), *(np.sqrt(2) * r[upper].imag)] for r in rhos])
    return orthonormal, np.array([nine(r) for r in rhos])


def expect_set(case):
    orthonormal, gell = set_matrices(np.array(case["stokes"]).reshape(-1, 4))
    values = np.linalg.svd(orthonormal, compute_uv=False)
    rank = int(np.sum(values > 1e-10 * values[0]))
    assert np.all((values > 1e-3 * values[0]) | (values < 1e-13 * values[0])), values
    others = np.linalg.svd(gell, compute_uv=False)
    return {"singularValues": values.tolist(), "rank": rank, "conditionNumber": float(values[0] / values[8]) if rank == 9 else None,
            "gellMannCondition": float(others[0] / others[8]) if rank == 9 else None}


EXPECT = {"tensors": expect_tensor, "lights": expect_light, "paths": expect_law, "scans": expect_scan, "sets": expect_set}


# The inputs: few decimals, so that no processor's last bit is in them.

def rounded(value, digits=4):
    return round(float(value), digits) + 0.0


def random_state(rng):
    return [rounded(rng.uniform(0, np.pi)), rounded(rng.uniform(-0.78, 0.78))]


def random_complex(rng, count, size=1.0):
    return [[rounded(size * rng.normal()), rounded(size * rng.normal())] for _ in range(count)]


def random_fibre(rng, kleinman, real, flat):
    r = [rounded(rng.uniform(0.6, 2.6)), 0.0 if real else rounded(rng.normal() * 0.4)]
    k = [1.0, 0.0] if kleinman else [rounded(rng.uniform(0.6, 1.4)), 0.0 if real else rounded(rng.normal() * 0.2)]
    return {"R": r, "K": k, "amplitude": rounded(rng.uniform(0.5, 1.5)), "axis": rounded(rng.uniform(0, np.pi)),
            "tilt": 0.0 if flat else rounded(rng.uniform(-0.9, 0.9))}


def tensor_cases(rng):
    for k in range(7):
        yield {"label": f"random tensor {k}", "weights": [1.0], "parts": [{"tensor": random_complex(rng, 6)}]}
    yield {"label": "fibre along H, R = 1.9", "weights": [1.0],
           "parts": [{"fibre": {"R": [1.9, 0.0], "K": [1.0, 0.0], "amplitude": 1.0, "axis": 0.0, "tilt": 0.0}}]}
    for k, (kleinman, real, flat) in enumerate(itertools.product([True, False], repeat=3)):
        yield {"label": f"fibre {k}", "weights": [1.0], "parts": [{"fibre": random_fibre(rng, kleinman, real, flat)}]}
    for count in (2, 3, 6):
        yield {"label": f"{count} tensors, their intensities added", "weights": [rounded(w) for w in rng.uniform(0.2, 1, count)],
               "parts": [{"tensor": random_complex(rng, 6)} for _ in range(count)]}
    yield {"label": "two fibres, their intensities added", "weights": [0.7, 0.3],
           "parts": [{"fibre": random_fibre(rng, True, True, True)} for _ in range(2)]}


def partial(rng):
    s0 = rng.uniform(0.6, 1.6)
    vector = rng.normal(size=3)
    vector *= s0 * rng.uniform(0.2, 0.95) / np.linalg.norm(vector)
    return [rounded(s0), *[rounded(v) for v in vector]]


def light_cases(rng):
    for k, state in enumerate([[0.0, 0.0], [0.7, 0.0], [0.3, 0.4], [2.0, -0.6], random_state(rng)]):
        yield {"label": f"pure {k}", "kind": "pure", "state": state, "intensity": [1.0, 1.7][k % 2]}
    yield {"label": "Gaussian, unpolarized", "kind": "gaussian", "stokes": [1.0, 0.0, 0.0, 0.0]}
    yield {"label": "Gaussian, polarized", "kind": "gaussian", "stokes": [1.0, 0.6, 0.0, -0.8]}
    for k in range(4):
        yield {"label": f"Gaussian {k}", "kind": "gaussian", "stokes": partial(rng)}
    for k in range(5):
        yield {"label": f"coherent and Gaussian {k}", "kind": "coherentGaussian", "state": random_state(rng), "intensity": rounded(rng.uniform(0.3, 1.5)),
               "diffuse": partial(rng)}
    yield {"label": "coherent and unpolarized Gaussian", "kind": "coherentGaussian", "state": [0.4, 0.2], "intensity": 0.6, "diffuse": [0.4, 0.0, 0.0, 0.0]}
    for intensity in (1.0, 2.5):
        yield {"label": f"scrambled, intensity {intensity:g}", "kind": "scrambled", "intensity": intensity}
    for count in (2, 3, 5):
        weights = [rounded(w) for w in rng.dirichlet(np.ones(count))]
        yield {"label": f"mixture of {count}", "kind": "mixture", "weights": weights,
               "intensities": [rounded(i) for i in rng.uniform(0.5, 2, count)], "states": [random_state(rng) for _ in range(count)]}


def path_cases(rng):
    for kind in ("haar", "diffusion", "gaussian", "coherentGaussian"):
        for a in (0.95, 0.8, 0.3):
            yield {"label": f"{kind}, a = {a}", "law": {"kind": kind, "a": a}, "state": random_state(rng)}
    for factors in ([1.0, 0.8, 0.6], [1.1, 0.5, -0.2]):
        yield {"label": f"factors {factors}", "law": {"kind": "factors", "factors": factors}, "state": random_state(rng)}


def grid(count):
    return [[rounded(np.pi * k / count, 6), 0.0] for k in range(count)]


def with_elliptical(rng, count):
    return [*grid(4), *[random_state(rng) for _ in range(count)]]


def scan_cases(rng):
    def flat(matrix):
        return [rounded(v, 6) for v in np.asarray(matrix).ravel()]

    jones = [random_complex(rng, 4, 0.6) for _ in range(3)]
    path = diagonal_depolarizer(0.8, 0.7, 0.6) @ linear_retarder(40, 25)
    laws = [{"kind": "none"}, {"kind": "haar", "a": 0.8}, {"kind": "diffusion", "a": 0.8}, {"kind": "gaussian", "a": 0.7},
            {"kind": "coherentGaussian", "a": 0.6}, {"kind": "factors", "factors": [1.0, 0.7, 0.45]},
            {"kind": "mixture", "weights": [0.5, 0.3, 0.2], "jones": jones}, {"kind": "gaussianPath", "mueller": flat(path)}]
    collections = [np.diag([1, 0.85, 0.85, 0.85]), np.eye(4), linear_retarder(60, 20),
                   diagonal_depolarizer(0.9, 0.8, 0.7) @ elliptical_diattenuator(0.8, [0.1, -0.2, 0.15]) @ elliptical_retarder(50, [1, 2, 1])]
    for number_, law in enumerate(laws):
        for tensor in ("fibre", "tensor"):
            linear = tensor == "fibre" and number_ % 2 == 0
            given = {"fibre": random_fibre(rng, number_ % 3 == 0, number_ % 2 == 0, number_ % 4 < 2)} if tensor == "fibre" else {"tensor": random_complex(rng, 6)}
            yield {"label": f"{tensor}, {law['kind']}, {'linear' if linear else 'elliptical'} states", **given, "law": law,
                   "states": grid(8) if linear else with_elliptical(rng, 5), "analysers": grid(8) if linear else with_elliptical(rng, 2),
                   "collection": flat(collections[(number_ + (tensor == "tensor")) % 4])}


CARDINAL = [[1, *v] for v in [(1, 0, 0), (-1, 0, 0), (0, 1, 0), (0, -1, 0), (0, 0, 1), (0, 0, -1)]]
MID_EDGES = [[1, *(np.array(v) / np.sqrt(2))] for v in [(1, 1, 0), (1, 0, 1), (0, 1, 1)]]


def linear_states(count):
    return [[1, np.cos(t), np.sin(t), 0] for t in 2 * np.pi * np.arange(count) / count]


def icosahedron():
    golden = (1 + np.sqrt(5)) / 2
    vertices = [np.roll([0, a, b * golden], k) for k in range(3) for a in (1, -1) for b in (1, -1)]
    return [[1, *(v / np.linalg.norm(v))] for v in vertices]


def random_states(rng, count):
    vectors = rng.normal(size=(count, 3))
    return [[1, *v] for v in vectors / np.linalg.norm(vectors, axis=1)[:, None]]


def set_cases(rng):
    sets = {"three linear": linear_states(3), "five linear": linear_states(5), "eight linear": linear_states(8), "cardinal": CARDINAL,
            "eight linear and both circular": linear_states(8) + CARDINAL[4:], "cardinal and three mid-edges": CARDINAL + MID_EDGES,
            "icosahedron": icosahedron(), "random 12": random_states(rng, 12), "random 20": random_states(rng, 20), "random 40": random_states(rng, 40)}
    for label, vectors in sets.items():
        yield {"label": label, "stokes": [float(v) for s in vectors for v in s]}


CASES = {"tensors": tensor_cases, "lights": light_cases, "paths": path_cases, "scans": scan_cases, "sets": set_cases}


def write():
    from harmonic_claims import check_claims
    check_claims()
    rng = np.random.default_rng(5123)
    parts = ['"about": ' + json.dumps(ABOUT)]
    count = 0
    for name, make in CASES.items():
        lines = [json.dumps({**case, "expect": EXPECT[name](case)}, allow_nan=False) for case in make(rng)]
        count += len(lines)
        parts.append(f'"{name}": [\n' + ",\n".join(lines) + "\n]")
    FILE.write_text("{" + ",\n".join(parts) + "}\n", encoding="utf-8", newline="\n")
    print(f"{count} cases written")


def check():
    from harmonic_claims import check_claims
    claims = check_claims()
    committed = json.loads(FILE.read_text(encoding="utf-8"))
    rng = np.random.default_rng(5123)
    count = 0
    for name, make in CASES.items():
        made = list(make(rng))
        if [case["label"] for case in made] != [case["label"] for case in committed[name]]:
            print(f"harmonic.json, {name}: the cases differ")
            return 1
        for case, again in zip(committed[name], made):
            inputs = {key: case[key] for key in case if key != "expect"}
            problem = difference(inputs, again, "") or difference(case["expect"], EXPECT[name](inputs), ".expect")
            if problem:
                print(f"{name}, {case['label']!r}{problem}")
                return 1
            count += 1
    print(f"{count} second-harmonic cases agree, and {claims} numbers of closed forms")
    return 0


def difference(stored, again, where):
    """Empty when equal within ALLOWED of the largest number of an array, else where they differ."""
    if isinstance(stored, dict) and isinstance(again, dict):
        if stored.keys() != again.keys():
            return f"{where}: fields differ: {sorted(stored.keys() ^ again.keys())}"
        return next(filter(None, (difference(stored[k], again[k], f"{where}.{k}") for k in stored)), "")
    if isinstance(stored, list) and isinstance(again, list) and any(isinstance(x, dict) for x in stored + again):
        if len(stored) != len(again):
            return f"{where}: {len(stored)} entries, now {len(again)}"
        return next(filter(None, (difference(a, b, f"{where}[{k}]") for k, (a, b) in enumerate(zip(stored, again)))), "")
    if isinstance(stored, str) or stored is None or again is None:
        return "" if stored == again else f"{where}: {stored!r}, now {again!r}"
    if where.endswith("ondition") or where.endswith("conditionNumber"):
        return "" if abs(stored - again) < 1e-10 * again else f"{where}: {stored!r}, now {again!r}"
    a, b = np.array(stored, float), np.array(again, float)
    if a.shape != b.shape:
        return f"{where}: shape {a.shape}, now {b.shape}"
    return "" if a.size == 0 or np.abs(a - b).max() <= ALLOWED * max(np.abs(b).max(), 1e-300) else f"{where}: differs by {np.abs(a - b).max():.3g}"


if __name__ == "__main__":
    if sys.argv[1:] == ["--check"]:
        sys.exit(check())
    write()
