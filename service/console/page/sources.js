// Sources and lists, with their ages.

import { h, put, rows, byID } from "./dom.js";
import { age, lasting, dated } from "./words.js";

const states = { "heard": "heard", "silent": "silent", "warming-up": "warming up", "not-receiving": "linked, receives nothing" };

const cells = (n) => {
  const head = h("th", { scope: "row" }), rest = Array.from({ length: n - 1 }, () => h("td"));
  const el = h("tr", null, head, ...rest);
  return { el, all: [head, ...rest] };
};

export function drawSources(view, now) {
  rows(byID("source-rows"), view?.sources ?? [], (s) => s.id, () => {
    const { el, all } = cells(6);
    return { el, update: (s) => {
      el.className = s.state === "heard" && s.safe !== false ? "" : s.required ? "alarm" : "notice";
      const texts = [s.id, `${s.kind}${s.required ? "" : ", optional"}`, s.safe === false ? `${states[s.state] ?? s.state}: not safe` : s.safe ? `${states[s.state] ?? s.state}: safe` : states[s.state] ?? s.state,
        age(s.age_s), lasting(s.stale_after_s), s.messages_per_min ? String(Math.round(s.messages_per_min)) : "–"];
      texts.forEach((t, i) => put(all[i], t));
    } };
  }, "No source is configured.");
  rows(byID("list-rows"), (view?.lists ?? []).map((l) => ({ l, now })), ({ l }) => `${l.authority}\0${l.id}`, () => {
    const { el, all } = cells(6);
    return { el, update: ({ l, now }) => {
      el.className = l.needs === "nothing" ? "" : "notice";
      const texts = [`${l.authority} ${l.id}`, l.needs === "nothing" ? l.status.replace("-", " ") : `${l.status.replace("-", " ")}: ${l.needs === "second-person" ? "a second person confirms" : "a person confirms"}`,
        dated(l.covers.until, now), dated(l.issued, now), String(l.window_count), l.by];
      texts.forEach((t, i) => put(all[i], t));
    } };
  }, "No closure list is in force or waiting.");
  const more = (view?.list_total ?? 0) - (view?.lists.length ?? 0);
  const r = view?.record;
  const record = byID("record");
  record.className = r && !r.healthy ? "alarm" : "";
  put(record, r ? `Record ${r.healthy ? "keeps up" : "does not keep up"}, ${lasting(r.behind_s)} behind.${more > 0 ? ` ${more} more lists are not shown.` : ""}` : "");
}
