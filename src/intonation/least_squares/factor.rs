//! Linear equations in whole numbers: a symmetric matrix taken apart once (Cholesky's way, with the pivots kept apart so
//! that no root is drawn), then used for any number of right-hand sides.
//!
//! Fixed point, rounded to nearest. How much room that needs follows from the matrix being positive definite: no product
//! of two of its parts exceeds its largest entry, and a product carries two fractions.

use super::{Row, TONES_MAX};

/// Entries of the matrix are below two to this.
pub const MATRIX_BITS: u32 = 39;
const FRACTION: u32 = 42;
const _: () = assert!(MATRIX_BITS + 2 * FRACTION < 125);
const HALF: i128 = 1 << (FRACTION - 1);

pub struct Factor {
    size: usize,
    /// Below the diagonal, in 2^-42nds.
    lower: Row<Row<i64>>,
    pivots: Row<Pivot>,
}

impl Factor {
    #[inline]
    pub fn of(matrix: &Row<Row<i64>>, size: usize) -> Factor {
        let mut factor = Factor {
            size,
            lower: Default::default(),
            pivots: [Pivot::of(1); TONES_MAX],
        };
        // What is left of the matrix on and above the diagonal, in 2^-42nds.
        let mut rest: Row<Row<i128>> = Default::default();
        for (rest, row) in rest.iter_mut().zip(matrix).take(size) {
            for (rest, entry) in rest.iter_mut().zip(row).take(size) {
                *rest = i128::from(*entry) << FRACTION;
            }
        }
        for k in 0..size {
            let (done, below) = rest[..size].split_at_mut(k + 1);
            let row = &done[k];
            let pivot = Pivot::of(row[k]);
            factor.pivots[k] = pivot;
            for (i, rest) in (k + 1..).zip(below) {
                let lower = pivot.divide(row[i]);
                factor.lower[i][k] = lower as i64;
                for (rest, entry) in rest.iter_mut().zip(row).take(size).skip(i) {
                    *rest -= (lower * entry + HALF) >> FRACTION;
                }
            }
        }
        factor
    }

    /// The unknowns, rounded to whole numbers.
    pub fn solve(&self, right: &Row<i128>) -> Row<i64> {
        let mut x = *right;
        for i in 1..self.size {
            let known = self.lower[i].iter().zip(&x).take(i);
            let sum: i128 = known.map(|(lower, x)| i128::from(*lower) * x).sum();
            x[i] -= (sum + HALF) >> FRACTION;
        }
        for i in (0..self.size).rev() {
            let known = self.lower.iter().zip(&x).take(self.size).skip(i + 1);
            let sum: i128 = known.map(|(lower, x)| i128::from(lower[i]) * x).sum();
            x[i] = self.pivots[i].divide(x[i]) - ((sum + HALF) >> FRACTION);
        }
        x.map(|x| x as i64)
    }
}

/// A positive number to divide by, as its reciprocal: what is divided is many, and division slow.
#[derive(Clone, Copy)]
struct Pivot {
    /// Between 2^61 and 2^62.
    reciprocal: i128,
    shift: u32,
}

impl Pivot {
    /// Of a number in 2^-42nds. None is as small as the least allowed here: each tone has a spring of at least 1.
    fn of(pivot: i128) -> Pivot {
        let pivot = pivot.max(1 << FRACTION >> 8);
        // Its first 62 bits.
        let bits = i128::BITS - pivot.leading_zeros();
        let mantissa = if bits > 62 {
            pivot >> (bits - 62)
        } else {
            pivot << (62 - bits)
        };
        Pivot {
            reciprocal: (1 << 123) / mantissa,
            shift: 61 + bits - FRACTION,
        }
    }

    /// To the nearest number. The result has 42 more fraction bits than what is divided, less those of the pivot.
    fn divide(self, over: i128) -> i128 {
        const LOW: u32 = 40;
        let high = (over >> LOW) * self.reciprocal;
        let low = ((over & ((1 << LOW) - 1)) * self.reciprocal) >> LOW;
        let shift = self.shift - LOW;
        (high + low + (1 << (shift - 1))) >> shift
    }
}
