//! Logarithms, angles and sizes that give the same bits on every machine.
//!
//! The system's mathematical functions choose their code by CPU and differ in the last bit; figures end in files whose
//! bytes must not.

use num_complex::Complex64;

/// A ratio of voltages in decibels.
pub fn decibels(ratio: f64) -> f64 {
    20.0 * libm::log10(ratio)
}

/// The ratio of voltages that `decibels` stand for.
pub fn ratio(decibels: f64) -> f64 {
    libm::pow(10.0, decibels / 20.0)
}

/// |z|.
pub fn magnitude(z: Complex64) -> f64 {
    libm::hypot(z.re, z.im)
}

/// The angle of z in degrees, −180 < angle ≤ 180.
pub fn degrees(z: Complex64) -> f64 {
    let angle = libm::atan2(z.im, z.re).to_degrees();
    if angle <= -180.0 { angle + 360.0 } else { angle }
}
