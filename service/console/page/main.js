// The page: joins the stream to what is drawn, and keys and buttons to work.

import { h, put, show, byID } from "./dom.js";
import { ask, follow, signedIn, signIn } from "./server.js";
import { Known } from "./known.js";
import { Beams } from "./beams.js";
import { Work } from "./work.js";
import { Sky } from "./sky.js";
import { drawSources } from "./sources.js";
import { leave, said } from "./desk.js";
import { hms } from "./words.js";

const known = new Known();
const work = new Work(known);
const beams = new Beams((beam) => work.rearm(beam));
const sky = new Sky(known);

const root = document.documentElement;
let trouble = "", wasLost = true, even = false, asked = false, boot = "";

function draw() {
  const lost = known.lost(), now = known.now(), view = known.view;
  document.body.classList.toggle("lost", lost);
  const age = known.age();
  put(byID("utc"), lost ? "--:--:--" : hms(now));
  put(byID("link"), !lost ? (view.fresh ? "Heard" : "Heard, but what the service decided last is too old to be believed") : Number.isFinite(age) ? `NOT KNOWN: no word for ${Math.floor(age / 1000)} s. ${trouble}` : `NOT KNOWN: no word from the server yet. ${trouble}`);
  if (view) {
    put(byID("site"), view.site);
    show(byID("simulated"), view.simulated);
  }
  beams.draw(view, now, lost);
  if (lost !== wasLost) {
    put(byID("urgent"), lost ? "The server is lost. Nothing on this page is known any more." : "The server is heard again.");
    wasLost = lost;
    sky.draw();
  }
  work.draw(view, lost);
  if (lost) return;
  drawSources(view, now);
}

// The curtain of the style sheet comes down within two seconds of the newest
// view, whether this script still runs or not.
function lift() {
  even = !even;
  document.body.classList.toggle("even", even);
  document.body.classList.toggle("odd", !even);
}

let due = false;
function soon() {
  if (due) return;
  due = true;
  requestAnimationFrame(() => { due = false; draw(); });
}

function heard(name, doc, sinceAsked) {
  if (name === "view") {
    if (!known.take(doc, sinceAsked)) return false;
    trouble = "";
    if (boot && boot !== doc.boot_id) renew();
    boot = doc.boot_id;
    lift();
    soon();
  } else if (name === "decision" && known.view) {
    // A change of one beam, ahead of the next view. It renews nothing.
    known.view.beams = known.view.beams.map((b) => (b.beam === doc.beam && doc.seq >= b.seq ? doc : b));
    soon();
  }
  return true;
}

// renew loads the page again where the server has another version of it.
async function renew() {
  try {
    const build = (await ask("GET", "/console/build", { accept: "text/plain" })).doc.trim();
    if (/^[0-9a-f]{16}$/.test(build) && build !== root.dataset.build) location.reload();
  } catch { /* the stream tells that the server is lost */ }
}

function ended(status, problem) {
  known.forget();
  trouble = status === 401 && !signedIn() ? "Sign in first." : status >= 400 ? `${problem.title ?? status}${problem.detail ? `: ${problem.detail}` : ""}.` : "";
  if (status === 401 || status === 403) known.drop(); // whoever may not see is shown nothing more
  if (status === 401 && !asked) {
    asked = true;
    const text = signedIn() ? `${problem.detail ?? problem.title}.` : "";
    signIn("");
    work.askToken(text);
  }
  draw();
  renew();
}

function theme() {
  const next = root.dataset.theme === "night" ? "day" : "night";
  root.dataset.theme = next;
  try { localStorage.setItem("theme", next); } catch { /* lasts as long as the page */ }
  named();
}
function named() {
  byID("theme").replaceChildren(root.dataset.theme === "night" ? "Day" : "Night", " ", h("kbd", null, "N"));
}

function go(id) {
  const el = byID(id);
  el.scrollIntoView({ block: "start" });
  el.focus({ preventScroll: true });
}

function next(kind) {
  const one = work.waits().find((w) => w.kind === kind);
  if (one) one.go(); else said(kind === "rearm" ? "No beam waits to be re-armed." : "No list waits for confirmation.");
}

const help = byID("help");
const keys = {
  s: () => work.shutter(), g: () => work.sighting(), h: () => work.hold(), r: () => next("rearm"), l: () => next("list"),
  u: () => { const first = known.view?.holds[0]; if (first) work.release(first.id); else said("No hold is placed."); },
  e: () => sky.turn(), n: theme, "?": () => (help.open ? help.close() : help.showModal()),
  1: () => go("beams"), 2: () => go("sky"), 3: () => go("work"), 4: () => go("sources"),
};

document.addEventListener("keydown", (event) => {
  if (event.key === "F9") {
    event.preventDefault();
    if (!event.repeat) work.shutter();
    return;
  }
  if (event.key === "Escape" && !help.open && leave()) return event.preventDefault();
  const writing = event.target.closest?.("input, textarea, select");
  if (writing || event.ctrlKey || event.metaKey || event.altKey || event.repeat) return;
  const does = keys[event.key.toLowerCase()];
  if (!does || (help.open && event.key !== "?" && event.key.toLowerCase() !== "s")) return;
  event.preventDefault();
  does();
});

const on = (id, does) => byID(id).addEventListener("click", does);
on("shutter", keys.s);
on("sighting", keys.g);
on("hold", keys.h);
on("mirror", keys.e);
on("theme", theme);
on("keys", () => help.showModal());
on("help-close", () => help.close());
const person = byID("person");
person.addEventListener("click", () => { signIn(""); location.reload(); });
person.addEventListener("needed", () => work.askToken());
person.addEventListener("signed", () => { asked = false; show(person, true); });
show(person, signedIn());

named();
draw();
setInterval(draw, 100);
document.addEventListener("visibilitychange", draw);
addEventListener("pageshow", draw);
follow(heard, ended);
sky.run();
renew();
