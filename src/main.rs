//! The program `platewright`: files in, files out, what a person sees.

#[allow(dead_code, unused_imports, reason = "the commands that read and write sound are not wired up yet")]
mod audio_files;

fn main() {}
