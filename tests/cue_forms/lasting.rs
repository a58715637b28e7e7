//! What lasts, by the language: nudge, plain, transposition, tonic, places of keys, names of black keys; and what each
//! key of four songs sounds with it, in floating point from the definitions of their scales.

/// In the order of the set: two by letter in cents from equal, a meantone chain with two names for one key, a just scale,
/// and equal temperament for the song that follows chords.
pub const TUNINGS: [&str; 5] = [
    "{offsets: {C: 0}, also: {C: {high: 30 c}, E: {low: 350 c}}, turns: {both: {C: high, E: low}}}",
    "{offsets: {C: +10 c, E: -14 c}}",
    "{fifths: {chain: [Ab, Eb, Bb, F, C, G, D, A, E, B, F#, C#, G#], each: narrow 1/4 syntonic}, also: {C: {high: 30 c}}}",
    "{pitches: [1/1, 16/15, 9/8, 6/5, 5/4, 4/3, 45/32, 3/2, 8/5, 5/3, 9/5, 15/8]}",
    "{offsets: {C: 0}}",
];
/// The song whose notes are where their chord is.
pub const FOLLOWS: usize = 4;
pub const BLACK_KEYS: &str = ", black_keys: [G# or Ab]";
/// Each song's own transposition.
pub const TRANSPOSED: [i32; 5] = [0, 1, 0, -2, 0];

const JUST: [(f64, f64); 12] = [
    (1., 1.),
    (16., 15.),
    (9., 8.),
    (6., 5.),
    (5., 4.),
    (4., 3.),
    (45., 32.),
    (3., 2.),
    (8., 5.),
    (5., 3.),
    (9., 5.),
    (15., 8.),
];

fn cents(over: f64, under: f64) -> f64 {
    1200.0 * (over / under).log2()
}

/// The just scale above its tonic.
fn just(keys_above: i32) -> f64 {
    let (over, under) = JUST[keys_above.rem_euclid(12) as usize];
    f64::from(keys_above.div_euclid(12)) * 1200.0 + cents(over, under)
}

/// Where a key stands in quarter-comma meantone with A = 6900, so many fifths from A.
fn meantone(key: i32, ab: bool) -> f64 {
    let fifth = cents(3.0, 2.0) - cents(81.0, 80.0) / 4.0;
    // C C# D Eb E F F# G G# A Bb B on the line of fifths from A.
    let fifths = [-3, 4, -1, -6, 1, -4, 3, -2, 5, 0, -5, 2][key.rem_euclid(12) as usize];
    let fifths = if ab && key.rem_euclid(12) == 8 {
        -7
    } else {
        fifths
    };
    let plain = f64::from(key) * 100.0;
    // The whole octaves that bring it to its key.
    plain + (fifth - 700.0) * f64::from(fifths)
}

#[derive(Clone, Default, PartialEq)]
pub struct Lasting {
    pub nudge_microcents: i64,
    pub plain: bool,
    pub transposed: Option<i32>,
    /// Tonic key, and what it sounds if not what the reference makes of it.
    pub tonic: Option<(i32, Option<f64>)>,
    high: bool,
    low: bool,
    /// C4 by itself.
    alone: Option<bool>,
    trim: i64,
    ab: bool,
    pub root_held: bool,
    /// Harmonic, or plain.
    pub sevenths: Option<bool>,
}

impl Lasting {
    pub fn begin_song(&mut self) {
        *self = Lasting {
            nudge_microcents: self.nudge_microcents,
            plain: self.plain,
            ..Lasting::default()
        };
    }

    /// Tells whether the song has what is asked for.
    pub fn take(&mut self, song: usize, action: &str) -> bool {
        match action {
            "plain" => self.plain = !self.plain,
            "pitch +5 c" => return self.nudge_by(5),
            "pitch -30 c now" => return self.nudge_by(-30),
            // Every song's reference is A4 = 440 Hz.
            "pitch 441 Hz" => {
                self.nudge_microcents = (cents(441.0, 440.0) * 1e6).round() as i64;
            }
            "pitch home" | "pitch home now" => self.nudge_microcents = 0,
            "transpose +2" => self.transposed = Some(2),
            "transpose home" => self.transposed = None,
            "inflect C high" if song == 0 || song == 2 => (self.high, self.alone) = (true, None),
            "inflect C4 high" if song == 0 || song == 2 => self.alone = Some(true),
            "inflect C4 home" => self.alone = Some(false),
            "inflect E low" if song == 0 => self.low = true,
            "turn both" if song == 0 => (self.high, self.low, self.alone) = (true, true, None),
            "inflect C home" => (self.high, self.trim, self.alone) = (false, 0, None),
            "inflect C +7 c" if self.trim + 7 > 100 => return false,
            "inflect C +7 c" => self.trim += 7,
            "inflect home" => {
                (self.high, self.low, self.trim, self.alone) = (false, false, 0, None);
            }
            "black-key Ab" if song == 2 => self.ab = true,
            "black-key G#" if song == 2 => self.ab = false,
            "root hold" if song == FOLLOWS => self.root_held = true,
            "root free" if song == FOLLOWS => self.root_held = false,
            "sevenths harmonic" if song == FOLLOWS => self.sevenths = Some(true),
            "sevenths plain" if song == FOLLOWS => self.sevenths = Some(false),
            "tonic home" if song == 3 => self.tonic = None,
            "tonic home" => return false,
            _ => return self.tonic_by_name(song, action),
        }
        true
    }

    /// An octave up or down at most.
    fn nudge_by(&mut self, nudge_cents: i64) -> bool {
        let nudge = self.nudge_microcents + nudge_cents * 1_000_000;
        let near = nudge.abs() <= 1_200_000_000;
        if near {
            self.nudge_microcents = nudge;
        }
        near
    }

    pub fn nudge_cents(&self) -> f64 {
        self.nudge_microcents as f64 / 1e6
    }

    /// `tonic D`, `tonic G pivot`.
    fn tonic_by_name(&mut self, song: usize, action: &str) -> bool {
        let Some(rest) = action.strip_prefix("tonic ") else {
            return false;
        };
        let keys = [("D", 62), ("E", 64), ("F", 65), ("G", 67), ("A", 69)];
        let (name, by) = rest.split_once(' ').unwrap_or((rest, "absolute"));
        let key = keys.iter().find(|(known, _)| *known == name);
        key.is_some_and(|(_, key)| self.move_tonic(song, *key, by))
    }

    pub fn move_tonic(&mut self, song: usize, key: i32, by: &str) -> bool {
        if song == 3 {
            let sounds = match by {
                "pivot" => Some(self.at_rest(song, key)),
                "equal" => Some(f64::from(key) * 100.0),
                _ => None,
            };
            self.tonic = Some((key, sounds));
        }
        song == 3
    }

    /// Whether a lamp is lit that shows something of this.
    pub fn shows(&self, song: usize, show: &str) -> bool {
        let at_home = !self.high && self.trim == 0;
        match show {
            "plain" => self.plain,
            "root hold" => song == FOLLOWS && self.root_held,
            "root free" => song == FOLLOWS && !self.root_held,
            "sevenths harmonic" => self.sevenths == Some(true),
            "transpose +2" => self.transpose_keys(song) == 2,
            "pitch home" => self.nudge_microcents == 0,
            "tonic home" => song == 3 && self.tonic.is_none(),
            "tonic D" => song == 3 && self.tonic.is_some_and(|(key, _)| key.rem_euclid(12) == 2),
            "inflect C high" => self.high,
            "inflect C home" => at_home,
            "inflect home" => at_home && !self.low && self.alone != Some(true),
            "turn both" => self.high && self.low,
            "black-key Ab" => song == 2 && self.ab,
            "black-key G#" => song == 2 && !self.ab,
            "home" => {
                let nudged = Lasting {
                    nudge_microcents: self.nudge_microcents,
                    ..Lasting::default()
                };
                *self == nudged
            }
            _ => panic!("{show}"),
        }
    }

    fn at_rest(&self, song: usize, key: i32) -> f64 {
        let equal = f64::from(key) * 100.0;
        match (song, key.rem_euclid(12)) {
            (1, 0) => equal + 10.0,
            (1, 4) => equal - 14.0,
            (2, _) => meantone(key, self.ab),
            (3, _) => match self.tonic.unwrap_or((60, None)) {
                (tonic, Some(sounds)) => sounds + just(key - tonic),
                (tonic, None) => 6900.0 + just(key - tonic) - just(69 - tonic),
            },
            _ => equal,
        }
    }

    pub fn transpose_keys(&self, song: usize) -> i32 {
        self.transposed.unwrap_or(TRANSPOSED[song])
    }

    pub fn cents(&self, song: usize, key: u8) -> f64 {
        let moved = i32::from(key) + self.transpose_keys(song);
        if self.plain {
            return f64::from(moved) * 100.0 + self.nudge_cents();
        }
        let high = self.alone.filter(|_| moved == 60).unwrap_or(self.high);
        let place = match moved.rem_euclid(12) {
            0 if high => self.at_rest(song, moved) + 30.0,
            4 if self.low => self.at_rest(song, moved - 4) + 350.0,
            _ => self.at_rest(song, moved),
        };
        let trim = if moved.rem_euclid(12) == 0 {
            self.trim
        } else {
            0
        };
        place + (trim as f64) + self.nudge_cents()
    }
}
