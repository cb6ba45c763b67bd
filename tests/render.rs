//! Sound through the program: exactly as long as the recording, aligned with it, at one level, the same bytes every time.

#![allow(clippy::disallowed_methods, reason = "a test may differ in the last bit from machine to machine")]

mod support;

use serde_json::Value;
use support::Folder;
use support::sound::{Sound, noise, shift, sines, write_float};

const STAGE: &str = include_str!("known-answers/known2.toml");

/// A folder with a stage of one configuration, "as drawn".
fn folder() -> Folder {
    let folder = Folder::new();
    folder.write("stage.toml", STAGE.as_bytes());
    folder
}

fn render(folder: &Folder, take: &str, into: &str, more: &[&str]) -> Sound {
    folder.done(&[&["render", "stage.toml", "--play", take, "--into", into, "--replace"], more].concat());
    Sound::read(&folder.path(into).join("as drawn.wav"))
}

fn renders(folder: &Folder, arguments: &[&str]) -> Vec<Value> {
    let all = folder.json(&[&["render", "stage.toml"], arguments].concat());
    all["renders"].as_array().expect("renders").clone()
}

#[test]
fn a_recording_that_cannot_be_played_is_refused_by_name() {
    let folder = folder();
    folder.write("text.wav", b"not sound at all, only words that go on for a while to fill a header");
    folder.write("short.wav", b"RIFF");
    folder.make("folder.wav");
    write_float(&folder.path("empty.wav"), 8000, &[vec![]]);
    write_float(&folder.path("nan.wav"), 8000, &[vec![0.0, 0.1], vec![0.0, f64::NAN]]);
    write_float(&folder.path("infinite.wav"), 8000, &[vec![f64::INFINITY]]);
    write_float(&folder.path("slow.wav"), 4000, &[vec![0.0]]);
    let cases = [
        ("text.wav", "not a WAV file"),
        ("short.wav", "cut short"),
        ("folder.wav", "not a regular file"),
        ("empty.wav", "holds no samples"),
        ("nan.wav", "frame 2, channel 2 is NaN"),
        ("infinite.wav", "frame 1, channel 1 is infinite"),
        ("slow.wav", "8000 to 192000 Hz"),
        ("missing.wav", "no such file"),
    ];
    for (name, expected) in cases {
        let commands: [&[&str]; 3] = [
            &["render", "stage.toml", "--play", name, "--into", "out"],
            &["compare", "stage.toml", "--play", name, "--into", "out"],
            &["measure", "stage.toml", "--headroom", "--play", name],
        ];
        for command in commands {
            let message = folder.refused(command);
            assert!(message.contains(name) && message.contains(expected), "{command:?}: {message}");
        }
    }
}

#[test]
fn the_file_is_as_long_as_the_recording_and_aligned_with_it() {
    let folder = folder();
    for (rate, times) in
        [(8000, None), (44_100, None), (48_000, Some("1")), (48_000, Some("8")), (96_000, Some("2"))]
    {
        // Levels so low that the stage is linear; a length that no block divides.
        let take = noise(2 * 8192 + 137, 7, 1e-3);
        write_float(&folder.path("take.wav"), rate, std::slice::from_ref(&take));
        let mut more = vec!["--format", "f32"];
        more.extend(times.iter().flat_map(|times| ["--oversample", *times]));
        let sound = render(&folder, "take.wav", "out", &more);
        assert_eq!((sound.rate, sound.frames()), (rate, take.len()), "{rate} Hz, {times:?}");
        assert_eq!(shift(&take, &sound.channels[0], 60), 0, "{rate} Hz, {times:?}");
    }
}

#[test]
fn another_rate_keeps_the_moment_of_every_sound() {
    let folder = folder();
    // A burst of 1 kHz whose middle lies 0.1 s after the beginning, at any rate.
    let burst = |rate: u32| -> Vec<f64> {
        let at = |frame: usize| {
            let seconds = frame as f64 / f64::from(rate) - 0.1;
            1e-3 * (-(seconds / 4e-3).powi(2)).exp() * (std::f64::consts::TAU * 1000.0 * seconds).cos()
        };
        (0..rate as usize / 5).map(at).collect()
    };
    write_float(&folder.path("take.wav"), 48_000, &[burst(48_000)]);
    for rate in [8000_u32, 44_100, 96_000] {
        let sound = render(&folder, "take.wav", "out", &["--format", "f32", "--rate", &rate.to_string()]);
        let expected = burst(rate);
        assert_eq!((sound.rate, sound.frames()), (rate, expected.len()), "{rate} Hz");
        assert_eq!(shift(&expected, &sound.channels[0], 30), 0, "{rate} Hz");
    }
}

#[test]
fn a_tail_goes_on_after_the_recording() {
    let folder = folder();
    write_float(&folder.path("take.wav"), 8000, &[noise(801, 3, 0.5)]);
    let level = ["--format", "f32", "--full-scale", "20"];
    let plain = render(&folder, "take.wav", "plain", &level);
    let longer = render(&folder, "take.wav", "longer", &[&level[..], &["--tail", "0.25"]].concat());
    assert_eq!((plain.frames(), longer.frames()), (801, 2801));
    assert_eq!(longer.channels[0][..801], plain.channels[0], "the beginning stays the same");
    let rest = &longer.channels[0][801..];
    assert!(rest[..80].iter().any(|sample| sample.abs() > 1e-3), "the stage rings on");
    assert!(rest[1900..].iter().all(|sample| sample.abs() < 0.02), "and comes to rest");
}

#[test]
fn every_format_holds_the_same_sound() {
    let folder = folder();
    write_float(&folder.path("take.wav"), 8000, &[noise(2000, 3, 0.5), noise(2000, 4, 0.25)]);
    let float = render(&folder, "take.wav", "f32", &["--format", "f32"]);
    assert!((20.0 * float.peak().log10() + 1.0).abs() < 1e-5, "the loudest peak is {}", float.peak());
    for (format, bits) in [("i16", 16), ("i24", 24), ("i32", 32), ("f32", 32)] {
        let sound = render(&folder, "take.wav", format, &["--format", format]);
        assert_eq!((sound.bits, sound.float, sound.channels.len()), (bits, format == "f32", 2), "{format}");
        // Half a step of the format, and what 24 bits of a float's fraction round away.
        let most = 0.5 / 2f64.powi(i32::from(bits) - 1) + 1.0 / 2f64.powi(24);
        for (got, want) in sound.channels.iter().flatten().zip(float.channels.iter().flatten()) {
            assert!((got - want).abs() <= most * 1.001, "{format}: {got} against {want}");
        }
    }
    let usual = render(&folder, "take.wav", "usual", &[]);
    assert_eq!(usual.bits, 24);
}

/// Triangular dither of two steps' width: an error of zero mean and, quantising included, of √(1/4) of a step rms
/// (Lipshitz, Wannamaker & Vanderkooy, "Quantization and dither", JAES 40, 1992).
#[test]
fn dither_is_triangular_and_the_same_in_every_run() {
    let folder = folder();
    write_float(&folder.path("take.wav"), 48_000, &[sines(48_000, 480.0, &[(1.0, 0.01)])]);
    let level = ["--full-scale", "20"];
    let float = render(&folder, "take.wav", "float", &[&level[..], &["--format", "f32"]].concat());
    let dithered = [&level[..], &["--format", "i16", "--dither"]].concat();
    let sound = render(&folder, "take.wav", "dithered", &dithered);
    let errors: Vec<f64> =
        sound.channels[0].iter().zip(&float.channels[0]).map(|(got, want)| (got - want) * 32_768.0).collect();
    let mean = errors.iter().sum::<f64>() / errors.len() as f64;
    let rms = (errors.iter().map(|error| error * error).sum::<f64>() / errors.len() as f64).sqrt();
    assert!(errors.iter().all(|error| error.abs() <= 1.5), "no error is larger than dither and quantising make it");
    assert!(mean.abs() < 0.01, "mean {mean} steps");
    assert!((rms - 0.5).abs() < 0.01, "{rms} steps rms");
    render(&folder, "take.wav", "again", &dithered);
    assert_eq!(folder.bytes("dithered/as drawn.wav"), folder.bytes("again/as drawn.wav"));
}

#[test]
fn drive_raises_the_recording_before_the_stage() {
    let folder = folder();
    let take = noise(2000, 5, 1e-3);
    write_float(&folder.path("take.wav"), 8000, std::slice::from_ref(&take));
    let louder: Vec<f64> = take.iter().map(|sample| f64::from(*sample as f32) * 10.0).collect();
    write_float(&folder.path("louder.wav"), 8000, &[louder]);
    let level = ["--format", "f32", "--full-scale", "1"];
    let driven = render(&folder, "take.wav", "driven", &[&level[..], &["--drive", "20"]].concat());
    let expected = render(&folder, "louder.wav", "louder", &level);
    for (got, want) in driven.channels[0].iter().zip(&expected.channels[0]) {
        assert!((got - want).abs() <= 1e-6 * expected.peak(), "{got} against {want}");
    }
    assert!(driven.peak() > 0.01);
}

#[test]
fn samples_over_full_scale_are_counted_and_kept_in_float() {
    let folder = folder();
    write_float(&folder.path("take.wav"), 8000, &[sines(1600, 80.0, &[(1.0, 0.8)]), vec![0.0; 1600]]);
    for (format, clipped) in [("f32", false), ("i16", true)] {
        let arguments =
            ["--play", "take.wav", "--into", "out", "--replace", "--format", format, "--full-scale", "2"];
        let counted = renders(&folder, &arguments)[0]["over_full_scale"].as_u64().expect("a count");
        let sound = Sound::read(&folder.path("out/as drawn.wav"));
        assert!(counted > 100, "{counted}");
        assert_eq!(sound.peak() > 1.5, !clipped, "{format}: {}", sound.peak());
        if !clipped {
            let over = sound.channels.iter().flatten().filter(|sample| sample.abs() > 1.0).count();
            assert_eq!(over as u64, counted);
        }
        let run = folder.run(&[&["render", "stage.toml", "--strict"], &arguments[..]].concat());
        assert_eq!(run.code, Some(3), "--strict: {}", run.stderr);
        assert!(run.stderr.contains(&format!("{counted} samples beyond 0 dBFS")), "{}", run.stderr);
    }
}

#[test]
fn replace_overwrites_our_own_names_alone() {
    let folder = folder();
    folder.write_silence("take.wav");
    folder.make("out");
    folder.write("out/as drawn.wav", b"old");
    folder.write("out/notes.txt", b"mine");
    let arguments = ["render", "stage.toml", "--play", "take.wav", "--into", "out"];
    let message = folder.refused(&arguments);
    assert!(message.contains("already holds") && message.contains("--replace"), "{message}");
    assert_eq!(folder.bytes("out/as drawn.wav"), b"old");
    folder.done(&[&arguments[..], &["--replace"]].concat());
    assert_eq!(Sound::read(&folder.path("out/as drawn.wav")).frames(), 4800);
    assert_eq!(folder.bytes("out/notes.txt"), b"mine");
}

#[test]
fn an_output_that_is_an_input_is_refused() {
    let folder = folder();
    folder.write_silence("as drawn.wav");
    let before = folder.bytes("as drawn.wav");
    let message = folder.refused(&["render", "stage.toml", "--play", "as drawn.wav", "--into", ".", "--replace"]);
    assert!(message.contains("as drawn.wav") && message.contains("overwrite an input"), "{message}");
    assert_eq!(folder.bytes("as drawn.wav"), before);
}

#[test]
fn several_recordings_share_one_level() {
    let folder = folder();
    write_float(&folder.path("loud.wav"), 8000, &[noise(1000, 1, 0.2)]);
    write_float(&folder.path("soft.wav"), 8000, &[noise(1000, 1, 0.02), noise(1000, 2, 0.01)]);
    let all = renders(&folder, &["--play", "soft.wav", "--play", "loud.wav", "--into", "out", "--format", "f32"]);
    let files: Vec<&str> = all.iter().map(|one| one["file"].as_str().expect("a file")).collect();
    assert_eq!(files, ["soft/as drawn.wav", "loud/as drawn.wav"]);
    assert_eq!(all[0]["full_scale_rms"], all[1]["full_scale_rms"]);
    let peak = |file: &str| 20.0 * Sound::read(&folder.path("out").join(file)).peak().log10();
    assert!((peak("loud/as drawn.wav") + 1.0).abs() < 1e-4, "the loudest: {} dBFS", peak("loud/as drawn.wav"));
    // 20 dB between the recordings, and a little that a nearly linear stage makes of it.
    assert!((peak("soft/as drawn.wav") + 21.0).abs() < 0.5, "the softer: {} dBFS", peak("soft/as drawn.wav"));
}
