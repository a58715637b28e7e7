//! Published figures, for expectations that owe nothing to trued.

/// A named tuning as trued ships it, and where each key sounds by the literature, at A4 = 440 Hz and from C.
pub struct Published {
    /// What a stage file calls it.
    pub name: &'static str,
    /// Pitches an octave apart share a channel; how many groups that leaves.
    pub groups: usize,
    cents: Cents,
}

enum Cents {
    /// Above C, for each key of the octave.
    Octave([f64; 12]),
    /// One key a step: steps to the octave.
    Steps(f64),
}

impl Published {
    /// Where a key sounds, in cents (100 x MIDI key); key 69 is 6900.
    pub fn key_cents(&self, key: u8) -> f64 {
        match self.cents {
            Cents::Octave(above_c) => {
                let place = |key: u8| (key / 12) as f64 * 1200.0 + above_c[key as usize % 12];
                6900.0 + place(key) - place(69)
            }
            Cents::Steps(steps) => 6900.0 + (key as f64 - 69.0) * 1200.0 / steps,
        }
    }
}

/// Werckmeister, Musicalische Temperatur (1691); Dupont 1935 p. 79: C-G, G-D, D-A, B-F# narrow by a quarter of the
/// Pythagorean comma, the rest pure.
pub const WERCKMEISTER_3: Published = Published {
    name: "werckmeister-3",
    groups: 12,
    cents: Cents::Octave([
        0.0,
        90.224996,
        192.179997,
        294.134997,
        390.224996,
        498.044999,
        588.269995,
        696.089998,
        792.179997,
        888.269995,
        996.089998,
        1092.179997,
    ]),
};

/// Aron, Toscanello (1523); Ratte 1991 p. 153. E flat to G sharp.
pub const QUARTER_COMMA_MEANTONE: Published = Published {
    name: "quarter-comma-meantone",
    groups: 12,
    cents: Cents::Octave([
        0.0,
        76.048999,
        193.156857,
        310.264715,
        386.313714,
        503.421572,
        579.470571,
        696.578428,
        772.627428,
        889.735285,
        1006.843143,
        1082.892142,
    ]),
};

/// Ellis, On Musical Duodenes (1874-5): 16/15 9/8 6/5 5/4 4/3 45/32 3/2 8/5 5/3 9/5 15/8.
pub const FIVE_LIMIT_SCALE: Published = Published {
    name: "five-limit-scale",
    groups: 12,
    cents: Cents::Octave([
        0.0,
        111.731285,
        203.910002,
        315.641287,
        386.313714,
        498.044999,
        590.223716,
        701.955001,
        813.686286,
        884.358713,
        1017.596288,
        1088.268715,
    ]),
};

pub const EQUAL_24: Published = Published {
    name: "equal-24",
    groups: 2,
    cents: Cents::Steps(24.0),
};

pub const EQUAL_19: Published = Published {
    name: "equal-19",
    groups: 19,
    cents: Cents::Steps(19.0),
};

pub const FIVE_TUNINGS: [&Published; 5] = [
    &WERCKMEISTER_3,
    &QUARTER_COMMA_MEANTONE,
    &FIVE_LIMIT_SCALE,
    &EQUAL_24,
    &EQUAL_19,
];

#[test]
fn figures_keep_to_their_definitions() {
    // Ratios by floating-point logarithm: another way than trued's.
    let cents = |ratio: f64| 1200.0 * ratio.log2();
    let near = |a: f64, b: f64| assert!((a - b).abs() < 2e-6, "{a} {b}");
    let duodene = [
        1.0,
        16.0 / 15.0,
        9.0 / 8.0,
        6.0 / 5.0,
        5.0 / 4.0,
        4.0 / 3.0,
        45.0 / 32.0,
        1.5,
        1.6,
        5.0 / 3.0,
        1.8,
        15.0 / 8.0,
    ];
    let above = |tuning: &Published, key| tuning.key_cents(60 + key) - tuning.key_cents(60);
    for (key, ratio) in duodene.iter().enumerate() {
        near(above(&FIVE_LIMIT_SCALE, key as u8), cents(*ratio));
    }
    near(above(&QUARTER_COMMA_MEANTONE, 7), cents(5.0) / 4.0);
    near(above(&QUARTER_COMMA_MEANTONE, 8), cents(25.0 / 16.0));
    near(
        above(&WERCKMEISTER_3, 9),
        cents(3.0) * 3.0 - 4800.0 - 0.75 * cents(531441.0 / 524288.0),
    );
    near(above(&EQUAL_19, 19), 1200.0);
}
