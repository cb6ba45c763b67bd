//! Looking a table up in one lane or in four, each lane in its own table.

use super::table::Tables;
use crate::lanes::{F64x4, LANES, Lanes};

/// Which of a section's tables.
#[derive(Clone, Copy)]
pub(crate) enum Which {
    Plate,
    Grid,
    Root,
}

/// 2⁵²: added to a number from 0 to 2³¹ it leaves the nearest whole number in the lowest bits.
const ROUND: f64 = (1u64 << 52) as f64;

/// Lanes that can look a table up, each in its own.
pub(crate) trait Lookup: Lanes {
    /// One set of tables a lane.
    type Tables<'a>: Copy;

    /// The cells whose numbers stand in the low 32 bits of `rounded`, coefficient by coefficient.
    ///
    /// Every number must be below the number of cells.
    fn fetch(tables: Self::Tables<'_>, which: Which, rounded: Self) -> [Self; 4];
    /// Square root.
    fn sqrt(self) -> Self;
    /// `yes` where the lane is at least `bound`, else `no`.
    fn at_least(self, bound: f64, yes: Self, no: Self) -> Self;
}

/// Value and slope a cell at `place`, in tables whose last cells are `last`; the first and last cells have no end.
#[inline(always)]
pub(crate) fn cubic<V: Lookup>(tables: V::Tables<'_>, which: Which, place: V, last: V) -> (V, V) {
    let round = V::splat(ROUND);
    // NaN becomes 0.
    let rounded = place.max(V::splat(0.0)).min(last) + round;
    let t = place - (rounded - round);
    let [c0, c1, c2, c3] = V::fetch(tables, which, rounded);
    let top = t * c3;
    let inner = c2 + top;
    (c0 + t * (c1 + t * inner), c1 + t * (inner + (inner + top)))
}

/// The number that [`cubic`] has rounded into the low bits.
#[inline(always)]
fn number(rounded: f64) -> usize {
    rounded.to_bits() as u32 as usize
}

#[inline(always)]
fn cell(tables: &Tables, which: Which, number: usize) -> &F64x4 {
    let cells = tables.cells(which);
    debug_assert!(number < cells.len());
    // SAFETY: `cubic` clamps to the last cell, NaN included; numbers and tables of a tube are made together.
    unsafe { cells.get_unchecked(number) }
}

impl Lookup for f64 {
    type Tables<'a> = &'a Tables;

    #[inline(always)]
    fn fetch(tables: &Tables, which: Which, rounded: f64) -> [f64; 4] {
        cell(tables, which, number(rounded)).0
    }
    #[inline(always)]
    fn sqrt(self) -> f64 {
        f64::sqrt(self)
    }
    #[inline(always)]
    fn at_least(self, bound: f64, yes: f64, no: f64) -> f64 {
        if self >= bound { yes } else { no }
    }
}

impl Lookup for F64x4 {
    type Tables<'a> = [&'a Tables; LANES];

    #[inline(always)]
    fn fetch(tables: [&Tables; LANES], which: Which, rounded: F64x4) -> [F64x4; 4] {
        let row = |lane: usize| cell(tables[lane], which, number(rounded.0[lane])).0;
        let (r0, r1, r2, r3) = (row(0), row(1), row(2), row(3));
        let coefficient = |k: usize| F64x4([r0[k], r1[k], r2[k], r3[k]]);
        [coefficient(0), coefficient(1), coefficient(2), coefficient(3)]
    }
    #[inline(always)]
    fn sqrt(self) -> F64x4 {
        let a = self.0;
        F64x4([a[0].sqrt(), a[1].sqrt(), a[2].sqrt(), a[3].sqrt()])
    }
    #[inline(always)]
    fn at_least(self, bound: f64, yes: F64x4, no: F64x4) -> F64x4 {
        let pick = |k: usize| if self.0[k] >= bound { yes.0[k] } else { no.0[k] };
        F64x4([pick(0), pick(1), pick(2), pick(3)])
    }
}

#[cfg(target_arch = "x86_64")]
mod avx2 {
    use std::arch::x86_64::*;

    use super::{F64x4, LANES, Lookup, Tables, Which, cell};
    use crate::lanes::avx2::Avx2x4;

    impl Lookup for Avx2x4 {
        type Tables<'a> = [&'a Tables; LANES];

        #[inline(always)]
        fn fetch(tables: [&Tables; LANES], which: Which, rounded: Avx2x4) -> [Avx2x4; 4] {
            // SAFETY: an Avx2x4 exists only where the CPU has AVX2 (`lanes::avx2`); cells are aligned to 32 bytes.
            unsafe {
                let bits = _mm256_castpd_si256(rounded.0);
                let (low, high) = (_mm256_castsi256_si128(bits), _mm256_extracti128_si256::<1>(bits));
                let row = |lane: usize, number: i32| -> __m256d {
                    let cell: &F64x4 = cell(tables[lane], which, number as u32 as usize);
                    _mm256_load_pd(cell.0.as_ptr())
                };
                let r0 = row(0, _mm_cvtsi128_si32(low));
                let r1 = row(1, _mm_extract_epi32::<2>(low));
                let r2 = row(2, _mm_cvtsi128_si32(high));
                let r3 = row(3, _mm_extract_epi32::<2>(high));
                let (even01, odd01) = (_mm256_unpacklo_pd(r0, r1), _mm256_unpackhi_pd(r0, r1));
                let (even23, odd23) = (_mm256_unpacklo_pd(r2, r3), _mm256_unpackhi_pd(r2, r3));
                [
                    Avx2x4(_mm256_permute2f128_pd::<0x20>(even01, even23)),
                    Avx2x4(_mm256_permute2f128_pd::<0x20>(odd01, odd23)),
                    Avx2x4(_mm256_permute2f128_pd::<0x31>(even01, even23)),
                    Avx2x4(_mm256_permute2f128_pd::<0x31>(odd01, odd23)),
                ]
            }
        }
        #[inline(always)]
        fn sqrt(self) -> Avx2x4 {
            // SAFETY: as for `fetch`.
            Avx2x4(unsafe { _mm256_sqrt_pd(self.0) })
        }
        #[inline(always)]
        fn at_least(self, bound: f64, yes: Avx2x4, no: Avx2x4) -> Avx2x4 {
            // SAFETY: as for `fetch`.
            Avx2x4(unsafe {
                let mask = _mm256_cmp_pd::<_CMP_GE_OQ>(self.0, _mm256_set1_pd(bound));
                _mm256_blendv_pd(no.0, yes.0, mask)
            })
        }
    }
}
