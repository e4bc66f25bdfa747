// The service's codes and numbers in plain words. What they mean stands in the
// service; here is only how they are said.

const reasons = {
  "listed-closure": "An authority's list closes this sky",
  "not-covered": "No authority's list covers this time",
  "aircraft": "Aircraft near the beam",
  "sighting": "A spotter saw something",
  "detector-alarm": "A detector raises the alarm or is blind",
  "field-crossing": "The beam would cross a neighbour's field",
  "hold": "A person holds the beam",
  "interlock": "The interlock is not safe",
  "watch-missing": "A spotter's post is not staffed",
  "elevation-limit": "Outside the elevation limits",
  "daylight": "The Sun is too high",
  "aim-unknown": "Where the beam points is not known",
  "slewing": "The telescope is turning",
  "source-silent": "A source is silent",
  "clock": "The clock cannot be trusted",
  "record": "The record does not keep up",
  "shutter-fault": "The shutter is not to be trusted",
  "starting": "The service has just started",
  "reopening": "A short wait after the last closure",
  "rearm": "A person must re-arm",
  "fault": "Something inside went wrong",
};

export const plain = (code) => reasons[code] ?? code;

// within is a plain reason within a sentence.
export const within = (code) => { const words = plain(code); return words[0].toLowerCase() + words.slice(1); };

// Causes after which a person re-arms, as they follow "after".
const causes = {
  "starting": "the start", "interlock": "an unsafe interlock", "detector-alarm": "a detector's alarm", "shutter-fault": "a shutter fault",
  "watch-missing": "an unstaffed post", "clock": "a clock fault", "record": "a fault of the record", "fault": "a fault inside the service",
};
export const after = (codes) => `after ${codes.map((c) => causes[c] ?? within(c)).join(", ")}`;

// What asks for a person's eye stands out; the rest is the calm of the night.
const loud = new Set(["shutter-fault", "fault", "record", "clock", "interlock", "detector-alarm", "watch-missing"]);
export const rank = (code) => (loud.has(code) ? "alarm" : code === "rearm" || code === "aircraft" || code === "sighting" ? "notice" : "calm");

const two = (n) => String(n).padStart(2, "0");

// hms is an instant's time of day in UTC.
export function hms(ms) {
  if (!Number.isFinite(ms)) return "--:--:--";
  const d = new Date(ms);
  return `${two(d.getUTCHours())}:${two(d.getUTCMinutes())}:${two(d.getUTCSeconds())}`;
}

// dated is an instant with its date where that is another day than now.
export function dated(text, nowMS) {
  const ms = Date.parse(text);
  if (!Number.isFinite(ms)) return "not said";
  const day = new Date(ms).toISOString().slice(0, 10);
  const today = Number.isFinite(nowMS) ? new Date(nowMS).toISOString().slice(0, 10) : "";
  return day === today ? hms(ms) : `${day} ${hms(ms).slice(0, 5)}`;
}

// span is a length of time as a clock shows it, its seconds rounded down: the
// time that is left is never told longer than it is.
export function span(seconds) {
  const s = Math.max(0, Math.floor(seconds));
  const hours = Math.floor(s / 3600);
  const rest = `${hours ? two(Math.floor(s / 60) % 60) : Math.floor(s / 60)}:${two(s % 60)}`;
  return hours ? `${hours}:${rest}` : rest;
}

// age is how old something is, rounded up: it is never told younger.
export function age(seconds) {
  if (seconds === null || seconds === undefined) return "never heard";
  if (seconds < 9.95) return `${(Math.ceil(seconds * 10 - 1e-9) / 10).toFixed(1)} s`;
  if (seconds < 120) return `${Math.ceil(seconds)} s`;
  return lasting(seconds);
}

// lasting is a limit or a sum of time.
export function lasting(seconds) {
  if (seconds < 120) return `${Number(seconds.toFixed(1))} s`;
  if (seconds < 7200) return `${Number((seconds / 60).toFixed(1))} min`;
  return `${Number((seconds / 3600).toFixed(1))} h`;
}

const units = { deg: "°", m: " m", s: " s" };
export function margin(m) {
  if (!m) return "";
  const digits = m.unit === "deg" ? 2 : m.unit === "s" ? 1 : 0;
  return `margin ${m.value.toFixed(digits)}${units[m.unit] ?? ` ${m.unit}`}`;
}

export const deg = (v) => (Number.isFinite(v) ? `${v.toFixed(1)}°` : "–");

const points = ["N", "NE", "E", "SE", "S", "SW", "W", "NW"];
export const compass = (az) => points[Math.round((((az % 360) + 360) % 360) / 45) % 8];
