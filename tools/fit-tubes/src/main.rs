//! Derives the tube library's parameters from the published points.

fn main() {}
