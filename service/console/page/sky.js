// The sky from above: azimuth round the picture, elevation from rim to middle.

import { h, svg, put, rows, byID } from "./dom.js";
import { ask } from "./server.js";
import { deg, compass, age } from "./words.js";

const rad = Math.PI / 180, rim = 100;

// A direction is [east, north, up].
const fromHorizon = (az, el) => [Math.cos(el * rad) * Math.sin(az * rad), Math.cos(el * rad) * Math.cos(az * rad), Math.sin(el * rad)];
const fromEquator = (ra, dec) => [Math.cos(dec * rad) * Math.cos(ra * rad), Math.cos(dec * rad) * Math.sin(ra * rad), Math.sin(dec * rad)];
const dot = (a, b) => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
const cross = (a, b) => [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]];
const unit = (a) => { const n = Math.hypot(...a); return a.map((x) => x / n); };
const toHorizon = (d) => ({ az: ((Math.atan2(d[0], d[1]) / rad) + 360) % 360, el: Math.asin(Math.max(-1, Math.min(1, d[2]))) / rad });

// turning makes a map from ICRS to the horizon out of two directions that the
// service gave in both, so that the page reckons no sky of its own. Good for a
// picture; null where no two are far enough apart.
function turning(pairs) {
  for (let i = 0; i < pairs.length; i++) {
    for (let j = 0; j < i; j++) {
      const [a, b] = [pairs[i], pairs[j]];
      if (!(Math.hypot(...cross(a.sky, b.sky)) > 0.05)) continue;
      const frame = (p, q) => { const z = unit(cross(p, q)); return [p, unit(cross(z, p)), z]; };
      const from = frame(a.sky, b.sky), to = frame(a.here, b.here);
      return (v) => { const k = from.map((axis) => dot(axis, v)); return [0, 1, 2].map((n) => k[0] * to[0][n] + k[1] * to[1][n] + k[2] * to[2][n]); };
    }
  }
  return null;
}

// ring is the edge of a cone about a direction.
function ring(dir, radiusDeg, n = 48) {
  const side = unit(cross(dir, Math.abs(dir[2]) < 0.9 ? [0, 0, 1] : [1, 0, 0])), other = cross(dir, side);
  const c = Math.cos(radiusDeg * rad), s = Math.sin(radiusDeg * rad);
  return Array.from({ length: n }, (_, i) => {
    const t = 2 * Math.PI * i / n;
    return [0, 1, 2].map((k) => c * dir[k] + s * (Math.cos(t) * side[k] + Math.sin(t) * other[k]));
  });
}

// regionsOf reads the regions of a list's CSV: their shapes alone.
export function regionsOf(text) {
  const out = [];
  for (const row of text.split("\n")) {
    const f = row.trim().split(",");
    if (row.startsWith("#") || f.length < 10 || f[0] === "region" || !["icrs", "horizon"].includes(f[1])) continue;
    const n = f.slice(2, 9).map(Number);
    out.push(f[1] === "icrs" ? { id: f[0], ra: n[0], dec: n[1], radius: n[2] } : { id: f[0], az: [n[3], n[4]], el: [n[5], n[6]] });
  }
  return out;
}

const regionsDrawn = 300, listsRead = 20, windowsRead = 20_000;

export class Sky {
  #aims = []; #craft = []; #neighbours = []; #regions = []; #sightings = []; #beams = [];
  #came = -Infinity; #lists = ""; #skipped = 0; #total = 0; #names = []; #unnamed = 0;
  mirror = true; // east to the left, as the sky is seen from below

  constructor(known) {
    this.known = known;
    try { this.mirror = localStorage.getItem("east") !== "right"; } catch { /* the usual side */ }
    this.#name();
  }

  turn() {
    this.mirror = !this.mirror;
    try { localStorage.setItem("east", this.mirror ? "left" : "right"); } catch { /* lasts as long as the page */ }
    this.#name();
    this.draw();
  }

  #name() { byID("mirror").replaceChildren(this.mirror ? "East is left" : "East is right", " ", h("kbd", null, "E")); }

  // run asks once a second for what the stream does not carry.
  async run() {
    for (;;) {
      if (!document.hidden && !this.known.lost()) {
        try { await this.#read(); } catch { /* its age tells */ }
      }
      this.draw();
      await new Promise((wait) => setTimeout(wait, 1000));
    }
  }

  async #read() {
    const view = this.known.view;
    const get = async (path) => (await ask("GET", path, { within: 2000 })).doc;
    const started = performance.now();
    const [craft, neighbours, set, ...aims] = await Promise.all([get("/v1/aircraft?limit=500"), get("/v1/neighbours"), get("/v1/beams"), ...view.beams.map((b) => get(`/v1/beams/${encodeURIComponent(b.beam)}/aim`))]);
    this.#craft = craft.aircraft;
    this.#total = craft.total;
    this.#neighbours = neighbours.neighbours;
    this.#aims = aims;
    this.#beams = set.beams;
    const seen = view.beams.some((b) => b.reasons.some((r) => r.code === "sighting"));
    this.#sightings = seen ? (await get("/v1/record?kinds=sighting&order=newest&limit=20")).entries.map((e) => e.body) : [];
    this.#came = started;
    const lists = view.lists.map((l) => l.digest).join();
    if (lists !== this.#lists) {
      const regions = [];
      this.#skipped = view.list_total - Math.min(view.lists.length, listsRead);
      for (const l of view.lists.slice(0, listsRead)) {
        if (l.window_count > windowsRead || l.region_count > regionsDrawn) { this.#skipped++; continue; }
        regions.push(...regionsOf((await ask("GET", `/v1/lists/${encodeURIComponent(l.authority)}/${encodeURIComponent(l.id)}`, { accept: "text/csv" })).doc).map((r) => ({ ...r, list: l.id })));
      }
      this.#regions = regions.slice(0, regionsDrawn);
      this.#lists = lists;
    }
  }

  #place(d) {
    const { az, el } = toHorizon(d);
    const r = rim * (90 - el) / 90, x = r * Math.sin(az * rad);
    return [this.mirror ? -x : x, -r * Math.cos(az * rad)];
  }

  #path(dirs, closed = true) {
    const up = dirs.filter((d) => d[2] > -0.02);
    if (up.length < 2) return "";
    return `M${up.map((d) => this.#place(d).map((v) => v.toFixed(2)).join(" ")).join("L")}${closed ? "Z" : ""}`;
  }

  // label asks for a name beside a place; names are set once all is known, the
  // more important first, each where it hides no other.
  #label(d, text, cls, room = 5, rank = 1) {
    const [x, y] = this.#place(d);
    this.#names.push({ x, y, text, cls, room, rank });
  }

  #setNames() {
    this.#unnamed = 0;
    const taken = this.#names.map((n) => ({ l: n.x - 3, r: n.x + 3, t: n.y - 3, b: n.y + 3 })), out = [];
    for (const n of [...this.#names].sort((a, b) => b.rank - a.rank)) {
      const high = n.rank > 2 ? 6.6 : 5.6, wide = n.text.length * high * 0.56;
      const spots = [[n.room, 2, 0], [-n.room - wide, 2, 0], [-wide / 2, -n.room - 1, 1], [-wide / 2, n.room + high, 1], [n.room, -high, 2], [n.room, high + 2, 2], [-n.room - wide, -high, 2], [-n.room - wide, high + 2, 2],
        [n.room, -2 * high, 3], [n.room, 2 * high + 2, 3], [-n.room - wide, 2 * high + 2, 3], [-n.room - wide, -2 * high, 3]];
      const boxes = spots.map(([dx, dy, far]) => {
        const box = { l: n.x + dx, r: n.x + dx + wide, t: n.y + dy - high * 0.85, b: n.y + dy + high * 0.25 };
        const over = taken.reduce((sum, o) => sum + Math.max(0, Math.min(o.r, box.r) - Math.max(o.l, box.l)) * Math.max(0, Math.min(o.b, box.b) - Math.max(o.t, box.t)), 0);
        return { box, over, cost: over + far + (box.l < -114 || box.r > 114 ? 1000 : 0), at: [n.x + dx, n.y + dy] };
      });
      const best = boxes.reduce((a, b) => (b.cost < a.cost ? b : a));
      // A name that would hide others is left to the table; a beam's never is.
      if (n.rank < 3 && best.over > 8) { this.#unnamed++; continue; }
      taken.push(best.box);
      out.unshift(svg("text", { x: best.at[0].toFixed(1), y: best.at[1].toFixed(1), class: n.cls }, n.text));
    }
    this.#names = [];
    return out;
  }

  #ground() {
    const out = [svg("circle", { r: rim, class: "rim" })];
    for (const el of [30, 60]) {
      out.push(svg("circle", { r: rim * (90 - el) / 90, class: "grid" }));
      out.push(svg("text", { x: 0, y: rim * (90 - el) / 90 + 5.5, class: "scale", "text-anchor": "middle" }, `${el}°`));
    }
    out.push(svg("path", { d: `M0 ${-rim}V${rim}M${-rim} 0H${rim}`, class: "grid" }));
    const e = this.mirror ? -1 : 1;
    for (const [text, x, y] of [["N", 0, -rim - 4], ["S", 0, rim + 10], ["E", e * (rim + 7), 3], ["W", -e * (rim + 7), 3]]) out.push(svg("text", { x, y, class: "wind", "text-anchor": "middle" }, text));
    for (const b of this.#beams) out.push(svg("circle", { r: rim * (90 - b.elevation_min_deg) / 90, class: "least" }));
    return out;
  }

  draw() {
    const stale = this.known.lost() || performance.now() - this.#came > 4000;
    const note = [], table = [], shapes = this.#ground();
    const tell = (key, what, d, more) => { const p = toHorizon(d); table.push({ key, what, az: `${deg(p.az)} ${compass(p.az)}`, el: deg(p.el), more }); };
    if (stale) {
      note.push("Where things are is not known: nothing was heard for more than 2 s.");
    } else {
      const pairs = [...this.#aims, ...this.#neighbours].filter((a) => a.icrs && a.horizon).map((a) => ({ sky: fromEquator(a.icrs.ra_deg, a.icrs.dec_deg), here: fromHorizon(a.horizon.az_deg, a.horizon.el_deg) }));
      const turned = turning(pairs);
      if (!turned && this.#regions.some((r) => r.radius !== undefined)) note.push("Regions fixed to the stars are not drawn: too few directions are known to place them.");
      for (const r of this.#regions) {
        if (r.radius !== undefined) {
          if (!turned) continue;
          const d = turned(fromEquator(r.ra, r.dec));
          if (d[2] < 0) continue;
          shapes.push(svg("path", { d: this.#path(ring(d, Math.max(r.radius, 1.6))), class: r.radius < 1.6 ? "region small" : "region" }));
          this.#label(d, r.id, "region-name", 4, 0);
          tell(`r${r.list}\0${r.id}`, `Region ${r.id}`, d, `list ${r.list}, radius ${r.radius}°`);
        } else {
          const wide = ((r.az[1] - r.az[0]) % 360 + 360) % 360 || 360, n = Math.max(2, Math.ceil(wide / 4));
          const edge = (el, back) => Array.from({ length: n + 1 }, (_, i) => fromHorizon(r.az[0] + wide * (back ? n - i : i) / n, el));
          shapes.push(svg("path", { d: this.#path([...edge(r.el[0]), ...edge(r.el[1], true)]), class: "region" }));
          const middle = fromHorizon(r.az[0] + wide / 2, (r.el[0] + r.el[1]) / 2);
          this.#label(middle, r.id, "region-name", 0, 0);
          tell(`r${r.list}\0${r.id}`, `Region ${r.id}`, middle, `list ${r.list}`);
        }
      }
      this.#sightings.forEach((s, i) => {
        const until = Date.parse(s.said) + s.for_ns / 1e6;
        if (!s.has_direction || s.clear || until < this.known.now()) return;
        shapes.push(svg("path", { d: this.#path(ring(s.direction, s.spread_rad / rad)), class: "sighting" }));
        this.#label(s.direction, "sighting", "notice-name", 0, 2);
        tell(`s${i}`, `Sighting by ${s.source}`, s.direction, "");
      });
      for (const n of this.#neighbours) {
        if (!n.horizon) { note.push(`Where ${n.id} points is not known.`); continue; }
        const d = fromHorizon(n.horizon.az_deg, n.horizon.el_deg);
        shapes.push(svg("path", { d: this.#path(ring(d, Math.max(n.field_radius_deg, 1.8), 4)), class: "field" }));
        this.#label(d, n.id, "name", 5, 1);
        tell(`n${n.id}`, `Field of ${n.id}`, d, `${n.state}, ${age(n.age_s)} old, radius ${n.field_radius_deg}°`);
      }
      let below = 0;
      for (const c of this.#craft) {
        if (!c.located || c.az_deg === null || c.range_m === null) { note.push(`${c.aircraft}: its place is not known.`); continue; }
        if (c.on_ground) continue;
        if (!(c.el_deg > 0)) { below++; continue; }
        const d = fromHorizon(c.az_deg, c.el_deg), at = d.map((k) => k * c.range_m);
        const v = c.track_deg === null || !(c.speed_mps > 0) ? null : [c.speed_mps * Math.sin(c.track_deg * rad), c.speed_mps * Math.cos(c.track_deg * rad), c.climb_mps ?? 0];
        const [x, y] = this.#place(d);
        const cls = c.inside ? "craft near" : "craft";
        if (v) {
          const steps = [0, 10, 20, 30].map((t) => unit(at.map((k, n) => k + v[n] * t)));
          shapes.push(svg("path", { d: this.#path(steps, false), class: "course" }));
          const [x1, y1] = this.#place(unit(at.map((k, n) => k + v[n] * 2)));
          shapes.push(svg("path", { d: "M0 -5 3.4 4 0 2.4 -3.4 4Z", class: cls, transform: `translate(${x.toFixed(2)} ${y.toFixed(2)}) rotate(${(Math.atan2(x1 - x, y - y1) / rad).toFixed(1)})` }));
        } else shapes.push(svg("path", { d: "M0 -4 4 0 0 4 -4 0Z", class: cls, transform: `translate(${x.toFixed(2)} ${y.toFixed(2)})` }));
        const high = c.altitude_m === null ? "" : ` ${(c.altitude_m / 1000).toFixed(1)} km`;
        this.#label(d, `${c.aircraft}${high}`, c.inside ? "name strong" : "name", 7.5, c.inside ? 2 : 1);
        tell(`a${c.aircraft}\0${c.source}`, `Aircraft ${c.aircraft}`, d, `${(c.range_m / 1000).toFixed(1)} km away${high && `, altitude${high}`}${v ? `, course ${deg(c.track_deg)}, ${Math.round(c.speed_mps)} m/s` : ""}, ${age(c.age_s)} old${c.drill ? ", drill" : ""}`);
      }
      for (const a of this.#aims) {
        if (!a.horizon) { note.push(`Where ${a.beam} points is not known.`); continue; }
        const d = fromHorizon(a.horizon.az_deg, a.horizon.el_deg), [x, y] = this.#place(d);
        const state = this.known.view.beams.find((b) => b.beam === a.beam)?.state;
        const at = `translate(${x.toFixed(2)} ${y.toFixed(2)})`;
        shapes.push(state === "open"
          ? svg("g", { class: "beam-mark", transform: at }, svg("circle", { r: 4.2, class: "hollow" }), svg("path", { d: "M0 -8V8M-8 0H8" }))
          : svg("g", { class: "beam-mark", transform: at }, svg("rect", { x: -4, y: -3, width: 8, height: 6, class: "full" })));
        this.#label(d, `${a.beam}, ${state}`, "beam-name", 9, 3);
        tell(`b${a.beam}`, `Beam ${a.beam}, ${state}`, d, `${a.motion}${a.target ? `, on ${a.target}` : ""}`);
      }
      if (below > 0) note.push(`${below} aircraft below the horizon are not drawn.`);
      if (this.#total > this.#craft.length) note.push(`${this.#total - this.#craft.length} more aircraft are not drawn.`);
      if (this.#skipped > 0) note.push(`${this.#skipped} lists are too large to draw.`);
    }
    byID("dome").replaceChildren(svg("svg", { viewBox: "-116 -112 232 226", role: "img", "aria-label": `The sky from above, east ${this.mirror ? "left" : "right"}. The same stands in words below.` }, ...shapes, ...this.#setNames()));
    if (this.#unnamed > 0) note.push(`${this.#unnamed} names are left out for want of room: see the words below.`);
    put(byID("sky-note"), [`East ${this.mirror ? "left, as seen looking up" : "right, as on a map"}. Courses for 30 s.`, ...note].join(" "));
    rows(byID("sky-rows"), table, (t) => t.key, () => {
      const all = [h("th", { scope: "row" }), h("td"), h("td"), h("td")];
      return { el: h("tr", null, ...all), update: (t) => [t.what, t.az, t.el, t.more].forEach((text, i) => put(all[i], text)) };
    }, "Nothing is known.");
  }
}
