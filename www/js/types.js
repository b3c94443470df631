/**
 * The shapes that the page and the engine exchange, as JSDoc types.
 *
 * @typedef {"light" | "dark" | "print"} Theme
 *
 * @typedef {Required<import("../halfshade.js").Convention>} Convention
 * @typedef {import("../halfshade.js").Noise} Noise
 * @typedef {Required<import("../halfshade.js").ExamineRequest> & { mueller: number[], convention: Convention }} Request with repeats the matrix is their mean; the engine takes that itself
 * @typedef {import("../halfshade.js").Figure} Figure
 * @typedef {import("../halfshade.js").Realizability} Realizability
 * @typedef {import("../halfshade.js").Examination} Examination
 * @typedef {Examination["nearest"]} Nearest
 * @typedef {import("../halfshade.js").PolarDecomposition} Polar
 * @typedef {import("../halfshade.js").DifferentialDecomposition} Differential
 * @typedef {import("../halfshade.js").StateDescription} State
 * @typedef {import("../halfshade.js").MappedState} MappedState
 * @typedef {import("../halfshade.js").Diagnosis} Diagnosis
 * @typedef {import("../halfshade.js").Comparison} Comparison
 * @typedef {import("../halfshade.js").Reading} Reading
 * @typedef {import("../halfshade.js").MatricesRead} Parsed
 * @typedef {import("../halfshade.js").ReadOptions} ReadOptions
 *
 * @typedef {object} Place where something is wrong: a field, or a spot of a text
 * @property {number} [line]
 * @property {number} [character]
 * @property {number} [length]
 * @property {string} [field]
 *
 * @typedef {object} Example
 * @property {string} file
 * @property {string} title
 * @property {string} story
 * @property {string} text
 * @property {boolean} normalised
 * @property {boolean} absolute
 * @property {Noise} noise
 *
 * @typedef {object} NoiseChoice what the person chose; σ is kept as typed
 * @property {"none" | "rounding" | "uniform" | "relative" | "perElement" | "covariance" | "replicates" | "other"} kind
 * @property {string} sigma as typed: σ itself, σ in per cent, or the numbers of all elements
 * @property {object | null} given the statement that was read from that or from a link
 * @property {string} [problem] why the numbers could not be read
 * @property {string} [note] where σ came from, if not from the person
 *
 * @typedef {object} Measurement the measured matrix as the person gave it
 * @property {string[]} cells sixteen texts, laid out as `convention.order` says
 * @property {string} text the text that the cells were read from
 * @property {ReadOptions} options
 * @property {number} pick which matrix of the text
 * @property {number | null} decimals printed resolution
 * @property {boolean} normalised
 * @property {boolean} absolute
 * @property {NoiseChoice} noise
 * @property {import("./instrument.js").Stated} instrument
 * @property {Convention} convention
 * @property {boolean} example
 * @property {string} label
 * @property {string} story
 * @property {Many | null} many all matrices of what was read, where they are several
 *
 * @typedef {"ask" | "pick" | "series" | "repeats" | "pair"} Use what several matrices are
 *
 * @typedef {object} Many
 * @property {Use} use
 * @property {number[][]} matrices in the order of the text
 * @property {(string | null)[]} labels
 * @property {(number | null)[]} coordinates
 * @property {string} source name of the file; empty where they are in the text
 * @property {string} sha256 of the file; empty where they are in the text
 *
 * @typedef {object} Work everything that undo covers; never changed in place
 * @property {Measurement} measurement
 * @property {{ draws: number, seed: number }} examine
 * @property {{ [block: string]: unknown }} blocks the other blocks of the configuration: the states of the tasks, and
 *   what only another version knows
 *
 * @typedef {object} View what undo leaves alone
 * @property {string} task
 * @property {number} azimuthDeg
 * @property {number} elevationDeg
 * @property {0 | 1} firstIndex what the first row and column are called
 * @property {"deg" | "waves" | "nm"} retardanceUnit
 * @property {number} wavelengthNm
 * @property {Form} form what is copied and saved
 *
 * @typedef {"tsv" | "csv" | "csvEuropean" | "json" | "latex" | "python" | "matlab"} Form
 *
 * @typedef {object} Shown what the panels get to show
 * @property {Work} work
 * @property {View} view
 * @property {Examination | null} result
 * @property {Request | null} request the request that `result` answers
 * @property {boolean} pending whether the slow part is still to come
 * @property {string | null} stale why the result is not that of the present input
 * @property {string | null} waiting what is missing before there can be a result
 *
 * @typedef {string | { number: string } | { mute: string }} Part a piece of a sentence
 *
 * @typedef {{ text: string, plain: string }} Formatted
 * @typedef {(request: { value: number, se: number | null }) => Formatted} FormatValue
 */
export {};
