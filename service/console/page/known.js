// What the page knows, and for how long it may say so.

// limit is the age in ms past which nothing is claimed any more. The promise is
// two seconds; the rest is left for noticing and drawing.
export const limit = 1800;

const lagsKept = 60_000;

// Known holds the newest view and judges its age. A view's age is counted from
// its arrival, by whichever clock went further, so that a machine that slept
// claims nothing; what came late on its way counts as late.
export class Known {
  view = null;
  #came = null;
  #lags = [];

  // take keeps a view; false when it was too long on its way to be believed.
  take(view, sinceAsked) {
    const fast = performance.now(), wall = Date.now();
    const first = this.#came === null;
    const lag = wall - Date.parse(view.at);
    this.#lags = this.#lags.filter((l) => fast - l.fast < lagsKept);
    this.#lags.push({ fast, lag });
    // A simulated clock keeps no pace, so its delay cannot be told.
    const late = view.simulated ? 0 : lag - Math.min(...this.#lags.map((l) => l.lag));
    if ((first && sinceAsked > limit) || !(late <= limit)) {
      this.forget();
      return false;
    }
    this.view = view;
    this.#came = { fast, wall, late };
    return true;
  }

  // forget is for a stream that broke: the next one is measured anew.
  forget() { this.#lags = []; }

  // drop takes every claim down at once.
  drop() {
    this.forget();
    this.#came = null;
  }

  // age is how long ago the newest view was true, in ms; Infinity before the first.
  age() {
    if (!this.#came) return Infinity;
    return Math.max(performance.now() - this.#came.fast, Date.now() - this.#came.wall, 0) + this.#came.late;
  }

  lost() { return !(this.age() <= limit); }

  // now is the service's time in ms, carried on from the newest view.
  now() {
    if (!this.#came) return NaN;
    return Date.parse(this.view.at) + performance.now() - this.#came.fast;
  }
}
