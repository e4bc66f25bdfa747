// Each beam: its state as a word and a shape, until when, and why.

import { h, svg, put, show, rows, byID } from "./dom.js";
import { plain, within, after, rank, hms, span, age, lasting, margin } from "./words.js";

// Three shapes that differ without colour: a ring with the beam through it, a
// block, a broken diamond.
const shapes = {
  open: () => [svg("circle", { cx: 12, cy: 12, r: 8.2, class: "line" }), svg("path", { d: "M12 23V1", class: "line" })],
  shuttered: () => [svg("rect", { x: 3, y: 5.5, width: 18, height: 13, class: "solid" })],
  unknown: () => [svg("path", { d: "M12 1.5 22.5 12 12 22.5 1.5 12Z", class: "line broken" }), svg("path", { d: "M12 7v6.5M12 16v1.6", class: "line" })],
};
const words = { open: "Open", shuttered: "Shuttered", unknown: "Not known" };

function reasonRow() {
  const name = h("strong"), more = h("span", { class: "more" });
  const el = h("li", null, name, " ", more);
  return { el, update: ({ r, now }) => {
    el.className = rank(r.code);
    put(name, plain(r.code));
    const until = Date.parse(r.until ?? "");
    const from = Date.parse(r.from ?? "");
    put(more, [
      r.source, r.detail, r.ref && `reference ${r.ref}`, margin(r.margin),
      from > now + 500 ? `from ${hms(from)}, in ${span((from - now) / 1000)}` : Number.isFinite(until) ? `until ${hms(until)}` : "",
    ].filter(Boolean).join(" · "));
  } };
}

function inputRow() {
  const name = h("span"), old = h("span"), used = svg("rect", { x: 0, y: 0, height: 10, width: 0, class: "used" });
  const bar = svg("svg", { viewBox: "0 0 60 10", class: "bar", preserveAspectRatio: "none", "aria-hidden": "true" }, used, svg("rect", { x: .5, y: .5, width: 59, height: 9, class: "room" }));
  const el = h("li", null, name, old, bar);
  return { el, update: (i) => {
    const late = !(i.age_s !== null && i.age_s <= i.limit_s);
    put(name, late ? `! ${i.source}` : i.source);
    put(old, i.age_s === null ? "never heard" : `${age(i.age_s)} of ${lasting(i.limit_s)}`);
    el.className = late ? "notice" : "";
    const width = String(Math.round(60 * (i.age_s === null ? 1 : Math.min(1, i.age_s / i.limit_s))));
    if (used.getAttribute("width") !== width) used.setAttribute("width", width);
  } };
}

function card(beam, rearm) {
  const shape = svg("svg", { viewBox: "0 0 24 24", class: "shape", "aria-hidden": "true" });
  const word = h("p", { class: "word" }), name = h("h2", null, beam), target = h("span", { class: "target" });
  const count = h("span", { class: "count" }), next = h("p", { class: "next" }), when = h("span", { class: "when" });
  next.append(count, " ", when);
  const why = h("ul", { class: "reasons" }), cautions = h("ul", { class: "cautions" }), coming = h("ul", { class: "coming" });
  const inputs = h("ul"), device = h("p", { class: "device" });
  const wait = h("button", { type: "button", class: "wait", hidden: true, on: { click: () => rearm(beam) } });
  const comingBox = h("details", null, h("summary", null, "What is coming for this aim"), coming);
  const told = h("div", { class: "told" },
    wait, why, cautions, device,
    h("details", { open: true, class: "inputs" }, h("summary", null, "What it rests on: ages against their limits"), inputs), comingBox);
  const el = h("article", { class: "beam claim", "aria-label": `Beam ${beam}` },
    h("div", { class: "head" }, name, target), h("div", { class: "state" }, shape, word), next, told,
    h("p", { class: "veil", "aria-hidden": "true" }, "Not known"));
  let drawn = "";
  const draw = (state) => {
    if (state === drawn) return;
    drawn = state;
    el.dataset.state = state;
    shape.replaceChildren(...shapes[state]());
    put(word, words[state]);
  };
  draw("unknown");
  return {
    el,
    update: ({ b, now, lost }) => {
      if (lost) {
        draw("unknown");
        put(count, "–:––");
        put(when, "no word from the server: ask the laser operator, trust no screen");
        put(target, "");
        show(wait, false);
        return;
      }
      const state = b.state === "open" || b.state === "shuttered" ? b.state : "unknown";
      draw(state);
      put(target, b.target ? `on ${b.target}` : "");
      const until = Date.parse((state === "open" ? b.open_until : b.opens_at) ?? "");
      if (Number.isFinite(until)) {
        put(count, span((until - now) / 1000));
        const first = state === "open" ? b.coming[0] : null;
        put(when, state === "open" ? `to ${hms(until)}, then shuttered${first ? `: ${within(first.code)}` : ""}` : `to ${hms(until)}, when it may open`);
      } else {
        put(count, b.opening ? "Opening" : "–:––");
        put(when, state === "open" ? "no closure in sight" : b.opening ? "once that is on record" : "when it may open cannot be told");
      }
      show(wait, b.rearm.length > 0);
      put(wait, `Re-arm ${beam}, ${after(b.rearm)}`);
      rows(why, b.reasons.map((r) => ({ r, now })), ({ r }) => `${r.code}\0${r.source}\0${r.ref}`, reasonRow);
      show(why, b.reasons.length > 0);
      rows(cautions, b.cautions, (c) => `${c.code}\0${c.source}`, () => {
        const el = h("li");
        return { el, update: (c) => put(el, `Caution: ${c.source ? `${c.source}: ` : ""}${c.detail || plain(c.code)}`) };
      });
      show(cautions, b.cautions.length > 0);
      put(device, `Shutter ${b.shutter === "unknown" ? "not heard" : b.shutter}, laser ${b.emitting === null ? "not heard" : b.emitting ? "emits" : "dark"}, decision ${b.seq}`);
      rows(inputs, b.inputs, (i) => i.source, inputRow, "Nothing was heard");
      rows(coming, b.coming.map((r) => ({ r, now })), ({ r }) => `${r.code}\0${r.source}\0${r.from}`, reasonRow, "Nothing in sight");
    },
  };
}

// Beams draws every beam and says aloud what changed.
export class Beams {
  #spoken = new Map();

  // strip says each beam's state once more, where it stays in sight while the
  // page is scrolled.
  #strip(view, now, lost) {
    rows(byID("strip-beams"), (view?.beams ?? []).map((b) => ({ b, now, lost })), ({ b }) => b.beam, ({ b: first }) => {
      const shape = svg("svg", { viewBox: "0 0 24 24", class: "shape" }), word = h("b"), count = h("span");
      const el = h("li", null, shape, h("span", null, first.beam), word, count);
      return { el, update: ({ b, now, lost }) => {
        const state = !lost && (b.state === "open" || b.state === "shuttered") ? b.state : "unknown";
        if (el.dataset.state !== state) { el.dataset.state = state; shape.replaceChildren(...shapes[state]()); }
        put(word, words[state]);
        const until = Date.parse(b.open_until ?? "");
        put(count, state === "open" && Number.isFinite(until) ? span((until - now) / 1000) : "");
      } };
    });
  }

  constructor(rearm) { this.rearm = rearm; }

  draw(view, now, lost) {
    rows(byID("beams"), (view?.beams ?? []).map((b) => ({ b, now, lost })), ({ b }) => b.beam, ({ b }) => card(b.beam, this.rearm));
    this.#strip(view, now, lost);
    const heads = [];
    for (const b of view?.beams ?? []) {
      const state = lost ? "not known" : b.state;
      heads.push(`${b.beam} ${state.toUpperCase()}`);
      const before = this.#spoken.get(b.beam);
      this.#spoken.set(b.beam, state);
      if (before === undefined || before === state || lost) continue;
      put(byID("polite"), `Beam ${b.beam} is ${state}${b.reasons.length ? `: ${b.reasons.map((r) => plain(r.code)).join("; ")}` : ""}.`);
    }
    const title = lost ? "NOT KNOWN · Beamward" : `${heads.join(" · ")} · Beamward`;
    if (document.title !== title) document.title = title;
  }
}
