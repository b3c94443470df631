"""The 200 input matrices: seeded, random and edge cases. `cases()` yields (label, 4x4, normalised)."""

import numpy as np

from elements import (
    circular_retarder, diagonal_depolarizer, elliptical_diattenuator, elliptical_retarder,
    isotropic_depolarizer, linear_diattenuator, linear_retarder, of_jones, rotator, turned,
)

SEED = 20240611


def cases():
    rng = np.random.default_rng(SEED)
    yield from retarders(rng)
    yield from diattenuators(rng)
    yield from random_pure(rng)
    yield from mixtures(rng)
    yield from depolarizers(rng)
    yield from degenerate(rng)
    yield from mirrors(rng)
    yield from noisy(rng)
    yield from singular()
    yield from extremes(rng)
    yield from printed()


def retarders(rng):
    yield "air", np.eye(4), True
    yield "grey filter", 0.5 * np.eye(4), False
    for retardance, axis in [(30, 10), (90, 0), (90, 45), (90, 33), (127, 71), (270, 20), (0.1, 64),
                             (179.9, 120), (180, 0), (180, 22.5), (180, 45), (180, 67), (180, 120)]:
        yield f"linear retarder {retardance} at {axis}", linear_retarder(retardance, axis), True
    for retardance in (20, 90, 180, 300):
        yield f"circular retarder {retardance}", circular_retarder(retardance), True
    for angle in (10, -40, 45, 90):
        yield f"rotator {angle}", rotator(angle), True
    for k in range(5):
        retarder = elliptical_retarder(rng.uniform(5, 175), rng.normal(size=3))
        yield f"random elliptical retarder {k}", retarder, True
    for axis in ([1, 2, 2], [-2, 1, 2], [0, 3, -4]):
        yield f"elliptical half-wave, axis {axis}", elliptical_retarder(180, axis), True


def diattenuators(rng):
    for t_max, t_min, axis in [(0.9, 0.3, 0), (0.8, 0.7, 25), (0.6, 0.1, 118), (1, 0.5, 90), (0.7, 0.69, 45)]:
        yield f"linear diattenuator {t_max} {t_min} at {axis}", linear_diattenuator(t_max, t_min, axis), False
    for axis in (0, 45, 90, 30, 107):
        yield f"ideal polarizer at {axis}", linear_diattenuator(1, 0, axis), False
    for t_min in (1e-2, 1e-3, 1e-4):
        yield f"real polarizer, least transmittance {t_min}", linear_diattenuator(0.85, t_min, 3), False
    for sign in (1, -1):
        yield f"circular polarizer, sign {sign}", elliptical_diattenuator(0.5, [0, 0, sign]), False
    yield "elliptical ideal polarizer", elliptical_diattenuator(1, np.array([2, -1, 2]) / 3), True
    for k in range(4):
        vector = rng.normal(size=3)
        vector *= rng.uniform(0.05, 0.98) / np.linalg.norm(vector)
        yield f"random elliptical diattenuator {k}", elliptical_diattenuator(rng.uniform(0.2, 0.6), vector), False


def jones(rng):
    return rng.normal(size=(2, 2)) + 1j * rng.normal(size=(2, 2))


def mean_transmittance(rng, mueller):
    return mueller * rng.uniform(0.1, 0.9) / mueller[0, 0]


def normalised(mueller):
    result = mueller / mueller[0, 0]
    result[0, 0] = 1.0
    return result


def random_pure(rng):
    for k in range(10):
        mueller = mean_transmittance(rng, of_jones(jones(rng)))
        yield f"random Jones {k}", normalised(mueller) if k % 2 else mueller, bool(k % 2)


def mixture(rng, count):
    weights = rng.dirichlet(np.ones(count))
    return sum(w * normalised(of_jones(jones(rng))) for w in weights)


def mixtures(rng):
    for count in (2, 3, 4):
        for k in range(6):
            mueller = mean_transmittance(rng, mixture(rng, count))
            yield f"mixture of {count} Jones {k}", normalised(mueller) if k % 2 else mueller, bool(k % 2)


def depolarizers(rng):
    for alpha in (0.3, 0.75, 1.0, 4 / 3):
        yield f"isotropic depolarizer {alpha:.3f}", isotropic_depolarizer(alpha), True
    for d in [(0.8, 0.7, 0.6), (0.6, 0.6, 0.9), (1, 0, 0), (0.5, 0.5, 0.5), (0.9, 0.2, 0.1), (0.25, -0.3, -0.4),
              (0.3, 0.2, 0)]:
        yield f"diagonal depolarizer {d}", diagonal_depolarizer(*d), True
    yield "diagonal depolarizer (0.8, 0.5, 0.4) turned by 27", turned(diagonal_depolarizer(0.8, 0.5, 0.4), 27), True
    for k in range(5):
        alpha = rng.uniform(0.05, 0.9)
        pure = mean_transmittance(rng, of_jones(jones(rng)))
        yield f"random Jones, then isotropic depolarizer {k}", isotropic_depolarizer(alpha) @ pure, False
        yield f"isotropic depolarizer, then random Jones {k}", pure @ isotropic_depolarizer(alpha), False
    for k in range(4):
        d = ordinary_depolarizer(rng)
        pure = normalised(of_jones(jones(rng)))
        yield f"random Jones, then diagonal depolarizer {k}", d @ pure, True
        other = ordinary_depolarizer(rng)
        # The first depolarizer changes M00 together with the polarizance, so divide again.
        yield f"random Jones between diagonal depolarizers {k}", normalised(other @ pure @ d), True
    for k in range(3):
        retarder = elliptical_retarder(rng.uniform(20, 160), rng.normal(size=3))
        yield f"diagonal depolarizer, then retarder {k}", retarder @ ordinary_depolarizer(rng), True


def ordinary_depolarizer(rng):
    """A realizable diagonal depolarizer with distinct positive values: a mixture of half-wave plates."""
    w = 0.6 * np.array([1, 0, 0, 0]) + 0.4 * rng.dirichlet(np.ones(4))
    return np.diag([1.0, w[0] + w[1] - w[2] - w[3], w[0] - w[1] + w[2] - w[3], w[0] - w[1] - w[2] + w[3]])


def degenerate(rng):
    """Equal singular values of the 3x3 block, in general position."""
    for d in [(0.7, 0.7, 0.4), (0.8, 0.4, 0.4), (0.6, 0.6, 0.6)]:
        left = elliptical_retarder(rng.uniform(20, 160), rng.normal(size=3))
        right = elliptical_retarder(rng.uniform(20, 160), rng.normal(size=3))
        yield f"retarder, depolarizer {d}, retarder", left @ diagonal_depolarizer(*d) @ right, True
    left = elliptical_retarder(70, [1, -2, 1])
    yield "mirrored, two smallest singular values equal", left @ diagonal_depolarizer(0.3, 0.2, -0.2), True
    yield "mirrored, two largest singular values equal", left @ diagonal_depolarizer(0.3, 0.3, -0.1), True
    yield "one singular value only", left @ diagonal_depolarizer(0.6, 0, 0), True
    yield "two singular values only", left @ diagonal_depolarizer(0.6, 0.3, 0), True


def mirrors(rng):
    """Negative determinant of the 3x3 block, realizable first, then with one side mirrored."""
    yield "diagonal, one sign negative", diagonal_depolarizer(0.3, 0.2, -0.1), True
    for k in range(4):
        # Beyond α = 1 the pure part is subtracted from the ideal depolarizer.
        alpha = rng.uniform(1.08, 1.25)
        pure = elliptical_diattenuator(1, rng.uniform(-0.25, 0.25, 3)) @ elliptical_retarder(
            rng.uniform(20, 160), rng.normal(size=3))
        ideal = np.diag([1.0, 0, 0, 0])
        yield f"isotropic depolarization beyond one {k}", (1 - alpha) * pure + alpha * ideal, True
    mirror = np.diag([1.0, 1, 1, -1])
    yield "mirrored air", mirror, True
    yield "mirrored retarder", mirror @ linear_retarder(70, 20), True
    for k in range(4):
        mueller = mean_transmittance(rng, of_jones(jones(rng)))
        mueller = mirror @ mueller if k % 2 else mueller @ mirror
        yield f"one side mirrored, random Jones {k}", mueller, False
    for k in range(3):
        mueller = normalised(isotropic_depolarizer(rng.uniform(0.05, 0.5)) @ of_jones(jones(rng)))
        yield f"one side mirrored, depolarizing {k}", mirror @ mueller, True


def noisy(rng):
    truths = [
        ("air", lambda: np.eye(4)),
        ("retarder", lambda: elliptical_retarder(rng.uniform(20, 160), rng.normal(size=3))),
        ("diattenuator", lambda: elliptical_diattenuator(1, rng.uniform(-0.4, 0.4, 3))),
        ("random Jones", lambda: normalised(of_jones(jones(rng)))),
        ("mixture of 2", lambda: normalised(mixture(rng, 2))),
        ("polarizer", lambda: elliptical_diattenuator(1, [0.6, 0.8, 0])),
    ]
    for name, truth in truths:
        for sigma in (0.002, 0.02, 0.1):
            mueller = truth() + rng.normal(0, sigma, (4, 4))
            yield f"{name} with noise {sigma}", 0.7 * mueller, False
            mueller = truth() + rng.normal(0, sigma, (4, 4))
            mueller[0, 0] = 1
            yield f"{name} with noise {sigma}, M00 exact", mueller, True


def singular():
    polarizer = linear_diattenuator(1, 0, 30)
    yield "polarizer, then ideal depolarizer", isotropic_depolarizer(1) @ linear_diattenuator(1, 0, 0), False
    yield "polarizer, then depolarizer", isotropic_depolarizer(0.4) @ polarizer, False
    yield "depolarizer, then polarizer", polarizer @ isotropic_depolarizer(0.4), False
    yield "polarizer, then quarter-wave", linear_retarder(90, 75) @ polarizer, False
    yield "two polarizers", linear_diattenuator(1, 0, 70) @ polarizer, False
    yield "zero matrix", np.zeros((4, 4)), False
    yield "zero M00", np.diag([0.0, 0.3, -0.2, 0.1]), False
    yield "negative air", -np.eye(4), False
    yield "negative diattenuator", -linear_diattenuator(0.9, 0.3, 12), False


def extremes(rng):
    for k in range(3):
        mueller = 24000 * normalised(mixture(rng, 3)) + rng.normal(0, 60, (4, 4))
        yield f"counts {k}", np.round(mueller), False
    yield "counts of air", np.round(61234 * np.eye(4) + rng.normal(0, 90, (4, 4))), False
    for scale in (1e-150, 1e150):
        yield f"retarder times {scale}", scale * linear_retarder(75, 15), False
        yield f"mixture times {scale}", scale * normalised(mixture(rng, 3)), False
        yield f"noisy times {scale}", scale * (linear_diattenuator(0.8, 0.5, 40) + rng.normal(0, 0.02, (4, 4))), False


def printed():
    for decimals in (4, 3, 2):
        yield (f"quarter-wave at 36 to {decimals} decimals", np.round(linear_retarder(90, 36), decimals) + 0.0, True)
        yield (f"retarder 70 at 25 to {decimals} decimals", np.round(linear_retarder(70, 25), decimals) + 0.0, True)
        yield (f"diattenuator at 20 to {decimals} decimals",
               np.round(linear_diattenuator(0.9, 0.3, 20), decimals) + 0.0, False)
        yield (f"polarizer at 30 to {decimals} decimals",
               np.round(linear_diattenuator(1, 0, 30), decimals) + 0.0, False)
