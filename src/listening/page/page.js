(() => {
  "use strict";
  const pack = JSON.parse(document.getElementById("pack-data").textContent);
  const id = (name) => document.getElementById(name);
  const sitting = new Sitting(pack.pack, pack.seal);
  const PLAY = "M7 4.5v15L20 12z", PAUSE = "M6 5h4v14H6zM14 5h4v14h-4z";
  const SHORTEST_PART = 0.5;

  let context = null, player = null, recording = null, sounds = null;
  let pairs = [], pair = 0, run = null, runs = 0, unsaved = 0, heardX = false;
  const preferences = new Map();

  // ---- words

  const number = (n, one, many) => (n === 1 ? `1 ${one}` : `${n} ${many}`);
  const clock = (seconds) => `${Math.floor(seconds / 60)}:${(seconds % 60).toFixed(1).padStart(4, "0")}`;
  const show = (name, visible) => { id(name).hidden = !visible; };

  function introduce() {
    const most = Math.max(...pack.recordings.map((r) => r.letters.length));
    const music = pack.recordings.length > 1 ? `${number(pack.recordings.length, "recording", "recordings")}, each` : "One recording";
    id("about").textContent = `${music} in ${most} takes of equal loudness. Nothing differs between them but the circuit that the music went through. Can you tell them apart, and which one would you keep?`;
    id("trial-count").textContent = pack.trials;
    id("pack-id").textContent = pack.pack.slice(0, 8);
    pack.recordings.forEach((r) => {
      const button = document.createElement("button");
      button.textContent = `Recording ${r.number}`;
      button.addEventListener("click", () => open(r));
      id("recordings").append(button);
    });
    show("recordings", pack.recordings.length > 1);
  }

  function trouble(error) {
    id("trouble").textContent = error.message || String(error);
    show("trouble", true);
  }

  // ---- sound

  async function begin() {
    id("begin").disabled = true;
    id("begin").textContent = "Reading the takes…";
    try {
      if (await open(pack.recordings[0])) {
        show("first", false);
        ["ways", "answers", "keys", "deck"].forEach((name) => show(name, true));
        toggle();
        id("play").focus({ preventScroll: true });
        return;
      }
    } catch (error) {
      trouble(error);
    }
    id("begin").disabled = false;
    id("begin").textContent = "Start softly";
  }

  // Opens a recording; one audio context a sample rate, so that browsers resample nothing inside the graph.
  async function open(next) {
    if (run || next === recording) return true;
    try {
      if (player) pause();
      if (!context || context.sampleRate !== next.rate) {
        if (context) await context.close();
        context = new AudioContext({ sampleRate: next.rate, latencyHint: "interactive" });
        player = new Player(context, Number(id("volume").value));
      }
      sounds = await Sounds.of(next);
      recording = next;
      player.reset();
      show("trouble", false);
    } catch (error) {
      trouble(error);
      return false;
    }
    pairs = [];
    next.letters.forEach((a, i) => next.letters.slice(i + 1).forEach((b) => pairs.push([a, b])));
    pair = 0;
    [...id("recordings").children].forEach((button, i) => button.setAttribute("aria-pressed", pack.recordings[i] === next));
    id("position").max = next.seconds;
    listPairs();
    showPair();
    loadBeside();
    showLoop();
    return true;
  }

  function pause() {
    player.pause();
    id("play-shape").setAttribute("d", PLAY);
    id("play").setAttribute("aria-label", "Play");
  }

  function toggle() {
    if (player.playing) return pause();
    context.resume();
    player.play();
    noteHeard();
    id("play-shape").setAttribute("d", PAUSE);
    id("play").setAttribute("aria-label", "Pause");
    return undefined;
  }

  function showTime() {
    if (player && recording) {
      const place = player.position();
      if (document.activeElement !== id("position") || player.playing) id("position").value = place;
      id("clock").textContent = `${clock(place)} of ${clock(recording.seconds)}`;
    }
    requestAnimationFrame(showTime);
  }

  function repeat(from, to) {
    if (to - from < SHORTEST_PART) return;
    player.repeat(from, to);
    showLoop();
  }

  function showLoop() {
    const all = player.from === 0 && player.to === fullLength();
    id("loop-part").style.left = `${(100 * player.from) / recording.seconds}%`;
    id("loop-part").style.right = `${100 - (100 * player.to) / recording.seconds}%`;
    id("loop-all").disabled = all;
  }

  function fullLength() { return sounds.get(recording.letters[0]).duration; }

  function setVolume(decibels) {
    const value = Math.min(0, Math.max(-50, decibels));
    id("volume").value = value;
    id("volume-text").textContent = `${value < 0 ? "−" : ""}${Math.abs(value)} dB`;
    if (player) player.level(value);
  }

  // ---- the big letters

  function letterButtons(place, names, choose) {
    id(place).replaceChildren(...names.map((name, i) => {
      const button = document.createElement("button");
      button.textContent = name;
      button.setAttribute("aria-pressed", i === 0);
      button.setAttribute("aria-label", `Listen to ${name}`);
      button.addEventListener("click", () => choose(i));
      return button;
    }));
  }

  function choose(index) {
    if (!player) return;
    player.choose(index);
    noteHeard();
    const place = run ? "slots" : "takes";
    [...id(place).children].forEach((button, i) => button.setAttribute("aria-pressed", i === index));
  }

  function loadBeside() {
    player.load(recording.letters.map((letter) => sounds.get(letter)), 0);
    letterButtons("takes", recording.letters, choose);
  }

  // ---- side by side

  const pairKey = () => `${recording.number} ${pairs[pair].join(" ")}`;

  function showPair() {
    const [first, second] = pairs[pair], kept = preferences.get(pairKey());
    id("pair-title").textContent = pairs.length > 1 ? `${first} and ${second}: pair ${pair + 1} of ${pairs.length}` : `${first} and ${second}`;
    id("prefer-first").textContent = first;
    id("prefer-second").textContent = second;
    document.querySelectorAll("input[name=preference]").forEach((input) => { input.checked = kept !== undefined && kept.choice === input.value; });
    id("note").value = kept ? kept.note : "";
    id("kept").textContent = kept ? "Kept." : "";
    show("pair-back", pairs.length > 1);
    show("pair-next", pairs.length > 1);
  }

  function turnPair(by) {
    pair = (pair + by + pairs.length) % pairs.length;
    showPair();
  }

  function keepPreference() {
    const checked = document.querySelector("input[name=preference]:checked");
    if (!checked) {
      id("kept").textContent = "Choose one of the three first.";
      return;
    }
    const [first, second] = pairs[pair];
    const note = id("note").value.replace(/[\ud800-\udfff]/gu, "").trim();
    const choice = { first, second, none: "none" }[checked.value];
    sitting.add({ kind: "preference", recording: recording.number, first, second, choice, note, at_ms: sitting.now() });
    preferences.set(pairKey(), { choice: checked.value, note });
    id("kept").textContent = "Kept.";
    unsaved += 1;
    countAnswers();
  }

  // ---- which is which

  function listPairs() {
    id("which-pair").replaceChildren(...pairs.map(([first, second], i) => new Option(`${first} as A, ${second} as B`, i)));
  }

  function lockForRun(locked) {
    ["way-beside", "way-which", "save", ...[...id("recordings").children]].forEach((button) => {
      (button instanceof HTMLElement ? button : id(button)).disabled = locked;
    });
    show("answers", !locked);
    show("which-before", !locked);
    show("which-during", locked);
  }

  function beginRun() {
    const [first, second] = pairs[Number(id("which-pair").value)];
    runs += 1;
    run = new Run(runs, recording.number, first, second, pack.trials, sitting.now());
    show("result", false);
    lockForRun(true);
    unsaved += 1;
    showTrial();
    if (!player.playing) toggle();
  }

  function showTrial() {
    heardX = false;
    player.load(run.takes(sounds), 0);
    letterButtons("slots", ["A", "B", "X"], choose);
    document.querySelectorAll("input[name=verdict]").forEach((input) => { input.checked = false; });
    id("trial-title").textContent = `Trial ${run.trial} of ${run.trials}`;
    id("trial-next").textContent = run.trial === run.trials ? "Finish the run" : "Next trial";
    id("hint").textContent = "";
    id("trial-title").focus({ preventScroll: true });
  }

  function noteHeard() { if (run && player.playing && player.chosen === 2) heardX = true; }

  function answerTrial() {
    const checked = document.querySelector("input[name=verdict]:checked");
    if (!checked || !heardX) {
      id("hint").textContent = heardX ? "Say which one X is first." : "Listen to X first.";
      return;
    }
    run.answer(checked.value === "first", sitting.now());
    if (run.done) endRun();
    else showTrial();
  }

  function endRun() {
    const { correct, entries } = run.finish(sitting.now());
    const trials = run.trials, probability = byGuessing(correct, trials);
    entries.forEach((entry) => sitting.add(entry));
    leaveRun();
    const figure = document.createElement("p"), meaning = document.createElement("p");
    figure.className = "figure";
    figure.textContent = `${correct} of ${trials} right`;
    const chance = probability < 0.001 ? "less than once in a thousand runs" : probability > 0.5 ? "in more than every second run" : `in one run of ${Math.round(1 / probability)}`;
    const verdict = probability <= 0.05 ? "It is fair to say that you heard a difference." : "That does not show that you heard a difference, nor that there is none.";
    meaning.textContent = `Guessing gives as many or more ${chance}. ${verdict}`;
    id("result").replaceChildren(figure, meaning);
    show("result", true);
    id("result").scrollIntoView({ block: "nearest" });
  }

  function stopRun() {
    sitting.add(run.stop(sitting.now()));
    leaveRun();
  }

  function leaveRun() {
    run = null;
    lockForRun(false);
    loadBeside();
    countAnswers();
  }

  function way(which) {
    if (run) return;
    show("beside", !which);
    show("which", which);
    id("way-beside").setAttribute("aria-pressed", !which);
    id("way-which").setAttribute("aria-pressed", which);
  }

  // ---- answers

  function countAnswers() {
    id("answers-count").textContent = sitting.size === 0 ? "There are none yet." : unsaved > 0 ? "There are answers that have not been saved." : "All answers are saved.";
    id("save").disabled = sitting.size === 0 || run !== null;
  }

  function save() {
    const nickname = id("nickname").value.replace(/[\ud800-\udfff]/gu, "").trim();
    const text = sitting.file(nickname === "" ? null : nickname);
    const link = document.createElement("a");
    link.href = URL.createObjectURL(new Blob([text], { type: "application/json" }));
    const name = nickname.replace(/[^\p{L}\p{N}]+/gu, "-").replace(/^-|-$/g, "");
    link.download = `answers-${pack.pack.slice(0, 8)}${name ? `-${name}` : ""}.json`;
    link.click();
    setTimeout(() => URL.revokeObjectURL(link.href), 60000);
    unsaved = 0;
    countAnswers();
  }

  // ---- keys

  function key(event) {
    if (!player || id("deck").hidden || event.ctrlKey || event.altKey || event.metaKey) return;
    const at = document.activeElement, pressed = event.key.length === 1 ? event.key.toUpperCase() : event.key;
    if (at.matches("textarea, input[type=text], select")) return;
    const own = at.matches("button, summary") && at.matches(":focus-visible");
    if (own && (pressed === " " || pressed === "Enter")) return;
    if (at.matches("input[type=range]") && pressed.startsWith("Arrow")) return;
    if (at.matches("input[type=radio]") && pressed.startsWith("Arrow")) return;
    const letters = run ? ["A", "B", "X"] : recording.letters;
    const actions = {
      P: toggle, " ": toggle,
      ArrowLeft: () => player.seek(player.position() - 1), ArrowRight: () => player.seek(player.position() + 1),
      "[": () => repeat(player.position(), player.to), "]": () => repeat(player.from, player.position()),
      0: () => repeat(0, fullLength()),
      "-": () => setVolume(Number(id("volume").value) - 1), "+": () => setVolume(Number(id("volume").value) + 1),
      "=": () => setVolume(Number(id("volume").value) + 1),
    };
    letters.forEach((letter, i) => { actions[letter] = () => choose(i); });
    if (run) Object.assign(actions, { 1: () => tick("verdict", 0), 2: () => tick("verdict", 1), Enter: answerTrial });
    else if (!id("beside").hidden) Object.assign(actions, { 1: () => tick("preference", 0), 2: () => tick("preference", 2), 3: () => tick("preference", 1), Enter: keepPreference, ",": () => turnPair(-1), ".": () => turnPair(1) });
    const action = actions[pressed];
    if (!action) return;
    event.preventDefault();
    action();
  }

  function tick(name, index) { document.querySelectorAll(`input[name=${name}]`)[index].checked = true; }

  // ---- everything together

  introduce();
  setVolume(Number(id("volume").value));
  countAnswers();
  const on = (name, action, event = "click") => id(name).addEventListener(event, action);
  on("begin", begin);
  on("play", toggle);
  on("position", () => player.seek(Number(id("position").value)), "input");
  on("volume", () => setVolume(Number(id("volume").value)), "input");
  on("loop-from", () => repeat(player.position(), player.to));
  on("loop-to", () => repeat(player.from, player.position()));
  on("loop-all", () => repeat(0, fullLength()));
  on("way-beside", () => way(false));
  on("way-which", () => way(true));
  on("pair-back", () => turnPair(-1));
  on("pair-next", () => turnPair(1));
  on("keep-preference", keepPreference);
  on("run-begin", beginRun);
  on("trial-next", answerTrial);
  on("run-stop", stopRun);
  on("save", save);
  document.addEventListener("keydown", key);
  window.addEventListener("beforeunload", (event) => { if (unsaved > 0) event.preventDefault(); });
  requestAnimationFrame(showTime);
})();
