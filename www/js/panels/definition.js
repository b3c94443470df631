/** A definition with its formula and source. */
import { make } from "../dom.js";

/**
 * @param {string} name
 * @param {{ [name: string]: import("../definitions.js").Definition }} definitions
 */
export function definitionNodes(name, definitions) {
  const definition = definitions[name];
  if (!definition) return [];
  return [
    make("p", null, definition.definition),
    make("p", { class: "formula" }, definition.formula),
    make("p", { class: "fine" }, `Source: ${definition.source}.`),
  ];
}
