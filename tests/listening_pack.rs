//! Listening packs as files: matched, aligned, exact, neutral and repeatable.
#![allow(clippy::disallowed_methods, reason = "test signals need not be the same on every CPU")]

#[path = "support/pack.rs"]
mod pack;
mod support;

use std::path::Path;

use pack::{STAGE, files, make, music, outside, read_wav, stage_with, take, write_wav};
use serde_json::Value;
use support::Folder;

fn folder(stage: &str) -> Folder {
    let folder = Folder::new();
    folder.write("stage.toml", stage.as_bytes());
    folder
}

fn text(path: &Path) -> String {
    path.to_string_lossy().into_owned()
}

/// ffmpeg's reading of a file: integrated loudness in LUFS and true peak in dBTP.
fn ffmpeg_levels(path: &Path) -> (f64, f64) {
    let filter = "ebur128=peak=true:metadata=1,ametadata=print:file=-";
    let out = outside("ffmpeg", &["-v", "error", "-nostats", "-i", &text(path), "-af", filter, "-f", "null", "-"]);
    let out = String::from_utf8_lossy(&out).into_owned();
    let values =
        |key: &str| -> Vec<f64> { out.lines().filter_map(|line| line.strip_prefix(key)?.parse().ok()).collect() };
    let peaks = values("lavfi.r128.true_peak=");
    let loudness =
        *values("lavfi.r128.I=").last().unwrap_or_else(|| panic!("{}: no loudness: {out}", path.display()));
    // A ratio, the highest so far.
    (loudness, 20.0 * peaks.last().expect("a true peak").log10())
}

#[test]
fn takes_are_matched_by_an_outside_reader() {
    let folder = folder(STAGE);
    write_wav(&folder.path("one.wav"), 48_000, &music(48_000, 6.0, 2));
    write_wav(&folder.path("two.wav"), 44_100, &music(44_100, 3.0, 1));
    let key = make(&folder, &["--play", "one.wav", "--play", "two.wav", "--with-dry", "--into", "pack"]);
    for recording in key["recordings"].as_array().unwrap() {
        let target = recording["loudness_LUFS"].as_f64().unwrap();
        assert_eq!(recording["takes"].as_array().unwrap().len(), 5);
        for take in recording["takes"].as_array().unwrap() {
            let path = folder.path("pack/send/takes").join(take["file"].as_str().unwrap());
            let (loudness, true_peak) = ffmpeg_levels(&path);
            assert!((loudness - target).abs() < 0.1, "{take}: {loudness} LUFS, not {target}");
            assert!(true_peak <= -1.0, "{take}: {true_peak} dBTP");
            assert!(take["gain_dB"].as_f64().unwrap() <= 0.0, "lowered only: {take}");
            assert!(take["dc_dBFS"].as_f64().is_none_or(|dc| dc < -90.0), "{take}");
        }
    }
}

#[test]
fn flac_files_are_sound_and_hold_exactly_the_samples_meant() {
    let folder = folder(STAGE);
    write_wav(&folder.path("take.wav"), 96_000, &music(96_000, 1.5, 2));
    let key = make(&folder, &["--play", "take.wav", "--wav", "--into", "pack"]);
    for take in key["recordings"][0]["takes"].as_array().unwrap() {
        let flac = folder.path("pack/send/takes").join(take["file"].as_str().unwrap());
        outside("flac", &["-t", "-s", "-w", &text(&flac)]);
        let decoded = folder.path("decoded.wav");
        outside("ffmpeg", &["-v", "error", "-y", "-i", &text(&flac), "-c:a", "pcm_s24le", &text(&decoded)]);
        let (decoded, meant) = (read_wav(&decoded), read_wav(&flac.with_extension("wav")));
        assert_eq!(meant[0].len(), 144_000);
        assert!(decoded == meant, "{}: decoded samples differ", flac.display());
    }
}

/// `render` writes the same volts by its own way: at the key's full scale its samples are the take's before the gain.
#[test]
fn stated_gain_polarity_and_place_are_what_was_applied() {
    let folder = folder(STAGE);
    write_wav(&folder.path("take.wav"), 48_000, &music(48_000, 2.0, 1));
    let key = make(&folder, &["--play", "take.wav", "--wav", "--into", "pack"]);
    let full_scale = key["recordings"][0]["full_scale_rms"].to_string();
    let arguments = ["render", "stage.toml", "--play", "take.wav", "--into", "out", "--full-scale", &full_scale];
    assert_eq!(folder.run(&arguments).code, Some(0));
    for take in key["recordings"][0]["takes"].as_array().unwrap() {
        let name = take["configuration"].as_str().unwrap();
        let rendered = read_wav(&folder.path("out").join(format!("{name}.wav")));
        let file = folder.path("pack/send/takes").join(take["file"].as_str().unwrap()).with_extension("wav");
        let packed = read_wav(&file);
        assert_eq!(rendered[0].len(), packed[0].len());
        // Between the fades.
        let inside = 1000..packed[0].len() - 1000;
        let (a, b) = (&rendered[0][inside.clone()], &packed[0][inside]);
        let product =
            |x: &[i32], y: &[i32]| x.iter().zip(y).map(|(x, y)| f64::from(*x) * f64::from(*y)).sum::<f64>();
        let ratio = product(a, b) / product(a, a);
        let stated = take["gain_dB"].as_f64().unwrap();
        assert!(ratio < 0.0 && take["turned"] == true, "{name}: one triode and a follower invert");
        assert!((20.0 * (-ratio).log10() - stated).abs() < 0.01, "{name}: {ratio}, stated {stated} dB");
        // At the same place sample by sample: what is left is the DC taken out, and rounding.
        let left: Vec<f64> = a.iter().zip(b).map(|(a, b)| f64::from(*b) - ratio * f64::from(*a)).collect();
        assert!(spread(&left) < 20.0, "{name}: {} of 8388608 apart", spread(&left));
    }
}

#[test]
fn polarity_stays_where_that_is_asked() {
    let folder = folder(STAGE);
    write_wav(&folder.path("take.wav"), 48_000, &music(48_000, 1.0, 1));
    let restored = make(&folder, &["--play", "take.wav", "--with-dry", "--wav", "--into", "restored"]);
    let kept = make(&folder, &["--play", "take.wav", "--with-dry", "--wav", "--keep-polarity", "--into", "kept"]);
    let correlation = |key: &Value, into: &str| {
        let samples = |configuration| {
            let file = take(key, 1, configuration)["file"].as_str().unwrap();
            read_wav(&folder.path(into).join("send/takes").join(file).with_extension("wav")).remove(0)
        };
        let (dry, wet) = (samples(None), samples(Some("12AU7, bypass in")));
        dry.iter().zip(&wet).map(|(a, b)| f64::from(*a) * f64::from(*b)).sum::<f64>()
    };
    assert!(correlation(&restored, "restored") > 0.0);
    assert!(correlation(&kept, "kept") < 0.0);
}

/// How far the values lie from their mean at most: what one constant does not explain.
fn spread(values: &[f64]) -> f64 {
    let mean = values.iter().sum::<f64>() / values.len() as f64;
    values.iter().map(|value| (value - mean).abs()).fold(0.0, f64::max)
}

/// The lag of `b` behind `a` in samples: the cross-correlation's highest whole lag, and a parabola through it and its
/// neighbours.
fn lag(a: &[i32], b: &[i32]) -> f64 {
    let most = 64_i64;
    let at = |lag: i64| {
        let range = most as usize..a.len() - most as usize;
        range.map(|n| f64::from(a[n]) * f64::from(b[(n as i64 + lag) as usize])).sum::<f64>()
    };
    let all: Vec<f64> = (-most..=most).map(at).collect();
    let best = (1..all.len() - 1).max_by(|x, y| all[*x].total_cmp(&all[*y])).unwrap();
    let (left, middle, right) = (all[best - 1], all[best], all[best + 1]);
    best as f64 - most as f64 + 0.5 * (left - right) / (left - 2.0 * middle + right)
}

#[test]
fn takes_are_aligned_to_the_sample_and_far_below() {
    let folder = folder(&stage_with("[compare]\n\"gain.plate_resistor\" = [\"33k\", \"33.33k\"]\n"));
    let noise = pack::noise(9, 96_000).iter().map(|sample| 0.3 * sample).collect();
    write_wav(&folder.path("take.wav"), 48_000, &[noise]);
    let key = make(&folder, &["--play", "take.wav", "--with-dry", "--wav", "--into", "pack"]);
    let samples = |configuration| {
        let file = take(&key, 1, configuration)["file"].as_str().unwrap();
        read_wav(&folder.path("pack/send/takes").join(file).with_extension("wav")).remove(0)
    };
    let takes = key["recordings"][0]["takes"].as_array().unwrap();
    let names: Vec<&str> = takes.iter().filter_map(|take| take["configuration"].as_str()).collect();
    let (dry, one, other) = (samples(None), samples(Some(names[0])), samples(Some(names[1])));
    // White noise is like itself at one lag alone; the stage's own lag at high frequencies is part of its sound.
    assert_eq!(lag(&dry, &one).round(), 0.0);
    let apart = lag(&one, &other);
    assert!(apart.abs() < 0.02, "{apart} samples apart");
    // The measure itself sees a lag.
    assert!((lag(&one[..90_000], &one[3..]) + 3.0).abs() < 0.01);
}

#[test]
fn send_tells_nothing_of_what_the_letters_stand_for() {
    use std::time::{Duration, SystemTime};
    let folder = folder(STAGE);
    write_wav(&folder.path("my secret tune.wav"), 48_000, &music(48_000, 1.0, 2));
    let key = make(&folder, &["--play", "my secret tune.wav", "--with-dry", "--wav", "--into", "pack"]);
    let send = folder.path("pack/send");
    let (mut sizes, mut telling) =
        (Vec::new(), vec!["12au7", "12bh7a", "bypass", "secret", "demo", "piano", "triode"]);
    telling.push(key["nonce"].as_str().unwrap());
    for path in files(&folder.path("pack")) {
        let modified = path.metadata().unwrap().modified().unwrap();
        assert_eq!(modified, SystemTime::UNIX_EPOCH + Duration::from_secs(946_684_800), "{}", path.display());
    }
    for path in files(&send) {
        let name = text(path.strip_prefix(&send).unwrap());
        let bytes = std::fs::read(&path).unwrap();
        // The sound itself is no text: of a script what stands outside the quotation marks, of a take its header.
        let readable = match path.extension().unwrap().to_str().unwrap() {
            "html" => String::from_utf8(bytes).unwrap(),
            "js" => String::from_utf8(bytes).unwrap().split('"').step_by(2).collect(),
            "flac" | "wav" => {
                sizes.push((path.extension().unwrap().to_owned(), bytes.len()));
                String::from_utf8_lossy(&bytes[..60]).into_owned()
            }
            other => panic!("{other}"),
        };
        let readable = format!("{name}\n{readable}").to_lowercase();
        for word in &telling {
            assert!(!readable.contains(word), "{name} holds \"{word}\"");
        }
    }
    sizes.sort();
    sizes.dedup();
    assert_eq!(sizes.len(), 2, "all FLAC files are of one size, and all WAV files: {sizes:?}");
    for file in files(&send.join("takes")).iter().filter(|path| path.extension().unwrap() == "flac") {
        let tags = outside("ffprobe", &["-v", "error", "-show_entries", "format_tags:stream_tags", &text(file)]);
        assert!(!String::from_utf8_lossy(&tags).contains("TAG:"), "{} has tags", file.display());
        let bytes = std::fs::read(file).unwrap();
        // FLAC's metadata: stream information, then padding, the last block, and nothing else.
        assert_eq!((bytes[4], bytes[4 + 4 + 34]), (0, 0x81), "{}", file.display());
    }
    let maker = std::fs::read_to_string(folder.path("pack/keep/maker.txt")).unwrap();
    for said in
        ["12AU7, bypass in", "the recording itself", "gain -", "polarity turned", "at 20 kHz", "my secret tune.wav"]
    {
        assert!(maker.contains(said), "maker.txt does not say \"{said}\":\n{maker}");
    }
}

#[test]
fn the_same_seed_gives_the_same_bytes_and_another_deals_anew() {
    let folder = folder(STAGE);
    write_wav(&folder.path("take.wav"), 48_000, &music(48_000, 1.0, 1));
    let contents = |into: &str| {
        let root = folder.path(into);
        files(&root)
            .iter()
            .map(|path| (text(path.strip_prefix(&root).unwrap()), std::fs::read(path).unwrap()))
            .collect::<Vec<_>>()
    };
    make(&folder, &["--play", "take.wav", "--seed", "7", "--into", "one"]);
    let run = std::process::Command::new(env!("CARGO_BIN_EXE_platewright"))
        .args(["listen", "pack", "stage.toml", "--play", "take.wav", "--seed", "7", "--into", "two"])
        .current_dir(folder.path(""))
        .env("PLATEWRIGHT_PORTABLE", "1")
        .env("RAYON_NUM_THREADS", "1")
        .output()
        .unwrap();
    assert!(run.status.success());
    assert!(contents("one") == contents("two"), "another thread count and the portable engine changed a byte");
    let letters = |seed: &str| {
        let key = make(&folder, &["--play", "take.wav", "--seed", seed, "--into", "again", "--replace"]);
        take(&key, 1, Some("12AU7, bypass in"))["letter"].clone()
    };
    let dealt: std::collections::BTreeSet<String> =
        ["1", "2", "3", "4", "5", "6"].iter().map(|seed| letters(seed).to_string()).collect();
    assert!(dealt.len() > 1, "six seeds, one letter");
}

#[test]
fn the_passage_is_the_one_asked_for() {
    let folder = folder(STAGE);
    write_wav(&folder.path("take.wav"), 48_000, &music(48_000, 4.0, 1));
    let asked =
        ["--play", "take.wav", "--from", "1.25", "--length", "0.75", "--with-dry", "--wav", "--into", "pack"];
    let key = make(&folder, &asked);
    assert_eq!(key["recordings"][0]["from_seconds"], 1.25);
    assert_eq!(key["recordings"][0]["frames"], 36_000);
    let dry = take(&key, 1, None);
    let packed =
        read_wav(&folder.path("pack/send/takes").join(dry["file"].as_str().unwrap()).with_extension("wav"));
    let recorded = read_wav(&folder.path("take.wav"));
    let factor = 10_f64.powf(dry["gain_dB"].as_f64().unwrap() / 20.0);
    let left: Vec<f64> =
        (1000..35_000).map(|n| f64::from(packed[0][n]) - factor * f64::from(recorded[0][60_000 + n])).collect();
    assert!(spread(&left) < 20.0, "{} of 8388608 apart", spread(&left));
    for (option, value) in [("--from", "3.9"), ("--from", "5"), ("--length", "4.5")] {
        let arguments = ["listen", "pack", "stage.toml", "--play", "take.wav", "--into", "no", option, value];
        let message = folder.refused(&arguments);
        assert!(message.contains("4.00 s") && message.contains("--from and --length"), "{message}");
    }
}

#[test]
fn odd_recordings_are_handled_or_refused_with_a_reason() {
    let folder = folder(STAGE);
    let silent = vec![vec![0.0; 48_000]];
    let clipped = vec![music(48_000, 1.0, 1)[0].iter().map(|s| (6.0 * s).clamp(-1.0, 1.0)).collect()];
    write_wav(&folder.path("silent.wav"), 48_000, &silent);
    write_wav(&folder.path("short.wav"), 48_000, &music(48_000, 0.39, 1));
    write_wav(&folder.path("just.wav"), 48_000, &music(48_000, 0.4, 1));
    write_wav(&folder.path("six.wav"), 48_000, &music(48_000, 1.0, 6));
    write_wav(&folder.path("clipped.wav"), 48_000, &clipped);
    write_wav(&folder.path("fast.wav"), 192_000, &music(192_000, 1.0, 1));
    for (name, reasons) in [
        ("silent.wav", ["silent.wav is silent", "sound in it"]),
        ("short.wav", ["0.390 s", "longer recording"]),
        ("six.wav", ["six.wav has 6 channels", "mix it down"]),
    ] {
        let message = folder.refused(&["listen", "pack", "stage.toml", "--play", name, "--into", "no"]);
        assert!(reasons.iter().all(|reason| message.contains(reason)), "{message}");
    }
    make(&folder, &["--play", "just.wav", "--into", "just"]);
    let fast = make(&folder, &["--play", "fast.wav", "--into", "fast"]);
    assert_eq!(fast["recordings"][0]["sample_rate"], 96_000, "what browsers play and FLAC encoders take");
    let arguments = ["listen", "pack", "stage.toml", "--play", "clipped.wav", "--into", "clipped", "--strict"];
    let run = folder.run(&arguments);
    assert_eq!(run.code, Some(3), "{}", run.stderr);
    assert!(run.stderr.contains("clipped.wav: the recording itself is clipped at"), "{}", run.stderr);
    for file in files(&folder.path("clipped/send/takes")) {
        outside("flac", &["-t", "-s", "-w", &text(&file)]);
        assert!(ffmpeg_levels(&file).1 <= -1.0);
    }
}

#[test]
fn stages_that_give_nothing_to_compare_are_refused() {
    let folder = folder(&stage_with(""));
    write_wav(&folder.path("take.wav"), 48_000, &music(48_000, 1.0, 1));
    let pack = ["listen", "pack", "stage.toml", "--play", "take.wav", "--into", "pack"];
    let message = folder.refused(&pack);
    assert!(message.contains("one configuration") && message.contains("--with-dry"), "{message}");
    folder.write("stage.toml", stage_with("[compare]\n\"input.pot.position\" = [0.45, 0]\n").as_bytes());
    let message = folder.refused(&pack);
    assert!(message.contains("position 0\" is silent") && message.contains("pot"), "{message}");
    folder.write("stage.toml", stage_with("[compare]\n\"source.resistance\" = [330, 330.0001]\n").as_bytes());
    let run = folder.run(&pack);
    assert_eq!(run.code, Some(0), "{}", run.stderr);
    folder.write("pack/other.txt", b"mine");
    assert!(folder.refused(&pack).contains("already holds"));
}

#[test]
fn trials_are_planned_exactly() {
    let folder = Folder::new();
    let run = folder.run(&["listen", "plan", "--effect", "0.7", "--power", "0.8", "--json"]);
    let plan: Value = serde_json::from_str(&run.stdout).unwrap();
    // scipy.stats: tests/reference/binomial.json.
    assert_eq!((&plan["trials"], &plan["needed"]), (&37.into(), &24.into()));
    let run = folder.run(&["listen", "plan", "--effect", "0.7", "--power", "0.8"]);
    assert!(run.stdout.starts_with("37 trials, of which 24 must be right"), "{}", run.stdout);
    assert!(folder.refused(&["listen", "plan", "--effect", "0.501", "--power", "0.9"]).contains("2000 trials"));
}

#[test]
fn compare_makes_a_pack_beside_the_report_and_links_it() {
    let folder = folder(&stage_with("[compare]\n\"gain.bypass.engaged\" = [true, false]\n"));
    write_wav(&folder.path("take.wav"), 48_000, &music(48_000, 1.0, 1));
    let run = folder.run(&["compare", "stage.toml", "--play", "take.wav", "--into", "out", "--pack"]);
    assert_eq!(run.code, Some(0), "{}", run.stderr);
    assert!(run.stdout.contains("send pack/send, keep pack/keep"), "{}", run.stdout);
    let page = std::fs::read_to_string(folder.path("out/report.html")).unwrap();
    assert!(page.contains("href=\"pack/send/index.html\""), "the report does not link the pack");
    assert!(folder.path("out/pack/send/index.html").is_file());
    // The pack is the one that `listen pack` makes.
    make(&folder, &["--play", "take.wav", "--into", "alone"]);
    for name in ["send/index.html", "send/sound-1.js", "keep/key.json", "keep/maker.txt"] {
        let read = |into: &str| std::fs::read(folder.path(into).join(name)).unwrap();
        assert!(read("out/pack") == read("alone"), "{name} differs");
    }
}
