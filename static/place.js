// The sheet in which a place is chosen: a site, the device's own position, or degrees typed in.

import { byId, el, setText } from "./dom.js";
import { plainNumber } from "./format.js";
import { place as words } from "./words.js";

const FIELDS = ["lat", "lon", "eye_height_m"];
/** 0.001° is 0.1 km: far finer than a bow needs, and no more of a position than need be leaves the device. */
const DECIMALS = 3;

export class PlaceSheet {
  /** `onChoose(place)` tries a place; it resolves when its outlook is there and rejects with an ApiError. */
  constructor(onChoose) {
    this.onChoose = onChoose;
    this.sheet = byId("place");
    this.form = byId("place-form");
    this.current = null;
    byId("place-close").addEventListener("click", () => this.sheet.close());
    byId("locate").addEventListener("click", () => this.locate());
    this.form.addEventListener("submit", (event) => {
      event.preventDefault();
      this.submit();
    });
  }

  open(sites, current) {
    this.current = current;
    this.say("");
    byId("sites").replaceChildren(
      ...sites.map((site) => {
        const key = el("button", { type: "button", "aria-pressed": String(current?.site === site.name) }, site.label ?? site.name);
        key.addEventListener("click", () => this.choose({ site: site.name }));
        return el("li", {}, key);
      }),
    );
    if (current && !current.site) for (const name of FIELDS) this.form.elements[name].value = current[name] ?? "";
    if (!this.sheet.open) this.sheet.showModal();
  }

  locate() {
    if (!navigator.geolocation) {
      this.say(words.locate_missing);
      return;
    }
    this.say(words.locating);
    navigator.geolocation.getCurrentPosition(
      ({ coords }) => {
        const found = { lat: coords.latitude.toFixed(DECIMALS), lon: coords.longitude.toFixed(DECIMALS) };
        for (const name of FIELDS) this.form.elements[name].value = found[name] ?? "";
        this.choose(found);
      },
      ({ code }) => this.say([words.locate_missing, words.locate_denied, words.locate_unavailable, words.locate_timeout][code] ?? words.locate_unavailable),
      { maximumAge: 60000, timeout: 20000 },
    );
  }

  submit() {
    const typed = {};
    for (const name of FIELDS) {
      const text = this.form.elements[name].value;
      if (name !== "eye_height_m" || text.trim()) typed[name] = plainNumber(text);
    }
    this.choose(typed);
  }

  async choose(place) {
    this.say(words.looking);
    byId("place-go").disabled = true;
    try {
      await this.onChoose(place);
      this.sheet.close();
    } catch (error) {
      if (error.name !== "AbortError") this.refuse(error);
    } finally {
      byId("place-go").disabled = false;
    }
  }

  refuse({ kind, detail, fields }) {
    if (kind !== "problem") {
      this.say(words.unreachable);
      return;
    }
    const known = fields.filter(({ field }) => FIELDS.includes(field));
    const others = fields.filter(({ field }) => !FIELDS.includes(field)).map((f) => f.detail);
    this.say(known.length ? [words.fields_wrong, ...others].join(" ") : others.join(" ") || detail, known);
    if (known.length) this.form.elements[known[0].field].focus();
  }

  /** Shows a message, and what is wrong beside each field. */
  say(message, wrong = []) {
    setText(byId("place-message"), message);
    for (const name of FIELDS) {
      const problem = wrong.find((w) => w.field === name);
      setText(byId(`error-${name}`), problem?.detail ?? "");
      this.form.elements[name].setAttribute("aria-invalid", String(Boolean(problem)));
    }
  }
}
