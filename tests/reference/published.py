"""Compares every entry of published.json with the definitions, so that no transcription is wrong."""

import json
from pathlib import Path

import numpy as np

import elements
from definitions import examine

FILE = Path(__file__).resolve().parent / "published.json"
KINDS = {"seen", "from memory", "recomputed", "derived"}
FIELDS = {"id", "kind", "source", "statement", "check", "input", "expect", "tolerance"}


def check_published():
    """0 when every entry holds within its tolerance; else the first that fails is printed."""
    entries = json.loads(FILE.read_text(encoding="utf-8"))
    if len({entry["id"] for entry in entries}) != len(entries):
        print("published.json: an id occurs twice")
        return 1
    for entry in entries:
        if set(entry) != FIELDS or entry["kind"] not in KINDS:
            print(f"{entry['id']}: wrong fields or kind")
            return 1
        problem = CHECKS[entry["check"]](entry["input"], entry["expect"], entry["tolerance"])
        if problem:
            print(f"{entry['id']}: {problem}")
            return 1
    print(f"{len(entries)} published and derived values hold")
    return 0


# Inputs.

def element(item):
    p = {name: x["value"] for name, x in item["parameters"].items()}
    match item["kind"]:
        case "linearDiattenuator":
            return elements.linear_diattenuator(p["transmittanceMax"], p["transmittanceMin"], p["axisDeg"])
        case "linearRetarder":
            return elements.linear_retarder(p["retardanceDeg"], p["axisDeg"])
        case "circularRetarder":
            return elements.circular_retarder(p["retardanceDeg"])
        case "ellipticalRetarder":
            return elements.elliptical_retarder(p["retardanceDeg"], direction(p))
        case "ellipticalDiattenuator":
            return elements.elliptical_diattenuator(p["transmittance"], p["diattenuation"] * direction(p))
        case "alignedDiattenuatingRetarder":
            return elements.aligned_diattenuating_retarder(
                p["transmittance"], p["diattenuation"], p["retardanceDeg"], p["axisDeg"])
        case "isotropicReflector":
            return elements.isotropic_reflector(p["psiDeg"], p["deltaDeg"], p["reflectance"], p["planeDeg"])
        case "fresnelReflection" | "fresnelTransmission" as kind:
            of = elements.fresnel_reflection if kind == "fresnelReflection" else elements.fresnel_transmission
            return of(p["indexBefore"], p["indexAfter"] - 1j * p["absorption"], p["incidenceDeg"], p["planeDeg"])
        case "rotator":
            return elements.rotator(p["angleDeg"])
        case "isotropicDepolarizer":
            return elements.isotropic_depolarizer(p["alpha"])
        case other:
            raise ValueError(other)


def direction(p):
    azimuth, ellipticity = 2 * p["azimuthDeg"], 2 * p["ellipticityDeg"]
    return np.array([elements.cosine(ellipticity) * elements.cosine(azimuth),
                     elements.cosine(ellipticity) * elements.sine(azimuth), elements.sine(ellipticity)])


def matrix(given):
    """16 numbers, or a train whose first element the light meets first."""
    if "mueller" in given:
        return np.array(given["mueller"], float).reshape(4, 4)
    product = np.eye(4)
    for item in given["train"]:
        product = element(item) @ product
    return product


def examined(given):
    return examine(matrix(given).ravel(), given.get("normalised", False))


def signs(convention):
    """Diagonal of K: a foreign convention and back."""
    k = np.ones(4)
    if convention.get("angles") == "clockwise":
        k *= [1, 1, -1, 1]
    if convention.get("positiveS3") == "counterclockwise":
        k *= [1, 1, 1, -1]
    if convention.get("zeroAngle") == "y":
        k *= [1, -1, -1, 1]
    return k


def near(got, wanted, tolerance):
    """The checks below return "" or what is wrong."""
    if wanted is None or got is None:
        return "" if got is wanted else f"{got}, expected {wanted}"
    if np.shape(got) != np.shape(wanted):
        return f"shape {np.shape(got)}, expected {np.shape(wanted)}"
    off = np.max(np.abs(np.subtract(got, wanted)))
    return "" if off <= tolerance else f"off by {off:.3g}: {got}, expected {wanted}"


def all_near(got, wanted, tolerance):
    return "; ".join(filter(None, (near(got[name], wanted[name], tolerance) for name in wanted)))


# One function for each kind of check; README.md says what each means.

def element_matrix(given, expect, tolerance):
    return near(element(given).ravel(), expect["mueller"], tolerance)


def stokes_through_train(given, expect, tolerance):
    k = signs(given.get("convention", {}))
    out = k * (matrix(given) @ (k * np.array(given["stokes"])))
    size = np.linalg.norm(out[1:])
    got = {"stokes": out, "intensity": out[0], "degree": size / out[0],
           "azimuthDeg": np.degrees(np.arctan2(out[2], out[1])) / 2 % 180}
    return all_near(got, expect, tolerance)


def figures(given, expect, tolerance):
    return all_near(examined(given)["figures"], expect, tolerance)


def figure_bounds(given, expect, tolerance):
    found = examined(given)["figures"]
    wrong = [name for name, bound in expect.items()
             if not bound["atLeast"] - tolerance <= found[name] <= bound["atMost"] + tolerance]
    return ", ".join(f"{name} = {found[name]}" for name in wrong)


def nested_indices(given, expect, tolerance):
    found = examined(given)["figures"]
    order = [0.0] + [found[name] for name in expect["order"]] + [1.0]
    return "" if min(np.diff(order)) >= -tolerance else f"not in order: {order}"


def eigenvalues(given, expect, tolerance):
    return near(examined(given)["eigenvalues"], expect["eigenvalues"], tolerance)


def realizability(given, expect, _):
    found = examined(given)
    return ", ".join(f"{name} is {found[name]}" for name in expect if found[name] is not expect[name])


def nearest(given, expect, tolerance):
    found = examined(given)
    got = {"mueller": found["nearest"], "distance": np.sqrt(found["distanceSquared"])}
    return all_near(got, expect, tolerance)


def polar(given, expect, tolerance):
    return all_near(examined(given)["polarForward"], expect, tolerance)


def polar_product(given, expect, tolerance):
    parts = examined(given)["polarForward"]
    product = np.linalg.multi_dot(
        [np.array(parts[name]).reshape(4, 4) for name in ("depolarizer", "retarder", "diattenuator")])
    return near(product.ravel(), expect["mueller"], tolerance)


def differential(given, expect, tolerance):
    return all_near(examined(given)["differential"], expect, tolerance)


def spectral(given, expect, tolerance):
    """Weights from the definitions; the parts again from NumPy's eigenvectors."""
    h = coherency(matrix(given))
    values, vectors = np.linalg.eigh(h)
    parts = [weight * elements.of_jones(np.sqrt(2) * v.reshape(2, 2)) for weight, v in zip(values, vectors.T)]
    got = {"weights": examined(given)["spectralWeights"], "mueller": sum(parts).ravel()}
    return all_near(got, expect, tolerance)


def coherency(mueller):
    p = elements.PAULI
    return np.einsum("ij,iac,jbd->abcd", mueller, p, p.conj()).reshape(4, 4) / 4


def coherency_norm(given, expect, tolerance):
    h = coherency(matrix(given))
    return near(4 * np.sum(np.abs(h) ** 2), expect["squaredNorm"], tolerance)


def passivity(given, expect, tolerance):
    m = matrix(given)
    largest = max(np.linalg.norm(m[0, 1:]), np.linalg.norm(m[1:, 0]))
    return near(m[0, 0] + largest - 1, expect["margin"], tolerance)


def jones_to_mueller(given, expect, tolerance):
    jones = np.array([complex(*x) for x in given["jones"]]).reshape(2, 2)
    return near(elements.of_jones(jones).ravel(), expect["mueller"], tolerance)


def state_in_convention(given, expect, tolerance):
    return near(signs(given["convention"]) * given["stokes"], expect["stokes"], tolerance)


def matrix_in_convention(given, expect, tolerance):
    k = np.diag(signs(given["convention"]))
    return near((k @ matrix(given) @ k).ravel(), expect["mueller"], tolerance)


def eigenvalue_error(given, expect, tolerance):
    """The standard error by simulation, which must lie within 2 % of what is expected."""
    rng = np.random.default_rng(3)
    noise = rng.normal(0, given["sigma"] / 100, (40000, 4, 4))
    if given["normalised"]:
        noise[:, 0, 0] = 0
    p = elements.PAULI
    h = np.einsum("nij,iac,jbd->nabcd", matrix(given) + noise, p, p.conj(), optimize=True).reshape(-1, 4, 4) / 4
    spread = 100 * np.linalg.eigvalsh(h).std(axis=0)[::-1]
    return near(spread / expect["eigenvalueSe"], np.ones(4), max(tolerance, 0.02))


def noise_on_pure(given, expect, tolerance):
    rng = np.random.default_rng(8)
    noise = rng.normal(0, given["sigma"], (given["draws"], 4, 4))
    p = elements.PAULI
    h = np.einsum("nij,iac,jbd->nabcd", matrix(given) + noise, p, p.conj(), optimize=True).reshape(-1, 4, 4) / 4
    smallest = np.linalg.eigvalsh(h)[:, 0] / given["sigma"]
    got = {"mean": smallest.mean(), "standardDeviation": smallest.std(),
           "quantile05": np.quantile(smallest, 0.05), "shareRealizable": (smallest >= 0).mean()}
    return all_near(got, expect, tolerance)


def rounding(given, expect, tolerance):
    """p of the violation, simulated under a pure truth with normal errors of the rounding."""
    m = matrix(given)
    sigma = 10.0 ** -given["decimals"] / np.sqrt(12)
    found = examined(given)
    values, vectors = np.linalg.eigh(coherency(m))
    truth = elements.of_jones(np.sqrt(2) * vectors[:, 3].reshape(2, 2))
    rng = np.random.default_rng(4)
    above = 0
    for _ in range(299):
        noise = rng.normal(0, sigma, (4, 4))
        noise[0, 0] = 0
        above += held_distance2(truth + noise) >= found["distanceSquared"]
    got = {"smallestEigenvalue": found["eigenvalues"][3], "roundingSigma": sigma}
    wrong = all_near(got, {name: expect[name] for name in got}, tolerance)
    if expect["consistentWithRounding"] != (above / 299 > 0.05):
        wrong += f" p = {above / 299}"
    return wrong


def held_distance2(mueller):
    """Squared distance to the nearest realizable matrix with the same M00."""
    values = np.linalg.eigvalsh(coherency(mueller))
    low, high = values.min() - 1, values.max()
    for _ in range(60):
        shift = (low + high) / 2
        low, high = (shift, high) if np.maximum(values - shift, 0).sum() > mueller[0, 0] else (low, shift)
    return 4 * np.sum((np.maximum(values - low, 0) - values) ** 2)


CHECKS = {
    "element-matrix": element_matrix, "stokes-through-train": stokes_through_train, "figures": figures,
    "figure-bounds": figure_bounds, "nested-indices": nested_indices, "eigenvalues": eigenvalues,
    "realizability": realizability, "nearest": nearest, "polar": polar, "polar-product": polar_product,
    "differential": differential, "spectral": spectral, "coherency-norm": coherency_norm, "passivity": passivity,
    "jones-to-mueller": jones_to_mueller, "state-in-convention": state_in_convention,
    "matrix-in-convention": matrix_in_convention, "eigenvalue-error": eigenvalue_error,
    "noise-on-pure": noise_on_pure, "rounding": rounding,
}
