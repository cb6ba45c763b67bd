//! The listener's page in a real browser, opened from a file: it plays, switches in place, hides X, and its answers tally.
#![allow(clippy::disallowed_methods, reason = "test signals need not be the same on every CPU")]

#[path = "support/browser.rs"]
mod browser;
#[path = "support/pack.rs"]
mod pack;
mod support;

use std::path::PathBuf;

use browser::Browser;
use serde_json::{Value, json};
use support::Folder;

/// Draws of the page come from here instead of from chance: `draws` are the bytes of the next runs' orders, in turn.
/// Sixteen bytes are drawn for the sitting first.
fn drawing(runs: &[[u8; 16]]) -> String {
    format!(
        "(() => {{
           const draws = {};
           let count = 0;
           crypto.getRandomValues = (array) => {{
             array.set(count === 0 ? new Array(array.length).fill(7) : draws[(count - 1) % draws.length]);
             count += 1;
             return array;
           }};
         }})();",
        json!(runs)
    )
}

/// Keeps the page's audio contexts where a test finds them, and records what goes to the loudspeakers.
const TAP: &str = "(() => {
  const connect = AudioNode.prototype.connect;
  window.tapped = { context: null, blocks: [] };
  AudioNode.prototype.connect = function (target, ...rest) {
    if (target === this.context.destination && this.context instanceof AudioContext && !this.tap) {
      const tap = this.context.createScriptProcessor(4096, 1, 1);
      this.tap = tap;
      window.tapped.context = this.context;
      tap.onaudioprocess = (event) => window.tapped.blocks.push(event.inputBuffer.getChannelData(0).slice());
      connect.call(this, tap);
      connect.call(tap, target);
      return target;
    }
    return connect.call(this, target, ...rest);
  };
})();";

/// A pack of two takes of noise, which is like itself at one place alone.
fn folder() -> (Folder, Value) {
    let folder = Folder::new();
    folder.write("stage.toml", pack::stage_with("[compare]\n\"gain.bypass.engaged\" = [true, false]\n").as_bytes());
    let noise = pack::noise(3, 2 * 48_000).iter().map(|sample| 0.2 * sample).collect();
    pack::write_wav(&folder.path("take.wav"), 48_000, &[noise]);
    let key = pack::make(&folder, &["--play", "take.wav", "--into", "pack"]);
    (folder, key)
}

fn begin(browser: &Browser, folder: &Folder) {
    browser.open(&folder.path("pack/send/index.html"));
    browser.click("#begin");
    browser.wait("!document.getElementById('deck').hidden");
}

/// Starts a run by pointer, and listens to X of the first trial.
fn begin_run(browser: &Browser) {
    browser.click("#way-which");
    browser.click("#run-begin");
}

/// Listens to X and answers: 1 is A, 2 is B.
fn answer(browser: &Browser, key: &str) {
    browser.keys("X");
    browser.keys(key);
    browser.keys("\n");
}

fn tally(folder: &Folder, answers: &[PathBuf], more: &[&str]) -> support::Run {
    let paths: Vec<String> = answers.iter().map(|path| path.display().to_string()).collect();
    let mut arguments = vec!["listen", "tally", "pack"];
    arguments.extend(paths.iter().map(String::as_str));
    arguments.extend(more);
    folder.run(&arguments)
}

#[test]
fn it_plays_and_switches_in_place() {
    let (folder, _) = folder();
    let browser = Browser::start();
    browser.before_pages(TAP);
    begin(&browser, &folder);
    let clock = || browser.value("tapped.context.currentTime").as_f64().unwrap();
    let before = clock();
    browser.wait("tapped.blocks.length > 12");
    assert!(clock() > before + 0.3, "the audio clock advances");
    browser.keys("M");
    let switched = browser.value("tapped.blocks.length").as_u64().unwrap();
    browser.wait(&format!("tapped.blocks.length > {}", switched + 6));
    browser.keys("K");
    browser.keys("M");
    // What was heard, held against the takes: where in the music each block begins, and which take it is like.
    let heard = browser.run(
        "const data = JSON.parse(document.getElementById('pack-data').textContent).recordings[0];
         return Sounds.of(data).then((sounds) => {
           const takes = data.letters.map((letter) => sounds.get(letter).getChannelData(0));
           const length = takes[0].length, size = 512;
           return tapped.blocks.slice(4).map((block) => takes.map((take) => {
             let best = 0, place = -1, own = 0;
             for (let n = 0; n < size; n += 1) own += block[n] * block[n];
             for (let at = 0; at < length - size; at += 1) {
               let sum = 0, energy = 0;
               for (let n = 0; n < size; n += 1) { sum += block[n] * take[at + n]; energy += take[at + n] * take[at + n]; }
               const likeness = sum / Math.sqrt(energy * own + 1e-30);
               if (likeness > best) { best = likeness; place = at; }
             }
             return { likeness: best, place };
           }));
         });",
    );
    let heard = heard.as_array().unwrap();
    let mut letters = Vec::new();
    let mut last: Option<(usize, f64)> = None;
    for (block, likes) in heard.iter().enumerate() {
        let likeness = |take: usize| likes[take]["likeness"].as_f64().unwrap();
        let best = usize::from(likeness(1) > likeness(0));
        if likeness(best) < 0.9999 {
            continue; // The end of the loop, or the cross-fade itself.
        }
        let place = likes[best]["place"].as_f64().unwrap();
        if let Some((earlier, from)) = last {
            let due = (from + 4096.0 * (block - earlier) as f64).rem_euclid(96_000.0);
            let off = (place - due + 48_000.0).rem_euclid(96_000.0) - 48_000.0;
            assert!(off.abs() / 48_000.0 < 0.005, "{off} samples off at block {block}");
        }
        last = Some((block, place));
        letters.push(best);
    }
    assert!(letters.len() > 12 && letters.contains(&0) && letters.contains(&1), "{letters:?}");
    // The test's own tap is of a kind that goes out of use.
    let complaints: Vec<String> =
        browser.console().into_iter().filter(|m| !m.contains("ScriptProcessorNode")).collect();
    assert_eq!(complaints, [""; 0], "the page has nothing to complain of");
}

/// The page's own graph, rendered offline and switched in the middle.
const OFFLINE: &str = "
  const rate = 48000, length = 2 * rate;
  const noise = (seed) => Float32Array.from({ length }, () => {
    seed ^= seed << 13; seed ^= seed >>> 17; seed ^= seed << 5;
    return (seed >>> 0) / 2 ** 32 - 0.5;
  });
  const sound = (samples) => {
    const buffer = new AudioBuffer({ length, numberOfChannels: 1, sampleRate: rate });
    buffer.copyToChannel(samples, 0);
    return buffer;
  };
  const rendered = async (takes, act) => {
    const context = new OfflineAudioContext(1, length, rate);
    const player = new Player(context, 0);
    player.load(takes, 0);
    player.play();
    context.suspend(1).then(() => { act(player); context.resume(); });
    return (await context.startRendering()).getChannelData(0);
  };
  const worst = (a, b, from, to) => {
    let most = 0;
    for (let n = from; n < to; n += 1) most = Math.max(most, Math.abs(a[n] - b[n]));
    return most;
  };
  const one = sound(noise(5)), half = sound(noise(5).map((s) => 0.5 * s));";

#[test]
fn the_graph_of_the_page_nulls_and_keeps_the_place() {
    let (folder, _) = folder();
    let browser = Browser::start();
    browser.open(&folder.path("pack/send/index.html"));
    let found = browser.run(&format!(
        "{OFFLINE}
         return Promise.all([
           rendered([one, one], () => undefined),
           rendered([one, one], (player) => player.choose(1)),
           rendered([one, half], (player) => player.choose(1)),
           rendered([one, one], (player) => player.repeat(0.25, 1.25)),
         ]).then(([still, same, other, repeated]) => {{
           const whole = one.getChannelData(0), quiet = half.getChannelData(0);
           return {{
             null: worst(still, same, 0, length),
             before: worst(other, whole, 480, rate),
             after: worst(other, quiet, rate + 640, length),
             moved: worst(other, quiet.map((s, n) => quiet[n + 1] ?? 0), rate + 640, length),
             repeated: worst(repeated.slice(rate + 1200, rate + 11000), whole.slice(rate + 1200, rate + 11000), 0, 9800),
             seam: worst(repeated.slice(rate + 12240, rate + 20000), whole.slice(12240, 20000), 0, 7760),
           }};
         }});"
    ));
    let level = |key: &str| 20.0 * found[key].as_f64().unwrap().log10();
    assert!(level("null") < -60.0, "A switched to A leaves {} dBFS", level("null"));
    assert!(level("before") < -60.0 && level("after") < -60.0, "the place is kept to the sample: {found}");
    assert!(level("moved") > -20.0, "a sample to the side would be seen: {found}");
    assert!(level("repeated") < -60.0 && level("seam") < -60.0, "a repeated part repeats itself: {found}");
}

#[test]
fn the_level_never_jumps_up() {
    let (folder, _) = folder();
    let browser = Browser::start();
    browser.open(&folder.path("pack/send/index.html"));
    let found = browser.run(
        "const rate = 48000, context = new OfflineAudioContext(1, 3 * rate, rate);
         const player = new Player(context, -24), ones = new AudioBuffer({ length: rate, numberOfChannels: 1, sampleRate: rate });
         ones.copyToChannel(new Float32Array(rate).fill(1), 0);
         player.load([ones], 0);
         player.play();
         context.suspend(0.5).then(() => { player.level(0); context.resume(); });
         context.suspend(2).then(() => { player.level(-50); context.resume(); });
         return context.startRendering().then((out) => [0.4, 1.5, 1.9, 2.2].map((s) => 20 * Math.log10(out.getChannelData(0)[Math.round(s * rate)])));",
    );
    for (level, expected) in found.as_array().unwrap().iter().zip([-24.0, -12.0, -7.2, -50.0]) {
        assert!((level.as_f64().unwrap() - expected).abs() < 0.1, "{found}");
    }
    assert_eq!(browser.value("document.getElementById('volume').value"), json!("-24"));
}

#[test]
fn a_run_by_keyboard_is_saved_and_tallied() {
    let (folder, _) = folder();
    let browser = Browser::start();
    // X is A where the byte is even; the listener below answers A for twelve trials, rightly in all but two of them.
    let order = [0, 2, 4, 6, 8, 1, 0, 0, 1, 0, 0, 0, 1, 3, 5, 7];
    browser.before_pages(&drawing(&[order]));
    browser.open(&folder.path("pack/send/index.html"));
    browser.tab_to("begin");
    browser.keys("\n");
    browser.wait("!document.getElementById('deck').hidden");
    browser.tab_to("way-which");
    browser.keys("\n");
    browser.tab_to("run-begin");
    browser.keys("\n");
    browser.keys("1\n");
    assert_eq!(browser.value("document.getElementById('hint').textContent"), json!("Listen to X first."));
    for trial in 0..16 {
        let title = browser.value("document.getElementById('trial-title').textContent");
        assert_eq!(title, json!(format!("Trial {} of 16", trial + 1)));
        browser.keys("ABX");
        browser.keys(if trial < 12 { "1" } else { "2" });
        browser.keys("\n");
    }
    let result = browser.value("document.getElementById('result').textContent");
    assert!(result.as_str().unwrap().starts_with("14 of 16 right"), "{result}");
    browser.tab_to("nickname");
    browser.keys("Ann \"von\" Ö.");
    browser.tab_to("save");
    browser.keys("\n");
    let saved = browser.download(0);
    let run = tally(&folder, std::slice::from_ref(&saved), &["--json"]);
    assert_eq!(run.code, Some(0), "{}", run.stderr);
    let counted: Value = serde_json::from_str(&run.stdout).unwrap();
    let comparison = &counted["comparisons"][0];
    let together = &comparison["together"];
    assert_eq!(counted["listeners"], json!(["Ann \"von\" Ö."]));
    assert_eq!([&together["correct"], &together["trials"]], [14, 16]);
    assert_eq!([&together["needed_95"], &together["needed_99"]], [12, 14]);
    // (120 + 16 + 1) / 65536.
    assert!((together["by_guessing"].as_f64().unwrap() - 137.0 / 65536.0).abs() < 1e-12, "{together}");
    assert!(
        comparison["conclusion"].as_str().unwrap().contains("bypass in and bypass out were told apart"),
        "{run:?}",
        run = run.stdout
    );
    let shown = tally(&folder, &[saved], &[]);
    assert!(shown.stdout.contains("14 of 16") && shown.stdout.contains("12 / 14"), "{}", shown.stdout);
}

/// Everything that the page shows or keeps where a listener or a script could look: text, attributes, states of fields,
/// names that it has put into the window, storage, address, title, resources, and what assistive technology is told.
const LOOK: &str = "
  const seen = new Set(), walk = (value, depth) => {
    if (value === null || (typeof value !== 'object' && typeof value !== 'function')) return String(value);
    if (seen.has(value) || depth > 4 || value instanceof Node || value === window || value === tapped) return '';
    seen.add(value);
    return Reflect.ownKeys(value).map((key) => {
      let inside = '';
      try { inside = walk(value[key], depth + 1); } catch (error) { inside = 'private'; }
      return String(key) + ':' + inside;
    }).join(',');
  };
  const own = Object.keys(window).filter((name) => !blankNames.includes(name) && name !== 'tapped');
  const fields = [...document.querySelectorAll('input:not(#position), select, textarea, button')].map((f) => [f.id, f.value, f.checked, f.disabled]);
  const page = document.documentElement.cloneNode(true);
  page.querySelector('#clock').remove();
  return JSON.stringify({
    page: page.outerHTML, fields, own, globals: [Sounds, Player, Run, Sitting, sha256, takesArrived, byGuessing].map((g) => walk(g, 0)),
    window: own.map((name) => walk(window[name], 0)),
    storage: [localStorage.length, sessionStorage.length, document.cookie], address: location.href, title: document.title,
    state: history.state, resources: performance.getEntriesByType('resource').map((r) => r.name),
    marks: performance.getEntriesByType('mark').length + performance.getEntriesByType('measure').length,
  });";

#[test]
fn nothing_tells_x_before_the_end() {
    let (folder, _) = folder();
    // Two sittings, alike in everything but what X is: all A, and all B.
    let looks = [[0; 16], [1; 16]].map(|order| {
        let browser = Browser::start();
        browser.before_pages(&drawing(&[order]));
        browser.before_pages("window.blankNames = Object.keys(window).concat('blankNames'); window.tapped = null;");
        begin(&browser, &folder);
        begin_run(&browser);
        let mut looks = Vec::new();
        for trial in 0..16 {
            browser.keys("BX");
            looks.push(browser.run(LOOK));
            browser.keys("1");
            let tree = browser.tool("Accessibility.getFullAXTree", json!({}));
            let names = tree["nodes"].as_array().unwrap().iter().map(|node| {
                // The clock runs; everything else has to be alike.
                let (name, role) = (&node["name"]["value"], &node["role"]["value"]);
                if name.to_string().contains(" of 0:") { String::new() } else { format!("{role} {name}") }
            });
            looks.push(json!(names.collect::<Vec<_>>()));
            if trial < 15 {
                browser.keys("\n");
            }
        }
        assert_eq!(browser.console(), [""; 0]);
        browser.keys("\n");
        let result = browser.value("document.getElementById('result').textContent");
        (looks, result)
    });
    let [(all_a, result_a), (all_b, result_b)] = looks;
    assert!(result_a.as_str().unwrap().starts_with("16 of 16"), "{result_a}");
    assert!(result_b.as_str().unwrap().starts_with("0 of 16"), "{result_b}");
    assert_eq!(all_a.len(), 32);
    for (look, (a, b)) in all_a.iter().zip(&all_b).enumerate() {
        assert!(a == b, "look {look} tells X:\n{a}\n{b}");
    }
}

#[test]
fn answers_cannot_be_saved_in_the_middle_and_broken_runs_do_not_count() {
    let (folder, _) = folder();
    let browser = Browser::start();
    browser.before_pages(&drawing(&[[0; 16]]));
    begin(&browser, &folder);
    begin_run(&browser);
    answer(&browser, "1");
    answer(&browser, "2");
    assert_eq!(browser.value("document.getElementById('save').disabled"), json!(true));
    browser.click("#run-stop");
    browser.click("#save");
    let saved = browser.download(0);
    let text = std::fs::read_to_string(&saved).unwrap();
    assert!(text.contains("broken-off") && !text.contains("\"x\""), "{text}");
    let run = tally(&folder, &[saved], &[]);
    assert!(run.stdout.contains("1 run was broken off"), "{}", run.stdout);
}

#[test]
fn preferences_are_tallied_and_what_does_not_belong_is_refused() {
    let (folder, key) = folder();
    let browser = Browser::start();
    begin(&browser, &folder);
    // The take preferred is the one with the bypass in, whatever its letter.
    let letter = pack::take(&key, 1, Some("bypass in"))["letter"].as_str().unwrap().to_owned();
    let first = browser.value("document.getElementById('prefer-first').textContent");
    browser.keys("3\n");
    browser.keys(if first == json!(letter) { "1" } else { "2" });
    browser.click("#note");
    browser.keys("fuller \"and\" wärmer \\ \u{1F3B9}");
    browser.click("#keep-preference");
    browser.click("#save");
    let saved = browser.download(0);
    let run = tally(&folder, std::slice::from_ref(&saved), &["--json"]);
    assert_eq!(run.code, Some(0), "{}", run.stderr);
    let counted: Value = serde_json::from_str(&run.stdout).unwrap();
    let preference = &counted["comparisons"][0]["preference"];
    assert_eq!(
        [&preference["one"], &preference["other"], &preference["ties"]],
        [1, 0, 0],
        "the last answer stands"
    );
    assert_eq!(preference["by_chance"], 1.0);
    assert_eq!(preference["notes"][0]["note"], "fuller \"and\" wärmer \\ \u{1F3B9}");
    assert_eq!(preference["notes"][0]["preferred"], "bypass in");

    let text = std::fs::read_to_string(&saved).unwrap();
    let refused = |name: &str, text: &str, reason: &str| {
        folder.write(name, text.as_bytes());
        let message = folder.refused(&["listen", "tally", "pack", name]);
        assert!(message.contains(name) && message.contains(reason), "{message}");
    };
    refused("note.json", &text.replace("fuller", "duller"), "altered");
    refused("nickname.json", &text.replace("\"listener\": null", "\"listener\": \"Bob\""), "altered");
    refused("pack.json", &text.replace(key["pack"].as_str().unwrap(), &"0".repeat(64)), "another pack (00000000");
    refused("cut.json", &text[..text.len() / 2], "no answers");
    refused("more.json", &text.replace("\"format\": 1,", "\"format\": 1, \"more\": 1,"), "no answers");
    folder.write("copy.json", text.as_bytes());
    let path = saved.display().to_string();
    let message = folder.refused(&["listen", "tally", "pack", &path, "copy.json"]);
    assert!(message.contains("copy.json repeats the sitting"), "{message}");
    folder.make("empty");
    let message = folder.refused(&["listen", "tally", "empty", &path]);
    assert!(message.contains("empty is no listening pack"), "{message}");
    let key_path = folder.path("pack/keep/key.json");
    let key_text = std::fs::read_to_string(&key_path).unwrap();
    std::fs::write(&key_path, key_text.replace("bypass in", "bypass out")).unwrap();
    let message = folder.refused(&["listen", "tally", "pack", &path]);
    assert!(message.contains("not the key that the page was sealed with"), "{message}");
}

#[test]
fn a_page_without_its_sound_says_what_to_do() {
    let (folder, _) = folder();
    std::fs::remove_file(folder.path("pack/send/sound-1.js")).unwrap();
    let browser = Browser::start();
    browser.open(&folder.path("pack/send/index.html"));
    browser.click("#begin");
    browser.wait("!document.getElementById('trouble').hidden");
    let trouble = browser.value("document.getElementById('trouble').textContent");
    assert!(trouble.as_str().unwrap().contains("Unpack the whole folder"), "{trouble}");
}
