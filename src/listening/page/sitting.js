// What a listener did, each entry hashed together with all before it, and runs of "which is which".
class Sitting {
  #pack;
  #seal;
  #sitting;
  #began;
  #hash;
  #entries = [];
  #opened = performance.now();

  constructor(pack, seal) {
    this.#pack = pack;
    this.#seal = seal;
    this.#sitting = Array.from(crypto.getRandomValues(new Uint8Array(16)), (b) => b.toString(16).padStart(2, "0")).join("");
    this.#began = new Date().toISOString();
    this.#hash = sha256(["platewright answers 1", pack, seal, this.#sitting, this.#began].join("\n"));
  }

  get size() { return this.#entries.length; }

  now() { return Math.round(performance.now() - this.#opened); }

  add(entry) {
    this.#hash = sha256(`${this.#hash}\n${JSON.stringify(entry)}`);
    this.#entries.push({ entry, hash: this.#hash });
  }

  file(listener) {
    const last = sha256(`${this.#hash}\n${JSON.stringify(listener)}`);
    const head = { format: 1, pack: this.#pack, seal: this.#seal, sitting: this.#sitting, began: this.#began, listener };
    return JSON.stringify({ ...head, entries: this.#entries, last }, null, 1) + "\n";
  }
}

// A run's order is drawn when it begins and stays in here until its last trial.
class Run {
  #first;
  #second;
  #order;
  #entries = [];
  #begun;

  constructor(number, recording, first, second, trials, now) {
    this.#first = first;
    this.#second = second;
    const drawn = crypto.getRandomValues(new Uint8Array(trials));
    this.#order = Array.from(drawn, (byte) => (byte & 1 ? second : first));
    this.#begun = { kind: "run", run: number, recording, first, second, trials, at_ms: now };
  }

  get trial() { return this.#entries.length + 1; }
  get trials() { return this.#order.length; }
  get done() { return this.#entries.length === this.#order.length; }

  // What to play for A, B and X, out of a map of takes.
  takes(sounds) { return [this.#first, this.#second, this.#order[this.#entries.length]].map((letter) => sounds.get(letter)); }

  answer(isFirst, now) {
    const trial = this.trial, x = this.#order[trial - 1];
    const choice = isFirst ? this.#first : this.#second;
    this.#entries.push({ kind: "trial", run: this.#begun.run, trial, x, choice, at_ms: now });
  }

  // Entries of a finished run, and how many answers were right.
  finish(now) {
    if (!this.done) throw new Error("the run is not over");
    const correct = this.#entries.filter((entry) => entry.x === entry.choice).length;
    return { correct, entries: [this.#begun, ...this.#entries, { kind: "end", run: this.#begun.run, at_ms: now }] };
  }

  stop(now) { return { kind: "broken-off", run: this.#begun.run, done: this.#entries.length, at_ms: now }; }
}

// The probability that guessing gives so many right answers or more.
function byGuessing(correct, trials) {
  let term = 0.5 ** trials, sum = 0;
  for (let k = 0; k <= trials; k += 1) {
    if (k >= correct) sum += term;
    term *= (trials - k) / (k + 1);
  }
  return Math.min(1, sum);
}
