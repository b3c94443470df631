"""What is expected of one Mueller matrix, from the definitions, with 60 decimal digits.

`examine(mueller, normalised)` takes 16 doubles, row by row, as exact numbers. Its result holds
doubles. A key that is missing has no expectation; `None` means *not determined*.
"""

import numpy as np
from mpmath import mp, mpf
from scipy import linalg, optimize

from elements import PAULI

mp.dps = 60

TOLERANCE = mpf("1e-12")  # of the condition λ4 ≥ −1e-12 M00
NOTHING = mpf("1e-12")    # below this a quantity counts as zero, far from the threshold 1e-9
PLENTY = mpf("1e-5")      # above this it counts as determined, far from the threshold 1e-9
OMIT = object()           # no expectation

# σi ⊗ σj* has four entries, each of modulus one: (row, column, value).
BASIS = [
    [(int(r), int(c), mp.mpc(k[r, c].real, k[r, c].imag)) for r, c in zip(*np.nonzero(k))]
    for k in (np.kron(PAULI[i], PAULI[j].conj()) for i in range(4) for j in range(4))
]


def examine(mueller, normalised):
    """Everything that is expected of `mueller`; see README.md for the fields."""
    exact = [mpf(float(x)) for x in mueller]
    m00 = exact[0]
    scale = abs(m00) if m00 != 0 else max(abs(x) for x in exact)
    if scale == 0:
        return zero_matrix()
    unit = [x / scale for x in exact]
    values, vectors = eigen(coherency(unit))
    spectrum = nearest_spectrum(values, unit[0], normalised)
    result = {}
    if m00 != 0:
        result["eigenvalues"] = doubles(values)
    result["realizable"] = realizable(values, unit[0])
    result["stokesCondition"] = stokes_condition(unit, result["realizable"])
    if spectrum is None:
        result.update(nearest=None, violation=None)
        return without_omitted(result)
    near = mueller_of(assembled(spectrum, vectors))
    check_nearest(unit, near, normalised)
    distance2 = sum((a - b) ** 2 for a, b in zip(near, unit))
    if m00 != 0:
        result["violation"] = double(mp.sqrt(distance2))
    result["distanceSquared"] = double(distance2 * scale**2)
    result["nearest"] = doubles(x * scale for x in near)
    if m00 <= 0:
        return without_omitted(result)
    forward, reverse = polar(near), polar(transposed(near))
    result["figures"] = {**figures(unit, scale, values, spectrum), **polar_figures(forward)}
    result["polarForward"] = factors(forward)
    result["polarReverse"] = factors(
        {key: transposed(x) if isinstance(x, list) else x for key, x in reverse.items()}
    )
    result["spectralWeights"] = doubles(x / sum(spectrum) for x in spectrum)
    result["characteristic"] = characteristic(spectrum, vectors)
    result["differential"] = differential(unit)
    result["isotropic"] = isotropic(values, vectors, scale)
    result["figures"]["isotropicAlpha"] = result["isotropic"]["alpha"]
    return without_omitted(result)


def zero_matrix():
    """No light passes: realizable, while every ratio to M00 is not determined."""
    return {
        "eigenvalues": None, "realizable": True, "stokesCondition": True, "violation": None,
        "distanceSquared": 0.0, "nearest": [0.0] * 16, "spectralWeights": None,
    }


# Coherency matrix (Cloude 1986): H = ¼ Σ M_ij σi ⊗ σj*, back M_ij = tr(H σi ⊗ σj*).

def coherency(m):
    h = mp.zeros(4, 4)
    for x, entries in zip(m, BASIS):
        for r, c, value in entries:
            h[r, c] += x * value / 4
    return h


def mueller_of(h):
    return [mp.re(mp.fsum(h[c, r] * value for r, c, value in entries)) for entries in BASIS]


def eigen(h):
    """Eigenvalues, descending, and their eigenvectors as columns in the same order."""
    values, vectors = mp.eighe(h)
    order = sorted(range(len(values)), key=lambda k: -values[k])
    return [values[k] for k in order], [vectors[:, k] for k in order]


def assembled(values, vectors):
    h = mp.zeros(4, 4)
    for value, v in zip(values, vectors):
        h += value * v * v.transpose_conj()
    return h


def realizable(values, m00):
    """Within 1e-9 of the border only matrices that are on it but for the last bits are allowed."""
    smallest = values[3]
    if m00 > 0 and not (smallest >= mpf("-1e-14") or smallest < mpf("-1e-9")):
        raise ValueError(f"too near the border of realizability: {mp.nstr(smallest, 5)}")
    return m00 > 0 and bool(smallest >= -TOLERANCE * m00)


# Nearest realizable matrix, equal errors.

def nearest_spectrum(values, m00, m00_exact):
    """The nearest non-negative spectrum; with `m00_exact` its sum stays m00, so λ → max(λ − τ, 0).

    Every number of kept eigenvalues is tried and the closest admissible one taken.
    """
    if not m00_exact:
        return [max(x, mpf(0)) for x in values]
    if m00 <= 0:
        return None
    best = None
    for kept in range(1, 5):
        shift = (mp.fsum(values[:kept]) - m00) / kept
        trial = [x - shift for x in values[:kept]] + [mpf(0)] * (4 - kept)
        if min(trial) < 0:
            continue
        distance = mp.fsum((a - b) ** 2 for a, b in zip(trial, values))
        if best is None or distance < best[0]:
            best = (distance, trial)
    return best[1]


def check_nearest(m, near, m00_exact):
    """Optimality (Karush, Kuhn, Tucker): N − H (+ τI) = Z with Z ⪰ 0 and tr(Z N) = 0."""
    h, n = coherency(m), coherency(near)
    z = n - h
    if m00_exact:
        trace = mp.re(sum(n[k, k] for k in range(4)))
        assert abs(trace - m[0]) < mpf("1e-40")
        product = z * n
        z = z - mp.eye(4) * (mp.re(sum(product[k, k] for k in range(4))) / trace)
    size = mp.mnorm(h, "f")
    product = z * n
    assert min(eigen(n)[0]) > -mpf("1e-40") * size
    assert min(eigen(z)[0]) > -mpf("1e-40") * size
    assert abs(sum(product[k, k] for k in range(4))) < mpf("1e-40") * size**2


def check_nearest_by_search(mueller, normalised, near):
    """A search over H = L L† (SciPy) finds nothing closer than `near`, and comes close to it."""
    m = np.array(mueller) / abs(mueller[0])
    near = np.array(near) / abs(mueller[0])
    basis = np.array([np.kron(PAULI[i], PAULI[j].conj()) for i in range(4) for j in range(4)])

    def distance2(parameters):
        l = parameters[:16].reshape(4, 4) + 1j * parameters[16:].reshape(4, 4)
        h = l @ l.conj().T
        if normalised:
            h *= m[0] / np.trace(h).real
        return np.sum((np.einsum("kab,ba->k", basis, h).real - m) ** 2)

    start = np.random.default_rng(5).normal(size=32)
    found = optimize.minimize(distance2, start, method="BFGS", options={"maxiter": 3000}).fun
    ours = np.sum((near - m) ** 2)
    assert found > ours - 1e-9, "a closer realizable matrix exists"
    assert found < ours + 1e-5, "the search did not come near the closest matrix"


# Stokes condition (Givens & Kostinski 1993, as a one-dimensional concave problem).

def stokes_condition(m, is_realizable):
    """M00 ≥ |M0i| and max over μ ≥ 0 of λmin(MᵀGM − μG) ≥ 0; sampled inputs must agree."""
    m = np.array([float(x) for x in m]).reshape(4, 4)
    metric = np.diag([1.0, -1, -1, -1])
    form = m.T @ metric @ m

    def smallest(mu):
        return np.linalg.eigvalsh(form - mu * metric)[0]

    low, high = 0.0, form[0, 0] + np.linalg.norm(form)
    ratio = (np.sqrt(5) - 1) / 2
    for _ in range(90):
        left, right = high - ratio * (high - low), low + ratio * (high - low)
        low, high = (left, high) if smallest(left) < smallest(right) else (low, right)
    margin = min(smallest(0.0) if high < 1e-15 else smallest((low + high) / 2),
                 m[0, 0] - np.linalg.norm(m[0, 1:]))
    worst = worst_output(m)
    if is_realizable:
        # A realizable matrix keeps the cone; polarizers and retarders sit on its border.
        assert margin > -1e-13 and worst > -1e-13, (margin, worst)
        return True
    if margin > 1e-7 or abs(margin) < 1e-13:
        assert worst > -1e-12, (margin, worst)
        return True
    if margin < -1e-7:
        assert worst < -1e-8, (margin, worst)
        return False
    return OMIT


def worst_output(m):
    """Smallest of S0 − |(S1, S2, S3)| of the output over fully polarized inputs of S0 = 1."""
    count = 4000
    k = np.arange(count) + 0.5
    polar_angle, turn = np.arccos(1 - 2 * k / count), np.pi * (1 + np.sqrt(5)) * k
    sphere = np.stack([np.sin(polar_angle) * np.cos(turn),
                       np.sin(polar_angle) * np.sin(turn), np.cos(polar_angle)])

    def excess(points):
        out = m @ np.vstack([np.ones((1, points.shape[1])), points])
        return out[0] - np.linalg.norm(out[1:], axis=0)

    sampled = excess(sphere)
    worst = sampled.min()
    # Refined from the three lowest samples: a small region of failure is easily missed.
    for index in np.argsort(sampled)[:3]:
        found = optimize.minimize(
            lambda x: excess((x / np.linalg.norm(x)).reshape(3, 1))[0], sphere[:, index],
            method="Nelder-Mead", options={"xatol": 1e-9, "fatol": 1e-15})
        worst = min(worst, found.fun)
    return worst


# Figures.

def figures(m, scale, values, spectrum):
    d, p = [m[1], m[2], m[3]], [m[4], m[8], m[12]]
    size_d, size_p = norm(d), norm(p)
    block = [m[k] for k in (5, 6, 7, 9, 10, 11, 13, 14, 15)]
    a, b, c, e = values
    shares = [x / mp.fsum(spectrum) for x in spectrum]
    return {
        "diattenuation": double(size_d),
        "linearDiattenuation": double(norm(d[:2])),
        "circularDiattenuation": double(d[2]),
        "diattenuationAzimuthDeg": azimuth(d),
        "polarizance": double(size_p),
        "linearPolarizance": double(norm(p[:2])),
        "circularPolarizance": double(p[2]),
        "polarizanceAzimuthDeg": azimuth(p),
        "transmittanceMax": double(scale * (1 + size_d)),
        "transmittanceMin": double(scale * (1 - size_d)),
        "depolarizationIndex": double(mp.sqrt((mp.fsum(x * x for x in m) - 1) / 3)),
        "sphericalPurity": double(norm(block) / mp.sqrt(3)),
        "purityIndex1": double(a - b),
        "purityIndex2": double(a + b - 2 * c),
        "purityIndex3": double(a + b + c - 3 * e),
        "entropy": double(-mp.fsum(x * mp.log(x, 4) for x in shares if x > 0)),
    }


def azimuth(vector):
    """½ atan2 in degrees, [0, 180); not determined without a linear part."""
    size = norm(vector[:2])
    if size < NOTHING:
        return None
    return double(mp.degrees(mp.atan2(vector[1], vector[0])) / 2 % 180) if size > PLENTY else OMIT


# Polar decomposition (Lu & Chipman 1996), the sign on the smallest singular value.

def polar(m):
    """Factors of m = MΔ MR MD for m00 = 1 (scaled here), from the eigenvectors of m'm'ᵀ."""
    m = [x / m[0] for x in m]
    d = [m[1], m[2], m[3]]
    size = norm(d)
    result = {"diattenuator": flat(diattenuator(d, size))}
    if 1 - size < NOTHING:
        return {**result, "depolarizer": None, "retarder": None, "rotation": None, "power": None}
    unclear = {"depolarizer": OMIT, "retarder": OMIT, "rotation": OMIT, "power": OMIT}
    if 1 - size < PLENTY:
        return {**result, **unclear}
    rest = mp.matrix(4, 4)
    for k in range(16):
        rest[k // 4, k % 4] = m[k]
    rest = rest * mp.inverse(diattenuator(d, size))
    block = rest[1:4, 1:4]
    squares, columns = mp.eigsy(block * block.T)
    order = sorted(range(3), key=lambda k: -squares[k])
    s = [mp.sqrt(max(squares[k], mpf(0))) for k in order]
    u = [[columns[r, k] for r in range(3)] for k in order]
    negative = mp.det(block) < 0 and s[2] > NOTHING
    signs = [1, 1, -1 if negative else 1]
    ambiguous = negative and s[1] - s[2] < PLENTY
    small = mp.matrix(3, 3)
    for sign, value, v in zip(signs, s, u):
        small += sign * value * mp.matrix(v) * mp.matrix(v).T
    full = mp.eye(4)
    for r in range(3):
        full[r + 1, 0] = rest[r + 1, 0]
        for c in range(3):
            full[r + 1, c + 1] = small[r, c]
    # With a mirror and two equal smallest values the depolarizer has no unique axes either.
    result["depolarizer"] = OMIT if ambiguous else flat(full)
    result["power"] = OMIT if ambiguous else 1 - abs(mp.fsum(a * b for a, b in zip(signs, s))) / 3
    if s[1] < NOTHING or (negative and s[1] - s[2] < NOTHING):
        return {**result, "retarder": None, "rotation": None}
    if s[1] < PLENTY or ambiguous:
        return {**result, "retarder": OMIT, "rotation": OMIT}
    # The proper rotation that takes the first two input axes to the first two output axes.
    w = [[mp.fsum(block[r, c] * v[r] for r in range(3)) / value for c in range(3)]
         for v, value in zip(u[:2], s[:2])]
    rotation = mp.matrix(3, 3)
    for left, right in ((u[0], w[0]), (u[1], w[1]), (cross(u[0], u[1]), cross(w[0], w[1]))):
        rotation += mp.matrix(left) * mp.matrix(right).T
    check_polar(block, small, rotation, negative, s[2])
    whole = mp.eye(4)
    for r in range(3):
        for c in range(3):
            whole[r + 1, c + 1] = rotation[r, c]
    return {**result, "retarder": flat(whole), "rotation": rotation}


def diattenuator(d, size):
    root = mp.sqrt(1 - size**2) if 1 - size > NOTHING else mpf(0)
    matrix = mp.eye(4)
    for r in range(3):
        matrix[0, r + 1] = matrix[r + 1, 0] = d[r]
        for c in range(3):
            share = d[r] * d[c] / size**2 if size > 0 else mpf(0)
            matrix[r + 1, c + 1] = (root if r == c else 0) + (1 - root) * share
    return matrix


def check_polar(block, small, rotation, negative, smallest):
    """The factors recompose, and without a mirror equal SciPy's polar decomposition."""
    assert mp.mnorm(small * rotation - block, "f") < mpf("1e-25")
    assert mp.mnorm(rotation * rotation.T - mp.eye(3), "f") < mpf("1e-25")
    assert abs(mp.det(rotation) - 1) < mpf("1e-25")
    if not negative and smallest > PLENTY:
        unitary, positive = linalg.polar(np.array(block.tolist(), float), side="left")
        assert np.allclose(unitary, np.array(rotation.tolist(), float), atol=1e-9)
        assert np.allclose(positive, np.array(small.tolist(), float), atol=1e-11)


def factors(parts):
    return {key: parts[key] if parts[key] is OMIT or parts[key] is None else doubles(parts[key])
            for key in ("depolarizer", "retarder", "diattenuator")}


RETARDER_FIGURES = ("retardanceDeg", "linearRetardanceDeg", "rotationDeg", "fastAxisDeg",
                    "retarderAzimuthDeg", "retarderEllipticityDeg")


def polar_figures(parts):
    power = parts["power"]
    found = {"depolarizationPower": power if power is OMIT or power is None else double(power)}
    r = parts["rotation"]
    if r is OMIT or r is None:
        return {**dict.fromkeys(RETARDER_FIGURES, r), **found}
    sines = half_antisymmetric(r)
    trace = r[0, 0] + r[1, 1] + r[2, 2]
    retardance = mp.atan2(norm(sines), (trace - 1) / 2)
    found["retardanceDeg"] = double(mp.degrees(retardance))
    axis = retarder_axis(r, sines, retardance)
    if axis is None or axis is OMIT:
        found["retarderAzimuthDeg"] = found["retarderEllipticityDeg"] = axis
    else:
        found["retarderAzimuthDeg"] = azimuth(axis)
        found["retarderEllipticityDeg"] = double(mp.degrees(mp.asin(axis[2])) / 2)
    # Linear retarder after a rotator: r = LR · rotation by ψ.
    x, y = r[0, 0] + r[1, 1], r[1, 0] - r[0, 1]
    found["linearRetardanceDeg"] = double(mp.degrees(mp.acos(min(mp.hypot(x, y) - 1, mpf(1)))))
    if mp.hypot(x, y) < PLENTY:
        found["rotationDeg"] = found["fastAxisDeg"] = None if mp.hypot(x, y) < NOTHING else OMIT
        return found
    turn = mp.atan2(y, x)
    found["rotationDeg"] = double(mp.degrees(turn) / 2)
    c, s = mp.cos(turn), mp.sin(turn)
    linear = half_antisymmetric(r * mp.matrix([[c, s, 0], [-s, c, 0], [0, 0, 1]]))
    assert abs(linear[2]) < mpf("1e-25")
    found["fastAxisDeg"] = azimuth(linear)
    return found


def retarder_axis(r, sines, retardance):
    """Unit axis; towards π the eigenvector of eigenvalue 1, first non-zero component positive."""
    if retardance < NOTHING:
        return None
    if retardance < PLENTY or NOTHING < mp.pi - retardance < PLENTY:
        return OMIT
    if mp.pi - retardance > PLENTY:
        return [x / norm(sines) for x in sines]
    outer = (r + r.T + 2 * mp.eye(3)) / 4
    column = max(range(3), key=lambda k: outer[k, k])
    axis = [outer[k, column] for k in range(3)]
    axis = [x / norm(axis) for x in axis]
    first = next(x for x in axis if abs(x) > NOTHING)
    if abs(first) < PLENTY:
        return OMIT
    return [x * mp.sign(first) for x in axis]


def half_antisymmetric(r):
    """½ ε_ijk r_jk, the sine of the retardance times the axis."""
    return [(r[1, 2] - r[2, 1]) / 2, (r[2, 0] - r[0, 2]) / 2, (r[0, 1] - r[1, 0]) / 2]


# Pure element with isotropic depolarization: H ≈ a h h† + b I, least squares.

def isotropic(values, vectors, scale):
    total = mp.fsum(values)
    up, down = values[0] - total / 4, total / 4 - values[3]
    if abs(up - down) < mpf("1e-9") and up > mpf("1e-9"):
        return {"alpha": OMIT, "mueller": OMIT}
    chosen = 0 if up >= down or up < mpf("1e-9") else 3
    share = values[chosen] / total
    alpha = mpf(4) / 3 * (1 - share)
    others = (total - values[chosen]) / 3
    gap = abs(values[chosen] - values[1 if chosen == 0 else 2])
    if gap < PLENTY and max(up, down) > NOTHING:
        return {"alpha": double(alpha), "mueller": OMIT}
    h = mp.eye(4) * others + assembled([values[chosen] - others], [vectors[chosen]])
    return {"alpha": double(alpha), "mueller": doubles(x * scale for x in mueller_of(h))}


# Characteristic decomposition (Gil 2007), by the indices of purity of the nearest matrix.

def characteristic(spectrum, vectors):
    """Weights P1, P2 − P1, P3 − P2, 1 − P3; each matrix with M00 = 1.

    A mixture of the first k is unique only where its eigenvalue and the next differ.
    """
    a, b, c, d = [x / mp.fsum(spectrum) for x in spectrum]
    p1, p2, p3 = a - b, a + b - 2 * c, a + b + c - 3 * d
    parts = []
    for count, weight in zip(range(1, 5), (p1, p2 - p1, p3 - p2, 1 - p3)):
        h = assembled([mpf(1) / count] * count, vectors[:count])
        parts.append({"weight": double(weight), "mueller": doubles(mueller_of(h)) if weight > PLENTY else OMIT})
    return parts


# Differential decomposition (Ossikovski 2011): the principal logarithm of m = M/M00.

def differential(unit):
    """Of the measured matrix. `None` where m is singular or has a real eigenvalue ≤ 0, no
    expectation where the problem is ill-conditioned: where the condition number of m is
    above 1e5, or an eigenvalue's argument is within 1e-5 of π, and not exactly so.
    """
    m = mp.matrix(4, 4)
    for k in range(16):
        m[k // 4, k % 4] = unit[k]
    reciprocal = 0 if mp.det(m) == 0 else 1 / (mp.mnorm(m, "f") * mp.mnorm(mp.inverse(m), "f"))
    if reciprocal < NOTHING:
        return None
    values = mp.eig(m, left=False, right=False)
    distance = min(mp.pi - abs(mp.arg(x)) for x in values)
    if distance < NOTHING:
        return None
    if reciprocal < PLENTY or distance < PLENTY:
        return OMIT
    whole = logarithm(m)
    metric = mp.diag([1, -1, -1, -1])
    mean = (whole - metric * whole.T * metric) / 2
    rest = (whole + metric * whole.T * metric) / 2
    return {
        "mean": doubles(flat(mean)), "depolarizing": doubles(flat(rest - mp.eye(4) * rest[0, 0])),
        "linearBirefringence": double(mean[2, 3]), "linearBirefringence45": double(mean[3, 1]),
        "circularBirefringence": double(mean[1, 2]), "linearDichroism": double(mean[0, 1]),
        "linearDichroism45": double(mean[0, 2]), "circularDichroism": double(mean[0, 3]),
    }


def logarithm(m):
    """From the eigenvectors, or by mpmath's roots where they don't span. Either way its
    exponential is m again, its eigenvalues are the principal ones, and SciPy agrees."""
    values, columns = mp.eig(m)
    if abs(mp.det(columns)) > mpf("1e-20"):
        found = columns * mp.diag([mp.log(x) for x in values]) * mp.inverse(columns)
    else:
        found = mp.logm(m)
    assert max(abs(mp.im(x)) for x in found) < mpf("1e-30")
    real = found.apply(mp.re)
    assert mp.mnorm(mp.expm(real) - m, "f") < mpf("1e-30") * mp.mnorm(m, "f")
    assert max(abs(mp.im(x)) for x in mp.eig(real, left=False, right=False)) < mp.pi
    by_scipy = linalg.logm(np.array(m.tolist(), float))
    assert np.allclose(by_scipy, np.array(real.tolist(), float), rtol=0, atol=1e-7)
    return real


# Small helpers.

def norm(vector):
    return mp.sqrt(mp.fsum(x * x for x in vector))


def cross(a, b):
    return [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]]


def flat(matrix):
    return [matrix[k // 4, k % 4] for k in range(16)]


def transposed(m):
    return [m[4 * (k % 4) + k // 4] for k in range(16)]


def double(x):
    return float(x) + 0.0


def doubles(values):
    return [double(x) for x in values]


def without_omitted(value):
    if isinstance(value, list):
        return [without_omitted(x) for x in value]
    if isinstance(value, dict):
        return {key: without_omitted(x) for key, x in value.items() if x is not OMIT}
    return value
