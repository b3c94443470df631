"""Mueller matrices of optical elements in doubles, as plain textbook formulas.

Convention: angles counter-clockwise from x for an observer facing the source, S3 > 0 turns
clockwise for that observer, time dependence exp(+iωt). Angles in degrees, 4x4 NumPy arrays.
"""

import math

import numpy as np

PAULI = np.array(
    [[[1, 0], [0, 1]], [[1, 0], [0, -1]], [[0, 1], [1, 0]], [[0, -1j], [1j, 0]]], dtype=complex
)
# S = STOKES_OF_FIELD (E ⊗ E*), with S3 = 2 Im(Ex* Ey).
STOKES_OF_FIELD = np.array([[1, 0, 0, 1], [1, 0, 0, -1], [0, 1, 1, 0], [0, 1j, -1j, 0]])


def cosine(degrees):
    """Exact at multiples of 90 degrees, so that a half-wave plate is one in every element."""
    quarter, rest = divmod(degrees, 90)
    if rest == 0:
        return [1.0, 0.0, -1.0, 0.0][int(quarter) % 4]
    return float(np.cos(np.radians(degrees)))


def sine(degrees):
    return cosine(degrees - 90)


def frame(angle):
    """Rotation of the frame by `angle`, often written R(θ)."""
    c, s = cosine(2 * angle), sine(2 * angle)
    return np.array([[1, 0, 0, 0], [0, c, s, 0], [0, -s, c, 0], [0, 0, 0, 1.0]])


def turned(mueller, angle):
    return frame(-angle) @ mueller @ frame(angle)


def linear_diattenuator(t_max, t_min, axis):
    a, b, g = (t_max + t_min) / 2, (t_max - t_min) / 2, np.sqrt(t_max * t_min)
    return turned(np.array([[a, b, 0, 0], [b, a, 0, 0], [0, 0, g, 0], [0, 0, 0, g]]), axis)


def linear_retarder(retardance, axis):
    c, s = cosine(retardance), sine(retardance)
    return turned(np.array([[1, 0, 0, 0], [0, 1.0, 0, 0], [0, 0, c, s], [0, 0, -s, c]]), axis)


def circular_retarder(retardance):
    c, s = cosine(retardance), sine(retardance)
    return np.array([[1, 0, 0, 0], [0, c, s, 0], [0, -s, c, 0], [0, 0, 0, 1.0]])


def elliptical_retarder(retardance, axis):
    """`axis`: the fast eigenstate on the Poincaré sphere, any length but zero."""
    axis = np.asarray(axis, float) / np.linalg.norm(axis)
    c, s = cosine(retardance), sine(retardance)
    cross = np.array([[0, axis[2], -axis[1]], [-axis[2], 0, axis[0]], [axis[1], -axis[0], 0]])
    mueller = np.eye(4)
    mueller[1:, 1:] = c * np.eye(3) + (1 - c) * np.outer(axis, axis) + s * cross
    return mueller


def elliptical_diattenuator(transmittance, vector):
    vector = np.asarray(vector, float)
    size2 = vector @ vector
    # The root of a last bit would be 1e-8, and processors differ in that bit.
    root = np.sqrt(1 - size2) if 1 - size2 > 1e-15 else 0.0
    mueller = np.eye(4)
    mueller[0, 1:] = mueller[1:, 0] = vector
    if size2 > 0:
        mueller[1:, 1:] = root * np.eye(3) + (1 - root) * np.outer(vector, vector) / size2
    return transmittance * mueller


def aligned_diattenuating_retarder(transmittance, diattenuation, retardance, axis):
    """As the Jones matrix of its two principal amplitudes, x advanced in phase."""
    high, low = np.sqrt(transmittance * np.array([1 + diattenuation, 1 - diattenuation]))
    return turned(of_jones(np.diag([high * np.exp(1j * np.radians(retardance)), low])), axis)


def isotropic_reflector(psi, delta, reflectance, plane):
    """As the Jones matrix diag(rp, rs) with rp/rs = tan Ψ exp(iΔ) and (|rp|² + |rs|²)/2 = R."""
    amplitudes = [sine(psi) * np.exp(1j * np.radians(delta)), cosine(psi)]
    return turned(of_jones(np.sqrt(2 * reflectance) * np.diag(amplitudes)), plane)


def refracted(before, behind, incidence):
    """n1 cosθi, n1 cosθt, n2 cosθi, n2 cosθt by Snell's law; behind = n - ik, fading away."""
    c = cosine(incidence)
    ct = np.sqrt(1 - (before * sine(incidence) / behind) ** 2 + 0j)
    if (behind * ct).imag > 0:
        ct = -ct
    return before * c, before * ct, behind * c, behind * ct


def fresnel_reflection(before, behind, incidence, plane):
    ic, it, bc, bt = refracted(before, behind, incidence)
    return turned(of_jones(np.diag([(bc - it) / (bc + it), (ic - bt) / (ic + bt)])), plane)


def fresnel_transmission(before, behind, incidence, plane):
    ic, it, bc, bt = refracted(before, behind, incidence)
    return turned(of_jones(np.diag([2 * ic / (bc + it), 2 * ic / (ic + bt)]) * np.sqrt(bt / ic)), plane)


def rotator(angle):
    return frame(-angle)


def isotropic_depolarizer(alpha):
    return np.diag([1, 1 - alpha, 1 - alpha, 1 - alpha])


def diagonal_depolarizer(d1, d2, d3):
    return np.diag([1.0, d1, d2, d3])


def of_jones(jones):
    """Mueller matrix of a Jones matrix, M_ij = ½ tr(σi J σj J†)."""
    jones = np.asarray(jones, dtype=complex)
    return 0.5 * np.einsum("iab,bc,jcd,ad->ij", PAULI, jones, PAULI, jones.conj()).real
