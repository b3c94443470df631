/** The tasks, in the order of the page: what each is called, what it needs, and its panel. */
import { ModelPanel } from "./panels/model.js";
import { PropertiesPanel } from "./panels/properties.js";
import { RealizabilityPanel } from "./panels/realizability.js";
import { TrainPanel } from "./panels/train.js";
import { TRAIN_BLOCKS } from "./train.js";

/**
 * @typedef {object} TaskActions what a panel may do to the rest of the page
 * @property {() => void} useNearest take the nearest realizable matrix over
 * @property {(mueller: number[], name: string, part?: Partial<import("./types.js").Measurement>, blocks?: { [block: string]: unknown }) => void} use
 *   take a computed matrix over as the measured one, as one step, with what else is known of it and with other blocks
 * @property {(name: string, blocks: { [block: string]: unknown }, merge?: string) => void} change take new blocks over as
 *   one step; `undefined` removes one
 * @property {() => void} loadTrainExample
 * @property {(view: Partial<import("./types.js").View>) => void} view
 * @property {(message: string) => void} tell
 * @property {(error: unknown) => void} failed
 * @property {import("./types.js").FormatValue} format
 *
 * @typedef {object} TaskPanel
 * @property {(shown: import("./types.js").Shown) => void} show
 * @property {() => void} clear another task is shown, or nothing can be
 * @property {(text: string) => boolean} [paste] a text that was pasted or dropped anywhere; false where it is not
 *   for this task
 *
 * @typedef {object} TaskEntry
 * @property {string} name in links, and in the identities of its elements
 * @property {string} label
 * @property {boolean} needsMatrix whether there is nothing to show without a measured matrix
 * @property {string[]} blocks the blocks of a configuration that hold its state
 * @property {(root: HTMLElement, actions: TaskActions) => TaskPanel} panel
 */

/** @type {TaskEntry[]} */
export const TASKS = [
  { name: "realizability", label: "Realizability", needsMatrix: true, blocks: [], panel: (root, actions) => new RealizabilityPanel(root, actions) },
  { name: "properties", label: "Properties", needsMatrix: true, blocks: [], panel: (root, actions) => new PropertiesPanel(root, actions) },
  { name: "model", label: "Model selection", needsMatrix: true, blocks: ["fit"], panel: (root, actions) => new ModelPanel(root, actions) },
  { name: "train", label: "Optical train", needsMatrix: false, blocks: TRAIN_BLOCKS, panel: (root, actions) => new TrainPanel(root, actions) },
];

/**
 * The task of this name; the first where there is none.
 * @param {unknown} name
 */
export function taskNamed(name) {
  return TASKS.find((task) => task.name === name) ?? /** @type {TaskEntry} */ (TASKS[0]);
}

/** The blocks that some task shows. */
export const TASK_BLOCKS = new Set(TASKS.flatMap((task) => task.blocks));
