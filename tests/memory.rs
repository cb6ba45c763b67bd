//! A long recording takes no more memory than a short one.
#![cfg(target_os = "linux")]

mod support;

use std::process::{Command, Stdio};

use support::Folder;

/// The most memory that a render of `minutes` minutes holds at once, KiB, by the kernel's own count.
fn peak_memory(minutes: u32, more: &[&str]) -> u64 {
    let folder = Folder::new();
    folder.write("stage.toml", include_str!("known-answers/known2.toml").as_bytes());
    let spec = hound::WavSpec {
        channels: 1,
        sample_rate: 8000,
        bits_per_sample: 16,
        sample_format: hound::SampleFormat::Int,
    };
    let mut writer = hound::WavWriter::create(folder.path("take.wav"), spec).expect("created");
    for n in 0..minutes * 60 * 8000 {
        writer.write_sample((n % 100) as i16 * 80 - 4000).expect("written");
    }
    writer.finalize().expect("finished");
    let mut child = Command::new(env!("CARGO_BIN_EXE_platewright"))
        .args(["render", "stage.toml", "--play", "take.wav", "--into", "out", "--oversample", "1"])
        .args(more)
        .env("RAYON_NUM_THREADS", "2")
        .current_dir(folder.path(""))
        .stdout(Stdio::null())
        .spawn()
        .expect("started");
    let status = format!("/proc/{}/status", child.id());
    let mut peak = 0;
    let code = loop {
        // "VmHWM:     5120 kB": the high-water mark, so that only the last look matters.
        let text = std::fs::read_to_string(&status).unwrap_or_default();
        let mark = text
            .lines()
            .find_map(|line| line.strip_prefix("VmHWM:"))
            .and_then(|rest| rest.split_whitespace().next());
        peak = peak.max(mark.and_then(|kib| kib.parse().ok()).unwrap_or(0));
        if let Some(code) = child.try_wait().expect("waited for") {
            break code;
        }
        std::thread::sleep(std::time::Duration::from_millis(1));
    };
    assert!(code.success());
    assert!(peak > 1000, "the kernel tells no memory: {peak} KiB");
    peak
}

/// With the level stated the sound goes straight into the file, else it waits on the disk.
#[test]
fn memory_does_not_grow_with_the_recording() {
    for level in [&["--full-scale", "4"][..], &[]] {
        let (short, long) = (peak_memory(1, level), peak_memory(10, level));
        println!("{short} KiB for a minute, {long} KiB for ten");
        assert!(long < 64 * 1024, "{long} KiB");
        assert!(long < short + 2048, "{short} KiB for a minute, {long} KiB for ten");
    }
}
