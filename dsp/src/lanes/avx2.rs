//! Four lanes in one AVX2 register: the same operations as on [`F64x4`], each as one instruction.
//!
//! Left to itself the compiler takes arrays apart and puts them together again around every table lookup, which costs
//! a third of a step; so the AVX2 form of the hot loop names its instructions. No fused multiply-add: the bits stay
//! those of the portable form.
//!
//! # Safety
//! Every function here needs AVX2. [`Avx2x4`] is made and used only inside functions compiled with
//! `#[target_feature(enable = "avx2")]`, into which all of these are inlined, and those are called only where the CPU
//! has been asked.

use std::arch::x86_64::*;
use std::ops::{Add, Div, Mul, Neg, Sub};

use super::{F64x4, FourLanes, Lanes};

/// Four lanes of `f64` in a register.
#[derive(Clone, Copy)]
pub(crate) struct Avx2x4(pub(crate) __m256d);

macro_rules! instruction {
    ($trait:ident, $method:ident, $intrinsic:ident) => {
        impl $trait for Avx2x4 {
            type Output = Self;
            #[inline(always)]
            fn $method(self, other: Self) -> Self {
                // SAFETY: see the head of this file.
                Avx2x4(unsafe { $intrinsic(self.0, other.0) })
            }
        }
    };
}
instruction!(Add, add, _mm256_add_pd);
instruction!(Sub, sub, _mm256_sub_pd);
instruction!(Mul, mul, _mm256_mul_pd);
instruction!(Div, div, _mm256_div_pd);

impl Neg for Avx2x4 {
    type Output = Self;
    #[inline(always)]
    fn neg(self) -> Self {
        // SAFETY: see the head of this file.
        Avx2x4(unsafe { _mm256_xor_pd(_mm256_set1_pd(-0.0), self.0) })
    }
}

impl Lanes for Avx2x4 {
    #[inline(always)]
    fn splat(value: f64) -> Self {
        // SAFETY: see the head of this file.
        Avx2x4(unsafe { _mm256_set1_pd(value) })
    }
    #[inline(always)]
    fn max(self, other: Self) -> Self {
        // SAFETY: see the head of this file.
        Avx2x4(unsafe { _mm256_max_pd(self.0, other.0) })
    }
    #[inline(always)]
    fn min(self, other: Self) -> Self {
        // SAFETY: see the head of this file.
        Avx2x4(unsafe { _mm256_min_pd(self.0, other.0) })
    }
    #[inline(always)]
    fn abs(self) -> Self {
        // SAFETY: see the head of this file.
        Avx2x4(unsafe { _mm256_andnot_pd(_mm256_set1_pd(-0.0), self.0) })
    }
}

impl FourLanes for Avx2x4 {
    #[inline(always)]
    fn load(from: &F64x4) -> Self {
        // SAFETY: see the head of this file; an F64x4 is 32 bytes at a multiple of 32.
        Avx2x4(unsafe { _mm256_load_pd(from.0.as_ptr()) })
    }
    #[inline(always)]
    fn store(self) -> F64x4 {
        let mut out = F64x4::default();
        // SAFETY: as for `load`.
        unsafe { _mm256_store_pd(out.0.as_mut_ptr(), self.0) };
        out
    }
    #[inline(always)]
    fn all_below(self, bound: f64) -> bool {
        // SAFETY: see the head of this file.
        unsafe { _mm256_movemask_pd(_mm256_cmp_pd::<_CMP_LT_OQ>(self.0, _mm256_set1_pd(bound))) == 0b1111 }
    }
}
