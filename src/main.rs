//! The program `platewright`: files in, files out, what a person sees.

fn main() {}
