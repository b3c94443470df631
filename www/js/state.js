/** The one state of the page, its undo history, and its snapshot for a reload. */

/**
 * @typedef {import("./types.js").Work} Work
 * @typedef {import("./types.js").View} View
 * @typedef {import("./types.js").Measurement} Measurement
 */

const SNAPSHOT = "halfshade";
const SNAPSHOT_VERSION = 1;
/** The history is cut by its size in characters, not by a number of steps. */
const HISTORY_CHARACTERS = 16e6;
/** More matrices than these are not written into the snapshot at every change. */
const MOST_KEPT = 300;

/** @returns {import("./types.js").Convention} */
export function usualConvention() {
  return { angles: "counterclockwise", positiveS3: "clockwise", zeroAngle: "x", time: "plus", order: "rows" };
}

/** @returns {Measurement} */
export function noMeasurement() {
  return {
    cells: Array(16).fill(""),
    text: "",
    options: {},
    pick: 0,
    decimals: null,
    normalised: false,
    absolute: false,
    noise: { kind: "none", sigma: "", given: null },
    instrument: {},
    convention: usualConvention(),
    example: false,
    label: "",
    story: "",
    many: null,
  };
}

/** @returns {Work} */
export function noWork() {
  return { measurement: noMeasurement(), examine: { draws: 2000, seed: 1 }, blocks: {} };
}

/** @returns {View} */
export function usualView() {
  return { task: "realizability", azimuthDeg: 30, elevationDeg: 20, firstIndex: 0, retardanceUnit: "deg", wavelengthNm: 550, form: "tsv" };
}

/**
 * Holds work and view. `commit` makes one undo step, `setView` none. Work objects
 * are never changed in place, so a step is just a reference.
 */
export class Store {
  /** @param {() => void} changed called after every change */
  constructor(changed) {
    /** @type {Work} */
    this.work = noWork();
    /** @type {View} */
    this.view = usualView();
    /** @type {{ work: Work, name: string }[]} */
    this.past = [];
    /** @type {{ work: Work, name: string }[]} */
    this.future = [];
    /** The work that is safe elsewhere: empty, an example, or in a link.
     * @type {Work} */
    this.safe = this.work;
    /** The fragment that this tab loaded or wrote last. */
    this.fragment = "";
    /** @type {string | null} */
    this.merging = null;
    this.changed = changed;
  }

  get unsaved() {
    return this.work !== this.safe;
  }

  /**
   * Take new work over as one step.
   * @param {string} name what was done, as it reads after "Undo"
   * @param {Work} work
   * @param {{ merge?: string, safe?: boolean }} [how] steps with the same `merge` become one,
   *   until `endMerge`
   */
  commit(name, work, how = {}) {
    if (!(how.merge && how.merge === this.merging)) {
      this.past.push({ work: this.work, name });
      this.trim();
    }
    this.merging = how.merge ?? null;
    this.future = [];
    this.work = work;
    if (how.safe) this.safe = work;
    this.changed();
  }

  endMerge() {
    this.merging = null;
  }

  /** @returns {string | null} what was undone */
  undo() {
    const step = this.past.pop();
    if (!step) return null;
    this.merging = null;
    this.future.push({ work: this.work, name: step.name });
    this.work = step.work;
    this.changed();
    return step.name;
  }

  /** @returns {string | null} what was done again */
  redo() {
    const step = this.future.pop();
    if (!step) return null;
    this.merging = null;
    this.past.push({ work: this.work, name: step.name });
    this.work = step.work;
    this.changed();
    return step.name;
  }

  /** @param {Partial<View>} view */
  setView(view) {
    this.view = { ...this.view, ...view };
    this.changed();
  }

  /** Say that the present work is safe in a link. */
  markSafe() {
    this.safe = this.work;
  }

  trim() {
    let size = 0;
    for (let step = this.past.length - 1; step >= 0; step -= 1) {
      size += 1000 + (this.past[step]?.work.measurement.text.length ?? 0);
      if (size > HISTORY_CHARACTERS) {
        this.past.splice(0, step);
        return;
      }
    }
  }

  /** Keep a snapshot in this tab, so that a reload brings it back. */
  keep() {
    const snapshot = { version: SNAPSHOT_VERSION, work: withoutBulk(this.work), view: this.view, fragment: this.fragment, safe: !this.unsaved };
    try {
      sessionStorage.setItem(SNAPSHOT, JSON.stringify(snapshot));
    } catch {
      // Storage can be switched off or full. The work itself is not touched by that.
    }
  }

  /**
   * Bring the snapshot back.
   * @param {string} fragment the fragment of the address now; a fragment that this tab
   *   has not seen is a link that was just opened, and wins
   * @returns {boolean} whether there was one
   */
  restore(fragment) {
    /** @type {{ version?: unknown, work?: Work, view?: View, fragment?: string, safe?: boolean } | null} */
    let snapshot = null;
    try {
      snapshot = JSON.parse(sessionStorage.getItem(SNAPSHOT) ?? "null");
    } catch {
      return false;
    }
    if (snapshot?.version !== SNAPSHOT_VERSION || !snapshot.work || !snapshot.view) return false;
    this.work = { ...noWork(), ...snapshot.work, measurement: { ...noMeasurement(), ...snapshot.work.measurement } };
    this.view = { ...usualView(), ...snapshot.view };
    this.fragment = snapshot.fragment ?? "";
    this.safe = snapshot.safe ? this.work : noWork();
    return this.fragment === fragment || fragment === "";
  }
}

/**
 * The work as a reload brings it back: of a large file only the matrix that is shown.
 * @param {Work} work
 * @returns {Work}
 */
function withoutBulk(work) {
  const { many } = work.measurement;
  if (!many || many.matrices.length <= MOST_KEPT) return work;
  return { ...work, measurement: { ...work.measurement, many: null } };
}
