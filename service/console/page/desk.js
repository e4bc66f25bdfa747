// The desk: one form at a time, which says what it will do, does it, and shows
// the service's own words when it is refused.

import { h, put, show, byID } from "./dom.js";
import { Refused, key } from "./server.js";

const advice = {
  0: "", 401: "Sign in, then do it again.", 403: "Your role does not allow it.", 409: "It cannot be done as things stand.",
  412: "It changed since you looked. What it is now is shown; look, then decide.", 422: "Something in the form cannot be taken.",
};

// saying makes a refusal's whole text, in the service's words first.
export function saying(err) {
  if (!(err instanceof Refused)) return "The page failed to do it. Load it again.";
  const p = err.problem;
  const more = (p.errors ?? []).slice(0, 20).map((e) => [e.line ? `line ${e.line}` : "", e.field ?? e.pointer ?? "", e.detail !== p.detail ? e.detail : "", e.mend].filter(Boolean).join(": ")).filter(Boolean).map((m) => `${m[0].toUpperCase()}${m.slice(1)}.`);
  return [`${p.title}${p.detail ? `: ${p.detail}` : ""}.`, ...more, advice[err.status] ?? ""].filter(Boolean).join(" ");
}

let left = null; // where the focus was before the form came

export function leave() {
  const desk = byID("desk");
  if (desk.hidden) return false;
  desk.replaceChildren();
  show(desk, false);
  left?.isConnected ? left.focus() : byID("work").focus();
  left = null;
  return true;
}

export function said(text, bad = false) {
  const el = byID("said");
  el.className = bad ? "alarm" : "";
  put(el, "");
  put(el, text);
}

// open puts a form on the desk. deed: {name, says (texts or elements), fields
// (elements), verb, run(form, key) -> text of what was done, changed()}. The
// same form sent again has the same key, so that it is done once.
export function open(deed) {
  const desk = byID("desk");
  if (desk.hidden) left = document.activeElement;
  said("");
  const problem = h("p", { class: "problem", role: "alert" });
  const does = deed.verb ? h("button", { type: "submit", class: "do" }, deed.verb) : null;
  const form = h("form", { "aria-labelledby": "desk-name", novalidate: true },
    h("h3", { id: "desk-name" }, deed.name), ...deed.says.map((s) => (typeof s === "string" ? h("p", null, s) : s)), ...(deed.fields ?? []), problem,
    h("p", { class: "deeds" }, does, h("button", { type: "button", on: { click: leave } }, "Leave it", " ", h("kbd", null, "Esc"))));
  let once = key(), sent = "";
  form.addEventListener("submit", async (event) => {
    event.preventDefault();
    if (!does || does.disabled) return;
    does.disabled = true;
    put(problem, "");
    // Another content is another request.
    const content = JSON.stringify([...new FormData(form)]);
    if (sent && sent !== content) once = key();
    sent = content;
    try {
      const done = await deed.run(new FormData(form), once);
      if (form.isConnected) leave();
      said(done);
    } catch (err) {
      put(problem, saying(err));
      if (err instanceof Refused && err.status !== 0) once = key();
      if (err instanceof Refused && (err.status === 412 || err.status === 404)) deed.changed?.();
      if (err instanceof Refused && err.status === 401) byID("person").dispatchEvent(new Event("needed"));
    } finally {
      does.disabled = false;
    }
  });
  desk.replaceChildren(form);
  show(desk, true);
  desk.scrollIntoView({ block: "nearest" });
  (form.querySelector("input, select, textarea") ?? does ?? form.querySelector("button")).focus();
  return form;
}

let fields = 0;

// field labels one control.
export function field(label, control, hint) {
  const id = `field-${++fields}`;
  control.id = id;
  const said = hint ? h("span", { class: "hint", id: `${id}-hint` }, hint) : null;
  if (said) control.setAttribute("aria-describedby", said.id);
  return h("p", { class: "field" }, h("label", { for: id }, label), control, said);
}

export const choice = (name, pairs) => h("select", { name }, ...pairs.map(([value, text]) => h("option", { value }, text)));
export const line = (name, more) => h("input", { name, autocomplete: "off", ...more });
