//! A keyboard through the engine, heard by the receiver: where every note really sounded.

use super::keyboard::{self, Music, Stroke};
use crate::support::receiver::{Kind, Note, Receiver};
use std::path::Path;
use std::time::Duration;
use trued::engine::Plan;
use trued::offline::retune;
use trued::offline::score_file::Score;
use trued::stage::Stage;

/// What the receiver is: a pitch is within half of 0.0244 cents on the first, of 0.586 on the second.
pub const CHANNEL_BEND: &str = "{port: virtual, dialect: channel-bend, bend_range: 2}";
pub const MPE: &str = "{port: virtual, dialect: mpe, bend_range: 48}";

/// A note-on may be so much later than its key.
const SLACK_NS: u64 = 4_000_000;
/// Longer than the default tail, so that the receiver follows every note to its end.
const TAIL: Duration = Duration::from_millis(1500);
const RANGE_AT_POWER_ON: u8 = 7;

/// What `song` says of its tuning, as a stage file has it.
pub fn plan(song: &str, synth: &str) -> Plan {
    let text =
        format!("stage: Judged\nsynths:\n  organ: {synth}\nset:\n  - {{song: Judged, {song}}}\n");
    let stage = Stage::parse(Path::new("judged.yaml"), &text);
    let stage = stage.unwrap_or_else(|complaints| panic!("{text}\n{complaints:#?}"));
    *stage.plan_offline()
}

/// A key that was struck, and where it sounded while key or pedal held it.
#[derive(Clone, Debug)]
pub struct Sounding {
    pub on_ns: u64,
    /// The key is let go.
    pub let_go_ns: u64,
    /// Neither holds it any more, or the key was struck again.
    pub off_ns: u64,
    pub key: u8,
    /// Cents from twelve-equal at the onset and from each change on.
    pub path: Vec<(u64, f64)>,
}

impl Sounding {
    pub fn at(&self, ns: u64) -> f64 {
        let later = self.path.partition_point(|(from_ns, _)| *from_ns <= ns);
        self.path[later.saturating_sub(1)].1
    }
}

/// What was heard of what was played.
#[derive(Clone, Debug, Default)]
pub struct Hearing {
    pub soundings: Vec<Sounding>,
    /// Keys that no note answered.
    pub missing: usize,
    /// Notes that no key asked for.
    pub extra: usize,
    pub stuck: usize,
    /// Notes that ended before or after key and pedal were let go.
    pub cut: usize,
}

pub fn hear(plan: &Plan, music: &Music) -> Hearing {
    let strokes = keyboard::one_keyboard(music);
    let file = keyboard::midi(&strokes, &music.pedal_s);
    let score = Score::read(&file).expect("our own file is good");
    let recording = retune::play(Box::new(plan.clone()), &score, 0, 0);
    let kind = match plan.synths[0].dialect {
        trued::engine::plan::Dialect::Mpe { .. } => Kind::Mpe,
        trued::engine::plan::Dialect::ChannelBend => Kind::Plain,
    };
    let mut receiver = Receiver::new(kind, TAIL, RANGE_AT_POWER_ON);
    for sent in &recording.sent {
        receiver.hear(Duration::from_nanos(sent.time.nanos()), &sent.bytes);
    }
    pair(&strokes, &receiver)
}

/// Each stroke with the note of its time and velocity; of several, the one nearest to its key.
fn pair(strokes: &[Stroke], receiver: &Receiver) -> Hearing {
    let mut left: Vec<&Note> = receiver.notes.iter().collect();
    left.sort_by_key(|note| note.on);
    let mut hearing = Hearing {
        stuck: receiver.stuck().len(),
        ..Hearing::default()
    };
    for (at, stroke) in strokes.iter().enumerate() {
        let equal_cents = stroke.key as f64 * 100.0;
        let off_by = |note: &Note| (note.onset_cents() - equal_cents).abs();
        let on_ns = |note: &Note| note.on.as_nanos() as u64;
        let found = left
            .iter()
            .enumerate()
            .take_while(|(_, note)| on_ns(note) <= stroke.on_ns + SLACK_NS)
            .filter(|(_, note)| on_ns(note) + SLACK_NS >= stroke.on_ns)
            .filter(|(_, note)| note.velocity == stroke.velocity)
            .min_by(|(_, a), (_, b)| off_by(a).total_cmp(&off_by(b)));
        let Some((place, _)) = found else {
            hearing.missing += 1;
            continue;
        };
        let note = left.remove(place);
        let end_ns = note.end.map_or(u64::MAX, |end| end.as_nanos() as u64);
        hearing.cut += (end_ns.abs_diff(stroke.end_ns) > SLACK_NS) as usize;
        let again = strokes[at + 1..].iter().find(|s| s.key == stroke.key);
        let path = note.pitch.iter();
        hearing.soundings.push(Sounding {
            on_ns: stroke.on_ns,
            let_go_ns: stroke.off_ns,
            off_ns: again.map_or(stroke.end_ns, |again| stroke.end_ns.min(again.on_ns)),
            key: stroke.key,
            path: path
                .map(|(at, cents)| (at.as_nanos() as u64, cents - equal_cents))
                .collect(),
        });
    }
    hearing.extra = left.len();
    hearing
}
