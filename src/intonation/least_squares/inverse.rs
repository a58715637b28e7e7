//! Linear equations in whole numbers: the inverse of a symmetric, positive definite matrix, worked out once, then used for
//! any number of right-hand sides.
//!
//! Cholesky's way, with roots drawn to a power of two only: the matrix is scaled to at most a sixteenth, each pivot to
//! between a quarter and one. No part of the root is above a half then, every number fits into 64 bits, and every product
//! is a single one for the machine.

/// Entries of the matrix are below two to this.
pub const MATRIX_BITS: u32 = 39;
/// Fraction bits of the scaled matrix and of its root.
const ROOT: u32 = 63;
/// The scaled matrix, as it is written, is below two to this.
const SCALED_BITS: u32 = ROOT - 4;
/// Of a pivot's reciprocal, at most 4.
const RECIPROCAL: u32 = 60;
/// Of the root's inverse. The square of its parts is at most the greatest entry of the inverse, and that is hardly above
/// the greatest of the matrix and its scale: each tone has a spring of at least 1.
const ROOT_INVERSE: u32 = 39;
const _: () = assert!(2 * ROOT_INVERSE + MATRIX_BITS + 4 + 3 < 127);
/// No pivot is as small, but for rounding.
const PIVOT_MIN: i64 = 1 << (SCALED_BITS - MATRIX_BITS - 4);
/// Of the inverse's entries, and of a right-hand side. The sum of four entries, or of products for all unknowns, is no too
/// large number.
const ENTRY_BITS: u32 = 60;
/// By so much an entry may be above the square of the greatest part of the root's inverse: it is the sum of at most
/// sixteen products, each with a reciprocal.
const SUM_BITS: u32 = 6;
/// Of a root's inverse with parts below two to the ninth. That is found by trial: with more, a solution is a few thousandths
/// of a cent off at worst, with less two microcents.
const FINE_BITS: u32 = ROOT_INVERSE + 9;

pub struct Inverse<const N: usize> {
    entries: [[i64; N]; N],
    /// Their fraction bits.
    fraction: u32,
    /// Whether a solution is right to a few microcents at once.
    pub is_fine: bool,
}

impl<const N: usize> Inverse<N> {
    /// Of the first so many rows and columns; the other entries are zero.
    #[inline]
    pub fn of(matrix: &[[i64; N]; N], size: usize) -> Inverse<N> {
        let greatest = (0..N).map(|i| matrix[i][i]).max();
        let scale = SCALED_BITS - bits(greatest.unwrap_or(1).into());
        let mut scaled = [[0; N]; N];
        for i in 0..N {
            for j in i..N {
                scaled[i][j] = matrix[i][j] << scale;
            }
        }
        // The others stand for themselves. Loops of a known length are faster by more than these cost.
        for (i, row) in scaled.iter_mut().enumerate().skip(size) {
            row[i] = 1 << (SCALED_BITS - 1);
        }
        let root = Root::of(scaled).inverse();
        let excess = 2 * root.bits + SUM_BITS - ENTRY_BITS;
        let mut inverse = Inverse {
            entries: [[0; N]; N],
            fraction: 2 * ROOT_INVERSE - excess + ROOT - scale,
            is_fine: root.bits < FINE_BITS,
        };
        for i in 0..N {
            for j in i..N {
                let sum: i128 = (j..N).map(|k| root.product(k, i, j)).sum();
                let entry = (sum >> excess) as i64;
                inverse.entries[i][j] = entry;
                inverse.entries[j][i] = entry;
            }
        }
        inverse
    }

    /// The unknowns, rounded to whole numbers.
    #[inline]
    pub fn solve(&self, right: &[i128; N]) -> [i64; N] {
        let greatest = right.iter().fold(0, |bits, right| bits | right.abs());
        let excess = bits(greatest).saturating_sub(ENTRY_BITS);
        let mut scaled = [0; N];
        for (scaled, right) in scaled.iter_mut().zip(right) {
            *scaled = (right >> excess) as i64;
        }
        let fraction = self.fraction - excess;
        let mut unknowns = [0; N];
        for (unknown, row) in unknowns.iter_mut().zip(&self.entries) {
            let mut sum = 1 << (fraction - 1);
            for (entry, right) in row.iter().zip(&scaled) {
                sum += times(*entry, *right);
            }
            *unknown = (sum >> fraction) as i64;
        }
        unknowns
    }

    /// How much further apart one pair of unknowns is if another one is pulled apart so strongly, with so many bits of
    /// fraction.
    #[inline]
    pub fn answer(&self, pair: (u8, u8), pulled: (u8, u8), by: i64, fraction: u32) -> i64 {
        let entry = |i: u8, j: u8| self.entries[i as usize][j as usize];
        let upper = entry(pair.1, pulled.1) - entry(pair.1, pulled.0);
        let lower = entry(pair.0, pulled.1) - entry(pair.0, pulled.0);
        (times(upper - lower, by) >> (self.fraction - fraction)) as i64
    }
}

/// The root of a matrix: times its pivots times itself turned over, it is the matrix.
struct Root<const N: usize> {
    /// Below the diagonal.
    parts: [[i64; N]; N],
    pivots: [Pivot; N],
}

impl<const N: usize> Root<N> {
    /// Of a matrix of which only what is on and above the diagonal counts.
    #[inline]
    fn of(mut rest: [[i64; N]; N]) -> Root<N> {
        let mut root = Root {
            parts: [[0; N]; N],
            pivots: [Pivot::default(); N],
        };
        for k in 0..N {
            let pivot = Pivot::of(rest[k][k]);
            root.pivots[k] = pivot;
            let mut row = rest[k];
            for entry in &mut row {
                *entry <<= pivot.scale + 1;
            }
            for i in k + 1..N {
                let part = high(row[i], pivot.reciprocal) << (ROOT - RECIPROCAL);
                root.parts[i][k] = part;
                for j in i..N {
                    rest[i][j] -= high(part, row[j]);
                }
            }
        }
        root
    }

    #[inline]
    fn inverse(&self) -> RootInverse<N> {
        let mut parts = [[0; N]; N];
        let mut divided = [[0; N]; N];
        let mut greatest = 0;
        for (i, pivot) in self.pivots.iter().enumerate() {
            let Pivot { scale, reciprocal } = *pivot;
            parts[i][i] = 1 << (ROOT_INVERSE + scale);
            for j in 0..i {
                let above = self.parts[i].iter().zip(&parts).take(i).skip(j);
                let sum: i128 = above.map(|(part, row)| times(*part, row[j])).sum();
                parts[i][j] = -(sum >> (ROOT - scale)) as i64;
            }
            for j in 0..=i {
                greatest |= parts[i][j].abs();
                divided[i][j] = (times(parts[i][j], reciprocal) >> RECIPROCAL) as i64;
            }
        }
        RootInverse {
            parts,
            divided,
            bits: bits(greatest.into()),
        }
    }
}

struct RootInverse<const N: usize> {
    parts: [[i64; N]; N],
    /// By the pivots.
    divided: [[i64; N]; N],
    /// All parts are below two to this.
    bits: u32,
}

impl<const N: usize> RootInverse<N> {
    /// What one row adds to an entry of the inverse.
    #[inline]
    fn product(&self, row: usize, i: usize, j: usize) -> i128 {
        times(self.parts[row][i], self.divided[row][j])
    }
}

/// A positive number to divide by, as its reciprocal: what is divided is many, and division slow.
#[derive(Clone, Copy, Default)]
struct Pivot {
    /// Of the pivot times four to the scale, which is between a quarter and one.
    reciprocal: i64,
    scale: u32,
}

impl Pivot {
    #[inline]
    fn of(pivot: i64) -> Pivot {
        let pivot = pivot.max(PIVOT_MIN);
        let scale = (ROOT - bits(pivot.into())) / 2;
        let pivot = (pivot as u128) << (2 * scale);
        Pivot {
            reciprocal: ((1 << (ROOT + RECIPROCAL)) / pivot) as i64,
            scale,
        }
    }
}

fn bits(number: i128) -> u32 {
    i128::BITS - number.leading_zeros()
}

pub fn times(one: i64, other: i64) -> i128 {
    i128::from(one) * i128::from(other)
}

/// The product without its lower 64 bits.
pub fn high(one: i64, other: i64) -> i64 {
    (times(one, other) >> 64) as i64
}
