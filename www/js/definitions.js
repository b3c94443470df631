/** What each figure is: name, definition, formula, source. */

/**
 * @typedef {object} Definition
 * @property {string} title
 * @property {string} unit
 * @property {string} definition
 * @property {string} formula
 * @property {string} source
 */

const MEASURED = "Of the measured matrix, unclipped, so noise can carry it past its limit.";
const POLAR = "From the polar decomposition of the nearest realizable matrix, depolarizer after.";
const COMMON = "common practice, no single source";
const LU_CHIPMAN = "Lu & Chipman 1996";
const GIL_BERNABEU = "Gil & Bernabéu 1986";
const PURITY = "San José & Gil 2011";

/** @type {{ [name: string]: Definition }} */
export const DEFINITIONS = {
  retardanceDeg: {
    title: "Retardance",
    unit: "°",
    definition: `Phase between the two eigenstates of the retarder, linear and circular part together. ${POLAR}`,
    formula: "R = atan2(‖½ ε_ijk (m_R)_jk‖, ½ (tr m_R − 1)), 0 … 180°",
    source: LU_CHIPMAN,
  },
  linearRetardanceDeg: {
    title: "Linear retardance",
    unit: "°",
    definition: `The retarder taken as a linear retarder and a rotator in a row: the retardance of the linear one. ${POLAR}`,
    formula: "δ = acos(hypot(r00 + r11, r10 − r01) − 1), with r = m_R",
    source: COMMON,
  },
  rotationDeg: {
    title: "Rotation",
    unit: "°",
    definition: `The angle by which the rotator of that pair turns the azimuth. Not determined for a half-wave retarder. ${POLAR}`,
    formula: "ψ = ½ atan2(r10 − r01, r00 + r11)",
    source: COMMON,
  },
  fastAxisDeg: {
    title: "Fast axis of the linear part",
    unit: "°",
    definition: `Azimuth of the axis along which the linear retarder, which follows the rotator, advances the phase. ${POLAR}`,
    formula: "azimuth of the whole retarder + ψ/2, 0 … 180°",
    source: COMMON,
  },
  retarderAzimuthDeg: {
    title: "Azimuth of the fast eigenstate",
    unit: "°",
    definition: `Azimuth of the polarization that the whole, elliptical, retarder advances. ${POLAR}`,
    formula: "½ atan2(a1, a0), with the unit axis a_i = ε_ijk (m_R)_jk / (2 sin R)",
    source: LU_CHIPMAN,
  },
  retarderEllipticityDeg: {
    title: "Ellipticity of the fast eigenstate",
    unit: "°",
    definition: `Ellipticity angle of that polarization: 0 for a linear retarder, ±45° for a circular one. ${POLAR}`,
    formula: "½ asin a2",
    source: LU_CHIPMAN,
  },
  diattenuation: {
    title: "Diattenuation D",
    unit: "",
    definition: `How much the transmittance depends on the input polarization: 0 not at all, 1 for a polarizer. ${MEASURED}`,
    formula: "D = ‖(m01, m02, m03)‖ / m00 = (Tmax − Tmin)/(Tmax + Tmin)",
    source: LU_CHIPMAN,
  },
  linearDiattenuation: {
    title: "Linear diattenuation",
    unit: "",
    definition: `Its part between two linear polarizations. ${MEASURED}`,
    formula: "hypot(m01, m02) / m00",
    source: LU_CHIPMAN,
  },
  circularDiattenuation: {
    title: "Circular diattenuation",
    unit: "",
    definition: `Its part between the two circular polarizations; positive where S3 > 0 passes better. ${MEASURED}`,
    formula: "m03 / m00",
    source: LU_CHIPMAN,
  },
  diattenuationAzimuthDeg: {
    title: "Azimuth of diattenuation",
    unit: "°",
    definition: "Azimuth of the linear polarization that passes best.",
    formula: "½ atan2(m02, m01), 0 … 180°",
    source: COMMON,
  },
  polarizance: {
    title: "Polarizance P",
    unit: "",
    definition: `Degree of polarization that unpolarized light leaves with. ${MEASURED}`,
    formula: "P = ‖(m10, m20, m30)‖ / m00",
    source: LU_CHIPMAN,
  },
  linearPolarizance: {
    title: "Linear polarizance",
    unit: "",
    definition: `The linear part of that. ${MEASURED}`,
    formula: "hypot(m10, m20) / m00",
    source: LU_CHIPMAN,
  },
  circularPolarizance: {
    title: "Circular polarizance",
    unit: "",
    definition: `The circular part of that, with its sign. ${MEASURED}`,
    formula: "m30 / m00",
    source: LU_CHIPMAN,
  },
  polarizanceAzimuthDeg: {
    title: "Azimuth of polarizance",
    unit: "°",
    definition: "Azimuth of what unpolarized light becomes.",
    formula: "½ atan2(m20, m10), 0 … 180°",
    source: COMMON,
  },
  isotropicAlpha: {
    title: "Isotropic depolarization α",
    unit: "",
    definition:
      "Share of an ideal depolarizer mixed in parallel with one pure element, best fit with equal errors. Constant stray light looks exactly the same: light c beside m00 gives α = c/(m00 + c). Reported as it comes out, also below zero.",
    formula: "M = (1 − α) M_J + α (M_J)00 diag(1, 0, 0, 0);  α = (4/3)(1 − λ1/m00)",
    source: "closed form derived from the eigenvalues of H; the coherency matrix: Cloude 1986",
  },
  depolarizationIndex: {
    title: "Depolarization index PΔ",
    unit: "",
    definition: `1 for an element that does not depolarize, 0 for one that depolarizes everything. ${MEASURED}`,
    formula: "PΔ = sqrt((Σ m_ij² / m00² − 1) / 3)",
    source: GIL_BERNABEU,
  },
  sphericalPurity: {
    title: "Degree of spherical purity",
    unit: "",
    definition: `The part of the depolarization index that comes from neither diattenuation nor polarizance. ${MEASURED}`,
    formula: "PS = ‖m_3×3‖ / (m00 √3);  PΔ² = (D² + P²)/3 + PS²",
    source: COMMON,
  },
  purityIndex1: {
    title: "Index of polarimetric purity P1",
    unit: "",
    definition: "How far the first pure part outweighs the second.",
    formula: "P1 = (λ1 − λ2) / m00",
    source: PURITY,
  },
  purityIndex2: {
    title: "Index of polarimetric purity P2",
    unit: "",
    definition: "How far the first two outweigh the third.",
    formula: "P2 = (λ1 + λ2 − 2 λ3) / m00",
    source: PURITY,
  },
  purityIndex3: {
    title: "Index of polarimetric purity P3",
    unit: "",
    definition: "How far the first three outweigh the fourth; 1 − P3 is the share of ideal depolarizer.",
    formula: "P3 = (λ1 + λ2 + λ3 − 3 λ4) / m00;  3 PΔ² = 2 P1² + ⅔ P2² + ⅓ P3²",
    source: PURITY,
  },
  entropy: {
    title: "Polarimetric entropy",
    unit: "",
    definition: "0 for a pure element, 1 for the ideal depolarizer. Of the nearest realizable matrix.",
    formula: "−Σ (λi/m00) log4 (λi/m00)",
    source: "Cloude 1986",
  },
  depolarizationPower: {
    title: "Depolarization power",
    unit: "",
    definition: `Mean loss of degree of polarization in the depolarizer of the decomposition. ${POLAR}`,
    formula: "1 − |tr m_Δ| / 3, m_Δ the lower right 3 × 3 block",
    source: LU_CHIPMAN,
  },
  transmittanceMax: {
    title: "Largest transmittance",
    unit: "",
    definition: "For the input polarization that passes best, in the unit of the matrix as given.",
    formula: "Tmax = m00 (1 + D)",
    source: LU_CHIPMAN,
  },
  transmittanceMin: {
    title: "Smallest transmittance",
    unit: "",
    definition: "For the input polarization that passes least, in the unit of the matrix as given.",
    formula: "Tmin = m00 (1 − D)",
    source: LU_CHIPMAN,
  },
};

/** The figures in the order of the table, under their headings. */
export const GROUPS = [
  { title: "Retardance", names: ["retardanceDeg", "linearRetardanceDeg", "fastAxisDeg", "rotationDeg", "retarderAzimuthDeg", "retarderEllipticityDeg"] },
  {
    title: "Diattenuation and polarizance",
    names: [
      "diattenuation",
      "linearDiattenuation",
      "circularDiattenuation",
      "diattenuationAzimuthDeg",
      "polarizance",
      "linearPolarizance",
      "circularPolarizance",
      "polarizanceAzimuthDeg",
      "transmittanceMax",
      "transmittanceMin",
    ],
  },
  {
    title: "Depolarization",
    names: ["isotropicAlpha", "depolarizationIndex", "depolarizationPower", "sphericalPurity", "purityIndex1", "purityIndex2", "purityIndex3", "entropy"],
  },
];

/** @type {{ [name: string]: Definition }} */
export const METHODS = {
  coherency: {
    title: "Coherency eigenvalues",
    unit: "",
    definition: "A Mueller matrix can be physical exactly when its coherency matrix H has no negative eigenvalue. Each positive one is the weight of a pure element in the mixture.",
    formula: "H = ¼ Σ M_ij σi ⊗ σj*;  tr H = m00",
    source: "Cloude 1986",
  },
  significance: {
    title: "How it is tested against the noise",
    unit: "",
    definition:
      "The distance to the nearest realizable matrix, in units of the noise, is compared with what the same noise does to a realizable sample: that matrix, with every eigenvalue below three of its standard errors set to zero. The draws are seeded, so the same input gives the same p. Below p = 0.05 the violation counts as beyond noise.",
    formula: "T = min (m̂ − m)ᵀ Σ⁻¹ (m̂ − m) over realizable m;  p = (1 + #{T* ≥ T}) / (1 + B)",
    source: "moment selection: Andrews & Soares 2010",
  },
  nearest: {
    title: "The nearest realizable matrix",
    unit: "",
    definition: "The realizable matrix that explains the measured elements best. With equal errors it comes from the spectrum of H: negative eigenvalues become zero. Where m00 is exact it is held.",
    formula: "min (m̂ − m)ᵀ Σ⁻¹ (m̂ − m), H(m) ⪰ 0",
    source: "projection on the positive semidefinite matrices; the condition: Cloude 1986",
  },
  stokes: {
    title: "The Stokes condition",
    unit: "",
    definition: "Every physical Stokes vector must come out as one. Weaker than realizability: a matrix can pass it and still not be physical.",
    formula: "m00 ≥ ‖(m01, m02, m03)‖ and max over μ ≥ 0 of λmin(Mᵀ G M − μ G) ≥ 0, G = diag(1, −1, −1, −1)",
    source: "Givens & Kostinski 1993",
  },
  polar: {
    title: "Polar decompositions",
    unit: "",
    definition:
      "The nearest realizable matrix, normalised, as a product of a depolarizer, a retarder and a diattenuator. The order is a choice, not a finding: both are shown. The sign of a negative determinant goes to the smallest axis of the depolarizer, so that the parts change smoothly.",
    formula: "depolarizer after: m = m_Δ m_R m_D;  depolarizer before: m = m_D m_R m_Δ",
    source: LU_CHIPMAN,
  },
  spectral: {
    title: "Spectral decomposition",
    unit: "",
    definition: "The matrix as a sum of at most four pure ones, each from one eigenvector of H. Weights are eigenvalues over m00; each Jones matrix is scaled to m00 = 1, with its largest entry real.",
    formula: "H = Σ λi hi hi†",
    source: "Cloude 1986",
  },
  characteristic: {
    title: "Characteristic decomposition",
    unit: "",
    definition: "Of the nearest realizable matrix: its leading pure element, the equal mixtures of its first two and first three elements, and an ideal depolarizer. The weights are differences of the indices of polarimetric purity. A part of weight zero is not unique.",
    formula: "m = P1 m1 + (P2 − P1) m2 + (P3 − P2) m3 + (1 − P3) diag(1, 0, 0, 0)",
    source: "Gil 2007",
  },
  differential: {
    title: "Differential decomposition",
    unit: "",
    definition:
      "Of the measured matrix, normalised: its logarithm, as if all properties acted at once along the path. The mean part holds birefringence and dichroism, the other part depolarization; for a pure element that is zero. A matrix with a real eigenvalue at or below zero, as of a polarizer or a half-wave retarder, has no such logarithm. Retardances above half a wave come back folded.",
    formula: "L = ln m;  mean part ½(L − G Lᵀ G);  the other ½(L + G Lᵀ G), less its element 00 times I;  G = diag(1, −1, −1, −1)",
    source: "Ossikovski 2011",
  },
};
