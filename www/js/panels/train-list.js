/** The elements of a train as a list that is edited in place, by keyboard, mouse and finger. */
import { choice, make, repaint } from "../dom.js";
import { quick } from "../engine.js";
import { fullText, readNumber } from "../format.js";
import { KINDS, MENU, matrixLines, newElement, parameterLabel, rearranged, tieTargets, titleOf, valueOf, withElement, withParameter } from "../train.js";

/**
 * @typedef {import("../train.js").TrainWork} TrainWork
 * @typedef {import("../train.js").TrainElement} TrainElement
 * @typedef {import("../train.js").TrainParameter} TrainParameter
 * @typedef {import("../../halfshade.js").Measurement} Measurement
 *
 * @typedef {object} ListActions
 * @property {(name: string, work: TrainWork, merge?: string) => void} change
 * @property {(message: string) => void} tell
 * @property {() => Measurement | null} measured the measured matrix, if there is one
 *
 * @typedef {object} Field one text field of the list
 * @property {HTMLInputElement | HTMLTextAreaElement} input
 * @property {(work: TrainWork) => string} text what it says where the person typed nothing else
 * @property {(text: string) => boolean} says whether this text says the same
 */

const MOST = 80;

export class TrainList {
  /** @param {ListActions} actions */
  constructor(actions) {
    this.actions = actions;
    /** @type {TrainWork | null} */
    this.work = null;
    this.shape = "";
    /** @type {Map<string, Field>} */
    this.fields = new Map();
    /** @type {Map<string, HTMLElement>} */
    this.errors = new Map();
    this.list = make("ol", { id: "train-list", class: "train" });
    this.kind = make(
      "select",
      { id: "train-kind", "aria-label": "Kind of the new element" },
      MENU.map(({ title, entries }) => make("optgroup", { label: title }, entries.map(({ name, label }) => make("option", { value: name }, label)))),
    );
    this.element = make(
      "div",
      null,
      this.list,
      make("p", { class: "row adder" }, this.kind, make("button", { type: "button", id: "train-add", onclick: () => this.add() }, "Add an element")),
    );
  }

  /**
   * @param {TrainWork} work
   * @param {{ at: string, message: string } | null} refused what the engine does not take, and where
   */
  show(work, refused) {
    this.work = work;
    const shape = JSON.stringify(work.train.map((element) => [element.kind, element.disabled ?? false, titleOf(element), Object.values(element.parameters ?? {}).map(({ free, tie }) => (tie ? `${tie.element}.${tie.name}` : (free ?? false)))]));
    // A label that is being typed renames its buttons only afterwards.
    const typing = document.activeElement instanceof HTMLElement && this.list.contains(document.activeElement) && document.activeElement.matches("input[type=text], textarea");
    const isSameButLabels = this.fields.size > 0 && unlabelled(shape) === unlabelled(this.shape);
    if (shape !== this.shape && !(typing && isSameButLabels)) this.paint(work, shape);
    for (const [key, { input, text, says }] of this.fields) {
      const kept = work.typed[key];
      const now = kept ?? text(work);
      // What is being typed stays as it is, and so does 0.50 for 0.5.
      if (input !== document.activeElement && input.value !== now && (kept !== undefined || !says(input.value))) input.value = now;
      input.setAttribute("aria-invalid", String(kept !== undefined));
    }
    for (const [place, element] of this.errors) {
      // Those of an element's parameters stand beside them, not below all of them again.
      const [, wrong] = place.includes(".") ? (Object.entries(work.typed).find(([key]) => key.startsWith(`${place}.`)) ?? []) : [];
      const said = wrong !== undefined ? this.wrongText(place, wrong) : refused?.at === place ? refused.message : "";
      element.textContent = said;
      element.hidden = said === "";
    }
  }

  /** @param {string} place @param {string} text */
  wrongText(place, text) {
    if (place.endsWith("measurement")) return `${reasonOf(text)} The last matrix that could be read is still used.`;
    return `${readNumber(text).error ?? reasonOf(text)} The last number is still used.`;
  }

  /** @param {TrainWork} work @param {string} shape */
  paint(work, shape) {
    this.shape = shape;
    this.fields.clear();
    this.errors.clear();
    repaint(this.list, work.train.map((element, place) => this.item(work, element, place)));
    this.list.hidden = work.train.length === 0;
  }

  /**
   * @param {TrainWork} work
   * @param {TrainElement} element
   * @param {number} place
   */
  item(work, element, place) {
    const title = titleOf(element);
    const id = `train-${place}`;
    const last = work.train.length - 1;
    /** @param {string} action @param {string} sign @param {string} words @param {() => void} press @param {boolean} [disabled] */
    const button = (action, sign, words, press, disabled = false) => make("button", { type: "button", id: `${id}-${action}`, class: "small", "aria-label": words, title: words, disabled, onclick: press }, sign);
    const label = this.text(`${place}.label`, make("input", { type: "text", id: `${id}-label`, class: "element-label", maxlength: MOST, autocomplete: "off", spellcheck: "false", placeholder: KINDS[element.kind].label, "aria-label": `Label of element ${place + 1}` }), (now) => now.train[place]?.label ?? "");
    label.addEventListener("input", () => this.commit("the change of a label", withElement(this.now(), place, { label: label.value.trim() === "" ? undefined : label.value }), label.id));
    label.addEventListener("blur", () => setTimeout(() => this.work && this.show(this.work, null)));
    const inBeam = make("input", { type: "checkbox", id: `${id}-on` });
    inBeam.checked = !element.disabled;
    inBeam.addEventListener("change", () => this.commit(inBeam.checked ? "putting an element into the beam" : "taking an element out of the beam", withElement(this.now(), place, { disabled: inBeam.checked ? undefined : true })));
    const item = make(
      "li",
      { class: element.disabled ? "off" : null, "data-place": place },
      make(
        "div",
        { class: "element-head" },
        this.handle(place),
        make("span", { class: "place" }, String(place + 1)),
        label,
        make("span", { class: "fine kind" }, KINDS[element.kind].label),
        make("label", { class: "fine" }, inBeam, "in the beam"),
        make(
          "span",
          { class: "tools" },
          button("up", "↑", `Move ${title} up`, () => this.move(place, place - 1, "up"), place === 0),
          button("down", "↓", `Move ${title} down`, () => this.move(place, place + 1, "down"), place === last),
          button("copy", "Duplicate", `Duplicate ${title}`, () => this.duplicate(place)),
          button("delete", "Delete", `Delete ${title}`, () => this.remove(place)),
        ),
      ),
      element.kind === "measured" ? this.measurement(element, place) : make("div", { class: "parameters" }, KINDS[element.kind].parameters.map((name) => this.parameter(work, place, name))),
      this.error(`${place}`),
    );
    return item;
  }

  /**
   * A place beside a field where its error is said.
   * @param {string} place
   */
  error(place) {
    const element = make("p", { id: `train-error-${place.replaceAll(".", "-")}`, class: "wrong fine", hidden: true });
    this.errors.set(place, element);
    return element;
  }

  /**
   * @param {TrainWork} work
   * @param {number} place
   * @param {string} name
   */
  parameter(work, place, name) {
    const { label, unit } = parameterLabel(name);
    const parameter = work.train[place]?.parameters?.[name] ?? {};
    const title = titleOf(work.train[place]);
    const id = `train-${place}-${name}`;
    const targets = tieTargets(work.train, place, name);
    const role = parameter.tie ? "tie" : parameter.free ? "free" : "fix";
    const words = `${label}${unit ? ` (${unit})` : ""} of ${title}`;
    const roles = /** @type {[string, string][]} */ ([["fix", "fixed"], ["free", "free"]]);
    if (targets.length > 0 || role === "tie") roles.push(["tie", "tied to…"]);
    const error = this.error(`${place}.${name}`);
    /** @type {import("../dom.js").Child[]} */
    let more = [];
    if (parameter.free) {
      more = [
        make("span", { class: "fine" }, "from"),
        this.number(place, name, "low", `smallest ${words}`, "no bound", (now) => now.low ?? null, (now, low) => ({ ...now, low: low ?? undefined })),
        make("span", { class: "fine" }, "to"),
        this.number(place, name, "high", `largest ${words}`, "no bound", (now) => now.high ?? null, (now, high) => ({ ...now, high: high ?? undefined })),
      ];
    } else if (parameter.tie) {
      const { tie } = parameter;
      const key = `${tie.element}.${tie.name}`;
      const options = targets.some(([one]) => one === key) ? targets : [/** @type {[string, string]} */ ([key, "a parameter that is no more"]), ...targets];
      more = [
        choice({ id: `${id}-target`, label: `What the ${words} is tied to`, value: key, options, change: (chosen) => this.tieTo(place, name, chosen) }),
        make("span", { class: "fine" }, "times"),
        this.number(place, name, "factor", `factor of the ${words}`, "1", (now) => now.tie?.factor ?? null, (now, factor) => ({ ...now, tie: { ...tie, ...now.tie, factor: factor ?? undefined } })),
        make("span", { class: "fine" }, "plus"),
        this.number(place, name, "offset", `offset of the ${words}`, "0", (now) => now.tie?.offset ?? null, (now, offset) => ({ ...now, tie: { ...tie, ...now.tie, offset: offset ?? undefined } })),
      ];
    }
    return make(
      "div",
      { class: "parameter" },
      make("span", { class: "parameter-name" }, label, unit ? make("span", { class: "unit" }, unit) : null),
      role === "tie" ? null : this.number(place, name, "value", words, "", (now) => now.value ?? 0, (now, value) => ({ ...now, value: value ?? now.value ?? 0 })),
      choice({ id: `${id}-role`, label: `${words}: fixed, free or tied`, value: role, options: roles, change: (chosen) => this.setRole(place, name, chosen) }),
      more,
      error,
    );
  }

  /**
   * A field for one number of a parameter.
   * @param {number} place
   * @param {string} name
   * @param {"value" | "low" | "high" | "factor" | "offset"} part
   * @param {string} label
   * @param {string} placeholder without one, the field may not be empty
   * @param {(parameter: TrainParameter) => number | null} read
   * @param {(parameter: TrainParameter, value: number | null) => TrainParameter} write
   */
  number(place, name, part, label, placeholder, read, write) {
    const key = `${place}.${name}.${part}`;
    const input = make("input", { type: "text", id: `train-${place}-${name}-${part}`, class: "sigma", inputmode: "decimal", autocomplete: "off", spellcheck: "false", placeholder, "aria-label": label, "aria-describedby": `train-error-${place}-${name}` });
    this.text(
      key,
      input,
      (work) => {
        const value = read(work.train[place]?.parameters?.[name] ?? {});
        return value === null ? "" : fullText(value);
      },
      (text) => {
        const value = read(this.work?.train[place]?.parameters?.[name] ?? {});
        return text.trim() === "" ? value === null : readNumber(text).value === value;
      },
    );
    input.addEventListener("input", () => {
      const work = this.now();
      const { [key]: _, ...typed } = work.typed;
      const isEmpty = input.value.trim() === "" && placeholder !== "";
      const given = readNumber(input.value);
      const next = isEmpty || given.error === null ? withParameter({ ...work, typed }, place, name, write(work.train[place]?.parameters?.[name] ?? {}, isEmpty ? null : given.value)) : { ...work, typed: { ...typed, [key]: input.value } };
      this.commit(`the change of ${label}`, next, input.id);
    });
    return input;
  }

  /**
   * @template {HTMLInputElement | HTMLTextAreaElement} T
   * @param {string} key
   * @param {T} input
   * @param {(work: TrainWork) => string} text
   * @param {(text: string) => boolean} [says]
   * @returns {T}
   */
  text(key, input, text, says = (written) => this.work !== null && written === text(this.work)) {
    this.fields.set(key, { input, text, says });
    return input;
  }

  /**
   * The sixteen numbers of a measured element, and what is known of them.
   * @param {TrainElement} element
   * @param {number} place
   */
  measurement(element, place) {
    const title = titleOf(element);
    const id = `train-${place}`;
    const key = `${place}.measurement`;
    const matrixOf = (/** @type {TrainWork | null} */ work) => work?.train[place]?.measurement;
    /** @param {string} name @param {Partial<Measurement>} part @param {string} [merge] @param {TrainWork["typed"]} [typed] */
    const set = (name, part, merge, typed = this.now().typed) => {
      const work = this.now();
      this.commit(name, withElement({ ...work, typed }, place, { measurement: { .../** @type {Measurement} */ (matrixOf(work)), ...part } }), merge);
    };
    const area = this.text(
      `${key}.matrix`,
      make("textarea", { id: `${id}-matrix`, rows: "4", wrap: "off", spellcheck: "false", autocomplete: "off", "aria-label": `The sixteen numbers of ${title}`, "aria-describedby": `train-error-${place}-measurement` }),
      (work) => matrixLines(matrixOf(work)),
      (text) => numbersOf(text).matrix?.mueller.every((value, k) => value === matrixOf(this.work)?.mueller?.[k]) ?? false,
    );
    area.addEventListener("input", () => {
      const { [`${key}.matrix`]: _, ...typed } = this.now().typed;
      const { matrix } = numbersOf(area.value);
      if (!matrix) this.commit(`the change of the matrix of ${title}`, { ...this.now(), typed: { ...typed, [`${key}.matrix`]: area.value } }, area.id);
      else set(`the change of the matrix of ${title}`, { mueller: /** @type {any} */ (matrix.mueller), normalised: matrix.mueller[0] === 1, ...(matrix.sigma ? { noise: { kind: "perElement", sigma: /** @type {any} */ (matrix.sigma) } } : {}) }, area.id, typed);
    });
    const sigma = this.text(
      `${key}.sigma`,
      make("input", { type: "text", id: `${id}-sigma`, class: "sigma", inputmode: "decimal", autocomplete: "off", spellcheck: "false", "aria-label": `σ of every number of ${title}`, "aria-describedby": `train-error-${place}-measurement` }),
      (work) => sigmaText(matrixOf(work)),
      (text) => sigmaText(matrixOf(this.work)) === text.trim() || String(readNumber(text).value) === sigmaText(matrixOf(this.work)),
    );
    sigma.addEventListener("input", () => {
      const { [`${key}.sigma`]: _, ...typed } = this.now().typed;
      const given = readNumber(sigma.value);
      if (sigma.value.trim() === "") set(`the change of σ of ${title}`, { noise: { kind: "none" } }, sigma.id, typed);
      else if (given.error === null && given.value > 0) set(`the change of σ of ${title}`, { noise: { kind: "uniform", sigma: given.value } }, sigma.id, typed);
      else this.commit(`the change of σ of ${title}`, { ...this.now(), typed: { ...typed, [`${key}.sigma`]: sigma.value } }, sigma.id);
    });
    const { kind = "none" } = element.measurement?.noise ?? {};
    const isOther = kind !== "none" && kind !== "uniform";
    /** @param {"normalised" | "absolute"} name @param {string} words */
    const box = (name, words) => {
      const input = make("input", { type: "checkbox", id: `${id}-${name}` });
      input.checked = element.measurement?.[name] ?? false;
      input.addEventListener("change", () => set(`the change of what the matrix of ${title} is`, { [name]: input.checked }));
      return make("label", { class: "fine" }, input, words);
    };
    const take = make(
      "button",
      {
        type: "button",
        id: `${id}-take`,
        class: "small",
        onclick: () => {
          const measured = this.actions.measured();
          if (!measured) this.actions.tell("There is no measured matrix yet: paste one while another task is shown, or type it into the grid.");
          else {
            this.shape = "";
            const work = this.now();
            const typed = Object.fromEntries(Object.entries(work.typed).filter(([name]) => !name.startsWith(`${key}.`)));
            this.commit(`taking the measured matrix for ${title}`, withElement({ ...work, typed }, place, { measurement: measured }));
          }
        },
      },
      "Take the measured matrix",
    );
    return make(
      "div",
      { class: "measured" },
      area,
      make(
        "div",
        { class: "parameter" },
        make("label", { class: "fine", for: sigma.id }, "σ"),
        sigma,
        isOther ? make("span", { class: "fine" }, "stated otherwise, and kept; a σ typed here takes its place") : null,
        box("normalised", "normalised to m00"),
        box("absolute", "absolute"),
        take,
        this.error(key),
      ),
    );
  }

  /**
   * What an element is dragged by.
   * @param {number} place
   */
  handle(place) {
    const handle = make("span", { class: "handle", "aria-hidden": "true", title: "Drag to another place" }, "⠿");
    /** @type {number | null} */
    let target = null;
    const clear = () => this.list.querySelectorAll("li").forEach((item) => item.classList.remove("drop-before", "drop-behind", "dragged"));
    handle.addEventListener("pointerdown", (event) => {
      if (event.button !== 0) return;
      event.preventDefault();
      handle.setPointerCapture(event.pointerId);
      target = place;
      handle.closest("li")?.classList.add("dragged");
    });
    handle.addEventListener("pointermove", (event) => {
      if (target === null) return;
      const items = [...this.list.children];
      const over = items.findIndex((item) => event.clientY < item.getBoundingClientRect().bottom);
      target = over < 0 ? items.length - 1 : over;
      items.forEach((item, k) => {
        item.classList.toggle("drop-before", k === target && target < place);
        item.classList.toggle("drop-behind", k === target && target > place);
      });
    });
    handle.addEventListener("pointerup", () => {
      const to = target;
      target = null;
      clear();
      if (to !== null && to !== place) this.move(place, to, to < place ? "up" : "down");
    });
    handle.addEventListener("pointercancel", () => {
      target = null;
      clear();
    });
    return handle;
  }

  add() {
    const work = this.now();
    const element = newElement(this.kind.value, this.actions.measured());
    if (!element) return;
    // What is known to stand behind the sample stays at the end.
    const place = work.train.length - work.behind.count;
    const order = work.train.map((_, k) => k);
    order.splice(place, 0, work.train.length);
    this.commit(`adding a ${KINDS[element.kind].label}`, rearranged({ ...work, train: [...work.train, element] }, order));
    this.actions.tell(`Element ${place + 1} added: ${KINDS[element.kind].label}.`);
  }

  /**
   * @param {number} from
   * @param {number} to
   * @param {"up" | "down"} way which button gets the keyboard
   */
  move(from, to, way) {
    const work = this.now();
    const order = work.train.map((_, k) => k).filter((k) => k !== from);
    order.splice(to, 0, from);
    this.commit("moving an element", rearranged(work, order));
    this.actions.tell(`${titleOf(work.train[from])} is now element ${to + 1} of ${work.train.length}.`);
    const other = way === "up" ? "down" : "up";
    for (const action of [way, other]) {
      const button = /** @type {HTMLButtonElement | null} */ (document.getElementById(`train-${to}-${action}`));
      if (button && !button.disabled) {
        button.focus();
        return;
      }
    }
  }

  /** @param {number} place */
  duplicate(place) {
    const work = this.now();
    const order = work.train.map((_, k) => k);
    order.splice(place + 1, 0, place);
    this.commit("duplicating an element", rearranged(work, order));
    this.actions.tell(`${titleOf(work.train[place])} duplicated, as element ${place + 2}.`);
    document.getElementById(`train-${place + 1}-copy`)?.focus();
  }

  /** @param {number} place */
  remove(place) {
    const work = this.now();
    const { before, behind } = work;
    const length = work.train.length;
    // The ends of the sample stay with their elements.
    const ends = {
      before: { ...before, count: before.count - (place < before.count ? 1 : 0) },
      behind: { ...behind, count: behind.count - (place >= length - behind.count ? 1 : 0) },
    };
    this.commit("deleting an element", rearranged({ ...work, ...ends }, work.train.map((_, k) => k).filter((k) => k !== place)));
    this.actions.tell(`${titleOf(work.train[place])} deleted.`);
    document.getElementById(length > 1 ? `train-${Math.min(place, length - 2)}-delete` : "train-kind")?.focus();
  }

  /**
   * @param {number} place
   * @param {string} name
   * @param {string} role
   */
  setRole(place, name, role) {
    const work = this.now();
    const parameter = work.train[place]?.parameters?.[name] ?? {};
    const { label } = parameterLabel(name);
    const value = valueOf(parameter, work.train);
    if (role === "tie") {
      const targets = tieTargets(work.train, place, name);
      const [key] = targets.find(([one]) => one.endsWith(`.${name}`)) ?? targets[0] ?? [];
      if (key) this.tieTo(place, name, key);
      return;
    }
    const typed = Object.fromEntries(Object.entries(work.typed).filter(([key]) => !key.startsWith(`${place}.${name}.`) || key.endsWith(".value")));
    this.commit(role === "free" ? `freeing the ${label}` : `fixing the ${label}`, withParameter({ ...work, typed }, place, name, role === "free" ? { value, free: true } : { value }));
  }

  /**
   * @param {number} place
   * @param {string} name
   * @param {string} key
   */
  tieTo(place, name, key) {
    const work = this.now();
    const parameter = work.train[place]?.parameters?.[name] ?? {};
    const [element = "", other = ""] = key.split(".");
    this.commit(`tying the ${parameterLabel(name).label}`, withParameter(work, place, name, { value: valueOf(parameter, work.train), tie: { ...parameter.tie, element: Number(element), name: other } }));
  }

  now() {
    return /** @type {TrainWork} */ (this.work);
  }

  /**
   * @param {string} name
   * @param {TrainWork} work
   * @param {string} [merge]
   */
  commit(name, work, merge) {
    this.actions.change(name, work, merge);
  }
}

/** A shape without the labels in it. @param {string} shape */
function unlabelled(shape) {
  if (shape === "") return "";
  return JSON.stringify(JSON.parse(shape).map((/** @type {unknown[]} */ [kind, off, , roles]) => [kind, off, roles]));
}

/** @param {Measurement | undefined} measurement */
function sigmaText(measurement) {
  return measurement?.noise?.kind === "uniform" ? fullText(measurement.noise.sigma) : "";
}

/**
 * The first matrix of a text, or why there is none.
 * @param {string} text
 */
function numbersOf(text) {
  try {
    return { matrix: quick.parseMatrices(text, undefined).matrices[0] ?? null, reason: "There are no sixteen numbers." };
  } catch (error) {
    return { matrix: null, reason: /** @type {Error} */ (error).message };
  }
}

/** @param {string} text */
function reasonOf(text) {
  const number = readNumber(text);
  if (number.error === null) return "σ must be above zero.";
  return /\s/.test(text.trim()) ? numbersOf(text).reason : number.error;
}
