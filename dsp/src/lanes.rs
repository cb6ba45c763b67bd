//! Four lanes of `f64` stepped at once, in code that gives the same bits with and without AVX2.
//!
//! Plain arrays and separate multiplies and adds: inside a function compiled for AVX2 the compiler turns each operation
//! into one instruction, elsewhere into two or four, and no fused multiply-add ever changes a rounding.

use std::ops::{Add, Div, Mul, Neg, Sub};

#[cfg(target_arch = "x86_64")]
pub(crate) mod avx2;

/// How many lanes are stepped at once.
pub const LANES: usize = 4;

/// Four lanes of `f64`.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
#[repr(C, align(32))]
pub struct F64x4(pub [f64; LANES]);

/// Arithmetic that the engine needs, for one lane (`f64`) and for four.
pub trait Lanes:
    Copy + Add<Output = Self> + Sub<Output = Self> + Mul<Output = Self> + Div<Output = Self> + Neg<Output = Self>
{
    /// The same value in every lane.
    fn splat(value: f64) -> Self;
    /// The larger of each pair; `other` where either is NaN.
    fn max(self, other: Self) -> Self;
    /// The smaller of each pair; `other` where either is NaN.
    fn min(self, other: Self) -> Self;
    /// Absolute value.
    fn abs(self) -> Self;
}

/// Arithmetic on four lanes, in the form that a kernel keeps them while it runs.
pub(crate) trait FourLanes: Lanes {
    /// From memory.
    fn load(from: &F64x4) -> Self;
    /// To memory.
    fn store(self) -> F64x4;
    /// Whether every lane is below `bound`; a NaN is not.
    fn all_below(self, bound: f64) -> bool;
}

macro_rules! lanewise {
    ($trait:ident, $method:ident, $op:tt) => {
        impl $trait for F64x4 {
            type Output = Self;
            #[inline(always)]
            fn $method(self, other: Self) -> Self {
                let (a, b) = (self.0, other.0);
                F64x4([a[0] $op b[0], a[1] $op b[1], a[2] $op b[2], a[3] $op b[3]])
            }
        }
    };
}
lanewise!(Add, add, +);
lanewise!(Sub, sub, -);
lanewise!(Mul, mul, *);
lanewise!(Div, div, /);

impl Neg for F64x4 {
    type Output = Self;
    #[inline(always)]
    fn neg(self) -> Self {
        let a = self.0;
        F64x4([-a[0], -a[1], -a[2], -a[3]])
    }
}

#[inline(always)]
fn larger(a: f64, b: f64) -> f64 {
    if a > b { a } else { b }
}

#[inline(always)]
fn smaller(a: f64, b: f64) -> f64 {
    if a < b { a } else { b }
}

impl Lanes for F64x4 {
    #[inline(always)]
    fn splat(value: f64) -> Self {
        F64x4([value; LANES])
    }
    #[inline(always)]
    fn max(self, other: Self) -> Self {
        let (a, b) = (self.0, other.0);
        F64x4([larger(a[0], b[0]), larger(a[1], b[1]), larger(a[2], b[2]), larger(a[3], b[3])])
    }
    #[inline(always)]
    fn min(self, other: Self) -> Self {
        let (a, b) = (self.0, other.0);
        F64x4([smaller(a[0], b[0]), smaller(a[1], b[1]), smaller(a[2], b[2]), smaller(a[3], b[3])])
    }
    #[inline(always)]
    fn abs(self) -> Self {
        let a = self.0;
        F64x4([a[0].abs(), a[1].abs(), a[2].abs(), a[3].abs()])
    }
}

impl FourLanes for F64x4 {
    #[inline(always)]
    fn load(from: &F64x4) -> Self {
        *from
    }
    #[inline(always)]
    fn store(self) -> F64x4 {
        self
    }
    #[inline(always)]
    fn all_below(self, bound: f64) -> bool {
        let v = self.0;
        (v[0] < bound) & (v[1] < bound) & (v[2] < bound) & (v[3] < bound)
    }
}

impl Lanes for f64 {
    #[inline(always)]
    fn splat(value: f64) -> Self {
        value
    }
    #[inline(always)]
    fn max(self, other: Self) -> Self {
        larger(self, other)
    }
    #[inline(always)]
    fn min(self, other: Self) -> Self {
        smaller(self, other)
    }
    #[inline(always)]
    fn abs(self) -> Self {
        f64::abs(self)
    }
}

/// Which compiled form of the hot loops runs; both give the same bits.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kernel {
    /// Code that every CPU of the target runs.
    Portable,
    /// Compiled for AVX2, without fused multiply-add.
    Avx2,
}

impl Kernel {
    /// The fastest form that this CPU runs.
    pub fn detect() -> Self {
        #[cfg(target_arch = "x86_64")]
        if std::arch::is_x86_feature_detected!("avx2") {
            return Kernel::Avx2;
        }
        Kernel::Portable
    }

    /// This form where the CPU runs it, else the portable one.
    pub fn supported(self) -> Self {
        if self == Kernel::Avx2 { Kernel::detect() } else { self }
    }
}
