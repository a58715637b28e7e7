//! The metrics: how pure, how steady, how far from home. All from the receiver's pitches, over true time, glides
//! integrated.
//!
//! Definitions are those of the table in `peers.md`. A *slice* is the time between two edges of keys; pitches are cents
//! from twelve-equal. Stricter than the table: `rest` looks at every 8 quarters that begin on a quarter, `fastest` at
//! every pitch inside its 20 ms.

use super::keyboard::QUARTER_S;
use super::played::{Hearing, Sounding};

/// Notes younger than this still settle; what moves later is late.
const YOUNG_NS: u64 = 50_000_000;
const FAST_NS: u64 = 20_000_000;
const QUARTER_NS: u64 = (QUARTER_S * 1e9) as u64;
const WINDOW_NS: u64 = 8 * QUARTER_NS;
/// A triad whose intervals are all nearer than this is pure.
const PURE_CENTS: f64 = 3.0;
const SHORTEST_NS: u64 = 1_000;

type Ratios = &'static [(f64, f64)];

/// What an interval may be meant as, by semitones modulo 12: consonances, others within five, others within seven.
#[rustfmt::skip]
const TARGETS: [[Ratios; 3]; 12] = [
    [&[(1.0, 1.0)], &[], &[]],
    [&[], &[(16.0, 15.0)], &[]],
    [&[], &[(9.0, 8.0), (10.0, 9.0)], &[(8.0, 7.0)]],
    [&[(6.0, 5.0)], &[], &[(7.0, 6.0)]],
    [&[(5.0, 4.0)], &[], &[]],
    [&[(4.0, 3.0)], &[], &[]],
    [&[], &[(45.0, 32.0), (64.0, 45.0)], &[(7.0, 5.0), (10.0, 7.0)]],
    [&[(3.0, 2.0)], &[], &[]],
    [&[(8.0, 5.0)], &[], &[]],
    [&[(5.0, 3.0)], &[], &[(12.0, 7.0)]],
    [&[], &[(16.0, 9.0), (9.0, 5.0)], &[(7.0, 4.0)]],
    [&[], &[(15.0, 8.0)], &[]],
];

/// Which intervals count, and what they may be.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Table {
    /// Consonances, within five.
    V5c,
    /// All intervals, within five.
    V5a,
    /// All intervals, within seven.
    V7a,
}

const TABLES: [Table; 3] = [Table::V5c, Table::V5a, Table::V7a];

/// Distance of an interval from the nearest it may be meant as, in cents; none if it does not count.
struct Purity([[Vec<f64>; 12]; 3]);

impl Purity {
    fn new() -> Purity {
        let cents = |(a, b): &(f64, f64)| 1200.0 * (a / b).log2();
        Purity(TABLES.map(|table| {
            TARGETS.map(|columns| {
                let counted = columns[..=table as usize].iter();
                counted
                    .flat_map(|ratios| ratios.iter())
                    .map(cents)
                    .collect()
            })
        }))
    }

    fn error(&self, table: Table, class: usize, cents: f64) -> Option<f64> {
        let targets = &self.0[table as usize][class];
        let errors = targets.iter().map(|target| (cents - target).abs());
        errors.min_by(f64::total_cmp)
    }
}

/// What the pieces so far come to.
pub struct Scores {
    purity: Purity,
    /// Errors with their seconds, by table.
    errors: [Vec<(f64, f64)>; 3],
    triads_s: f64,
    pure_triads_s: f64,
    held: Vec<f64>,
    late: Vec<f64>,
    settling: Vec<f64>,
    drift_ends: Vec<f64>,
    drift_peak: f64,
    rest: f64,
    farthest: f64,
    fastest: f64,
    pub missing: usize,
    pub extra: usize,
    pub stuck: usize,
    pub cut: usize,
    pub notes: usize,
    pub played_s: f64,
}

/// Mean, 95th percentile, maximum.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Spread {
    pub mean: f64,
    pub p95: f64,
    pub max: f64,
}

impl Scores {
    pub fn new() -> Scores {
        Scores {
            purity: Purity::new(),
            errors: [const { Vec::new() }; 3],
            triads_s: 0.0,
            pure_triads_s: 0.0,
            held: Vec::new(),
            late: Vec::new(),
            settling: Vec::new(),
            drift_ends: Vec::new(),
            drift_peak: 0.0,
            rest: 0.0,
            farthest: 0.0,
            fastest: 0.0,
            missing: 0,
            extra: 0,
            stuck: 0,
            cut: 0,
            notes: 0,
            played_s: 0.0,
        }
    }

    /// One more piece.
    pub fn add(&mut self, hearing: &Hearing) {
        self.missing += hearing.missing;
        self.extra += hearing.extra;
        self.stuck += hearing.stuck;
        self.cut += hearing.cut;
        self.notes += hearing.soundings.len();
        let notes = &hearing.soundings[..];
        if notes.is_empty() {
            return;
        }
        self.add_purity(notes);
        self.add_motion(notes);
        self.add_drift(notes);
        self.played_s += notes.iter().map(|n| n.off_ns).max().unwrap_or(0) as f64 / 1e9;
    }

    /// Between two changes of any kind nothing moves.
    fn add_purity(&mut self, notes: &[Sounding]) {
        let changes = notes.iter().flat_map(|n| {
            let inside = n.path.iter().map(|(at, _)| *at);
            inside.filter(|at| (n.on_ns..=n.off_ns).contains(at))
        });
        let all = edges(notes).into_iter().chain(changes).collect();
        for (from, to, now) in stretches(notes, sorted(all)) {
            if to - from < SHORTEST_NS {
                continue;
            }
            let mut sounding: Vec<(u8, f64)> = now
                .iter()
                .map(|n| (notes[*n].key, notes[*n].at(from)))
                .collect();
            sounding.sort_by_key(|(key, _)| *key);
            self.add_chord(&sounding, (to - from) as f64 / 1e9);
        }
    }

    fn add_chord(&mut self, sounding: &[(u8, f64)], seconds: f64) {
        let sum: f64 = sounding.iter().map(|(_, cents)| cents).sum();
        self.farthest = self
            .farthest
            .max((sum / sounding.len().max(1) as f64).abs());
        let mut worst: f64 = 0.0;
        for (place, (low, low_cents)) in sounding.iter().enumerate() {
            for (high, high_cents) in &sounding[place + 1..] {
                let class = (high - low) as usize % 12;
                let cents = high_cents - low_cents + 100.0 * class as f64;
                for table in TABLES {
                    if let Some(error) = self.purity.error(table, class, cents) {
                        self.errors[table as usize].push((error, seconds));
                        if table == Table::V5c {
                            worst = worst.max(error);
                        }
                    }
                }
            }
        }
        let classes = sounding
            .iter()
            .fold(0u16, |set, (key, _)| set | 1 << (key % 12));
        if is_triad(classes) {
            self.triads_s += seconds;
            if worst <= PURE_CENTS {
                self.pure_triads_s += seconds;
            }
        }
    }

    fn add_motion(&mut self, notes: &[Sounding]) {
        let edges = edges(notes);
        for note in notes {
            let from = edges.partition_point(|edge| *edge < note.on_ns);
            let inside: Vec<u64> = edges[from..]
                .iter()
                .copied()
                .take_while(|edge| *edge <= note.off_ns)
                .collect();
            // A note's pitch at the end of one slice and of the next, a microsecond before the edge.
            for three in inside.windows(3) {
                let [_, middle, end] = three else { continue };
                let moved = (note.at(end - SHORTEST_NS) - note.at(middle - SHORTEST_NS)).abs();
                self.held.push(moved);
                if middle - note.on_ns >= YOUNG_NS {
                    self.late.push(moved);
                } else {
                    self.settling.push(moved);
                }
            }
            self.fastest = self.fastest.max(fastest(note));
        }
    }

    fn add_drift(&mut self, notes: &[Sounding]) {
        let end = notes.iter().map(|n| n.off_ns).max().unwrap_or(0);
        let first = Profile::of(notes, 0, end / 4);
        let last = Profile::of(notes, end - end / 4, end);
        self.drift_ends.push(last.above(&first).abs());
        let starts = (0..).map(|quarter| quarter * QUARTER_NS);
        let windows = starts.take_while(|from| from + WINDOW_NS <= end + SHORTEST_NS);
        for (quarter, from) in windows.enumerate() {
            let window = Profile::of(notes, from, from + WINDOW_NS);
            if quarter % 4 == 0 {
                self.drift_peak = self.drift_peak.max(window.above(&first).abs());
            }
            self.rest = self.rest.max(window.mean().abs());
        }
    }

    pub fn purity(&self, table: Table) -> Spread {
        let mut errors = self.errors[table as usize].clone();
        errors.sort_unstable_by(|a, b| a.0.total_cmp(&b.0));
        let total: f64 = errors.iter().map(|(_, s)| s).sum();
        let mean = errors.iter().map(|(e, s)| e * s).sum::<f64>() / total;
        let mut so_far = 0.0;
        let p95 = errors.iter().find(|(_, s)| {
            so_far += s;
            so_far >= 0.95 * total - 1e-12
        });
        Spread {
            mean,
            p95: p95.map_or(f64::NAN, |(error, _)| *error),
            max: errors.last().map_or(f64::NAN, |(error, _)| *error),
        }
    }

    pub fn pure_triads_percent(&self) -> f64 {
        100.0 * self.pure_triads_s / self.triads_s
    }

    pub fn held(&self) -> Spread {
        spread(&self.held)
    }

    /// Of notes older than 50 ms.
    pub fn late(&self) -> Spread {
        spread(&self.late)
    }

    /// Of notes younger than that.
    pub fn settling(&self) -> Spread {
        spread(&self.settling)
    }

    /// Of the last quarter of each piece against its first: mean and maximum over pieces.
    pub fn drift_ends(&self) -> Spread {
        spread(&self.drift_ends)
    }

    /// Of any 8 quarters against the first quarter of their piece.
    pub fn drift_peak(&self) -> f64 {
        self.drift_peak
    }

    /// The largest mean distance from twelve-equal over any 8 quarters.
    pub fn rest(&self) -> f64 {
        self.rest
    }

    /// The largest mean distance from twelve-equal of what sounds at any moment.
    pub fn farthest(&self) -> f64 {
        self.farthest
    }

    /// The largest motion within 20 ms of a note older than 50 ms.
    pub fn fastest(&self) -> f64 {
        self.fastest
    }
}

fn is_triad(classes: u16) -> bool {
    let turned = |by: u32| (classes << by | classes >> (12 - by)) & 0xFFF;
    let triads = [1 << 0 | 1 << 4 | 1 << 7, 1 << 0 | 1 << 3 | 1 << 7];
    (0..12).any(|by| triads.contains(&turned(by)))
}

/// Where what sounds stands from twelve-equal, on average over keys and time.
pub fn mean_between(notes: &[Sounding], from_ns: u64, to_ns: u64) -> f64 {
    Profile::of(notes, from_ns, to_ns).mean()
}

fn sorted(mut times: Vec<u64>) -> Vec<u64> {
    times.sort_unstable();
    times.dedup();
    times
}

/// Keys going down, keys let go, and the ends of what pedals held.
fn edges(notes: &[Sounding]) -> Vec<u64> {
    let edges = notes.iter().flat_map(|n| [n.on_ns, n.let_go_ns, n.off_ns]);
    sorted(edges.collect())
}

/// Each time between two neighbours of `times`, and which notes sound all through it.
fn stretches(notes: &[Sounding], times: Vec<u64>) -> Vec<(u64, u64, Vec<usize>)> {
    let mut order: Vec<usize> = (0..notes.len()).collect();
    order.sort_by_key(|n| notes[*n].on_ns);
    let (mut next, mut now, mut out) = (0, Vec::new(), Vec::new());
    for pair in times.windows(2) {
        let (from, to) = (pair[0], pair[1]);
        while next < order.len() && notes[order[next]].on_ns <= from {
            now.push(order[next]);
            next += 1;
        }
        now.retain(|n: &usize| notes[*n].off_ns >= to);
        out.push((from, to, now.clone()));
    }
    out
}

/// The largest difference between any two pitches of an old note that are no more than 20 ms apart.
fn fastest(note: &Sounding) -> f64 {
    let old_ns = note.on_ns + YOUNG_NS;
    let mut most: f64 = 0.0;
    for (place, (at, cents)) in note.path.iter().enumerate().skip(1) {
        if *at <= old_ns || *at > note.off_ns {
            continue;
        }
        let since = at.saturating_sub(FAST_NS).max(old_ns);
        let inside = note.path[..place].iter().rev();
        let inside = inside.take_while(|(when, _)| *when >= since);
        let before = inside.map(|(_, cents)| *cents);
        // The last change is looked at however long ago the note stood there.
        let ends = [note.at(since), note.path[place - 1].1];
        let moved = before.chain(ends).map(|other| (cents - other).abs());
        most = moved.fold(most, f64::max);
    }
    most
}

/// Cents by seconds, and seconds, of each pitch class in a stretch of time.
struct Profile([(f64, f64); 12]);

impl Profile {
    fn of(notes: &[Sounding], from: u64, to: u64) -> Profile {
        let mut sums = [(0.0, 0.0); 12];
        for note in notes {
            let (from, to) = (note.on_ns.max(from), note.off_ns.min(to));
            if from < to {
                let sum = &mut sums[note.key as usize % 12];
                sum.0 += integral(note, from, to);
                sum.1 += (to - from) as f64 / 1e9;
            }
        }
        Profile(sums)
    }

    fn mean(&self) -> f64 {
        let [cents, seconds] = [
            self.0.iter().map(|(c, _)| c).sum::<f64>(),
            self.0.iter().map(|(_, s)| s).sum::<f64>(),
        ];
        if seconds > 0.0 { cents / seconds } else { 0.0 }
    }

    /// How much higher, over the pitch classes of both, each by the shorter of its two times.
    fn above(&self, first: &Profile) -> f64 {
        let (mut sum, mut weights) = (0.0, 0.0);
        for ((later_sum, later_s), (sum_s, first_s)) in self.0.iter().zip(&first.0) {
            let weight = later_s.min(*first_s);
            if weight > 0.0 {
                sum += weight * (later_sum / later_s - sum_s / first_s);
                weights += weight;
            }
        }
        if weights > 0.0 { sum / weights } else { 0.0 }
    }
}

fn integral(note: &Sounding, from: u64, to: u64) -> f64 {
    let changes = note.path.iter().map(|(at, _)| *at);
    let inside = changes.filter(|at| (from..to).contains(at));
    let times: Vec<u64> = [from].into_iter().chain(inside).chain([to]).collect();
    let part = |pair: &[u64]| note.at(pair[0]) * (pair[1] - pair[0]) as f64 / 1e9;
    times.windows(2).map(part).sum()
}

fn spread(values: &[f64]) -> Spread {
    let mut sorted = values.to_vec();
    sorted.sort_unstable_by(f64::total_cmp);
    let Some(max) = sorted.last().copied() else {
        return Spread {
            mean: 0.0,
            p95: 0.0,
            max: 0.0,
        };
    };
    // Between neighbours, as numpy's quantile.
    let place = 0.95 * (sorted.len() - 1) as f64;
    let (low, part) = (place as usize, place.fract());
    let high = (low + 1).min(sorted.len() - 1);
    Spread {
        mean: sorted.iter().sum::<f64>() / sorted.len() as f64,
        p95: sorted[low] + part * (sorted[high] - sorted[low]),
        max,
    }
}
