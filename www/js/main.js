/** Wiring: the one state object, what is computed from it, and the one place for errors. */
import { ConventionPanel, conventionInWords } from "./convention.js";
import { byId, isTextField, make, repaint } from "./dom.js";
import { DisplayPanel } from "./display.js";
import { ENDINGS, exported, resultsOf } from "./exports.js";
import { ask, cancel, isDropped, quick, startEngine } from "./engine.js";
import { fileStem, isConfiguration, listenForFiles, saveFile, textIn } from "./files.js";
import { countFrom, fullText, place, readNumber } from "./format.js";
import { Grid } from "./grid.js";
import { listenForHelp } from "./help.js";
import { InstrumentPanel, systematicOf } from "./instrument.js";
import { configurationOf, fromConfiguration, noiseChoice, textOf, withoutSeries } from "./link.js";
import { ManyPanel, manyOf } from "./many.js";
import { tinyMatrix } from "./matrix-view.js";
import { meanOf } from "./mean.js";
import { NoisePanel, forEngine, noiseOf, printedNoise, repeatsNoise } from "./noise.js";
import { linkIn, listen, writeClipboard } from "./paste.js";
import { followTheme } from "./plots.js";
import { ProvenancePanel } from "./provenance.js";
import { ReadingPanel } from "./reading.js";
import { Store, noMeasurement } from "./state.js";
import { TASKS, TASK_BLOCKS, taskNamed } from "./tasks.js";
import { isSingleFile, loadExamples, loadTrainExample, publicAddress } from "./where.js";
import { detectionText, verdictOf } from "./words.js";

/**
 * @typedef {import("./types.js").Measurement} Measurement
 * @typedef {import("./types.js").Request} Request
 * @typedef {import("./types.js").Examination} Examination
 * @typedef {import("./types.js").Example} Example
 * @typedef {import("./reading.js").ReadOutcome} ReadOutcome
 */

/** A fragment beyond this length is cut by some mail and chat programs. */
const LONG_LINK = 2000;
/** A fragment beyond this length is not made: a file serves better. */
const LONGEST_LINK = 8000;
/** A longer text is read in the worker, and not kept as a text. */
const LONG_TEXT = 200_000;
/** Time to read a message. */
const MESSAGE_MS = 4000;

const store = new Store(render);
/** The last examination and what it answers. @type {{ key: string, request: Request, result: Examination, pending: boolean } | null} */
let answer = null;
/** @type {{ text: string, options: string, outcome: ReadOutcome }} */
let lastReading = { text: "", options: "", outcome: { parsed: null, error: null } };
/** @type {Example[]} */
let examples = [];
/** A train with its measured matrix. @type {import("./link.js").Configuration | null} */
let trainExample = null;
let said = "";
/** The last words that were no verdict. */
let message = { text: "", at: -Infinity };
let saidVerdict = "";
let isReady = false;

/** @type {import("./types.js").FormatValue} */
const format = (request) => quick.formatValue(request);

const grid = new Grid(byId("grid"), "measured-heading", {
  edit: (changes, name) => editCells(changes, name),
  editing: () => store.endMerge(),
  tell: (message) => tell(message),
});
const reading = new ReadingPanel(byId("reading"), {
  type: (text) => take(text, "the edit of the text", { merge: "text", options: store.work.measurement.options }),
  typed: () => store.endMerge(),
  reread: (options) => take(store.work.measurement.text, "the other reading", { options }),
  order: (order) => change("the change of order", { convention: { ...store.work.measurement.convention, order } }),
  normalised: (normalised) => change("the change of normalisation", { normalised }),
  absolute: (absolute) => change("the change of unit", { absolute }),
  divide: (by) => divide(by),
  clear: () => store.commit("clearing", { ...store.work, measurement: noMeasurement() }),
});
const many = new ManyPanel(byId("many"), { use: useMany, pick: pickOne, format });
const display = new DisplayPanel(byId("display"), { view: (view) => store.setView(view), save: saveResults });
const noise = new NoisePanel(byId("noise"), {
  change: (choice, name, merge) => change(name, { noise: choice }, merge ? { merge } : {}),
  numbers: (text) => quick.parseMatrices(text, undefined).matrices.flatMap((matrix) => matrix.mueller),
  numbersOfFile: async (file) => quick.parseFile(new Uint8Array(await file.arrayBuffer()), undefined).matrices.flatMap((matrix) => matrix.mueller),
});
const instrument = new InstrumentPanel(byId("instrument-panel"), (stated, merge) => change("the change of the instrument’s uncertainty", { instrument: stated }, { merge }));
/** Why the engine does not take a part of the noise statement. @type {{ noise: string | null, instrument: string | null }} */
let refused = { noise: null, instrument: null };
const convention = new ConventionPanel(byId("convention"), (chosen) => change("the change of convention", { convention: chosen }));
const tasks = TASKS.map((entry) => {
  const link = make("a", { href: `#${entry.name}`, "data-task": entry.name }, entry.label);
  link.addEventListener("click", (event) => {
    // The fragment of the address belongs to links.
    event.preventDefault();
    store.setView({ task: entry.name });
  });
  byId("tasks").append(link);
  const root = make("div", { id: `${entry.name}-panel` });
  byId("panels").append(root);
  const panel = entry.panel(root, {
    useNearest,
    use: useMatrix,
    change: changeBlocks,
    loadTrainExample: takeTrainExample,
    view: (view) => store.setView(view),
    tell: (message) => tell(message),
    failed: fail,
    format,
  });
  return { ...entry, link, root, panel };
});

const provenance = new ProvenancePanel(byId("provenance"), { info: () => quick.engineInfo(), link: linkNow, tell: (message) => tell(message) });

listen({
  matrix: (text) => takeText(text, "the paste"),
  link: (fragment) => openLink(fragment),
  block: (block) => grid.fill(block),
  copySelected: () => (grid.walking ? grid.selectedText : null),
  cutSelected: () => grid.clearSelected("the cutting of"),
  leaveEditor: () => grid.cancel(),
});
listenForFiles(byId("open-file"), { open: (file) => void takeFile(file), text: (text) => takeText(text, "the drop of a text"), failed: fail });
byId("save-file").addEventListener("click", saveConfiguration);

byId("undo").addEventListener("click", undo);
byId("redo").addEventListener("click", redo);
byId("copy-link").addEventListener("click", copyLink);
listenForHelp(byId("help-button"));
byId("skip").addEventListener("click", (event) => {
  event.preventDefault();
  byId("task").focus();
});
document.addEventListener("keydown", (event) => {
  if (!(event.ctrlKey || event.metaKey) || event.altKey || isTextField(document.activeElement)) return;
  const key = event.key.toLowerCase();
  if (key === "z" && !event.shiftKey) undo();
  else if (key === "y" || (key === "z" && event.shiftKey)) redo();
  else return;
  event.preventDefault();
});
addEventListener("hashchange", () => {
  const fragment = linkIn(location.hash);
  if (fragment && fragment !== store.fragment) openLink(fragment);
});
addEventListener("beforeunload", (event) => {
  store.keep();
  if (store.unsaved) event.preventDefault();
});

followTheme();
start().catch(fail);

async function start() {
  const restored = store.restore(linkIn(location.hash) ?? "");
  render();
  const slow = setTimeout(() => tell("Loading the engine…"), 300);
  try {
    const [, loaded, train] = await Promise.all([startEngine(), loadExamples(), loadTrainExample()]);
    examples = loaded;
    trainExample = train;
  } finally {
    clearTimeout(slow);
  }
  isReady = true;
  byId("version").textContent = `Halfshade ${quick.engineInfo().version}`;
  const fragment = linkIn(location.hash);
  if (fragment && !restored) openLink(fragment);
  else render();
  document.documentElement.dataset["ready"] = "true";
}

/**
 * Take over a text as the measured matrix.
 * @param {string} text
 * @param {string} name what it is called after "Undo"
 * @param {{ fresh?: boolean, merge?: string, options?: import("./types.js").ReadOptions, pick?: number, example?: Example }} how
 *   `fresh`: another measurement than before
 */
function take(text, name, { fresh = false, merge, options = {}, pick = 0, example } = {}) {
  const before = store.work.measurement;
  // What an example states does not hold for the person's own matrix.
  const base = fresh && before.example ? noMeasurement() : before;
  const { parsed } = read(text, options);
  const matrix = parsed?.matrices[pick] ?? parsed?.matrices[0];
  const use = fresh ? "ask" : (before.many?.use ?? "ask");
  /** @type {Measurement} */
  const measurement = {
    ...base,
    ...(fresh ? { label: "", story: "" } : {}),
    ...(example ? { convention: noMeasurement().convention } : {}),
    text,
    options,
    pick: matrix ? (parsed?.matrices.indexOf(matrix) ?? 0) : 0,
    example: false,
  };
  if (matrix) {
    measurement.cells = matrix.mueller.map((value) => fullText(value, matrix.decimals));
    measurement.decimals = matrix.decimals;
    if (fresh) measurement.normalised = matrix.mueller[0] === 1;
    if (fresh && matrix.label) measurement.label = matrix.label.slice(0, 80);
    if (measurement.noise.kind === "rounding" && matrix.decimals === null) measurement.noise = noMeasurement().noise;
    if (matrix.sigma) measurement.noise = printedNoise(matrix.sigma);
    measurement.many = manyOf(parsed, use === "repeats" ? "ask" : use);
  } else {
    // The old matrix stays in the grid until the text can be read.
    Object.assign(measurement, { ...before, text, options });
  }
  if (example) {
    measurement.example = true;
    measurement.label = example.title;
    measurement.story = example.story;
    measurement.normalised = example.normalised;
    measurement.absolute = example.absolute;
    measurement.noise = { kind: example.noise.kind, sigma: example.noise.kind === "uniform" ? String(example.noise.sigma) : "", given: null };
  }
  hideProblem();
  store.commit(name, { ...store.work, measurement }, { ...(merge ? { merge } : {}), safe: example !== undefined });
}

/**
 * A pasted or dropped text, whatever is in it and however long it is.
 * @param {string} text
 * @param {string} name
 */
function takeText(text, name) {
  if (isConfiguration(text)) openConfiguration(() => quick.decodeFile(text), "file");
  else if (shownTask().panel.paste?.(text)) return;
  else if (text.length > LONG_TEXT) void takeLarge("parseMatrices", text, name, { name: "", sha256: "" });
  else take(text, name, { fresh: true });
}

/** @param {import("./files.js").OpenedFile} file */
async function takeFile(file) {
  const text = textIn(file.bytes, LONG_TEXT);
  if (text !== null) takeText(text, `the opening of ${file.name}`);
  else await takeLarge("parseFile", file.bytes, `the opening of ${file.name}`, file);
}

/**
 * Read in the worker what is large or no text; its matrices are kept, the text is not.
 * @param {"parseMatrices" | "parseFile"} how
 * @param {string | Uint8Array<ArrayBuffer>} content
 * @param {string} name
 * @param {{ name: string, sha256: string }} file
 * @param {import("./types.js").ReadOptions} [options]
 */
async function takeLarge(how, content, name, file, options = {}) {
  const start = performance.now();
  const size = `${(content.length / 1e6).toFixed(1)} MB`;
  const progress = setInterval(() => {
    const seconds = Math.round((performance.now() - start) / 1000);
    const stop = make("button", { type: "button", id: "stop-reading", class: "inline", onclick: () => cancel("read") }, "Stop");
    showBanner([make("progress", { "aria-label": "Reading" }), ` Reading ${size}, ${seconds} s. `, stop], false);
  }, 300);
  try {
    const parsed = await (how === "parseFile"
      ? ask("parseFile", [/** @type {Uint8Array} */ (content), options], { channel: "read" })
      : ask("parseMatrices", [/** @type {string} */ (content), options], { channel: "read" }));
    takeParsed(parsed, name, file);
    const others = parsed.alternatives;
    if (others.length > 0) {
      showBanner(
        [
          "This array can be read in more than one way. Its matrices are counted by ",
          [parsed, ...others].map(({ reading, matrices }) => {
            const stacking = reading.stacking === "last" ? "last" : "first";
            return make(
              "span",
              { class: "alternative" },
              tinyMatrix(`Its first matrix by the ${stacking} axis`, matrices[0]?.mueller ?? []),
              make("button", { type: "button", id: `stack-${stacking}`, onclick: () => void takeLarge(how, content, name, file, { stacking }) }, `the ${stacking} axis`),
            );
          }),
        ],
        true,
      );
    }
  } catch (error) {
    if (isDropped(error)) tell("The reading was stopped. Nothing was changed.");
    else fail(error);
  } finally {
    clearInterval(progress);
    if (document.getElementById("stop-reading")) hideBanner();
  }
}

/**
 * @param {import("./types.js").Parsed} parsed
 * @param {string} name
 * @param {{ name: string, sha256: string }} file
 */
function takeParsed(parsed, name, file) {
  const [matrix] = parsed.matrices;
  if (!matrix) return;
  const cells = matrix.mueller.map((value) => fullText(value, matrix.decimals));
  const before = store.work.measurement;
  const normalised = matrix.mueller[0] === 1;
  const base = before.example ? noMeasurement() : before;
  hideProblem();
  store.commit(name, {
    ...store.work,
    measurement: {
      ...base,
      cells,
      text: textOf(cells),
      options: {},
      pick: 0,
      decimals: matrix.decimals,
      normalised,
      noise: matrix.sigma ? printedNoise(matrix.sigma) : base.noise,
      label: matrix.label?.slice(0, 80) ?? file.name,
      story: "",
      example: false,
      many: manyOf(parsed, "ask", file),
    },
  });
  const refused = parsed.notes.filter((note) => note.severity === "refusal");
  const said = parsed.notes.map((note) => note.message).slice(0, 3).join(" ");
  tell(`Read ${parsed.matrices.length} matrices.${said ? ` ${said}` : ""}`);
  if (refused[0]) showBanner([`${refused.length} ${refused.length === 1 ? "part" : "parts"} could not be read. The first: ${refused[0].message}`], true);
}

/** @param {number} pick which of several matrices is shown */
function pickOne(pick) {
  const { measurement } = store.work;
  const matrix = measurement.many?.matrices[pick];
  if (!matrix || !measurement.many) return;
  const inText = measurement.many.source === "" && read(measurement.text, measurement.options).parsed?.matrices.length === measurement.many.matrices.length;
  if (inText) {
    take(measurement.text, "the choice of a matrix", { options: measurement.options, pick });
    return;
  }
  const cells = matrix.map((value) => fullText(value));
  change("the choice of a matrix", { cells, text: textOf(cells), options: {}, pick, decimals: null, label: measurement.many.labels[pick]?.slice(0, 80) ?? measurement.label });
}

/** @param {import("./types.js").Use} use */
function useMany(use) {
  const { measurement } = store.work;
  const { many } = measurement;
  if (!many) return;
  const name = "the choice of what the matrices are";
  if (use === "repeats") {
    const { mean, sigma } = meanOf(many.matrices, measurement.normalised);
    const cells = mean.map((value) => fullText(value));
    const noise = sigma > 0 ? repeatsNoise(many.matrices, sigma) : noMeasurement().noise;
    change(name, { many: { ...many, use }, cells, text: textOf(cells), options: {}, pick: 0, decimals: null, noise });
  } else if (many.use === "repeats") {
    const cells = (many.matrices[0] ?? []).map((value) => fullText(value));
    const noise = measurement.noise.kind === "replicates" ? noMeasurement().noise : measurement.noise;
    change(name, { many: { ...many, use }, cells, text: textOf(cells), options: {}, pick: 0, decimals: null, noise });
  } else {
    change(name, { many: { ...many, use } });
  }
}

/** @param {Example} example */
function takeExample(example) {
  take(example.text, `the example “${example.title}”`, { fresh: true, example });
}

/** The train of the invented film, with what was measured of all its elements together. */
function takeTrainExample() {
  if (!trainExample) return;
  const { label, measurement, ...rest } = trainExample;
  const configuration = { ...rest, label: String(label).replace(/^invented: /, ""), measurement: { ...measurement, example: true } };
  const { work } = fromConfiguration(configuration, store.view, (text, options) => quick.parseMatrices(text, options));
  hideProblem();
  store.commit("the example of a train", work, { safe: true });
}

/**
 * @param {string} name
 * @param {Partial<Measurement>} part
 * @param {{ merge?: string }} [how]
 * @param {{ [block: string]: unknown }} [blocks]
 */
function change(name, part, how = {}, blocks = {}) {
  const measurement = { ...store.work.measurement, ...part };
  // Repeats speak of their own mean: with other numbers, their scatter is no statement.
  if (measurement.noise.kind === "replicates" && measurement.many?.use !== "repeats") measurement.noise = noMeasurement().noise;
  store.commit(name, { ...store.work, measurement, blocks: blocksWith(blocks) }, how);
}

/**
 * @param {string} name
 * @param {{ [block: string]: unknown }} changed
 * @param {string} [merge]
 */
function changeBlocks(name, changed, merge) {
  store.commit(name, { ...store.work, blocks: blocksWith(changed) }, merge ? { merge } : {});
}

/** @param {{ [block: string]: unknown }} changed */
function blocksWith(changed) {
  return Object.fromEntries(Object.entries({ ...store.work.blocks, ...changed }).filter(([, value]) => value !== undefined));
}

function shownTask() {
  const { name } = taskNamed(store.view.task);
  return /** @type {typeof tasks[number]} */ (tasks.find((task) => task.name === name));
}

/**
 * @param {import("./grid.js").Change[]} changes
 * @param {string} name
 */
function editCells(changes, name) {
  const { measurement } = store.work;
  const cells = [...measurement.cells];
  for (const { index, text } of changes) cells[index] = text;
  const numbers = cells.map(readNumber);
  const whole = numbers.every((number) => number.error === null);
  const decimals = whole ? Math.max(0, ...numbers.map((number) => number.decimals ?? 0)) : null;
  change(name, {
    cells,
    text: whole ? textOf(cells) : "",
    options: {},
    pick: 0,
    decimals: decimals !== null && decimals <= 15 ? decimals : null,
    example: false,
    story: "",
    label: measurement.example ? "" : measurement.label,
    many: null,
  });
}

/**
 * Digits are shifted, and not rounded, where that is possible: 98.5 over 100 is 0.985.
 * @param {number} by a power of ten
 */
function divide(by) {
  const { measurement } = store.work;
  const power = Math.round(Math.log10(by));
  /** @param {string} text */
  const shifted = (text) => {
    const read = readNumber(text);
    return read.error === null ? fullText(Number(`${read.plain.replace(/e.*/, "")}e${Number(/e(.*)/.exec(read.plain)?.[1] ?? 0) - power}`)) : text;
  };
  const cells = measurement.cells.map(shifted);
  const { noise: stated } = measurement;
  change(`the division by ${by}`, {
    cells,
    text: textOf(cells),
    options: {},
    pick: 0,
    decimals: measurement.decimals === null ? null : Math.min(15, measurement.decimals + power),
    noise: scaledNoise(stated, shifted, by),
    many: null,
  });
}

/**
 * @param {import("./types.js").NoiseChoice} stated
 * @param {(text: string) => string} shifted
 * @param {number} by
 * @returns {import("./types.js").NoiseChoice}
 */
function scaledNoise(stated, shifted, by) {
  if (stated.kind === "uniform") return { ...stated, sigma: shifted(stated.sigma) };
  const { given } = stated;
  if (stated.kind === "perElement" && given && "sigma" in given) return noiseChoice({ kind: "perElement", sigma: /** @type {number[]} */ (given.sigma).map((value) => value / by) });
  if (stated.kind === "covariance" && given && "covariance" in given) return noiseChoice({ kind: "covariance", covariance: /** @type {number[]} */ (given.covariance).map((value) => value / by / by) });
  return stated;
}

function useNearest() {
  const nearest = answer?.result.nearest.mueller;
  if (nearest) useMatrix(nearest, "the step to the nearest realizable matrix");
}

/**
 * Take a computed matrix over as the measured one.
 * @param {number[]} mueller row by row
 * @param {string} name
 * @param {Partial<Measurement>} [part] what else is known of it
 * @param {{ [block: string]: unknown }} [blocks] what changes in the same step
 */
function useMatrix(mueller, name, part = {}, blocks = {}) {
  const { order } = store.work.measurement.convention;
  /** @type {string[]} */
  const cells = Array(16).fill("");
  mueller.forEach((value, k) => {
    cells[place(order, Math.floor(k / 4), k % 4)] = fullText(value);
  });
  change(name, { cells, text: textOf(cells), options: {}, pick: 0, decimals: null, many: null, ...part }, {}, blocks);
  byId("task").focus();
}

/**
 * @param {string} text
 * @param {import("./types.js").ReadOptions} options
 * @returns {ReadOutcome}
 */
function read(text, options) {
  const key = JSON.stringify(options);
  if (lastReading.text === text && lastReading.options === key) return lastReading.outcome;
  /** @type {ReadOutcome} */
  let outcome = { parsed: null, error: null };
  if (isReady && text.trim() !== "") {
    try {
      outcome = { parsed: quick.parseMatrices(text, options), error: null };
    } catch (error) {
      outcome = { parsed: null, error: /** @type {Error} */ (error) };
    }
  }
  if (isReady) lastReading = { text, options: key, outcome };
  return outcome;
}

/**
 * What the engine is asked of the present input, or what is missing.
 * @param {ReadOutcome} outcome
 * @returns {{ request: Request | null, waiting: string | null }}
 */
function requestNow(outcome) {
  const { measurement, examine } = store.work;
  if (outcome.error) return { request: null, waiting: "The text could not be read; the reason stands beside it." };
  const numbers = measurement.cells.map(readNumber);
  const empty = measurement.cells.filter((cell) => cell === "").length;
  if (empty === 16) return { request: null, waiting: null };
  if (empty > 0) return { request: null, waiting: `${empty} of the 16 elements ${empty === 1 ? "is" : "are"} still empty.` };
  const mueller = numbers.map((number) => number.value);
  if (!mueller.every((value) => value !== null)) return { request: null, waiting: "An element is not a number; the reason stands below the grid." };
  const { normalised, absolute } = measurement;
  return {
    request: {
      mueller: /** @type {number[]} */ (mueller),
      normalised,
      absolute,
      convention: measurement.convention,
      noise: statedNoise(measurement),
      ...examine,
    },
    waiting: null,
  };
}

/**
 * The random part, and that of the instrument beside it.
 * @param {Measurement} measurement
 * @returns {import("./types.js").Noise}
 */
function statedNoise({ noise: choice, decimals, instrument: stated }) {
  const { noise: random } = noiseOf(choice, decimals);
  const { systematic } = systematicOf(stated);
  return random.kind === "none" || !systematic ? random : { ...random, systematic };
}

/**
 * What the stated noise can show, before or beside a measurement.
 * @param {Measurement} measurement
 */
function detection({ noise: choice, decimals, cells, normalised }) {
  const { noise: stated } = noiseOf(choice, decimals);
  // Without a matrix, as for one whose first element is 1.
  const first = Math.abs(readNumber(cells[0] ?? "").value ?? 1) || 1;
  const sigma = stated.kind === "uniform" ? stated.sigma / first : stated.kind === "relative" ? stated.fraction : null;
  return sigma !== null && sigma > 0 ? detectionText(quick.detectable({ sigma, normalised })) : "";
}

/** Bring everything that is shown in line with the state. */
function render() {
  const { work, view } = store;
  const { measurement } = work;
  const outcome = read(measurement.text, measurement.options);
  const filled = measurement.cells.some((cell) => cell !== "");
  const { request, waiting } = requestNow(outcome);
  if (isReady && request) compute(request);
  else if (!filled && !outcome.error) answer = null;

  countFrom(view.firstIndex);
  grid.show(measurement.cells, measurement.convention.order);
  reading.show(measurement, outcome, filled);
  many.show(measurement.many, measurement.pick, isReady ? request : null);
  display.show(view);
  noise.show(measurement.noise, measurement.decimals, filled, refused.noise, isReady ? detection(measurement) : "");
  instrument.show(measurement.instrument, statedNoise(measurement).kind !== "none", refused.instrument);
  convention.show(measurement.convention);
  showOrigin(measurement);
  showExamples(measurement);
  showHistory();
  for (const { name, link, root } of tasks) {
    if (name === shownTask().name) link.setAttribute("aria-current", "page");
    else link.removeAttribute("aria-current");
    root.hidden = name !== shownTask().name;
  }
  showTask(request ? null : waiting);
  store.keep();
}

/**
 * @param {string | null} stale why the answer is not that of the present input
 */
function showTask(stale) {
  const { work, view } = store;
  const task = shownTask();
  const isEmpty = answer === null && task.needsMatrix;
  const empty = byId("empty");
  empty.hidden = !isEmpty;
  repaint(empty, isEmpty ? firstWords(stale) : null);
  const note = byId("stale");
  note.hidden = !(answer && stale);
  note.textContent = answer && stale ? `${stale} What is shown below belongs to the last matrix that could be read.` : "";
  byId("task").classList.toggle("is-stale", Boolean(answer && stale));
  const shown = { work, view, result: answer?.result ?? null, request: answer?.request ?? null, pending: answer?.pending ?? false, stale, waiting: stale };
  provenance.show(shown);
  for (const each of tasks) {
    if (each === task && isReady && !isEmpty) each.panel.show(shown);
    else each.panel.clear();
  }
  if (answer && !stale) {
    const { title } = verdictOf(answer.result, answer.request, answer.pending, format);
    document.title = `${title} · Halfshade`;
    // A verdict is said once, and behind a message that nobody had the time to read.
    if (!answer.pending && title !== saidVerdict) {
      saidVerdict = title;
      const { text, at } = message;
      tell(performance.now() - at < MESSAGE_MS ? `${text} ${title}.` : title, performance.now() - at >= MESSAGE_MS);
      message = { text, at };
    }
    requestAnimationFrame(() => performance.mark("halfshade-verdict"));
  } else {
    saidVerdict = "";
    document.title = "Halfshade: Mueller matrices, checked and explained";
  }
}

/** @param {string | null} waiting */
function firstWords(waiting) {
  return [
    make("h1", { id: "task-heading", tabindex: "-1" }, waiting ? "Not a whole matrix yet" : "Paste a measured Mueller matrix"),
    make("p", null, waiting ?? "Ctrl+V anywhere on this page. At once you see whether it can be physical, how sure that is, and what the element does to light."),
    waiting || examples.length === 0
      ? null
      : [
          make("h2", null, "No matrix at hand? Invented measurements of a small film workshop"),
          make("ul", { class: "choices" }, examples.map((each) => make("li", null, make("button", { type: "button", class: "inline", onclick: () => takeExample(each) }, each.title)))),
        ],
  ];
}

/**
 * @param {Request} request
 * @param {boolean} [isAgain] without a part that the engine refused
 */
function compute(request, isAgain = false) {
  const key = JSON.stringify(request);
  if (answer?.key === key) return;
  if (!isAgain) refused = { noise: null, instrument: null };
  try {
    answer = { key, request, result: quick.examine({ ...forEngine(request), draws: 0 }), pending: true };
  } catch (error) {
    const at = /** @type {{ at?: { field?: string } | null }} */ (error).at;
    // A statement of the noise that can't be used is none; why stands beside it.
    const { message } = /** @type {Error} */ (error);
    if (at?.field?.startsWith("noise.systematic")) {
      refused = { ...refused, instrument: message };
      const { systematic, ...random } = request.noise;
      compute({ ...request, noise: random }, true);
    } else if (at?.field?.startsWith("noise") && request.noise.kind !== "none") {
      refused = { ...refused, noise: message };
      compute({ ...request, noise: { kind: "none" } }, true);
    } else fail(error);
    return;
  }
  ask("examine", [forEngine(request)], { channel: "examine" }).then(
    (result) => {
      if (answer?.key !== key) return;
      answer = { key, request, result, pending: false };
      render();
    },
    (error) => {
      if (!isDropped(error)) fail(error);
    },
  );
}

/** @param {Measurement} measurement */
function showOrigin({ example, label, story }) {
  const origin = byId("origin");
  origin.hidden = !example && label === "";
  origin.classList.toggle("example", example);
  repaint(origin, example ? [make("b", null, `Invented example: ${label}.`), story ? ` ${story}` : null] : label);
}

/** @param {Measurement} measurement */
function showExamples({ example, label }) {
  if (examples.length === 0) return;
  const select = make("select", { id: "example", "aria-label": "Invented examples" });
  const none = make("option", { value: "" }, "Invented examples…");
  none.selected = !example;
  select.append(none);
  examples.forEach((each, index) => {
    const option = make("option", { value: String(index) }, each.title);
    option.selected = example && each.title === label;
    select.append(option);
  });
  select.addEventListener("change", () => {
    const chosen = examples[Number(select.value)];
    if (select.value !== "" && chosen) takeExample(chosen);
  });
  repaint(byId("examples"), select);
}

function showHistory() {
  for (const [id, steps, word] of /** @type {const} */ ([
    ["undo", store.past, "Undo"],
    ["redo", store.future, "Redo"],
  ])) {
    const button = /** @type {HTMLButtonElement} */ (byId(id));
    const name = steps.at(-1)?.name;
    button.disabled = name === undefined;
    button.title = name === undefined ? "" : `${word} ${name}`;
  }
}

function undo() {
  const name = store.undo();
  if (name) tell(`Undone: ${name}.`);
}

function redo() {
  const name = store.redo();
  if (name) tell(`Done again: ${name}.`);
}

/**
 * The configuration of the present work, or what is missing for one.
 * @returns {{ configuration: import("./link.js").Configuration | null, waiting: string | null }}
 */
function configurationNow() {
  const { work } = store;
  const { measurement } = work;
  const outcome = read(measurement.text, measurement.options);
  const { request, waiting } = requestNow(outcome);
  if (!request && (waiting !== null || Object.keys(work.blocks).length === 0)) return { configuration: null, waiting: waiting ?? "There is no matrix yet." };
  const textHolds = outcome.parsed !== null && measurement.text.length <= LONG_TEXT;
  return { configuration: configurationOf(work, store.view, request, textHolds, quick.engineInfo().version), waiting: null };
}

/**
 * A fragment for the configuration; with the shown matrix alone where all are too many.
 * @param {import("./link.js").Configuration} configuration
 */
function fragmentOf(configuration) {
  const bulk = configuration["series"]?.matrices?.length ?? 0;
  try {
    const fragment = bulk > LONGEST_LINK / 10 ? "" : quick.encodeLink(configuration);
    if (fragment !== "" && fragment.length <= LONGEST_LINK) return { fragment, whole: true };
  } catch (error) {
    if (bulk === 0 && !configuration["measurement"]?.text) throw error;
  }
  return { fragment: quick.encodeLink(withoutSeries(configuration)), whole: false };
}

/** The link to the present work, for the report; null while there is no whole matrix. */
function linkNow() {
  const { configuration } = configurationNow();
  if (!configuration) return null;
  return `${isSingleFile ? publicAddress() : location.href.split("#")[0]}#${fragmentOf(configuration).fragment}`;
}

async function copyLink() {
  const { configuration, waiting } = configurationNow();
  if (!configuration) {
    tell(waiting ?? "");
    return;
  }
  try {
    const { fragment, whole } = fragmentOf(configuration);
    const address = isSingleFile && publicAddress() === "" ? `#${fragment}\nHalfshade: open halfshade.html and paste this text, or put it behind the address of the page.` : `${isSingleFile ? publicAddress() : location.href.split("#")[0]}#${fragment}`;
    store.fragment = fragment;
    if (whole) store.markSafe();
    try {
      history.replaceState(null, "", `#${fragment}`);
    } catch {
      // A browser that forbids it loses only the address in its bar.
    }
    render();
    const done = await writeClipboard(address);
    const size = `Link copied, ${fragment.length} characters.`;
    const warning = fragment.length > LONG_LINK ? " Some mail and chat programs cut it: Save makes a file instead." : "";
    if (!done) offerText(address);
    else if (whole) tell(`${size}${warning}`);
    else {
      tell(`${size} It holds the shown matrix alone.`);
      showBanner(["All matrices together do not fit into a link: this one holds the shown matrix alone. ", make("button", { type: "button", id: "save-instead", class: "inline", onclick: saveConfiguration }, "Save a file with all of them")], true);
    }
  } catch (error) {
    fail(error);
  }
}

function saveConfiguration() {
  const { configuration, waiting } = configurationNow();
  if (!configuration) {
    tell(waiting ?? "");
    return;
  }
  try {
    const name = `${fileStem(store.work.measurement.label)}.json`;
    saveFile(name, new Blob([quick.encodeFile(configuration)], { type: "application/json" }));
    store.markSafe();
    render();
    tell(`Saved as ${name}. Drop it on the page to open it again.`);
  } catch (error) {
    fail(error);
  }
}

/** What a result stands on. */
function notesNow() {
  if (!answer) return [];
  const { title } = verdictOf(answer.result, answer.request, answer.pending, format);
  const { noise: stated, convention: used, normalised } = answer.request;
  return [
    title,
    `Halfshade ${quick.engineInfo().version}; matrices row by row; ${normalised ? "normalised to m00" : "not normalised"}`,
    `Noise: ${JSON.stringify(stated)}`,
    `Convention: facing the source, ${conventionInWords(used)}; time dependence exp(${used.time === "plus" ? "+" : "-"}i omega t)`,
  ];
}

/** Everything that is known of the shown matrix, as a file in the chosen form. */
function saveResults() {
  if (!answer) {
    tell("There is no result yet.");
    return;
  }
  try {
    const { form } = store.view;
    const name = `${fileStem(store.work.measurement.label)}-results.${ENDINGS[form]}`;
    saveFile(name, new Blob([exported(resultsOf(answer.result, answer.request, store.work.measurement.label, notesNow()), form)], { type: "text/plain" }));
    tell(`Saved as ${name}.`);
  } catch (error) {
    fail(error);
  }
}

/** @param {string} text */
function offerText(text) {
  const field = make("textarea", { id: "link-text", readonly: true, rows: "3", "aria-label": "The link" });
  field.value = text;
  showBanner(["The browser did not allow the copy. Press Ctrl+C here: ", field], false);
  field.focus();
  field.select();
}

/** @param {string} fragment */
function openLink(fragment) {
  openConfiguration(() => quick.decodeLink(fragment), "link", fragment);
}

/**
 * @param {() => import("./link.js").Configuration} decode
 * @param {"link" | "file"} from
 * @param {string} [fragment]
 */
function openConfiguration(decode, from, fragment) {
  if (!isReady) return;
  try {
    const configuration = decode();
    const { work, view } = fromConfiguration(configuration, store.view, (text, options) => quick.parseMatrices(text, options));
    if (fragment !== undefined) store.fragment = fragment;
    store.view = view;
    hideProblem();
    store.commit(`the opening of a ${from}`, work, { safe: true });
    const by = typeof configuration["app"] === "string" ? configuration["app"] : "another version";
    const kept = Object.keys(work.blocks).filter((block) => !TASK_BLOCKS.has(block));
    const file = work.measurement.many ? null : configuration["dataFile"];
    showBanner(
      [
        `Loaded from a ${from} made with version ${by}.`,
        kept.length > 0 ? ` It also holds ${kept.join(", ")}, which this version does not show but keeps.` : null,
        file ? ` The other matrices are in ${file.name}: open that file to see them.` : null,
        " ",
        make("button", { type: "button", id: "banner-undo", class: "inline", onclick: () => { hideBanner(); undo(); } }, "Undo"),
      ],
      true,
    );
  } catch (error) {
    render();
    fail(error);
  }
}

/**
 * @param {import("./dom.js").Child[]} children
 * @param {boolean} closable
 */
function showBanner(children, closable) {
  const banner = byId("banner");
  banner.hidden = false;
  repaint(banner, ...children, closable ? make("button", { type: "button", class: "inline", onclick: hideBanner }, "Close") : null);
}

function hideBanner() {
  byId("banner").hidden = true;
}

function hideProblem() {
  byId("problem").hidden = true;
}

/**
 * Say something without taking the keyboard.
 * @param {string} words
 * @param {boolean} [isShown] whether a wide page shows it anyhow
 */
function tell(words, isShown = false) {
  message = { text: words, at: performance.now() };
  if (words === said) return;
  said = words;
  const status = byId("status");
  status.textContent = words;
  status.classList.toggle("shown-below", isShown);
}

/**
 * The one place where errors are shown.
 * @param {unknown} error
 */
function fail(error) {
  const problem = byId("problem");
  const message = error instanceof Error ? error.message : String(error);
  problem.hidden = false;
  repaint(problem, make("b", null, "That did not work: "), message, " ", make("button", { type: "button", class: "inline", onclick: hideProblem }, "Close"));
  tell(message);
}
