/** Small helpers to build elements. Text always goes in as text, never as markup. */

/**
 * What may stand inside an element; lists nest.
 * @typedef {Node | string | null | undefined | false | Child[]} Child
 */

/**
 * Make an element. Keys starting with `on` add listeners, `class` and other keys set
 * attributes; `true` sets an empty one, `false`, `null` and `undefined` leave it out.
 * @template {keyof HTMLElementTagNameMap} K
 * @param {K} tag
 * @param {{ [name: string]: unknown } | null} attributes
 * @param {...Child} children
 * @returns {HTMLElementTagNameMap[K]}
 */
export function make(tag, attributes, ...children) {
  const element = document.createElement(tag);
  for (const [name, value] of Object.entries(attributes ?? {})) {
    if (value === false || value === null || value === undefined) continue;
    if (name.startsWith("on") && typeof value === "function") {
      element.addEventListener(name.slice(2), /** @type {EventListener} */ (value));
    } else {
      element.setAttribute(name, value === true ? "" : String(value));
    }
  }
  append(element, children);
  return element;
}

/**
 * @param {Element} parent
 * @param {Child[]} children
 */
function append(parent, children) {
  for (const child of children) {
    if (child === null || child === undefined || child === false) continue;
    if (Array.isArray(child)) append(parent, child);
    else parent.append(child);
  }
}

/**
 * The element with this id, which index.html is known to hold.
 * @param {string} id
 * @returns {HTMLElement}
 */
export function byId(id) {
  const element = document.getElementById(id);
  if (!element) throw new Error(`The page lacks its part "${id}".`);
  return element;
}

/**
 * Replace what a container shows. Focus and open folds stay where an element with
 * the same id comes back, so that a late result never takes the keyboard away.
 * @param {Element} container
 * @param {...Child} children
 */
export function repaint(container, ...children) {
  const focused = document.activeElement;
  const focusedId = focused && container.contains(focused) ? focused.id : "";
  const open = new Set([...container.querySelectorAll("details[open][id]")].map((fold) => fold.id));
  container.replaceChildren();
  append(container, children);
  for (const fold of container.querySelectorAll("details[id]")) {
    if (open.has(fold.id)) /** @type {HTMLDetailsElement} */ (fold).open = true;
  }
  if (focusedId) document.getElementById(focusedId)?.focus({ preventScroll: true });
}

/**
 * Pieces of a sentence as nodes.
 * @param {import("./types.js").Part[]} parts
 * @returns {Child[]}
 */
export function sentence(parts) {
  return parts.map((part) => {
    if (typeof part === "string") return part;
    if ("number" in part) return make("b", { class: "number" }, part.number);
    return make("span", { class: "mute" }, part.mute);
  });
}

/**
 * A fold with an id, so that it stays open when its surroundings are painted anew.
 * @param {string} id
 * @param {Child} summary
 * @param {...Child} children
 */
export function fold(id, summary, ...children) {
  return make("details", { id }, make("summary", null, summary), ...children);
}

/**
 * A select in the run of a sentence.
 * @param {{ id: string, label: string, value: string, options: [string, string][], change: (value: string) => void }} given
 */
export function choice({ id, label, value, options, change }) {
  const select = make("select", { id, class: "inline", "aria-label": label });
  for (const [key, text] of options) {
    const option = make("option", { value: key }, text);
    option.selected = key === value;
    select.append(option);
  }
  select.addEventListener("change", () => change(select.value));
  return select;
}

/**
 * Whether the keyboard is in a field that keeps its own text and undo.
 * @param {Element | null} element
 * @returns {boolean}
 */
export function isTextField(element) {
  if (element instanceof HTMLTextAreaElement) return true;
  return element instanceof HTMLInputElement && ["text", "number", "search", "url"].includes(element.type);
}
