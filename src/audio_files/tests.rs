//! Files made and read by sox and ffmpeg, and files that are odd or wrong.

#![allow(clippy::disallowed_methods, reason = "a test may differ in the last bit from machine to machine")]

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};

use super::error::RecordingProblem as Problem;
use super::wav_output::Levels;
use super::*;

/// Runs a tool that the tests need and returns its standard output.
fn tool(name: &str, arguments: &[&str]) -> Vec<u8> {
    let output = Command::new(name).args(arguments).stdin(Stdio::null()).output().unwrap_or_else(|error| {
        panic!("{name} is needed and does not start ({error}): tools/run-tests installs it")
    });
    let messages = String::from_utf8_lossy(&output.stderr);
    assert!(output.status.success(), "{name} {arguments:?} failed: {messages}");
    output.stdout
}

fn sox(arguments: &str) -> Vec<u8> {
    tool("sox", &arguments.split_whitespace().collect::<Vec<_>>())
}

fn ffmpeg(arguments: &str) -> Vec<u8> {
    let mut all = vec!["-v", "error", "-nostdin", "-y"];
    all.extend(arguments.split_whitespace());
    tool("ffmpeg", &all)
}

/// A folder for one test whose path holds no spaces.
fn folder() -> tempfile::TempDir {
    tempfile::tempdir().expect("a temporary folder")
}

fn path_in(folder: &tempfile::TempDir, name: &str) -> (PathBuf, String) {
    let path = folder.path().join(name);
    let text = path.to_str().expect("a plain path").to_owned();
    (path, text)
}

/// All frames, interleaved, read in blocks of an odd length.
fn samples(recording: &Recording) -> Vec<f64> {
    let mut blocks = recording.blocks().unwrap();
    let mut planes = vec![Vec::new(); recording.channels()];
    let mut interleaved = Vec::new();
    loop {
        let frames = blocks.read(&mut planes, 37).unwrap();
        if frames == 0 {
            return interleaved;
        }
        for frame in 0..frames {
            interleaved.extend(planes.iter().map(|plane| plane[frame]));
        }
    }
}

fn problem(path: &Path) -> Problem {
    match Recording::open(path) {
        Err(AudioError::Recording { problem, .. }) => problem,
        other => panic!("{}: expected a problem, got {other:?}", path.display()),
    }
}

fn refused(bytes: &[u8]) -> Problem {
    let folder = folder();
    let path = folder.path().join("take.wav");
    fs::write(&path, bytes).unwrap();
    problem(&path)
}

fn opened(bytes: &[u8]) -> Recording {
    let folder = folder();
    let path = folder.path().join("take.wav");
    fs::write(&path, bytes).unwrap();
    let recording = Recording::open(&path).unwrap();
    // The file outlives this function for the caller's sake; the system clears its folder for temporaries.
    samples(&recording);
    recording
}

/// sox's own raw output, as 32-bit integers, is what sox reads from the file.
#[test]
fn integer_files_made_by_sox_are_read_bit_for_bit() {
    let folder = folder();
    for coding in ["-b 8 -e unsigned", "-b 16 -e signed", "-b 24 -e signed", "-b 32 -e signed"] {
        for channels in [1, 2, 6] {
            for rate in [8000, 11025, 44100, 48000, 96000, 192_000] {
                let (path, file) = path_in(&folder, "made.wav");
                sox(&format!("-R -r {rate} -c {channels} -n {coding} {file} synth 1001s whitenoise gain -1"));
                let raw = sox(&format!("{file} -t raw -e signed -b 32 -L -"));
                let expected: Vec<f64> = raw
                    .chunks_exact(4)
                    .map(|bytes| f64::from(i32::from_le_bytes(bytes.try_into().unwrap())) / 2_147_483_648.0)
                    .collect();
                let recording = Recording::open(&path).unwrap();
                let shape =
                    (recording.channels(), recording.sample_rate(), recording.frames(), recording.warning());
                assert_eq!(shape, (channels, rate, 1001, None), "{coding}");
                assert!(samples(&recording) == expected, "{coding}, {channels} channels, {rate} Hz");
                let peak = expected.iter().fold(0.0_f64, |peak, sample| peak.max(sample.abs()));
                assert_eq!(recording.peak().unwrap(), peak);
            }
        }
    }
}

#[test]
fn float_files_made_by_sox_are_read_bit_for_bit() {
    let folder = folder();
    for channels in [1, 2, 6] {
        for rate in [8000, 44100, 192_000] {
            let (path, file) = path_in(&folder, "made.wav");
            sox(&format!("-R -r {rate} -c {channels} -n -b 32 -e float {file} synth 1001s whitenoise gain -1"));
            let ours = samples(&Recording::open(&path).unwrap());
            for raw in
                [sox(&format!("{file} -t raw -e float -b 32 -L -")), ffmpeg(&format!("-i {file} -f f32le -"))]
            {
                let expected: Vec<f64> = raw
                    .chunks_exact(4)
                    .map(|bytes| f64::from(f32::from_le_bytes(bytes.try_into().unwrap())))
                    .collect();
                assert!(ours == expected, "{channels} channels, {rate} Hz");
            }
        }
    }
}

/// Frames, one plane a channel, that use the whole range and are not on any format's grid.
fn sound(channels: usize, frames: usize) -> Vec<Vec<f64>> {
    let mut state = 7_u64;
    let mut sample = || {
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (state >> 11) as f64 / (1_u64 << 52) as f64 - 1.0
    };
    (0..channels).map(|_| (0..frames).map(|_| sample()).collect()).collect()
}

fn write(folder: &Path, name: &str, format: SampleFormat, rate: u32, planes: &[Vec<f64>]) -> (PathBuf, Levels) {
    let plan = OutputPlan::check(folder, true, &[name.into()], &[]).unwrap();
    let into = plan.create().unwrap();
    let frames = planes[0].len();
    let mut output = WavOutput::new(into.stage(name).unwrap(), format, planes.len(), rate, frames as u64).unwrap();
    for start in (0..frames).step_by(100) {
        let block: Vec<&[f64]> = planes.iter().map(|plane| &plane[start..(start + 100).min(frames)]).collect();
        output.write(&block).unwrap();
    }
    let (staged, levels) = output.finish().unwrap();
    (into.commit(vec![staged]).unwrap().remove(0), levels)
}

/// The samples as the format should hold them, computed with the plainest arithmetic.
fn expected_bytes(format: SampleFormat, planes: &[Vec<f64>]) -> Vec<u8> {
    let mut bytes = Vec::new();
    for frame in 0..planes[0].len() {
        for plane in planes {
            let scaled = |bits: i32| (plane[frame] * 2_f64.powi(bits)).round_ties_even() as i64;
            match format {
                SampleFormat::I16 => bytes.extend(&scaled(15).min(0x7FFF).to_le_bytes()[..2]),
                SampleFormat::I24 => bytes.extend(&scaled(23).min(0x7F_FFFF).to_le_bytes()[..3]),
                SampleFormat::I32 => bytes.extend(&scaled(31).min(0x7FFF_FFFF).to_le_bytes()[..4]),
                SampleFormat::F32 => bytes.extend((plane[frame] as f32).to_le_bytes()),
            }
        }
    }
    bytes
}

const RAW: [(SampleFormat, &str, &str); 4] = [
    (SampleFormat::I16, "-e signed -b 16", "s16le"),
    (SampleFormat::I24, "-e signed -b 24", "s24le"),
    (SampleFormat::I32, "-e signed -b 32", "s32le"),
    (SampleFormat::F32, "-e float -b 32", "f32le"),
];

#[test]
fn sox_ffmpeg_and_hound_read_what_is_written() {
    let folder = folder();
    for (format, sox_raw, ffmpeg_raw) in RAW {
        for (channels, rate) in [(1, 44100), (2, 48000), (3, 8000), (6, 192_000)] {
            let planes = sound(channels, 1001);
            let (path, _) = write(folder.path(), "ours.wav", format, rate, &planes);
            let file = path.to_str().unwrap();
            let expected = expected_bytes(format, &planes);
            let what = format!("{format}, {channels} channels");
            assert!(
                ffmpeg(&format!("-i {file} -f {ffmpeg_raw} -c:a pcm_{ffmpeg_raw} -")) == expected,
                "ffmpeg: {what}"
            );
            assert_eq!(String::from_utf8(sox_info(file, "-r")).unwrap().trim(), rate.to_string());
            assert_eq!(String::from_utf8(sox_info(file, "-c")).unwrap().trim(), channels.to_string());
            if format == SampleFormat::F32 {
                // sox holds samples as 32-bit integers and cuts off what lies below.
                let by_sox = sox(&format!("-D {file} -t raw -e float -b 64 -L -"));
                let apart = by_sox.chunks_exact(8).zip(expected.chunks_exact(4)).map(|(sox, ours)| {
                    let ours = f32::from_le_bytes(ours.try_into().unwrap());
                    (f64::from_le_bytes(sox.try_into().unwrap()) - f64::from(ours)).abs()
                });
                assert_eq!(by_sox.len(), 2 * expected.len(), "sox: {what}");
                assert!(apart.fold(0.0, f64::max) < 1.0 / 2_147_483_648.0, "sox: {what}");
            } else {
                assert!(sox(&format!("-D {file} -t raw {sox_raw} -L -")) == expected, "sox: {what}");
            }
            let hound = hound::WavReader::open(&path).unwrap();
            let spec = hound.spec();
            assert_eq!((usize::from(spec.channels), spec.sample_rate, hound.duration()), (channels, rate, 1001));
            assert_eq!(fs::metadata(&path).unwrap().len() % 2, 0, "padded to an even length");
            assert!(!samples(&Recording::open(&path).unwrap()).is_empty());
        }
    }
}

fn sox_info(file: &str, what: &str) -> Vec<u8> {
    tool("sox", &["--info", what, file])
}

#[test]
fn what_is_read_and_written_again_is_the_same() {
    let folder = folder();
    let (path, file) = path_in(&folder, "made.wav");
    for (coding, format) in [
        ("-b 16 -e signed", SampleFormat::I16),
        ("-b 24 -e signed", SampleFormat::I24),
        ("-b 32 -e signed", SampleFormat::I32),
        ("-b 32 -e float", SampleFormat::F32),
    ] {
        sox(&format!("-R -r 48000 -c 2 -n {coding} {file} synth 1000s whitenoise"));
        let first = samples(&Recording::open(&path).unwrap());
        let planes: Vec<Vec<f64>> =
            (0..2).map(|channel| first.iter().skip(channel).step_by(2).copied().collect()).collect();
        let (again, levels) = write(folder.path(), "again.wav", format, 48000, &planes);
        assert!(samples(&Recording::open(&again).unwrap()) == first, "{coding}");
        assert_eq!(levels.over_full_scale, 0);
    }
}

#[test]
fn samples_over_full_scale_are_counted_clipped_in_integers_and_kept_in_float() {
    let folder = folder();
    let planes = [vec![0.5, 1.0, -1.0, 1.25, -3.0]];
    let (path, levels) = write(folder.path(), "i.wav", SampleFormat::I24, 48000, &planes);
    assert_eq!(levels, Levels { peak: 3.0, over_full_scale: 2 });
    let most = 1.0 - SampleFormat::I24.step();
    assert_eq!(samples(&Recording::open(&path).unwrap()), [0.5, most, -1.0, most, -1.0]);
    let (path, levels) = write(folder.path(), "f.wav", SampleFormat::F32, 48000, &planes);
    assert_eq!(levels, Levels { peak: 3.0, over_full_scale: 2 });
    assert_eq!(samples(&Recording::open(&path).unwrap()), planes[0]);
}

#[test]
fn sound_that_is_not_finite_is_never_written() {
    let home = folder();
    let plan = OutputPlan::check(home.path(), true, &["x.wav".into()], &[]).unwrap();
    let into = plan.create().unwrap();
    let mut output = WavOutput::new(into.stage("x.wav").unwrap(), SampleFormat::F32, 1, 48000, 3).unwrap();
    let error = output.write(&[[0.0, f64::NAN, 0.0]]).unwrap_err();
    assert!(matches!(error, AudioError::NotFinite { frame: 2, channel: 1, .. }), "{error}");
    drop(output);
    assert_eq!(fs::read_dir(home.path()).unwrap().count(), 0);
}

/// `fmt ` for 16-bit mono at 48 kHz unless told otherwise.
fn format_chunk(tag: u16, channels: u16, rate: u32, bits: u16) -> Vec<u8> {
    let frame_bytes = channels * bits / 8;
    let mut bytes = b"fmt \x10\0\0\0".to_vec();
    bytes.extend(tag.to_le_bytes());
    bytes.extend(channels.to_le_bytes());
    bytes.extend(rate.to_le_bytes());
    bytes.extend((rate * u32::from(frame_bytes)).to_le_bytes());
    bytes.extend(frame_bytes.to_le_bytes());
    bytes.extend(bits.to_le_bytes());
    bytes
}

fn chunk(id: &[u8; 4], declared: u32, contents: &[u8]) -> Vec<u8> {
    [&id[..], &declared.to_le_bytes(), contents].concat()
}

fn riff(declared: u32, chunks: &[Vec<u8>]) -> Vec<u8> {
    [b"RIFF", &declared.to_le_bytes()[..], b"WAVE", &chunks.concat()].concat()
}

/// 16-bit mono, header and samples of 4 frames, whole.
fn plain() -> Vec<u8> {
    riff(44, &[format_chunk(1, 1, 48000, 16), chunk(b"data", 8, &[1, 0, 2, 0, 3, 0, 4, 0])])
}

#[test]
fn files_from_pipes_are_read_to_their_end_without_a_warning() {
    let folder = folder();
    let (path, file) = path_in(&folder, "made.wav");
    sox(&format!("-R -r 44100 -c 2 -n -b 16 {file} synth 1001s whitenoise gain -1"));
    let expected = samples(&Recording::open(&path).unwrap());
    let pipes = [
        sox(&format!("{file} -t wav -")),
        ffmpeg(&format!("-i {file} -f wav -")),
        ffmpeg(&format!("-i {file} -rf64 always -f wav -")),
    ];
    for (number, bytes) in pipes.into_iter().enumerate() {
        let (path, _) = path_in(&folder, "pipe.wav");
        fs::write(&path, bytes).unwrap();
        let recording = Recording::open(&path).unwrap();
        assert_eq!((recording.frames(), recording.warning()), (1001, None), "pipe {number}");
        assert!(samples(&recording) == expected, "pipe {number}");
    }
}

#[test]
fn recording_whose_recorder_was_cut_off_is_read_to_its_end() {
    let zeros = riff(0, &[format_chunk(1, 1, 48000, 16), chunk(b"data", 0, &[1, 0, 2, 0, 3, 0, 4])]);
    let recording = opened(&zeros);
    assert_eq!((recording.frames(), recording.warning()), (3, None));
}

#[test]
fn rf64_made_by_ffmpeg_is_read_bit_for_bit() {
    let folder = folder();
    let (path, file) = path_in(&folder, "made.wav");
    let (long_path, long_file) = path_in(&folder, "long.wav");
    sox(&format!("-R -r 96000 -c 2 -n -b 24 {file} synth 1001s whitenoise gain -1"));
    ffmpeg(&format!("-i {file} -c:a pcm_s24le -rf64 always -metadata title=take {long_file}"));
    assert_eq!(&fs::read(&long_path).unwrap()[..4], b"RF64");
    assert!(samples(&Recording::open(&long_path).unwrap()) == samples(&Recording::open(&path).unwrap()));
}

#[test]
fn chunks_around_the_samples_are_passed_over() {
    let odd = chunk(b"LIST", 5, b"notes\0");
    let file =
        riff(0, &[odd.clone(), format_chunk(1, 1, 48000, 16), odd.clone(), chunk(b"data", 4, &[1, 0, 2, 0]), odd]);
    let recording = opened(&file);
    assert_eq!((recording.frames(), recording.warning()), (2, None));
}

#[test]
fn samples_cut_short_are_used_as_far_as_they_go_with_a_warning() {
    let mut file = plain();
    file.truncate(file.len() - 3);
    let recording = opened(&file);
    assert_eq!(recording.frames(), 2);
    let warning = recording.warning().unwrap();
    assert!(warning.contains("promises 4 frames, 2 are there"), "{warning}");
}

#[test]
fn header_cut_short_anywhere_is_refused() {
    for length in 0..44 {
        let problem = refused(&plain()[..length]);
        let expected = match length {
            0..4 => Problem::NotWav { looks_like: None },
            _ => Problem::HeaderCutShort,
        };
        assert_eq!(problem, expected, "after {length} bytes");
    }
    assert_eq!(refused(&plain()[..44]), Problem::NoSamples);
    assert_eq!(refused(&plain()[..45]), Problem::NoSamples);
}

#[test]
fn recording_without_samples_is_refused() {
    let after = chunk(b"LIST", 4, b"note");
    let file = riff(48, &[format_chunk(1, 1, 48000, 16), chunk(b"data", 0, &[]), after]);
    assert_eq!(refused(&file), Problem::NoSamples);
    let folder = folder();
    let (path, file) = path_in(&folder, "made.wav");
    sox(&format!("-r 48000 -n -b 16 {file} trim 0 0"));
    assert_eq!(problem(&path), Problem::NoSamples);
}

#[test]
fn other_kinds_of_file_are_named() {
    let folder = folder();
    for (name, kind) in [("x.flac", "FLAC"), ("x.aiff", "AIFF"), ("x.ogg", "Ogg")] {
        let (path, file) = path_in(&folder, name);
        sox(&format!("-R -r 48000 -n {file} synth 0.1 sine 440"));
        let message = Recording::open(&path).unwrap_err().to_string();
        assert!(message.contains(&format!("{kind} file, not WAV")), "{message}");
    }
    assert_eq!(refused(b"title = \"a stage file\"\n"), Problem::NotWav { looks_like: None });
    assert_eq!(problem(folder.path()), Problem::NotAFile);
    let missing = Recording::open(&folder.path().join("missing.wav")).unwrap_err();
    assert!(missing.to_string().contains("no such file") && missing.is_request(), "{missing}");
}

#[test]
fn codings_that_are_not_read_are_named() {
    let folder = folder();
    for (coding, name) in [
        ("-b 64 -e float", "64-bit float"),
        ("-e mu-law", "µ-law"),
        ("-e a-law", "A-law"),
        ("-e ms-adpcm", "ADPCM"),
        ("-e ima-adpcm", "ADPCM"),
    ] {
        let (path, file) = path_in(&folder, "x.wav");
        sox(&format!("-R -r 48000 -c 2 -n {coding} {file} synth 0.1 sine 440"));
        assert_eq!(problem(&path), Problem::UnsupportedCoding { found: name.into() });
    }
    let twelve = riff(38, &[format_chunk(1, 1, 48000, 12), chunk(b"data", 2, &[0, 0])]);
    assert_eq!(refused(&twelve), Problem::UnsupportedCoding { found: "12-bit integer".into() });
}

#[test]
fn rates_beyond_8_to_192_khz_are_refused() {
    for rate in [0, 7999, 192_001, 384_000] {
        let file = riff(38, &[format_chunk(1, 1, rate, 16), chunk(b"data", 2, &[0, 0])]);
        assert_eq!(refused(&file), Problem::RateOutOfRange { rate });
    }
}

#[test]
fn header_that_contradicts_itself_is_refused() {
    let no_format = riff(14, &[chunk(b"data", 2, &[0, 0])]);
    assert!(matches!(refused(&no_format), Problem::BadHeader { .. }));
    let no_channels = riff(38, &[format_chunk(1, 0, 48000, 16), chunk(b"data", 2, &[0, 0])]);
    assert!(matches!(refused(&no_channels), Problem::BadHeader { .. }));
    let mut wrong_frame = plain();
    wrong_frame[32] = 3;
    assert!(matches!(refused(&wrong_frame), Problem::BadHeader { .. }));
    let short = riff(20, &[chunk(b"fmt ", 4, &[1, 0, 1, 0]), chunk(b"data", 2, &[0, 0])]);
    assert!(matches!(refused(&short), Problem::BadHeader { .. }));
}

#[test]
fn nan_and_infinity_are_found_before_anything_is_made() {
    let file = |value: f32, at: usize| {
        let mut samples = vec![0.25_f32; 20_000];
        samples[at] = value;
        let bytes: Vec<u8> = samples.iter().flat_map(|sample| sample.to_le_bytes()).collect();
        riff(80_036, &[format_chunk(3, 2, 48000, 32), chunk(b"data", 80_000, &bytes)])
    };
    assert!(matches!(refused(&file(f32::NAN, 0)), Problem::NotFinite { frame: 1, channel: 1, .. }));
    let infinite = refused(&file(f32::NEG_INFINITY, 19_999));
    assert_eq!(infinite, Problem::NotFinite { frame: 10_000, channel: 2, value: f64::NEG_INFINITY });
    assert!(infinite.to_string().contains("frame 10000, channel 2 is infinite"), "{infinite}");
}

#[test]
fn damaged_headers_never_panic() {
    let folder = folder();
    let path = folder.path().join("damaged.wav");
    let extensible = riff(0, &[format_chunk(0xFFFE, 2, 48000, 24), chunk(b"data", 12, &[7; 12])]);
    for whole in [plain(), extensible] {
        for at in 0..whole.len() {
            for value in [0, 1, 0x7F, 0x80, 0xFE, 0xFF] {
                let mut damaged = whole.clone();
                damaged[at] = value;
                fs::write(&path, &damaged).unwrap();
                if let Ok(recording) = Recording::open(&path) {
                    assert!(samples(&recording).len() <= damaged.len());
                }
            }
        }
    }
}
/// Beyond 4 GiB the header is RF64's; a limit of nothing asks for it in a small file.
#[test]
fn sox_ffmpeg_and_the_reader_agree_on_written_rf64() {
    let folder = folder();
    for (format, _, ffmpeg_raw) in RAW {
        for channels in [1, 2, 6] {
            let planes = sound(channels, 1001);
            let samples_bytes = expected_bytes(format, &planes);
            let mut bytes = wav_output::header(format, channels, 96000, 1001, 0);
            assert_eq!(&bytes[..4], b"RF64");
            bytes.extend(&samples_bytes);
            bytes.resize(bytes.len().next_multiple_of(2), 0);
            let riff_bytes = u64::from_le_bytes(bytes[20..28].try_into().unwrap());
            assert_eq!(riff_bytes, bytes.len() as u64 - 8, "the length of all that follows it");
            let (path, file) = path_in(&folder, "long.wav");
            fs::write(&path, bytes).unwrap();
            let what = format!("{format}, {channels} channels");
            assert!(
                ffmpeg(&format!("-i {file} -f {ffmpeg_raw} -c:a pcm_{ffmpeg_raw} -")) == samples_bytes,
                "{what}"
            );
            assert_eq!(String::from_utf8(sox_info(&file, "-s")).unwrap().trim(), "1001", "{what}");
            let recording = Recording::open(&path).unwrap();
            let shape = (recording.frames(), recording.channels(), recording.sample_rate(), recording.warning());
            assert_eq!(shape, (1001, channels, 96000, None));
        }
    }
}

#[test]
fn header_changes_to_rf64_where_32_bits_end() {
    let kind = |frames| wav_output::header(SampleFormat::I16, 1, 48000, frames, u64::from(u32::MAX))[..4].to_vec();
    // The header counts 36 bytes of its own; the length must stay even.
    let most = (u64::from(u32::MAX) - 36) / 2;
    assert_eq!((kind(most), kind(most + 1)), (b"RIFF".to_vec(), b"RF64".to_vec()));
}

/// ffmpeg's `ebur128` filter measures the same files.
#[test]
fn loudness_and_true_peak_agree_with_ffmpeg() {
    let folder = folder();
    for (channels, rate, effects) in [
        (1, 48000, "synth 8 pinknoise fade t 3 8 2 gain -6"),
        (2, 44100, "synth 8 pluck C3 pluck E3 repeat 1 gain -3"),
        (2, 96000, "synth 6 brownnoise tremolo 0.5 80 gain -9"),
    ] {
        let (path, file) = path_in(&folder, "made.wav");
        sox(&format!("-R -r {rate} -c {channels} -n -b 24 {file} {effects}"));
        let recording = Recording::open(&path).unwrap();
        let mut meter = platewright_dsp::signal::LevelMeter::new(channels, rate).unwrap();
        let mut planes = vec![Vec::new(); channels];
        let mut blocks = recording.blocks().unwrap();
        while blocks.read(&mut planes, 1000).unwrap() > 0 {
            meter.add(&planes);
        }
        let ours = meter.finish();
        let measure = "ebur128=metadata=1:peak=true,ametadata=mode=print:file=-";
        let report = String::from_utf8(ffmpeg(&format!("-i {file} -af {measure} -f null /dev/null"))).unwrap();
        let last = |key: &str| -> f64 {
            let line = report.lines().rfind(|line| line.starts_with(key)).unwrap_or_else(|| panic!("no {key}"));
            line[key.len()..].parse().unwrap()
        };
        let loudness = last("lavfi.r128.I=");
        assert!((ours.loudness.unwrap() - loudness).abs() < 0.02, "{:?}, ffmpeg {loudness} LUFS", ours.loudness);
        assert_eq!(ours.peak, recording.peak().unwrap());
        let true_peak = (0..channels).map(|c| last(&format!("lavfi.r128.true_peaks_ch{c}="))).fold(0.0, f64::max);
        // Both interpolate with short filters of their own; EBU Tech 3341 allows a meter +0.2 and −0.4 dB.
        let apart_db = 20.0 * (ours.true_peak / true_peak).log10();
        assert!(apart_db.abs() < 0.2, "true peak {}, ffmpeg {true_peak}", ours.true_peak);
    }
}
