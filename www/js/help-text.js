/** What the help says, as sections of plain pieces. */
import { DEPENDENCES, INDEPENDENT, TELLING } from "./convention.js";
import { CAUTION } from "./provenance.js";
import { BLIND, GLOSS } from "./words.js";

/**
 * A paragraph; a list; a formula; lines of a program; rows with a name each.
 * @typedef {string | string[] | { formula: string } | { program: string } | { rows: [string, string][] }} Piece
 * @typedef {{ id: string, title: string, pieces: Piece[] }} Section
 */

/** H from M and its eigenvalues, from the definitions. */
export const EIGENVALUES_PROGRAM = `import numpy as np
M = np.array([[1, 0, 0, 0], [0, 0.8, 0, 0], [0, 0, 0.7, 0], [0, 0, 0, 0.6]])
s = [np.eye(2), np.diag([1, -1]), np.array([[0, 1], [1, 0]]), np.array([[0, -1j], [1j, 0]])]
H = sum(M[i, j] * np.kron(s[i], s[j].conj()) for i in range(4) for j in range(4)) / 4
print(np.linalg.eigvalsh(H)[::-1] / M[0, 0])  # 0.775 0.125 0.075 0.025`;

/** The hash of the report block. */
export const HASH_PROGRAM = `import hashlib, numpy as np
print(hashlib.sha256(b"v1;4,4;C;<f8;" + (np.asarray(M, "<f8") + 0.0).tobytes("C")).hexdigest())`;

/** @type {Section[]} */
export const SECTIONS = [
  {
    id: "input",
    title: "What can be pasted or opened",
    pieces: [
      "Paste anywhere on the page, type into the cells, edit the text (“As text”), open a file, or drop one. The line below the grid says how the text was understood; each guess can be changed there.",
      {
        rows: [
          ["Tables", "four rows of four, sixteen numbers in a line or a column, one matrix a line (n × 16, or n × 17 with a coordinate first), between tabs, spaces, commas or semicolons. Comments, headers and titles such as “450 nm” become labels and coordinates."],
          ["Programs", "lists and prints of Python and NumPy, bracketed rows with semicolons (MATLAB), JSON, TeX matrices, prints in blocks of columns or with a common factor."],
          ["Numbers", "0.5, .5, 1.2e-3, 1.2d-3, 1.2 × 10⁻³; decimal point or comma, the same in the whole text; the true minus sign too."],
          ["Uncertainties", "0.123(4), 0.123 ± 0.004, 0.123 +/- 0.004, or a second array behind the first: one standard deviation each. They become the noise statement."],
          ["Files", "text in UTF-8, UTF-16 or Windows-1252, up to 16 MiB; NumPy arrays (.npy) of shape (4, 4), (16,), (N, 4, 4), (N, 16), (4, 4, N) or (16, N), up to two million real numbers; configurations saved here."],
          ["Links", "a link to this page, pasted, opens what it holds."],
        ],
      },
      "Asked: what several matrices are to each other, and which reading is right where a text has two. Chosen by you, because no text says it: row by row or column by column, normalised or not (assumed where m00 is exactly 1), relative or absolute, the noise, the convention.",
      "Refused, with the place marked and the text kept: too few or too many numbers, words among them, two decimal marks in one number, NaN and infinity, complex numbers, shortened prints (…), expressions that still have to be calculated. An empty cell is never taken as zero.",
    ],
  },
  {
    id: "convention",
    title: "Conventions",
    pieces: [
      "Four physical facts fix a convention; the panel asks for each. The numbers that you read are always in yours. As it comes: the observer faces the source, x, y and the direction of propagation are right-handed, angles count counter-clockwise from x, S3 > 0 turns clockwise, waves are exp(+iωt).",
      "The other answer about:",
      { rows: DEPENDENCES.map(({ fact, depends }) => /** @type {[string, string]} */ ([fact, `${depends}.`])) },
      `Under every answer stay the same: ${INDEPENDENT}. (p and the ends of simulated intervals may move by the scatter of the simulation.) So “I don’t know” costs nothing of these: leave the panel as it is. ${TELLING}`,
      { formula: "M → K M K, with K = diag(1, 1, −1, 1) for the sense of angles, diag(1, 1, 1, −1) for the sign of S3, diag(1, −1, −1, 1) for the zero at y" },
      "The order, row by row or column by column, is no convention of physics: it transposes the matrix, which exchanges diattenuation and polarizance. No check sees it.",
    ],
  },
  {
    id: "verdict",
    title: "What the verdict means",
    pieces: [
      `${GLOSS} The necessary and sufficient condition (Cloude 1986): no eigenvalue of the coherency matrix H is negative.`,
      { formula: "H = ¼ Σ m_ij σi ⊗ σj*,  tr H = m00" },
      {
        rows: [
          ["Realizable", "all four eigenvalues are at or above zero, to 10⁻¹² of m00, the accuracy of the arithmetic."],
          ["Not realizable, but within noise", "p is 0.05 or more: the stated noise is enough of an explanation. Where the noise is that of rounding, it says “consistent with rounding”."],
          ["Not realizable, beyond noise", "p is below 0.05: something else than the stated noise is wrong, or the noise is larger."],
          ["Not realizable as it stands", "no noise is stated, so nothing is tested. The smallest σ that would explain it is given."],
        ],
      },
      "p is the share of simulated measurements of a realizable sample, with the stated noise, that come out at least as far from realizable as yours. T is the distance to the nearest realizable matrix in units of the noise; T* are the simulated ones.",
      { formula: "T = min (m̂ − m)ᵀ Σ⁻¹ (m̂ − m) over realizable m;  p = (1 + #{T* ≥ T}) / (1 + B),  B = 999" },
      "The sample that is simulated is the nearest realizable matrix with every eigenvalue below three of its standard errors set to zero, never the largest (moment selection: Andrews & Soares 2010); without that step good mixtures would be condemned too often.",
      "A pure sample (a polarizer, a retarder, a mirror) nearly always looks not realizable: three of its eigenvalues should be zero, noise moves them apart, and the smallest lands near −0.96 σ. About 99 of 100 good measurements of one do. That is no fault.",
      "Rounding does the same: d printed decimals are a σ of 10⁻ᵈ/√12 an element. A textbook retarder printed to 4, 3 or 2 decimals has its smallest eigenvalue near −3·10⁻⁵, −2.5·10⁻⁴, −2.5·10⁻³.",
      "No such check can see:",
      BLIND,
      "A realizable matrix stays realizable under each of these. Measure air, and then a sample that you know.",
      "The Stokes condition, every Stokes vector comes out as one, is older and weaker (Givens & Kostinski 1993): diag(1, 1, 1, −1) passes it and is not realizable.",
      "Passivity, no more light comes out than goes in, is tested for absolute matrices only; constant stray light, a gain or a lamp that drifted can break it.",
      { formula: "m00 (1 + max(D, P)) ≤ 1" },
    ],
  },
  {
    id: "figures",
    title: "Figures and their uncertainty",
    pieces: [
      "Each figure opens with its definition, formula and source. Diattenuation, polarizance, depolarization index and the purities are of the measured matrix, unclipped, so noise can carry them past their limits. Retardance, axes, depolarization power and entropy come from the nearest realizable matrix, because they need one.",
      "The noise is stated in one of five ways: by the printed digits, by one σ for all elements, by a σ in per cent of m00, by a σ for each element, or by the 16 × 16 covariance of the elements. It refers to the matrix as given. Repeats give a σ by their scatter, pooled over the elements, or, where they are more than 40, their whole covariance. A normalised m00 has no error.",
      "Beside it may stand the uncertainty of the instrument: of the retardance, azimuth and contrast of each side, and of constant light. These are the same in every repeat, so that they are added after the averaging, as u² (∂M/∂q)(∂M/∂q)ᵀ for each quantity q, for sides made of a polarizer at rest and a retarder that turns. Two measurements of a pair by the same instrument share them.",
      "0.1230(41) is 0.1230 with a standard uncertainty of 0.0041 (k = 1), two digits of it (Guide to the Expression of Uncertainty in Measurement, 2008). Intervals are for 95 %. Without a noise statement there is neither.",
      "Standard errors are of first order; they hold while σ is small beside the figure’s own scale. Intervals come from seeded simulated measurements around yours (the central 95 % of them). A length near zero (D, P, retardance) gets its interval from the noncentral χ² distribution of its square, or, where it may be zero, the upper end of that interval alone; a retardance near half a wave a lower limit. Where two eigenvalues lie within three standard errors of each other, the purity indices and the entropy have no interval. The page says so beside the figure.",
      "“Not determined” is an answer: the azimuth of a diattenuation that is zero, the axis of a retarder without retardance, the rotation beside a half-wave retarder. The reason stands beside it. A zero would be wrong there.",
      "Both orders of the polar decomposition (Lu & Chipman 1996) are shown, named by where the depolarizer stands: the order is a choice, not a finding. Beside the isotropic depolarization α: constant stray light looks the same.",
    ],
  },
  {
    id: "models",
    title: "Which model explains a matrix",
    pieces: [
      "A measured matrix has sixteen numbers; a sample usually has four to eight. Model selection fits twelve models and recommends the one with the fewest parameters that the noise allows (p of 0.05 or more); without a noise statement, or where none passes, the one with the lowest Akaike criterion. Any other can be chosen by hand, and its numbers come with intervals too.",
      "A retarder or diattenuator has few parameters; a pure element is any Jones matrix (seven numbers, its phase means nothing). α is what is lost of the polarization:",
      { formula: "M = (1 − α) M_J + α M_J00 diag(1, 0, 0, 0)" },
      "for light that passes beside the element, or diag(1, 1 − α, 1 − α, 1 − α) in series behind it or in front of it. All three are the same where nothing is diattenuating. α is not kept between 0 and 1: below 0 by more than its error, a gain or a background is wrong; beyond 4/3, what is left of the polarization is turned over, so one side is counted the other way round. Constant stray light looks the same as α.",
      "The residuals show where a model fails, in standard errors. A mixture of two or three pure elements has a simulated p, because χ² would reject it too often. What nothing determines is said, as are other numbers for the same element: a retardance of 300° with its axis turned by 90° is one of 60°.",
      "The profile of χ² over a parameter fits all others again at each of its values; its interval is to be preferred where the curve is no parabola. Simulated measurements of the fit (parametric bootstrap) show the scatter of every parameter.",
    ],
  },
  {
    id: "train",
    title: "Optical train",
    pieces: [
      "A train is a list of elements in the order in which light meets them. Each parameter is fixed, free (with bounds, if you like) or tied to another one as factor × that + offset. Its value is also where the search of a fit starts. Angles are in degrees and, like Stokes numbers and phases, in the convention chosen beside the measured matrix. A measured element has sixteen numbers, its σ and a convention of its own.",
      {
        rows: [
          ["Follow the light", "the state after every element, for a source that may be partly polarized; where light is lost, where it depolarizes, where the order of neighbours matters. An element out of the beam leaves the light as it is."],
          ["Fit", "the free parameters, so that the whole train gives the measured matrix. Several starts are searched, always the same ones. χ² and p say whether the train is enough of an explanation; combinations of parameters that no such matrix can tell apart are named, and so are other solutions that are as good."],
          ["Take optics away", "the sample alone, from what is known of the elements before and behind it, with the noise of all of them. The condition number says how much errors can grow. “Use as the measured matrix” takes it over with its covariance, for every other task; one undo brings everything back."],
        ],
      },
      { formula: "M = M_n … M_2 M_1;  sample = M_behind⁻¹ M M_before⁻¹" },
      "A polarizer blocks a state for good: it can stand in a train, but it cannot be taken away. What differs between two places in the beam, or changes while it is measured, is in no train.",
      "The button beside “The train as JSON” copies list, source and choices; such a text, or a bare list of elements, pasted while this task is shown replaces the train.",
    ],
  },
  {
    id: "links",
    title: "Links, files and paper",
    pieces: [
      "Copy link makes a link that holds the measured numbers with their text, noise, convention, seed, and the view: whoever has it has your numbers. They stand behind the #, which browsers do not send to a server. It opens on every copy of the page, now and in later versions.",
      "From the single file, halfshade.html, the copied text is that part alone. A colleague opens their own copy and pastes it, or puts it behind the page’s address. If your lab has the page at a public address, set it under “Display and copies”.",
      "Some mail and chat programs cut links beyond 2000 characters. Beyond 8000 the link holds the shown matrix alone, and the page says so; Save makes a file with all of it. Drop that file on the page to go on.",
      "Printing gives the task in view, with every fold opened, and ends with the report block: program, time, convention, noise, seed, the sixteen numbers and their SHA-256.",
    ],
  },
  {
    id: "keyboard",
    title: "Keyboard",
    pieces: [
      {
        rows: [
          ["Ctrl+V, Ctrl+C, Ctrl+X", "anywhere: paste a matrix; in the grid: paste, copy, cut the selected cells"],
          ["arrow keys, Home, End", "walk in the grid; with Shift they select; Ctrl+Home and Ctrl+End go to its corners, Ctrl+A selects all"],
          ["a digit or sign", "begins a new number in the cell"],
          ["Enter, F2", "edit the cell; Enter takes the number and goes down, Tab takes it and goes on, Escape gives the old one back"],
          ["Delete", "empties the selected cells"],
          ["Ctrl+Z, Ctrl+Y", "undo and redo, every edit, paste, choice and opened link (also Ctrl+Shift+Z)"],
          ["arrow keys on the sphere", "turn it; the sliders below do the same"],
          ["Escape", "closes this help"],
        ],
      },
      "On a Mac, ⌘ stands for Ctrl. A reload brings the work of this tab back.",
    ],
  },
  {
    id: "recompute",
    title: "Recompute it yourself",
    pieces: [
      "The eigenvalues in NumPy, from the definition; they are the same in every convention:",
      { program: EIGENVALUES_PROGRAM },
      "The SHA-256 of the report block. M holds the sixteen numbers in the order of the input:",
      { program: HASH_PROGRAM },
    ],
  },
  {
    id: "sources",
    title: "Sources",
    pieces: [
      [
        "D. W. K. Andrews and G. Soares, Econometrica 78, 119 (2010): moment selection",
        "S. R. Cloude, Optik 75, 26 (1986): the coherency matrix and realizability",
        "J. J. Gil and E. Bernabéu, Optica Acta 33, 185 (1986): depolarization index",
        "C. R. Givens and A. B. Kostinski, J. Mod. Opt. 40, 471 (1993): the Stokes condition",
        "S.-Y. Lu and R. A. Chipman, J. Opt. Soc. Am. A 13, 1106 (1996): polar decomposition",
        "I. San José and J. J. Gil, Opt. Commun. 284, 38 (2011): indices of polarimetric purity",
      ],
    ],
  },
  { id: "caution", title: "Caution", pieces: [CAUTION, "Everything is computed in this page. After it has loaded it makes no request; its content-security policy forbids any to another place."] },
];
