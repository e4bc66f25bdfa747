// What people do: shutter, hold, release, re-arm, report, confirm, sign in.

import { h, put, rows, byID } from "./dom.js";
import { ask, key, signIn, Refused } from "./server.js";
import { open, field, choice, line, said, saying } from "./desk.js";
import { within, after, dated, lasting } from "./words.js";

const tries = 20;

export class Work {
  constructor(known) { this.known = known; }

  #shuttering = false;
  #since = 0;
  #held = ""; // the hold that the shutter button placed, while it is told

  // shutter places a hold on every beam, and goes on asking until it is
  // answered: the same key each time, so that it is one hold.
  async shutter() {
    const done = byID("shutter-done");
    if (this.#shuttering) return;
    this.#shuttering = true;
    this.#held = "";
    const once = key();
    put(done, "Asking for every beam to be shuttered…");
    done.className = "notice";
    try {
      for (let n = 1; ; n++) {
        try {
          const { doc } = await ask("POST", "/v1/holds", { body: { beam: "*", reason: "shutter all beams, from the console" }, key: once, within: 3000 });
          this.#held = doc.id;
          this.#since = this.known.view?.seq ?? 0;
          put(done, `Every beam is held: hold ${doc.id} of ${doc.by} is on record.`);
          done.className = "";
          return;
        } catch (err) {
          const again = !(err instanceof Refused) || err.status === 0 || err.status === 429 || err.status >= 500;
          done.className = "alarm";
          if (!again || n === tries) {
            put(done, `NOT SHUTTERED FROM HERE. ${saying(err)} Use the interlock.`);
            if (err.status === 401) this.askToken();
            return;
          }
          put(done, `No answer yet: asking again (${n}). Use the interlock if it matters.`);
          await new Promise((wait) => setTimeout(wait, 500));
        }
      }
    } finally {
      this.#shuttering = false;
    }
  }

  #beamNames() { return (this.known.view?.beams ?? []).map((b) => b.beam); }

  hold() {
    open({
      name: "Place a hold", verb: "Shutter and hold",
      says: ["Shutters at once, and keeps shuttered until a person releases it or its time is over. It stands on record with your name."],
      fields: [
        field("Beam", choice("beam", [["*", "every beam"], ...this.#beamNames().map((b) => [b, b])])),
        field("Reason", line("reason", { required: true, maxlength: 500, value: "held from the console" })),
        field("For how long", choice("minutes", [["", "until released"], ["5", "5 minutes"], ["15", "15 minutes"], ["60", "1 hour"]])),
        field("Whose order", choice("order", [["site", "our own"], ["authority", "an authority's, by telephone"]]), "An authority's is released by a second person, with a reference."),
        field("Who called", line("caller", { maxlength: 200 })),
        field("Call back at", line("call_back", { maxlength: 200 })),
      ],
      run: async (form, once) => {
        const body = { beam: form.get("beam"), reason: form.get("reason"), order: form.get("order") };
        for (const name of ["caller", "call_back"]) if (form.get(name)) body[name] = form.get(name);
        if (form.get("minutes")) body.until = `${new Date((this.known.lost() ? Date.now() : this.known.now()) + form.get("minutes") * 60_000).toISOString().slice(0, 19)}Z`;
        const { doc } = await ask("POST", "/v1/holds", { body, key: once });
        return `${doc.beam === "*" ? "Every beam" : `Beam ${doc.beam}`} is held: ${doc.id}, on record by ${doc.by}.`;
      },
    });
  }

  release(id) {
    const hold = (this.known.view?.holds ?? []).find((one) => one.id === id);
    if (!hold) return said("That hold is no longer there.");
    const authority = hold.order === "authority";
    open({
      name: `Release hold ${hold.id}`, verb: "Release",
      says: [`Takes away the hold of ${hold.by} on ${hold.beam === "*" ? "every beam" : hold.beam}: “${hold.reason}”. ${hold.beam === "*" ? "Beams" : "The beam"} may open again once nothing else forbids it.`,
        authority ? `It is an authority's order${hold.caller ? `, called by ${hold.caller}` : ""}${hold.call_back ? `, call back at ${hold.call_back}` : ""}: a second person releases it, with the authority's reference.` : ""].filter(Boolean),
      fields: authority ? [field("The authority's reference", line("reference", { maxlength: 200, required: true }))] : [],
      run: async (form) => {
        await ask("POST", `/v1/holds/${encodeURIComponent(id)}/release`, { body: form.get("reference") ? { reference: form.get("reference") } : {}, match: hold.etag });
        return `Hold ${id} is released, on record with your name.`;
      },
    });
  }

  // rearm shows why a person is asked, as the service has it now, and re-arms
  // only if that is still so.
  async rearm(beam) {
    let got;
    try {
      got = await ask("GET", `/v1/beams/${encodeURIComponent(beam)}`);
    } catch (err) {
      return said(saying(err), true);
    }
    const now = got.doc.now;
    if (now.rearm.length === 0) return said(`Beam ${beam} waits for nobody.`);
    open({
      name: `Re-arm ${beam}`, verb: `Re-arm ${beam}`,
      says: [`A person is asked ${after(now.rearm)}. By this you say that you looked at the cause and that it is over.`,
        `It opens nothing by itself: ${now.reasons.filter((r) => r.code !== "rearm").map((r) => within(r.code)).join("; ") || "nothing else forbids the beam at this moment"}.`],
      fields: [field("What you found", line("note", { maxlength: 500 }), "Kept on record; may be left empty.")],
      run: async (form) => {
        await ask("POST", `/v1/beams/${encodeURIComponent(beam)}/rearm`, { body: form.get("note") ? { note: form.get("note") } : {}, match: got.etag });
        return `Beam ${beam} is re-armed, on record with your name.`;
      },
      changed: async () => { await this.rearm(beam); said("It changed since you looked: this is what it is now.", true); },
    });
  }

  sighting() {
    const spotters = (this.known.view?.sources ?? []).filter((s) => s.kind === "sighting");
    if (spotters.length === 0) return said("No spotter's source is configured or heard of here: place a hold instead.", true);
    const az = [["", "anywhere: the whole sky"], ["0", "north"], ["45", "north-east"], ["90", "east"], ["135", "south-east"], ["180", "south"], ["225", "south-west"], ["270", "west"], ["315", "north-west"]];
    open({
      name: "Report a sighting", verb: "Report",
      says: ["Says that something is in the sky. Every beam near the place is shuttered for as long as you say; without a place, all are."],
      fields: [
        field("Who saw it", choice("source", spotters.map((s) => [s.id, s.id]))),
        field("What", choice("what", [["seen", "something is there"], ["clear", "take back: clear again"]])),
        field("Where", choice("az", az)),
        field("How high", choice("el", [["45", "half way up"], ["20", "low"], ["75", "high"]])),
        field("How sure", choice("spread", [["25", "roughly there"], ["10", "within a fist at arm's length"], ["60", "that half of the sky"]])),
        field("For", choice("for", [["60", "1 minute"], ["30", "30 seconds"], ["180", "3 minutes"], ["600", "10 minutes"]])),
      ],
      run: async (form) => {
        // The service refuses a time ahead of its own, so the newest that it told is given.
        const fact = { kind: "sighting", source: form.get("source"), at: this.known.view.at };
        if (form.get("what") === "clear") fact.clear = true;
        else {
          fact.for_s = Number(form.get("for"));
          if (form.get("az") !== "") Object.assign(fact, { az_deg: Number(form.get("az")), el_deg: Number(form.get("el")), spread_deg: Number(form.get("spread")) });
        }
        const { doc } = await ask("POST", "/v1/facts", { body: `${JSON.stringify(fact)}\n`, type: "application/x-ndjson" });
        if (doc.refused_total > 0) {
          const bad = doc.refused[0];
          throw new Refused(422, { title: "The report was not taken", detail: bad.cause, errors: [{ detail: bad.field ?? "", mend: bad.mend }] });
        }
        return fact.clear ? `Taken: ${fact.source} says clear.` : `Taken: ${fact.source} saw something, for ${lasting(fact.for_s)}.`;
      },
    });
  }

  // confirm shows what a waiting list changes, as the service reckons it, then
  // confirms that very list or nothing.
  async confirm(authority, id) {
    const path = `/v1/lists/${encodeURIComponent(authority)}/${encodeURIComponent(id)}`;
    let head, change;
    try {
      head = await ask("GET", path);
      const csv = await ask("GET", path, { accept: "text/csv", within: 60_000 });
      change = (await ask("POST", "/v1/lists/check", { body: csv.doc, type: "text/csv", within: 60_000 })).doc;
    } catch (err) {
      return said(saying(err), true);
    }
    const l = head.doc, c = change.change, now = this.known.now();
    if (l.needs === "nothing") return said(`List ${id} of ${authority} waits for nobody.`);
    const spans = (title, list, what) => list.length === 0 ? null : h("details", null, h("summary", null, `${title} (${list.length})`),
      h("ul", null, ...list.map((s) => h("li", null, `${what(s)}${dated(s.from, now)} to ${dated(s.until, now)}`))));
    const none = (s) => (s.region ? `${s.region}: ` : "");
    const withdrawal = l.withdrawal_asked_by !== "";
    open({
      name: withdrawal ? `Confirm that ${id} of ${authority} is withdrawn` : `Confirm list ${id} of ${authority}`, verb: withdrawal ? "Confirm the withdrawal" : "Confirm the list",
      says: [
        withdrawal ? `${l.withdrawal_asked_by} asked to take it out of force. What it closes will be closed by it no longer, and what only it opened will be shuttered.`
          : `Brought by ${l.by}, issued ${dated(l.issued, now)}. Its closed windows hold already; by this its open time counts too.`,
        `It covers ${dated(l.covers.from, now)} to ${dated(l.covers.until, now)}, ${l.beams.length ? l.beams.join(", ") : "every beam"}; ${l.region_count} regions, ${l.window_count} windows; the sky that it does not name is ${l.unlisted_sky}.`,
        c.replaced.length ? `Replaces ${c.replaced.join(", ")}.` : "Replaces no list that is in force.",
        `Against what it replaces: opens ${lasting(c.opened_s)}, closes ${lasting(c.closed_s)} (each region on its own)${c.unlisted_sky_was && c.unlisted_sky_was !== l.unlisted_sky ? `; the unnamed sky was ${c.unlisted_sky_was}` : ""}.`,
        spans("Time that becomes covered", c.coverage_added, none), spans("Time no longer covered", c.coverage_lost, none),
        spans("Opened", c.opened, none), spans("Closed", c.closed, none),
        h("p", { class: "digest" }, l.digest),
        l.needs === "second-person" ? "This asks for a second named person: not the one who brought it." : "",
      ].filter(Boolean),
      run: async (form, once) => {
        await ask("POST", `${path}/confirm`, { body: { digest: l.digest }, match: head.etag, key: once });
        return `${withdrawal ? "The withdrawal" : "The list"} is confirmed, on record with your name.`;
      },
      changed: async () => { await this.confirm(authority, id); said("It changed since you looked: this is what it is now.", true); },
    });
  }

  askToken(text) {
    open({
      name: "Sign in", verb: "Sign in",
      says: [text || "The service asks who you are.", "The token stays in this tab and goes to this server alone."],
      fields: [field("Token", line("token", { type: "password", required: true }))],
      run: async (form) => { signIn(form.get("token").trim()); byID("person").dispatchEvent(new Event("signed")); return "The token is sent with what comes next."; },
    });
  }

  // waits is what asks for a person now, in the order of the view.
  waits() {
    const v = this.known.view;
    return [
      ...(v?.beams ?? []).filter((b) => b.rearm.length > 0).map((b) => ({ kind: "rearm", id: b.beam, text: `Beam ${b.beam}: re-arm ${after(b.rearm)}`, verb: `Re-arm ${b.beam}`, go: () => this.rearm(b.beam) })),
      ...(v?.lists ?? []).filter((l) => l.needs !== "nothing").map((l) => ({ kind: "list", id: `${l.authority}/${l.id}`, verb: "Look at it", go: () => this.confirm(l.authority, l.id),
        text: `${l.withdrawal_asked_by ? "Withdrawal of list" : "List"} ${l.id} of ${l.authority}: ${l.needs === "second-person" ? "a second person confirms" : "a person confirms"}` })),
    ];
  }

  draw(view, lost) {
    // What was held is told only as long as it is known to be held still.
    const ours = (o) => o.id === this.#held;
    if (this.#held && (lost || (view.seq > this.#since + 50 || view.holds.length > 0) && !view.holds.some(ours))) {
      this.#held = "";
      put(byID("shutter-done"), "");
    }
    if (lost) return;
    const row = (item) => {
      const text = h("span"), button = h("button", { type: "button" });
      let go = item.go;
      button.addEventListener("click", () => go());
      return { el: h("li", null, text, " ", button), update: (i) => { put(text, i.text); put(button, i.verb); go = i.go; } };
    };
    rows(byID("waiting"), this.waits(), (i) => `${i.kind}\0${i.id}`, row, "Nothing waits for a person.");
    rows(byID("holds"), (view?.holds ?? []).map((o) => ({
      id: o.id, verb: "Release", go: () => this.release(o.id),
      text: `${o.beam === "*" ? "Every beam" : o.beam}: ${o.reason}. By ${o.by}${o.order === "authority" ? ", an authority's order" : ""}${o.until ? `, until ${dated(o.until, this.known.now())}` : ", until released"}${o.now ? "" : ", not at this moment"}`,
    })), (i) => i.id, row, "No hold is placed.");
  }
}
