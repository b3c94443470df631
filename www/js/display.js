/** How things are shown and copied: names of the elements, units, the form of what leaves. */
import { choice, fold, make, repaint } from "./dom.js";
import { FORMS, chooseForm } from "./exports.js";
import { fullText, readNumber } from "./format.js";
import { isSingleFile, publicAddress, setPublicAddress } from "./where.js";

/** @typedef {import("./types.js").View} View */

/**
 * A retardance in the unit that the person reads.
 * @param {number} deg
 * @param {View} view
 */
export function retardanceIn(deg, { retardanceUnit, wavelengthNm }) {
  if (retardanceUnit === "waves") return deg / 360;
  return retardanceUnit === "nm" ? (deg / 360) * wavelengthNm : deg;
}

/** How the units are written behind a number. */
export const RETARDANCE_UNIT = { deg: "°", waves: " waves", nm: " nm" };

export class DisplayPanel {
  /**
   * @param {HTMLElement} root
   * @param {{ view: (view: Partial<View>) => void, save: () => void }} actions
   */
  constructor(root, actions) {
    this.root = root;
    this.actions = actions;
    this.wavelength = make("input", { type: "text", id: "wavelength", class: "sigma", inputmode: "decimal", autocomplete: "off", "aria-label": "Wavelength in nanometres" });
    this.wavelength.addEventListener("change", () => {
      const read = readNumber(this.wavelength.value);
      const good = read.error === null && read.value > 0 && read.value < 1e7;
      if (good) {
        this.wavelength.removeAttribute("aria-invalid");
        actions.view({ wavelengthNm: read.value });
      } else this.wavelength.setAttribute("aria-invalid", "true");
    });
    this.address = make("input", { type: "text", id: "public-address", class: "wide", autocomplete: "off", spellcheck: "false", placeholder: "https://…" });
    this.address.addEventListener("change", () => setPublicAddress(this.address.value));
  }

  /** @param {View} view */
  show(view) {
    chooseForm(view.form);
    const { view: change, save } = this.actions;
    if (document.activeElement !== this.wavelength) this.wavelength.value = fullText(view.wavelengthNm);
    if (document.activeElement !== this.address) this.address.value = publicAddress();
    repaint(
      this.root,
      make("h3", null, "Display and copies"),
      make(
        "p",
        { class: "said" },
        "Elements ",
        choice({
          id: "first-index",
          label: "Names of the elements",
          value: String(view.firstIndex),
          options: [
            ["0", "m00 … m33"],
            ["1", "m11 … m44"],
          ],
          change: (value) => change({ firstIndex: value === "1" ? 1 : 0 }),
        }),
        ", retardance in ",
        choice({
          id: "retardance-unit",
          label: "Unit of retardance",
          value: view.retardanceUnit,
          options: [
            ["deg", "degrees"],
            ["waves", "waves"],
            ["nm", "nanometres"],
          ],
          change: (value) => change({ retardanceUnit: value === "waves" || value === "nm" ? value : "deg" }),
        }),
        view.retardanceUnit === "nm" ? [" at ", this.wavelength, " nm"] : null,
        ".",
      ),
      make(
        "p",
        { class: "said" },
        "Copy as ",
        choice({ id: "form", label: "Form of copies", value: view.form, options: FORMS, change: (value) => change({ form: /** @type {import("./types.js").Form} */ (value) }) }),
        " ",
        make("button", { type: "button", id: "save-results", class: "small", onclick: save }, "Save results"),
      ),
      isSingleFile
        ? fold(
            "address-fold",
            "Address for links",
            make("p", { class: "fine" }, "A link from this file holds the fragment alone. If your lab has the page at a public address, links can begin with it:"),
            make("label", null, "Public address ", this.address),
          )
        : null,
    );
  }
}
