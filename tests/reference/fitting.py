"""Candidate models fitted to noisy Mueller matrices: 60 fits, from the definitions of the models.

Usage:  python fitting.py          write fitting.json
        python fitting.py --check  compute all again from the committed inputs and compare

Minimises (M(x) − m)ᵀ Σ⁻¹ (M(x) − m) over the elements that have an error, by SciPy's
`least_squares` from many starts (trust region and Levenberg-Marquardt), then by Gauss-Newton
steps until the step is below 1e-10 of a standard error. Jones matrices are eight real numbers
here, with all that they leave undetermined (phase, and scale where M00 is exact): steps and
covariances use the pseudoinverse of the known rank, so that no choice of phase enters.
Standard errors are first order, (JᵀJ)⁻¹ with the noise known.

Kind: recomputed. Asserted for every case: the Jacobian against differences, the rank of the Jacobian, the gradient
at the minimum, and that a second start finds it. Under equal errors the least χ² of `pure` and of
parallel `pureIsotropic` is asserted against the eigenvalues of H (Cloude 1986; derived).
"""

import json
import sys
from pathlib import Path

import numpy as np
from scipy.linalg import solve_triangular
from scipy.optimize import least_squares

from elements import PAULI

FILE = Path(__file__).resolve().parent / "fitting.json"
COUNT = 60
STARTS = 12
EPSILON = np.zeros((3, 3, 3))
for i, j, k in [(0, 1, 2), (1, 2, 0), (2, 0, 1)]:
    EPSILON[i, j, k], EPSILON[j, i, k] = 1, -1

ABOUT = (
    "Least-squares fits of candidate models to noisy Mueller matrices, by fitting.py (SciPy), without the engine. "
    "Convention: angles counter-clockwise from x facing the source, exp(+iwt), S3 > 0 clockwise facing the source; "
    "all angles in radians; matrices row by row; standardErrors = sqrt of the diagonal of the inverse of JtJ, noise known. "
    "normalised: M00 is exact and held, and the transmittance (m00) is then no parameter. covariance: 256 numbers, row by row. "
    "axis modulo pi; retardance of linearRetarder in [0, pi], of alignedDiattenuatingRetarder in (-pi, pi] with axis that of "
    "the larger transmittance; retarderVector = retardance times the unit fast eigenstate on the sphere, shorter than pi; "
    "m00 = M00 of the Jones part; of the d only their moduli and the sign of their product count, the last one bears the sign. "
    "side: parallel = (1-a) MJ + a MJ00 diag(1,0,0,0); after = depolarizer behind MJ (left factor); before = right factor; "
    "null = no depolarizer. fittedErrors: standard error of each element of the fitted matrix. "
    "Tolerances for a comparison: chiSquare 1e-8 relative, values 1e-3 of their standard error, standard errors 1 %."
)


# The pure parts: each gives its Mueller matrix and the derivatives.

def about_axis(matrix, derivatives, axis):
    """R(−θ) M R(θ), and the derivative by θ last."""
    c, s = np.cos(2 * axis), np.sin(2 * axis)
    turn = np.array([[1, 0, 0, 0], [0, c, s, 0], [0, -s, c, 0], [0, 0, 0, 1]])
    slope = 2 * np.array([[0, 0, 0, 0], [0, -s, c, 0], [0, -c, -s, 0], [0, 0, 0, 0]])
    turned = [turn.T @ part @ turn for part in [matrix, *derivatives]]
    return turned[0], [*turned[1:], slope.T @ matrix @ turn + turn.T @ matrix @ slope]


def linear_retarder(x):
    transmittance, retardance, axis = x
    c, s = np.cos(retardance), np.sin(retardance)
    unit = np.array([[1, 0, 0, 0], [0, 1, 0, 0], [0, 0, c, s], [0, 0, -s, c]])
    slope = np.array([[0, 0, 0, 0], [0, 0, 0, 0], [0, 0, -s, c], [0, 0, -c, -s]])
    return about_axis(transmittance * unit, [unit, transmittance * slope], axis)


def aligned(x):
    """T(1+D) along the axis, T(1−D) across; the axis is the fast one too."""
    transmittance, diattenuation, retardance, axis = x
    c, s, g = np.cos(retardance), np.sin(retardance), np.sqrt(1 - diattenuation**2)
    unit = np.array([[1, diattenuation, 0, 0], [diattenuation, 1, 0, 0], [0, 0, g * c, g * s], [0, 0, -g * s, g * c]])
    dg = -diattenuation / g
    by_diattenuation = np.array([[0, 1, 0, 0], [1, 0, 0, 0], [0, 0, dg * c, dg * s], [0, 0, -dg * s, dg * c]])
    by_retardance = g * np.array([[0, 0, 0, 0], [0, 0, 0, 0], [0, 0, -s, c], [0, 0, -c, -s]])
    return about_axis(transmittance * unit, [unit, transmittance * by_diattenuation, transmittance * by_retardance], axis)


def linear_diattenuator(x):
    matrix, (by_t, by_d, _, by_axis) = aligned([x[0], x[1], 0.0, x[2]])
    return matrix, [by_t, by_d, by_axis]


def elliptical_retarder(x):
    """I cosδ + (1 − cosδ) a aᵀ + ε_ijk a_k sinδ, in the vector v = δ a."""
    transmittance, v = x[0], np.asarray(x[1:])
    d = np.linalg.norm(v)
    first, second = np.sin(d) / d, (1 - np.cos(d)) / d**2
    first_slope = np.cos(d) / d - np.sin(d) / d**2
    second_slope = np.sin(d) / d**2 - 2 * (1 - np.cos(d)) / d**3
    unit = np.eye(4)
    unit[1:, 1:] = np.cos(d) * np.eye(3) + second * np.outer(v, v) + first * (EPSILON @ v)
    slopes = []
    for k, e in enumerate(np.eye(3)):
        slope = np.zeros((4, 4))
        along = v[k] / d
        slope[1:, 1:] = (along * (-np.sin(d) * np.eye(3) + second_slope * np.outer(v, v) + first_slope * (EPSILON @ v))
                         + second * (np.outer(e, v) + np.outer(v, e)) + first * (EPSILON @ e))
        slopes.append(transmittance * slope)
    return transmittance * unit, [unit, *slopes]


def elliptical_diattenuator(x):
    """[[1, Dᵀ], [D, q I + (1 − q) d dᵀ]] with (1 − q)/D² = 1/(1 + q)."""
    transmittance, v = x[0], np.asarray(x[1:])
    q = np.sqrt(1 - v @ v)
    unit = np.eye(4)
    unit[0, 1:] = unit[1:, 0] = v
    unit[1:, 1:] = q * np.eye(3) + np.outer(v, v) / (1 + q)
    slopes = []
    for k, e in enumerate(np.eye(3)):
        dq = -v[k] / q
        slope = np.zeros((4, 4))
        slope[0, 1:] = slope[1:, 0] = e
        slope[1:, 1:] = dq * np.eye(3) + (np.outer(e, v) + np.outer(v, e)) / (1 + q) - np.outer(v, v) * dq / (1 + q) ** 2
        slopes.append(transmittance * slope)
    return transmittance * unit, [unit, *slopes]


def jones(x):
    """M_ij = ½ tr(σi J σj J†); real parts of J row by row, then imaginary parts."""
    matrix = (np.asarray(x[:4]) + 1j * np.asarray(x[4:8])).reshape(2, 2)
    left = np.einsum("iab,bc,jcd->ijad", PAULI, matrix, PAULI)
    mueller = 0.5 * np.einsum("ijad,ad->ij", left, matrix.conj()).real
    slopes = []
    for unit in (1, 1j):
        for k in range(4):
            change = np.zeros(4, complex)
            change[k] = unit
            slopes.append(np.einsum("ijad,ad->ij", left, change.reshape(2, 2).conj()).real)
    return mueller, slopes


# name: (pure part, its parameters, names of the depolarizer's parameters)
MODELS = {
    "linearRetarder": (linear_retarder, ["transmittance", "retardance", "axis"], ["alpha"]),
    "linearDiattenuator": (linear_diattenuator, ["transmittance", "diattenuation", "axis"], ["alpha"]),
    "alignedDiattenuatingRetarder": (aligned, ["transmittance", "diattenuation", "retardance", "axis"], ["alpha"]),
    "ellipticalRetarder": (elliptical_retarder, ["transmittance", *[f"retarderVector{k}" for k in range(3)]], ["alpha"]),
    "ellipticalDiattenuator": (elliptical_diattenuator, ["transmittance", *[f"diattenuationVector{k}" for k in range(3)]], ["alpha"]),
    "pure": (jones, None, []),
    "pureIsotropic": (jones, None, ["alpha"]),
    "pureLinearCircular": (jones, None, ["depolarizationLinear", "depolarizationCircular"]),
    "pureDiagonal": (jones, None, [f"depolarization{k}" for k in range(3)]),
}


def evaluate(model, side, x):
    """The model's matrix and its derivatives by every number of x."""
    pure, names, extra = MODELS[model]
    count = 8 if names is None else len(names)
    matrix, slopes = pure(x[:count])
    if not extra:
        return matrix, slopes
    given = x[count:]
    if extra == ["alpha"]:
        diagonal, by = np.array([1, *[1 - given[0]] * 3]), [np.array([0.0, -1, -1, -1])]
    elif len(extra) == 2:
        diagonal, by = np.array([1, given[0], given[0], given[1]]), [np.array([0.0, 1, 1, 0]), np.array([0.0, 0, 0, 1])]
    else:
        diagonal, by = np.array([1, *given]), list(np.eye(4)[1:])

    def through(part, factors):
        if side == "after":
            return factors[:, None] * part
        if side == "before":
            return part * factors
        # M00 stays, the other fifteen elements fade: α of the light comes out unpolarized.
        result = factors[1] * part
        result[0, 0] = factors[0] * part[0, 0]
        return result

    return through(matrix, diagonal), [*[through(slope, diagonal) for slope in slopes], *[through(matrix, factors) for factors in by]]


class Fit:
    def __init__(self, model, side, measured, covariance, normalised):
        self.model, self.side, self.measured, self.normalised = model, side, measured, normalised
        self.names = MODELS[model][1]
        self.free = np.flatnonzero(np.diag(covariance) > 0)
        self.root = np.linalg.cholesky(covariance[np.ix_(self.free, self.free)])
        pure = 7 if self.names is None else len(self.names)
        self.rank = pure + len(MODELS[model][2]) - normalised

    def matrix(self, x):
        """16 elements and their Jacobian; M00 is 1 where it is exact."""
        if self.normalised and self.names is not None:
            matrix, slopes = evaluate(self.model, self.side, [1.0, *x])
            return matrix.ravel(), np.array([slope.ravel() for slope in slopes[1:]]).T
        matrix, slopes = evaluate(self.model, self.side, x)
        values, jacobian = matrix.ravel(), np.array([slope.ravel() for slope in slopes]).T
        if self.normalised:
            jacobian = (jacobian - np.outer(values, jacobian[0]) / values[0]) / values[0]
            values = values / values[0]
        return values, jacobian

    def residuals(self, x):
        return solve_triangular(self.root, (self.matrix(x)[0] - self.measured)[self.free], lower=True)

    def jacobian(self, x):
        return solve_triangular(self.root, self.matrix(x)[1][self.free], lower=True)

    def inverse(self, jacobian):
        """Pseudoinverse of the known rank."""
        u, s, vt = np.linalg.svd(jacobian, full_matrices=False)
        assert s[self.rank - 1] > 1e-5 * s[0], s
        assert np.all(s[self.rank:] < 1e-10 * s[0]), s
        return (vt[: self.rank].T / s[: self.rank]) @ u[:, : self.rank].T

    def minimise(self, starts):
        found = []
        for number, start in enumerate(starts):
            for method in ("trf", "lm"):
                # Beyond D = 1 there is no matrix: such a start is given up.
                try:
                    with np.errstate(invalid="raise"):
                        result = least_squares(self.residuals, start, self.jacobian, method=method,
                                               ftol=1e-15, xtol=1e-15, gtol=1e-15, max_nfev=400)
                except (FloatingPointError, ValueError, np.linalg.LinAlgError):
                    continue
                found.append((2 * result.cost, result.x, number))
        found.sort(key=lambda one: one[0])
        least = found[0][0]
        reached = {number for value, _, number in found if value - least < 1e-6 * (1 + least)}
        assert len(reached) > 1, [value for value, *_ in found]
        x = self.shortest(found[0][1])
        for _ in range(100):
            inverse = self.inverse(self.jacobian(x))
            step = -inverse @ self.residuals(x)
            x = x + step
            errors = np.sqrt(np.sum(inverse**2, axis=1))
            if np.all(np.abs(step) < 1e-10 * errors):
                break
        else:
            raise AssertionError("no convergence")
        residuals, jacobian = self.residuals(x), self.jacobian(x)
        # The gradient in units of the errors.
        assert np.abs(self.inverse(jacobian).T @ (jacobian.T @ residuals)).max() < 1e-7
        chi_square = residuals @ residuals
        assert chi_square <= least * (1 + 1e-12)
        return x, chi_square, len(reached) / len(starts)

    def shortest(self, x):
        """The same retarder with its vector within π."""
        if self.model == "ellipticalRetarder":
            x = x.copy()
            vector = x[len(x) - 4 : len(x) - 1]
            size = np.linalg.norm(vector)
            vector *= ((size + np.pi) % (2 * np.pi) - np.pi) / size
        return x

    def parameters(self, x):
        """What the data determine, in the ranges of ABOUT, each with its gradient."""
        extra = MODELS[self.model][2]
        gradients = np.eye(len(x))
        entries = {}
        if self.names is None:
            if not self.normalised:
                matrix, slopes = evaluate(self.model, self.side, x)
                entries["m00"] = (matrix[0, 0], np.array([slope[0, 0] for slope in slopes]))
            offset = 8
        else:
            names = self.names[1:] if self.normalised else self.names
            entries.update({name: (x[k], gradients[k]) for k, name in enumerate(names)})
            offset = len(names)
        entries.update({name: (x[offset + k], gradients[offset + k]) for k, name in enumerate(extra)})
        values = {name: float(value) for name, (value, _) in entries.items()}
        quarter = 0.0
        if values.get("diattenuation", 1) < 0:
            values["diattenuation"] *= -1
            quarter = np.pi / 2
            if "retardance" in values:
                values["retardance"] *= -1
        if "retardance" in values:
            values["retardance"] = np.pi - (np.pi - values["retardance"]) % (2 * np.pi)
            if self.model == "linearRetarder" and values["retardance"] < 0:
                values["retardance"] *= -1
                quarter = np.pi / 2
        if "axis" in values:
            values["axis"] = float((values["axis"] + quarter) % np.pi)
        if "retarderVector0" in values:
            vector = np.array([values[f"retarderVector{k}"] for k in range(3)])
            size = np.linalg.norm(vector)
            assert size < 3.1, size
        if extra and extra != ["alpha"]:
            # A half-turn about one axis of the sphere changes two signs, and the Jones part takes it.
            chosen = [values[name] for name in extra]
            all_three = [chosen[0], *chosen] if len(chosen) == 2 else chosen
            sign = np.sign(np.prod(all_three))
            for name in extra:
                values[name] = abs(values[name])
            values[extra[-1]] *= sign
        return values, {name: gradient for name, (_, gradient) in entries.items()}

    def check_jacobian(self, x):
        for k in range(len(x)):
            step = np.zeros(len(x))
            step[k] = 1e-5
            slope = (self.matrix(x + step)[0] - self.matrix(x - step)[0]) / 2e-5
            assert np.abs(slope - self.matrix(x)[1][:, k]).max() < 1e-7, (self.model, k)

    def solved(self, starts):
        x, chi_square, share = self.minimise(starts)
        self.check_jacobian(x)
        inverse = self.inverse(self.jacobian(x))
        covariance = inverse @ inverse.T
        fitted, slopes = self.matrix(x)
        values, gradients = self.parameters(x)
        errors = {name: float(np.sqrt(gradient @ covariance @ gradient)) for name, gradient in gradients.items()}
        result = {
            "chiSquare": float(chi_square), "degreesOfFreedom": len(self.free) - self.rank,
            "fitted": fitted.tolist(), "fittedErrors": np.sqrt(np.maximum(np.sum((slopes @ inverse) ** 2, axis=1), 0)).tolist(),
            "parameters": values, "standardErrors": errors,
        }
        assert np.all(np.isfinite(result["fittedErrors"])) and result["degreesOfFreedom"] > 0
        away_from_borders(result)
        return result, share


def away_from_borders(result):
    """First order means little where a border is close, and where an end of a range is two values."""
    values, errors = result["parameters"], result["standardErrors"]
    for name, value in values.items():
        if name in ("diattenuation", "depolarizationLinear", "alpha") or name in ("depolarization0", "depolarization1", "depolarization2"):
            assert 6 * errors[name] < abs(value) < 1 - 2 * errors[name], (name, value, errors[name])
        if name == "axis":
            assert 5 * errors[name] < value < np.pi - 5 * errors[name], (name, value)
    vector = [values[f"diattenuationVector{k}"] for k in range(3) if "diattenuationVector0" in values]
    assert np.linalg.norm(vector) < 0.9


# The inputs.

def unit(rng):
    vector = rng.normal(size=3)
    return vector / np.linalg.norm(vector)


def unitary(rng):
    q, _ = np.linalg.qr(rng.normal(size=(2, 2)) + 1j * rng.normal(size=(2, 2)))
    return q


def random_truth(rng, model):
    """Numbers of x that stay away from the borders; a random start is such a draw, too."""
    transmittance = rng.uniform(0.4, 0.9)
    alpha = rng.uniform(0.15, 0.45)
    diattenuation, retardance, axis = rng.uniform(0.25, 0.7), rng.uniform(0.5, 2.5), rng.uniform(0.3, 2.8)
    if model == "linearRetarder":
        return [transmittance, retardance, axis, alpha]
    if model == "linearDiattenuator":
        return [transmittance, diattenuation, axis, alpha]
    if model == "alignedDiattenuatingRetarder":
        return [transmittance, diattenuation, retardance * rng.choice([-1, 1]), axis, alpha]
    if model == "ellipticalRetarder":
        return [transmittance, *(retardance * unit(rng)), alpha]
    if model == "ellipticalDiattenuator":
        return [transmittance, *(diattenuation * unit(rng)), alpha]
    amplitudes = np.sqrt(transmittance * np.array([1 + diattenuation, 1 - diattenuation]))
    matrix = (unitary(rng) * amplitudes) @ unitary(rng)
    x = [*matrix.real.ravel(), *matrix.imag.ravel()]
    if model == "pureIsotropic":
        x.append(alpha)
    elif model == "pureLinearCircular":
        x += [rng.uniform(0.6, 0.85), rng.uniform(0.4, 0.85)]
    elif model == "pureDiagonal":
        x += list(rng.uniform(0.45, 0.85, 3))
    return x


def plan():
    """(model, side, noise, factor of the noise that is drawn)"""
    fading = ["linearRetarder", "linearDiattenuator", "alignedDiattenuatingRetarder", "ellipticalRetarder", "ellipticalDiattenuator",
              "pureIsotropic"]
    kinds = ["uniform", "exact", "perElement", "covariance"]
    for model in fading:
        for kind in kinds:
            yield model, "parallel", kind, 1
    for k, model in enumerate(fading):
        yield model, "after", kinds[k % 4], 1
        yield model, "before", [*kinds, "covarianceExact"][(k + 2) % 5], 1
    for kind in kinds:
        yield "pure", None, kind, 1
    for model in ("pureLinearCircular", "pureDiagonal"):
        for side in ("after", "before"):
            for kind in kinds:
                yield model, side, kind, 1
    # The model does not hold: a large χ².
    yield "pureIsotropic", "parallel", "covarianceExact", 6
    yield "alignedDiattenuatingRetarder", "before", "perElement", 6
    yield "pure", None, "covarianceExact", 6
    yield "pureDiagonal", "after", "covariance", 4


def cases():
    """Inputs have few decimals, so that no processor's last bit is in them."""
    rng = np.random.default_rng(9042)
    for number, (model, side, kind, factor) in enumerate(plan()):
        sigma = [0.002, 0.005, 0.01][number % 3]
        truth = random_truth(rng, model)
        normalised = kind in ("exact", "covarianceExact")
        if kind in ("uniform", "exact"):
            noise = {"kind": "uniform", "sigma": sigma}
        elif kind == "perElement":
            noise = {"kind": "perElement", "sigma": [round(float(value), 6) for value in sigma * rng.uniform(0.3, 2, 16)]}
        else:
            basis, _ = np.linalg.qr(rng.normal(size=(16, 16)))
            covariance = np.round(4 * sigma**2 * (basis * np.geomspace(1, 1e-3, 16)) @ basis.T, 12)
            covariance = np.triu(covariance) + np.triu(covariance, 1).T + 0.0
            if normalised:
                covariance[0, :] = covariance[:, 0] = 0
            noise = {"kind": "covariance", "covariance": covariance.ravel().tolist()}
        covariance = covariance_of(noise, normalised)
        if normalised and MODELS[model][1] is not None:
            truth[0] = 1.0
        matrix = evaluate(model, side, truth)[0].ravel()
        if normalised:
            matrix = matrix / matrix[0]
        values, vectors = np.linalg.eigh(covariance)
        drawn = vectors @ (np.sqrt(np.maximum(values, 0)) * (vectors.T @ rng.normal(size=16)))
        measured = [round(float(value), 7) for value in matrix + factor * drawn]
        if normalised:
            measured[0] = 1.0
        starts = [truth, *[random_truth(rng, model) for _ in range(STARTS)]]
        if normalised and MODELS[model][1] is not None:
            starts = [start[1:] for start in starts]
        yield {"model": model, "side": side, "normalised": normalised, "mueller": measured, "noise": noise}, starts


def covariance_of(noise, normalised):
    if noise["kind"] == "covariance":
        covariance = np.array(noise["covariance"]).reshape(16, 16)
    else:
        covariance = np.diag(np.ones(16) * np.array(noise["sigma"]) ** 2)
    if normalised:
        covariance[0, :] = covariance[:, 0] = 0
    return covariance


def solved(case, starts):
    covariance = covariance_of(case["noise"], case["normalised"])
    measured = np.array(case["mueller"])
    result, share = Fit(case["model"], case["side"], measured, covariance, case["normalised"]).solved(starts)
    if case["noise"]["kind"] == "uniform":
        check_against_eigenvalues(case, measured, result["chiSquare"])
    return result, share


def check_against_eigenvalues(case, measured, chi_square):
    """‖M‖² = 4 ‖H‖²: the leading eigenvector is the best pure matrix (Cloude 1986), and
    a h h† + b I the best with a parallel depolarizer, also with M00 held (derived)."""
    h = np.einsum("ij,iab,jcd->acbd", measured.reshape(4, 4), PAULI, PAULI.conj()).reshape(4, 4) / 4
    values = np.linalg.eigvalsh(h)[::-1]
    squared_sigma = case["noise"]["sigma"] ** 2
    if case["model"] == "pure" and not case["normalised"]:
        expected = 4 * np.sum(values[1:] ** 2) / squared_sigma
    elif case["model"] == "pureIsotropic" and case["side"] == "parallel":
        expected = 4 * np.sum((values[1:] - values[1:].mean()) ** 2) / squared_sigma
    else:
        return
    assert abs(chi_square - expected) < 1e-9 * expected, (chi_square, expected)


def write():
    lines, shares = [], []
    for case, starts in cases():
        result, share = solved(case, starts)
        shares.append(share)
        lines.append(json.dumps({**case, **result}, allow_nan=False))
    assert len(lines) == COUNT
    FILE.write_text('{"about": ' + json.dumps(ABOUT) + ', "cases": [\n' + ",\n".join(lines) + "\n]}\n", encoding="utf-8", newline="\n")
    print(f"{len(lines)} fits written; the share of starts that reach the minimum is {min(shares):.2f} or more")


def check():
    committed = json.loads(FILE.read_text(encoding="utf-8"))["cases"]
    made = list(cases())
    if len(committed) != COUNT or len(made) != COUNT:
        print("fitting.json: not 60 cases")
        return 1
    for number, (case, (inputs, starts)) in enumerate(zip(committed, made)):
        where = f"case {number}, {case['model']}, {case['side']}"
        given = {key: case[key] for key in inputs}
        same = all(given[key] == inputs[key] for key in ("model", "side", "normalised"))
        if not same or np.abs(np.array(given["mueller"]) - inputs["mueller"]).max() > 2e-7:
            print(f"{where}: the input differs")
            return 1
        again, _ = solved(given, starts)
        problem = difference(case, again)
        if problem:
            print(f"{where}: {problem}")
            return 1
    print(f"{COUNT} fits of candidate models agree")
    return 0


def difference(case, again):
    """χ² to 1e-9 relative, values to 1e-5 of their standard errors, those to 1e-6 relative."""
    if case["degreesOfFreedom"] != again["degreesOfFreedom"] or case["parameters"].keys() != again["parameters"].keys():
        return "the parameters differ"
    if abs(case["chiSquare"] - again["chiSquare"]) > 1e-9 * again["chiSquare"]:
        return f"χ² was {case['chiSquare']!r}, now {again['chiSquare']!r}"
    for name, value in again["parameters"].items():
        error = again["standardErrors"][name]
        if abs(case["parameters"][name] - value) > 1e-5 * error or abs(case["standardErrors"][name] - error) > 1e-6 * error:
            return f"{name} was {case['parameters'][name]!r} ± {case['standardErrors'][name]!r}, now {value!r} ± {error!r}"
    errors = np.array(again["fittedErrors"])
    largest = errors.max()
    if np.any(np.abs(np.array(case["fitted"]) - again["fitted"]) > 1e-5 * largest):
        return "the fitted matrix differs"
    if np.any(np.abs(np.array(case["fittedErrors"]) - errors) > 1e-6 * largest):
        return "the standard errors of the fitted matrix differ"
    return ""


if __name__ == "__main__":
    if sys.argv[1:] == ["--check"]:
        sys.exit(check())
    write()
