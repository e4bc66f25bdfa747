// Speaking with the service: the stream of views, and single requests.

// The session keeps the token of this tab only. The policy lets no script but
// the page's own read it.
const tokenKey = "token";
let token = "";
try { token = sessionStorage.getItem(tokenKey) ?? ""; } catch { /* kept in memory only */ }

export const signedIn = () => token !== "";
export function signIn(value) {
  token = value;
  try {
    if (value) sessionStorage.setItem(tokenKey, value); else sessionStorage.removeItem(tokenKey);
  } catch { /* kept in memory only */ }
}

const headers = (more) => ({ ...(token ? { Authorization: `Bearer ${token}` } : {}), ...more });

// Refused is an answer that is no success: a problem document (RFC 9457), or
// none at all, status 0.
export class Refused extends Error {
  constructor(status, problem) {
    super(problem.detail || problem.title || "no answer");
    this.status = status;
    this.problem = problem;
  }
}

// ask makes one request. It answers {doc, etag}; a text where it is no JSON.
export async function ask(method, path, { body, type, accept, match, key, within = 8000 } = {}) {
  let res;
  try {
    res = await fetch(path, {
      method, cache: "no-store", signal: AbortSignal.timeout(within),
      headers: headers({
        Accept: accept ?? "application/json",
        ...(body !== undefined ? { "Content-Type": type ?? "application/json" } : {}),
        ...(match ? { "If-Match": match } : {}), ...(key ? { "Idempotency-Key": key } : {}),
      }),
      body: body === undefined ? undefined : typeof body === "string" ? body : JSON.stringify(body),
    });
    const text = await res.text();
    if (!res.ok) {
      let problem = {};
      try { problem = JSON.parse(text); } catch { /* a proxy's page, not the service's word */ }
      throw new Refused(res.status, { title: `status ${res.status}`, ...problem });
    }
    const json = (res.headers.get("Content-Type") ?? "").includes("json");
    return { doc: json ? JSON.parse(text) : text, etag: res.headers.get("ETag") };
  } catch (err) {
    if (err instanceof Refused) throw err;
    throw new Refused(0, { title: "No answer from the server", detail: "it is not known whether it was done: look, then try again" });
  }
}

// key is a new Idempotency-Key: the same request sent again does nothing again.
export const key = () => Array.from(crypto.getRandomValues(new Uint8Array(16)), (b) => b.toString(16).padStart(2, "0")).join("");

const seen = () => new Promise((go) => {
  if (!document.hidden) return go();
  document.addEventListener("visibilitychange", function look() {
    if (document.hidden) return;
    document.removeEventListener("visibilitychange", look);
    go();
  });
});

// silent is how long a stream may say nothing before it is given up, in ms.
const silent = 3000;

// follow reads the stream for ever: heard(name, doc, sinceAsked) for each event,
// ended(status, problem) whenever it breaks. It begins again by itself.
//
// A browser holds few connections to one server, and each stream takes one. A
// page that nobody sees gives its own back, so that the button on the one that
// is seen always has a way.
export async function follow(heard, ended) {
  for (;;) {
    await seen();
    let status = 0, problem = {};
    const stop = new AbortController();
    let watch = setTimeout(() => stop.abort(), silent);
    const alive = () => { clearTimeout(watch); watch = setTimeout(() => stop.abort(), silent); };
    const asked = performance.now();
    const away = setInterval(() => { if (!document.hidden) unseen = 0; else if (++unseen > 10) stop.abort(); }, 1000);
    let unseen = 0;
    try {
      const res = await fetch("/v1/stream", { headers: headers({ Accept: "text/event-stream" }), cache: "no-store", signal: stop.signal });
      status = res.status;
      if (!res.ok) {
        problem = await res.json();
      } else {
        const reader = res.body.pipeThrough(new TextDecoderStream()).getReader();
        let rest = "";
        for (;;) {
          const { value, done } = await reader.read();
          if (done) break;
          alive();
          const parts = (rest + value).split("\n\n");
          rest = parts.pop();
          for (const part of parts) {
            let name = "message", data = "";
            for (const line of part.split("\n")) {
              if (line.startsWith("event: ")) name = line.slice(7);
              else if (line.startsWith("data: ")) data += line.slice(6);
            }
            if (data && heard(name, JSON.parse(data), performance.now() - asked) === false) stop.abort();
          }
        }
      }
    } catch { /* the connection broke, or was given up; ended tells */ }
    clearTimeout(watch);
    clearInterval(away);
    stop.abort();
    ended(status, problem);
    // One that held for a while is asked for again at once; one that is refused,
    // less often.
    const held = status === 200 && performance.now() - asked > 2000;
    await new Promise((again) => setTimeout(again, held ? 50 : 1000));
  }
}
