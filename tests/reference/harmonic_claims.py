"""Closed forms of the second harmonic and numbers worked out from them, against explicit sums.

`check_claims()` raises with all that is not reproduced, and returns how many numbers were
compared. Kind of all: derived, unless marked; the tolerance is half of the last digit of a number
that is given with few of them.
"""

import numpy as np

from harmonic import (
    CARDINAL, LAMBDA, MID_EDGES, PAULI, TO_PRODUCTS, VS, behind, coherency_of_stokes, expect_set, fibre_tensor, field_of_state, gaussian, group_nodes,
    icosahedron, light, linear_states, matrix_and_coherency, moments, multipole_parts, nine, scrambled, stokes, table_factors, two_photon,
)


class Tally:
    def __init__(self):
        self.count = 0
        self.failed = []

    def near(self, what, found, printed, allowed):
        found, printed = np.asarray(found, float), np.asarray(printed, float)
        self.count += printed.size
        off = np.abs(found - printed)
        if not np.all(off <= allowed):
            self.failed.append(f"{what}: printed {printed.tolist()}, found {found.tolist()}")


def symmetric_square(j):
    return VS @ np.kron(j, j) @ VS.T


def pure_field(s):
    """Of a unit Stokes vector, up to a phase."""
    azimuth, ellipticity = np.arctan2(s[1], s[0]) / 2, np.arcsin(s[2]) / 2
    return field_of_state([azimuth, ellipticity])


def harmonic_stokes(tensor, rho):
    polarized = tensor @ TO_PRODUCTS @ rho @ TO_PRODUCTS.T @ tensor.conj().T
    return np.array([np.trace(s @ polarized).real for s in PAULI])


# A scan with linear light in and a linear analyser, by Kronecker products and by its closed form.

def parts_of(field):
    return multipole_parts(two_photon([(1.0, field)]))


LINEAR = {}


def linear_parts(angle):
    key = round(float(angle), 12)
    if key not in LINEAR:
        LINEAR[key] = parts_of(field_of_state([angle, 0.0]))
    return LINEAR[key]


def out_states(parts, r, k, q, b, axis=0.0):
    """Stokes vectors of the harmonic behind a depolarizer diag(1, b, b, b), one for each input."""
    tensor = fibre_tensor(r, k, 1.0, axis, 0.0)
    return np.array([harmonic_stokes(tensor, sum(f * p for f, p in zip(q, some))) for some in parts]) * [1, b, b, b]


def scan(thetas, phis, r, q, b, k=1.0, axis=0.0):
    out = out_states([linear_parts(t) for t in thetas], r, k, q, b, axis)
    return out @ np.array([[1, np.cos(2 * p), np.sin(2 * p), 0] for p in phis]).T / 2


def closed(theta, phi, r, q, b, k=1.0):
    c2, s2, c4, s4 = np.cos(2 * theta), np.sin(2 * theta), np.cos(4 * theta), np.sin(4 * theta)
    along = (r**2 + 1) * (q[0] / 3 + q[2] * (1 / 24 + c4 / 8)) + (r**2 - 1) * q[1] * c2 / 2 + r * q[2] * (1 - c4) / 4
    across = k**2 * (2 * q[0] / 3 - q[2] * (1 / 6 + c4 / 2))
    slanted = k * ((r + 1) * q[1] * s2 + (r - 1) * q[2] * s4 / 2)
    return (along + across + b * ((along - across) * np.cos(2 * phi) + slanted * np.sin(2 * phi))) / 2


EIGHT = np.pi * np.arange(8) / 8


def least_squares(model, data, start, weights=None):
    """Levenberg-Marquardt on the model, with differences for its slopes."""
    x, damping = np.array(start, float), 1e-3
    weights = np.ones_like(data) if weights is None else weights
    residual = (model(x) - data) * weights
    for _ in range(300):
        slopes = np.array([(model(x + h) - model(x - h)) / 2e-6 for h in 1e-6 * np.eye(len(x))]).T * weights[:, None]
        square = slopes.T @ slopes
        step = np.linalg.solve(square + damping * np.diag(np.diag(square) + 1e-12), -slopes.T @ residual)
        tried = (model(x + step) - data) * weights
        if tried @ tried <= residual @ residual:
            x, residual, damping = x + step, tried, damping / 5
            if np.abs(step).max() < 1e-11:
                break
        else:
            damping *= 5
            if damping > 1e12:
                break
    return x


def polarized_scan(thetas, phis, axis_and_r):
    axis, r = axis_and_r
    return closed(thetas[:, None] - axis, phis[None, :] - axis, r, (1, 1, 1), 1.0)


def nine_elements(t):
    s = (0.48, 0.6, 0.64)
    t.near("nine elements of pure light", nine(two_photon([(1.0, pure_field(s))])),
           [1.13068447, -0.53347165, -0.48, -0.0248, 0.888, 0.312, 0.384, 0.9472, -0.3328], 6e-9)
    mean = np.array([1, *(0.7 * np.array(s))])
    fields = gaussian(coherency_of_stokes(mean))
    t.near("nine elements of Gaussian light", nine(two_photon(fields)),
           [1.94089729, -0.81725085, -0.672, -0.024304, 1.12224, 0.55776, 0.37632, 1.197056, -0.594944], 6e-9)
    m = moments(fields)
    size = mean[1:] @ mean[1:]
    t.near("moments of Gaussian light", m[0, 0], 1 + (1 + size) / 2, 1e-13)
    t.near("moments of Gaussian light", m[0, 1:], 2 * mean[1:], 1e-13)
    t.near("moments of Gaussian light", m[1:, 1:], 2 * np.outer(mean[1:], mean[1:]) + np.eye(3) * (1 - size) / 2, 1e-13)
    c = coherency_of_stokes(mean)
    t.near("two photons of Gaussian light", np.abs(two_photon(fields) - 2 * symmetric_square(c)).max(), 0, 1e-13)
    field = pure_field((0.6, 0.0, -0.8)) * 0.8
    both = np.outer(field, field.conj()) + c
    t.near("coherent and Gaussian light",
           np.abs(two_photon(gaussian(c, field)) - 2 * symmetric_square(both) + symmetric_square(np.outer(field, field.conj()))).max(), 0, 1e-12)
    t.near("traces of the nine matrices", np.einsum("aij,bji->ab", LAMBDA, LAMBDA).real, 2 * np.eye(9), 1e-14)
    for e in (field_of_state([0.3, 0.5]), field_of_state([2.0, -0.1])):
        weights = [np.vdot(p, p).real for p in parts_of(e)]
        t.near("weights of the multipoles of pure light", weights, [1 / 3, 1 / 2, 1 / 6], 1e-13)
    jones = np.array([[0.3 + 0.2j, -0.5], [0.1j, 0.8 - 0.4j]])
    (p, q), (r, u) = jones
    root = np.sqrt(2)
    square = np.array([[p * p, root * p * q, q * q], [root * p * r, p * u + q * r, root * q * u], [r * r, root * r * u, u * u]])
    t.near("symmetric square", np.abs(symmetric_square(jones) - square).max(), 0, 1e-14)


def tensors(t):
    matrix, _ = matrix_and_coherency([1.0], [fibre_tensor(1.9, 1.0, 1.0, 0.0, 0.0)])
    t.near("4x9 of a fibre, row 0", matrix[0], [2.290273, 0.753442, -1.305, 1.9, 0, 0, 0, 0, 0], 6e-7)
    t.near("4x9 of a fibre, row 1", matrix[1], [1.473776, 1.908143, -1.305, 1.9, 0, 0, 0, 0, 0], 6e-7)
    t.near("4x9 of a fibre, row 2", matrix[2], [0, 0, 0, 0, 1.9, 1, 0, 0, 0], 1e-12)
    t.near("4x9 of a fibre, row 3", matrix[3], [0, 0, 0, 0, 0, 0, 0, 1.9, 1], 1e-12)
    for r, k, tilt in [(1.9, 1.0, 0.5), (0.7, 1.0, -1.1), (2.3, 1.3, 0.4)]:
        seen = r * np.cos(tilt) ** 2 + (1 + 2 * k) * np.sin(tilt) ** 2
        t.near("tilted fibre", np.abs(fibre_tensor(r, k, 1.0, 0.8, tilt) - fibre_tensor(seen, k, np.cos(tilt), 0.8, 0.0)).max(), 0, 1e-13)
    axis = np.array([np.cos(0.8), np.sin(0.8)])
    for e in np.random.default_rng(1).normal(size=(3, 2)):
        law = (1.9 - 3) * (axis @ e) ** 2 * axis + (e @ e) * axis + 2 * (axis @ e) * e
        products = np.array([e[0] ** 2, e[1] ** 2, 2 * e[0] * e[1]])
        t.near("fibre in any orientation", (fibre_tensor(1.9, 1.0, 1.0, 0.8, 0.0) @ products).real, law, 1e-13)


def unpolarized_lights(t):
    tensor = fibre_tensor(1.9, 1.0, 1.0, 0.0, 0.0)

    def halves(first, second):
        return light({"kind": "mixture", "weights": [0.5, 0.5], "intensities": [1, 1], "states": [first, second]})
    q = np.pi / 4
    rows = [("scrambled", scrambled(np.array([1, 0])), 2.2033, 0.3949, 0.395), ("Gaussian", gaussian(np.eye(2) / 2), 3.3050, 0.3949, 0.395),
            ("H and V", halves([0, 0], [2 * q, 0]), 2.3050, 1.0, 1.0), ("+45 and -45", halves([q, 0], [-q, 0]), 3.1025, 0.3554, 0.355),
            ("right and left", halves([0, q], [0, -q]), 1.2025, -0.6632, 0.663)]
    for name, fields, s0, ratio, degree in rows:
        out = harmonic_stokes(tensor, two_photon(fields))
        t.near(f"unpolarized, {name}, s0'", out[0], s0, 6e-5)
        t.near(f"unpolarized, {name}, s1'/s0'", out[1] / out[0], ratio, 6e-5)
        t.near(f"unpolarized, {name}, degree", np.linalg.norm(out[1:]) / out[0], degree, 6e-4)
    t.near("scrambled", np.abs(two_photon(scrambled(np.array([1, 0]))) - np.eye(3) / 3).max(), 0, 1e-13)
    t.near("Gaussian, unpolarized", np.abs(two_photon(gaussian(np.eye(2) / 2)) - np.eye(3) / 2).max(), 0, 1e-13)


def laws(t):
    e = field_of_state([0.37, 0.21])
    before = parts_of(e)
    for kind in ("haar", "diffusion", "gaussian", "coherentGaussian"):
        for a in (0.2, 0.8, 1.0):
            after = multipole_parts(behind({"kind": kind, "a": a}, e))
            found = [np.vdot(p, x).real / np.vdot(p, p).real for p, x in zip(before, after)]
            t.near(f"factors of {kind}", found, table_factors(kind, a), 1e-12)
            t.near(f"{kind} keeps the directions", max(np.abs(x - q * p).max() for q, p, x in zip(found, before, after)), 0, 1e-12)
    for kind, printed in [("haar", 0.80), ("diffusion", 0.512), ("gaussian", 0.703), ("coherentGaussian", 0.542)]:
        q = table_factors(kind, 0.8)
        t.near(f"r2 of {kind} at 0.8", q[2] / q[0], printed, 6e-4)
    # Retarders of one fixed angle about random axes are the ends of all isotropic unitary laws.
    found = []
    for angle in np.linspace(0, np.pi, 1001):
        found.append(((1 + 2 * np.cos(angle)) / 3, (1 + 2 * np.cos(angle) + 2 * np.cos(2 * angle)) / 5))
    a, q2 = np.array(found).T
    t.near("lower bound of q2", q2, (9 * a**2 - 3 * a - 1) / 5, 1e-12)
    t.near("upper bound of q2 (chord of the same curve)", [q2[0], q2[-1]], [(2 + 3 * a[0]) / 5, (2 + 3 * a[-1]) / 5], 1e-12)
    # a = 0.8 by one angle (least), and by half-wave retarders among nothing (most).
    angle = np.arccos((3 * 0.8 - 1) / 2)
    half_waves = (1 - 0.8) / (1 + 1 / 3)
    t.near("bounds at 0.8", [(1 + 2 * np.cos(angle) + 2 * np.cos(2 * angle)) / 5, 1 - half_waves + half_waves / 5], [0.472, 0.88], 1e-12)
    t.near("least q2", [q2.min(), a[q2.argmin()]], [-0.25, 1 / 6], 2e-3)
    # One angle, axes from the group's nodes: what the curve above says, by explicit sums.
    for angle in (0.6, 2.0):
        turn = np.diag(np.exp([0.5j * angle, -0.5j * angle]))
        after = multipole_parts(two_photon([(w, g @ turn @ g.conj().T @ e) for w, g in group_nodes(6, 10)]))
        found = [np.vdot(p, x).real / np.vdot(p, p).real for p, x in zip(before, after)]
        t.near("retarders about random axes", found,
               [1, (1 + 2 * np.cos(angle)) / 3, (1 + 2 * np.cos(angle) + 2 * np.cos(2 * angle)) / 5], 1e-12)
    # The Pauli mixture has the same diag(1, a, a, a) but damps products of two Stokes elements only.
    a = 0.8
    weights = [(1 + 3 * a) / 4, *[(1 - a) / 4] * 3]
    fields = [(w, s @ e) for w, s in zip(weights, PAULI)]
    s = stokes(e)
    m = moments(fields)
    t.near("Pauli mixture, Stokes vector", sum(w * stokes(f) for w, f in fields), [1, *(a * s[1:])], 1e-13)
    t.near("Pauli mixture, squares", np.diag(m), s**2, 1e-13)
    t.near("Pauli mixture, products", [m[1, 2], m[1, 3], m[2, 3]], a * np.array([s[1] * s[2], s[1] * s[3], s[2] * s[3]]), 1e-13)


def scans(t):
    t.near("scan value 1", closed(0.2, 0.7, 1.9, (1, 0.8, 0.6), 0.85), 2.295338812, 6e-10)
    t.near("scan value 2", closed(0, 0, 1.9, (1, 1, 1), 1), 3.61, 1e-12)
    t.near("scan value 3", closed(1.0, -0.4, 1.4, (1, 0.5, 0.125), 0.5), 0.668085630, 6e-10)
    for r, k, q, b in [(1.9, 1.0, (1, 0.8, 0.6), 0.85), (-0.7, 1.3, (1.2, 0.3, -0.1), 0.4)]:
        both = scan(EIGHT, EIGHT, r, q, b, k), closed(EIGHT[:, None], EIGHT[None, :], r, q, b, k)
        t.near("closed form of a scan", np.abs(both[0] - both[1]).max(), 0, 1e-13)
    for theta, phi in [(0.3, 1.1), (1.4, -0.2)]:
        amplitude = np.sin(phi) * np.sin(2 * theta) + np.cos(phi) * (1.9 * np.cos(theta) ** 2 + np.sin(theta) ** 2)
        t.near("scan of a polarized fibre (from memory)", scan([theta], [phi], 1.9, (1, 1, 1), 1.0)[0, 0], amplitude**2, 1e-13)
    r, q1, q2, b = 1.9, 0.7, 0.4, 0.85
    out = out_states([linear_parts(x) for x in EIGHT], r, 1.0, (1, q1, q2), b)

    def wave(values, shape, n):
        return values @ shape(n * EIGHT) / 4
    a0, a1, a2 = wave(out[:, 0], np.cos, 2), wave(out[:, 1], np.cos, 2), wave(out[:, 2], np.sin, 2)
    t.near("Fourier coefficients",
           [a0, wave(out[:, 0], np.cos, 4), a1, wave(out[:, 1], np.cos, 4), a2, wave(out[:, 2], np.sin, 4)],
           [(r * r - 1) * q1 / 2, q2 * (r - 3) * (r + 1) / 8, b * (r * r - 1) * q1 / 2, b * q2 * ((r - 1) ** 2 / 8 + 0.5), b * (r + 1) * q1,
            b * (r - 1) * q2 / 2], 1e-12)
    t.near("closed estimates", [1 + 2 * a1 / a2, a1 / a0], [r, b], 1e-12)
    k = 1.3
    out = out_states([linear_parts(x) for x in EIGHT], r, k, (1, q1, q2), b)
    t.near("closed estimate with K", 2 * k * wave(out[:, 1], np.cos, 2) / wave(out[:, 2], np.sin, 2), r - 1, 1e-12)
    out = out_states([linear_parts(0.3)], r, 1.0, (1, 0, 0), b)[0]
    t.near("fully scrambled", out[1] / out[0], b * (r * r - 1) / (r * r + 3), 1e-12)


def sets(t):
    def rank(vectors):
        return expect_set({"stokes": np.ravel(vectors)})

    for vectors, printed in [(linear_states(8), 5), (CARDINAL, 6), (CARDINAL + MID_EDGES, 9)]:
        t.near("rank", rank(vectors)["rank"], printed, 0)
    t.near("icosahedron", rank(icosahedron())["conditionNumber"], np.sqrt(10), 1e-12)
    t.near("cardinal and mid-edges", rank(CARDINAL + MID_EDGES)["conditionNumber"], 8.69, 6e-3)
    t.near("cardinal and mid-edges, other normalisation", rank(CARDINAL + MID_EDGES)["gellMannCondition"], 10.90, 6e-3)


def fisher(design, values, names):
    """Poisson information at 1e5 photons, by differences of the explicit scan."""
    def intensities(x):
        return design({**values, **dict(zip(names, x))})
    x = np.array([values[name] for name in names])
    slopes = np.array([(intensities(x + h) - intensities(x - h)) / 2e-5 for h in 1e-5 * np.eye(len(x))]).T
    expected = intensities(x)
    return (slopes / expected[:, None]).T @ slopes * 1e5 / expected.sum()


def designs():
    linear = [[t, 0.0] for t in EIGHT]
    six = [[0, 0], [np.pi / 2, 0], [np.pi / 4, 0], [-np.pi / 4, 0], [0, np.pi / 4], [0, -np.pi / 4]]

    # "a" stands for r1 = r2, the law of scrambling.
    def design(states, analysers):
        parts = [parts_of(e) for e in states]

        def evaluate(v):
            tensor_r = v["R"] + 1j * v["I"]
            q = (1, v.get("a", v["r1"]), v.get("a", v["r2"]))
            out = out_states(parts, tensor_r, v["K"], q, v["b"], v["axis"])
            return v["A"] * (out @ np.array(analysers).T / 2).ravel()
        return evaluate

    nothing = [2, 0, 0, 0]
    states = [field_of_state(s) for s in linear]
    nine_states = [pure_field(s[1:]) for s in CARDINAL + MID_EDGES]
    rows = [stokes(field_of_state(s)) for s in linear]
    return {"scan": design(states, rows), "no analyser": design(states, [nothing]), "total and one analyser": design(states, [nothing, rows[0]]),
            "nine in, six out": design(nine_states, [stokes(field_of_state(s)) for s in six])}


def ranks(t):
    values = {"A": 1.0, "axis": 0.37, "R": 1.9, "K": 1.0, "I": 0.0, "r1": 0.8, "r2": 0.8, "b": 0.85}
    base = ["A", "axis", "R", "r1", "r2"]
    made = designs()
    printed = {"scan": [5, 6, 7, 7], "no analyser": [4, 4, 4, 4], "total and one analyser": [5, 6, 7, 7], "nine in, six out": [5, 6, 7, 8]}
    for name, expected in printed.items():
        for count, rank in enumerate(expected):
            names = base + ["b", "K", "I"][:count]
            information = fisher(made[name], values, names)
            t.near(f"rank of {name}, {names}", numerical_rank(information), rank, 0)
    for name, expected in [("scan", 5), ("no analyser", 4), ("total and one analyser", 5), ("nine in, six out", 5)]:
        information = fisher(made[name], {**values, "a": 0.8}, ["A", "axis", "R", "a", "b"])
        t.near(f"rank of {name}, scrambling", numerical_rank(information), expected, 0)
    information = fisher(made["scan"], {**values, "a": 0.0, "I": 0.0}, ["A", "axis", "R", "b"])
    t.near("rank of a scan, all scrambled", numerical_rank(information), 3, 0)
    information = fisher(made["scan"], {**values, "I": 0.3}, [*base, "b", "K", "I"])
    t.near("rank of the scan with a complex R", numerical_rank(information), 8, 0)
    information = fisher(made["scan"], values, [*base, "b"])
    deviations = np.sqrt(np.diag(np.linalg.inv(information)))
    t.near("standard deviations of a scan", deviations[1:], [0.0024, 0.0107, 0.0077, 0.0144, 0.0060], [6e-5] * 5)
    information = fisher(made["scan"], values, [*base, "b", "K"])
    t.near("standard deviation of R with K free", np.sqrt(np.linalg.inv(information)[2, 2]), 0.0267, 6e-5)
    information = fisher(made["scan"], values, ["A", "axis", "R"])
    t.near("standard deviation of R alone", np.sqrt(np.linalg.inv(information)[2, 2]), 0.0100, 6e-5)
    for a, printed, last in [(1, 0.008, 6e-4), (0.9, 0.0096, 6e-5), (0.8, 0.011, 6e-4), (0.6, 0.015, 6e-4), (0.4, 0.025, 6e-4), (0.2, 0.071, 6e-4), (0.05, 0.97, 6e-3)]:
        information = fisher(made["scan"], {**values, "r1": a, "r2": a, "b": a}, [*base, "b"])
        t.near(f"standard deviation of R at a = b = {a}", np.sqrt(np.linalg.inv(information)[2, 2]), printed, last)
    information = fisher(made["scan"], {**values, "R": -1.0}, [*base, "b"])
    # r1 does nothing there; A, r2 and b give the two numbers A(4 − r2) and A b r2 only (derived).
    t.near("rank at R = -1", numerical_rank(information), 4, 0)
    for r in (1.0, 3.0):
        information = fisher(made["scan"], {**values, "R": r}, [*base, "b"])
        t.near(f"rank at R = {r}", numerical_rank(information), 6, 0)


def numerical_rank(information):
    size = np.sqrt(np.diag(information))
    # A parameter that does nothing gives differences of the last bit only.
    kept = size > 1e-6 * size.max()
    scaled = information[np.ix_(kept, kept)] / np.outer(size[kept], size[kept])
    return int(np.sum(np.linalg.eigvalsh(scaled) > 1e-9))


def whole_matrices(t):
    """How many of r1, r2, b a whole 4×9 matrix determines beside a coherency X of rank 1 to 6."""
    rng = np.random.default_rng(8)
    levels = [np.array([multipole_parts(one)[level] for one in LAMBDA]) for level in range(3)]

    def outputs(x, rank):
        factors = (x[: 6 * rank] + 1j * x[6 * rank : 12 * rank]).reshape(rank, 2, 3) @ TO_PRODUCTS
        r1, r2, b = x[12 * rank :]
        lights = levels[0] + r1 * levels[1] + r2 * levels[2]
        coherencies = np.einsum("rij,ajk,rlk->ail", factors, lights, factors.conj())
        return (np.einsum("sij,aji->as", PAULI, coherencies).real * [1, b, b, b]).ravel()
    for rank, (own, more) in enumerate([(11, 3), (20, 3), (27, 3), (32, 3), (35, 1), (36, 0)], start=1):
        x = np.array([*rng.normal(size=12 * rank), 0.8, 0.6, 0.85])
        slopes = np.array([(outputs(x + h, rank) - outputs(x - h, rank)) / 2e-4 for h in 1e-4 * np.eye(len(x))]).T
        # Differences of a cubic leave 1e-8.
        t.near(f"X of rank {rank}", [np.linalg.matrix_rank(slopes[:, :-3], 1e-6 * np.linalg.norm(slopes)),
                                     np.linalg.matrix_rank(slopes, 1e-6 * np.linalg.norm(slopes))], [own, own + more], 0)


def biases(t):
    """R where depolarization is left out of the fit; Haar law, without noise."""
    rows = [
        (1.4, 0.9, 0.9, [-0.2, -0.7, -1.4, -2.5, -3.1, -0.5]), (1.4, 0.8, 0.8, [-0.6, -1.5, -2.8, -5.3, -6.3, -1.1]),
        (1.9, 0.95, 0.95, [-0.5, -0.9, -1.8, -2.8, -3.1, -0.5]), (1.9, 0.9, 0.9, [-1.1, -2.0, -3.6, -5.5, -6.1, -1.0]),
        (1.9, 0.8, 0.8, [-2.7, -4.4, -7.2, -11.0, -11.9, -2.5]), (1.9, 0.6, 0.6, [-7.6, -10.5, -14.6, -21.5, None, None]),
        (2.5, 0.8, 0.8, [-5.0, -7.6, -11.5, -17.7, -17.7, -4.2]), (2.5, 0.6, 0.6, [-13.1, -17.0, -22.5, -31.5, None, None]),
        (1.9, 1.0, 0.8, [0.0, 0.0, 0.0, 0.0, -2.3, -1.3]),
    ]
    columns = ["least squares", "weighted by 1/I", "no analyser", "root of two intensities", "analyser along", "analyser turns along"]
    for r, a, b, printed in rows:
        for name, value, expected in zip(columns, biased(r, (1, a, a), b), printed):
            if expected is not None:
                t.near(f"bias of R = {r}, a = {a}, b = {b}, {name}", 100 * (value / r - 1), expected, 0.051)
    for r, expected in [(0.4, 8.8), (0.7, 4.2), (1.0, 1.6)]:
        t.near(f"bias of R = {r}", 100 * (biased(r, (1, 0.8, 0.8), 0.8)[0] / r - 1), expected, 0.051)
    for r in (0.4, 1.9, 3.5):
        t.near("no bias behind generation", biased(r, (1, 1, 1), 0.6)[0], r, 1e-8)
    t.near("R of counted photons", biased(1.9, (1, 0.8, 0.8), 0.8)[1], 1.817, 6e-4)
    for r, expected in [(1.9, 2.12), (1.4, 1.56)]:
        out = out_states([linear_parts(x) for x in EIGHT], r, 1.0, (1, 0.8, 0.512), 1.0)[:, 0]

        def equal(x):
            return x[0] * (closed(EIGHT, 0, x[1], (1, x[2], x[2]), 1.0) + closed(EIGHT, np.pi / 2, x[1], (1, x[2], x[2]), 1.0))
        t.near("a wrong law without analyser", least_squares(equal, out, [1, r, 0.8])[1], expected, 6e-3)
    t.near("discrete twin", total(1.4, (1, 0.85, 0.85), 0.0) / total(1.4, (1, 0.85, 0.85), 0.0).mean(),
           total(1 / 3, (1, 0.489, 0.489), np.pi / 2) / total(1 / 3, (1, 0.489, 0.489), np.pi / 2).mean(), 6e-4)
    for law, r, a, b in [("diffusion", 1.886, 0.884, 0.835), ("gaussian", 1.892, 0.933, 0.863), ("coherentGaussian", 1.887, 0.893, 0.839)]:
        data = closed(EIGHT[:, None], EIGHT[None, :], 1.9, table_factors(law, 0.8), 0.9).ravel()

        def haar(x):
            return x[0] * closed(EIGHT[:, None], EIGHT[None, :], x[1], (1, x[2], x[2]), x[3]).ravel()
        t.near(f"{law} taken for scrambling", least_squares(haar, data, [1, 1.9, 0.8, 0.9])[1:], [r, a, b], 6e-4)


def total(r, q, axis):
    return out_states([linear_parts(x) for x in EIGHT], r, 1.0, q, 1.0, axis)[:, 0]


def biased(r, q, b):
    data = scan(EIGHT, EIGHT, r, q, b)

    def full(x):
        return x[0] * polarized_scan(EIGHT, EIGHT, x[1:]).ravel()

    def unanalysed(x):
        return x[0] * (closed(EIGHT, 0, x[1], (1, 1, 1), 1.0) + closed(EIGHT, np.pi / 2, x[1], (1, 1, 1), 1.0))

    def along(x):
        return x[0] * closed(EIGHT, 0, x[1], (1, 1, 1), 1.0)

    def together(x):
        return x[0] * closed(EIGHT, EIGHT, x[1], (1, 1, 1), 1.0)
    result = [least_squares(full, data.ravel(), [1, 0, r])[2]]
    result.append(least_squares(full, data.ravel(), [1, 0, r], 1 / np.sqrt(data.ravel()))[2])
    out = total(r, q, 0.0)
    result.append(least_squares(unanalysed, out, [1, r])[1])
    result += [np.sqrt(data[0, 0] / data[4, 0]), least_squares(along, data[:, 0], [1, r])[1], least_squares(together, np.diag(data), [1, r])[1]]
    return result


def check_claims():
    t = Tally()
    for part in (nine_elements, tensors, unpolarized_lights, laws, scans, sets, ranks, whole_matrices, biases):
        part(t)
    assert not t.failed, "\n".join(t.failed)
    return t.count
