//! Seeded randomness. Our own few lines (xorshift, Marsaglia 2003), so that a seed means the same play for ever.

/// The same seed gives the same throws on every machine.
#[derive(Clone, Debug)]
pub struct Dice(u64);

impl Dice {
    pub fn new(seed: u64) -> Dice {
        // Zero is the one state xorshift never leaves; the odd factor spreads small seeds.
        Dice(seed.wrapping_mul(0x9E37_79B9_7F4A_7C15) | 1)
    }

    fn next(&mut self) -> u64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        self.0 >> 11
    }

    /// From 0 up to, not including, `end`.
    pub fn below(&mut self, end: u64) -> u64 {
        self.next() % end
    }

    /// Both ends included.
    pub fn between(&mut self, low: u64, high: u64) -> u64 {
        low + self.below(high - low + 1)
    }

    /// True so many times in a hundred.
    pub fn percent(&mut self, chance: u64) -> bool {
        self.below(100) < chance
    }

    pub fn pick<T: Copy>(&mut self, from: &[T]) -> T {
        from[self.below(from.len() as u64) as usize]
    }
}

#[test]
fn the_same_seed_gives_the_same_throws_and_others_differ() {
    let throws = |seed| {
        let mut dice = Dice::new(seed);
        (0..50).map(|_| dice.between(1, 6)).collect::<Vec<_>>()
    };
    assert_eq!(throws(7), throws(7));
    assert_ne!(throws(7), throws(8));
    assert!((1..=6).all(|face| throws(7).contains(&face)));
}
