//! Every default of the stage file, once: the reading code takes them from here, `check --defaults` prints them from here.

use crate::engine::plan::ChannelSet;
use crate::intonation::Settings;
use crate::pitch::Interval;

pub const DIALECT: &str = "channel-bend";
pub const BEND_RANGE: u8 = 2;
pub const BEND_RANGE_MPE: u8 = 48;
pub const CHANNELS: ChannelSet = ChannelSet::ALL;
/// Channel 10, where General MIDI has its drums (GM1, p. 3).
pub const DRUMS: ChannelSet = ChannelSet(1 << 9);
pub const DRUMS_MPE: ChannelSet = ChannelSet::NONE;
pub const TAIL_MS: u64 = 1500;
pub const WHEEL: u8 = 2;
/// What a keyboard sends: all notes on one channel.
pub const SENDS: &str = "plain";
pub const REFERENCE: &str = "A4 = 440 Hz";
pub const TUNING: &str = "equal-12";
pub const TONIC: &str = "C";
pub const TONIC_OCTAVE: u8 = 4;
pub const INTONATION: &str = "fixed";
pub const PROGRAMS_FROM: u8 = 1;
pub const EDITS: &str = "at-next-song";
pub const LEAVE: &str = "plain";
pub const STEAL: &str = "oldest";
pub const LONG_MS: u64 = 800;
pub const LAMP_VALUE: u8 = 127;
/// Between the pieces of a live set-up, so that a key never waits long behind one on a slow wire.
pub const PACE_MS: u64 = 8;

/// One line of `check --defaults`.
pub struct Default {
    /// Where it is written: `songs`, `synths` and so on; empty at the top of the file.
    pub section: &'static str,
    pub key: &'static str,
    pub value: String,
    pub meaning: &'static str,
}

/// The whole table, section by section.
pub fn table() -> Vec<Default> {
    let line = |section, key, value: &dyn ToString, meaning| Default {
        section,
        key,
        value: value.to_string(),
        meaning,
    };
    let sections = [
        top(&line),
        keyboards(&line),
        synths(&line),
        parts(&line),
        songs(&line),
        intonation(&line),
        cues(&line),
        lamps(&line),
    ];
    sections.into_iter().flatten().collect()
}

type Line<'l> = &'l dyn Fn(&'static str, &'static str, &dyn ToString, &'static str) -> Default;

fn top(line: Line<'_>) -> Vec<Default> {
    vec![
        line(
            "",
            "pitch",
            &REFERENCE,
            "the reference pitch of the evening",
        ),
        line(
            "",
            "programs_from",
            &PROGRAMS_FROM,
            "how people count programs: from 1 or from 0",
        ),
        line(
            "",
            "edits",
            &EDITS,
            "when an edit of the song now playing takes effect",
        ),
        line(
            "",
            "set",
            &"the songs in their order",
            "what is played tonight",
        ),
    ]
}

fn keyboards(line: Line<'_>) -> Vec<Default> {
    vec![
        line(
            "keyboards",
            "port",
            &"every input port that is not ours, not a through port and not a synth's",
            "",
        ),
        line(
            "keyboards",
            "channel",
            &"1-16",
            "where the keyboard is heard",
        ),
        line(
            "keyboards",
            "wheel",
            &WHEEL,
            "semitones of a full push of its wheel",
        ),
        line(
            "keyboards",
            "sends",
            &SENDS,
            "mpe: each note on a channel of its own, with bend, pressure and brightness of its own",
        ),
        line(
            "keyboards",
            "bend_range",
            &BEND_RANGE_MPE,
            "with `sends: mpe`: semitones of a full bend of one note, until the keyboard says otherwise",
        ),
        line(
            "keyboards",
            "local_sound",
            &"yes",
            "no: its keys no longer play its own sound",
        ),
    ]
}

fn synths(line: Line<'_>) -> Vec<Default> {
    let mpe = |plain: &dyn ToString, mpe: &dyn ToString| {
        format!("{} (mpe: {})", plain.to_string(), mpe.to_string())
    };
    vec![
        line(
            "synths",
            "port",
            &"the first output port that is not ours and not a through port",
            "",
        ),
        line(
            "synths",
            "dialect",
            &DIALECT,
            "how pitch is spelt on the wire",
        ),
        line("synths", "channels", &"1-16", "the channels it listens on"),
        line(
            "synths",
            "bend_range",
            &mpe(&BEND_RANGE, &BEND_RANGE_MPE),
            "semitones of a full bend; it is told",
        ),
        line(
            "synths",
            "tail_ms",
            &TAIL_MS,
            "how long a sound rings after its key is up",
        ),
        line(
            "synths",
            "drums",
            &mpe(&"[10]", &"[]"),
            "channels never touched",
        ),
        line(
            "synths",
            "share",
            &"yes",
            "keys of equal bend may sound on one channel",
        ),
        line(
            "synths",
            "steal",
            &STEAL,
            "which held note gives way when no channel is left",
        ),
        line("synths", "leave", &LEAVE, "how it is left when trued stops"),
    ]
}

fn parts(line: Line<'_>) -> Vec<Default> {
    vec![
        line("parts", "from", &"every keyboard", ""),
        line("parts", "to", &"the first synth", ""),
        line("parts", "keys", &"all", ""),
        line(
            "parts",
            "channel",
            &"an even share of the synth's channels",
            "",
        ),
        line("parts", "transpose", &0, "keys up or down"),
        line("parts", "offset", &"0 c", "added to every pitch"),
        line(
            "parts",
            "pass",
            &"[wheel, pedals, pressure, controllers, programs]",
            "what goes through",
        ),
        line("parts", "tune", &"yes", "no: plays untuned"),
        line(
            "parts",
            "follow",
            &"yes",
            "with the harmony; no: stands at rest and is not counted; own: a harmony of its own; uncounted: goes with \
             it and is not counted",
        ),
        line(
            "parts",
            "mono",
            &"no",
            "yes: one channel, the bend moves with the note",
        ),
    ]
}

fn songs(line: Line<'_>) -> Vec<Default> {
    vec![
        line("songs", "tuning", &TUNING, ""),
        line(
            "songs",
            "tonic",
            &TONIC,
            "only for tunings from the tonic; octave 4 unless said",
        ),
        line("songs", "pitch", &"the evening's", ""),
        line("songs", "transpose", &0, "keys up or down"),
        line(
            "songs",
            "intonation",
            &INTONATION,
            "chord-root: every chord is pure",
        ),
    ]
}

/// The knobs of a method that follows the chord.
fn intonation(line: Line<'_>) -> Vec<Default> {
    let knobs = Settings::DEFAULT;
    let cents = |limit: Option<Interval>| {
        limit.map_or("none".to_string(), |limit| limit.cents().to_string())
    };
    vec![
        line(
            "intonation",
            "ratios",
            &"pure",
            "pure-with-7: dominant sevenths are 4:5:6:7; or twelve of your own above the root",
        ),
        line(
            "intonation",
            "drift_limit_cents",
            &cents(knobs.drift_limit),
            "how far what sounds may stand from the tuning, on average: 12 alone or with voices, 5 beside fixed \
             instruments, none: as far as its notes carry it",
        ),
        line(
            "intonation",
            "return_cents_per_s",
            &knobs.return_per_s.cents(),
            "how fast a chord that stays goes back to the tuning",
        ),
        line(
            "intonation",
            "settle_ms",
            &knobs.settle.millis(),
            "notes younger than this jump to their place as the chord fills in",
        ),
        line(
            "intonation",
            "hold_limit_cents",
            &cents(knobs.hold_limit),
            "how far one change may move a held note, and twice that in its life; none: as far as the chord wants",
        ),
        line(
            "intonation",
            "glide_cents_per_s",
            &knobs.glide_per_s.cents(),
            "how fast it is moved; 0: not at all",
        ),
        line(
            "intonation",
            "memory_s",
            &(knobs.memory.millis() / 1e3),
            "how long a note that has ended still draws chords to where it was",
        ),
    ]
}

fn cues(line: Line<'_>) -> Vec<Default> {
    vec![
        line("cues", "from", &"every keyboard", ""),
        line("cues", "channel", &"1-16", ""),
        line(
            "cues",
            "value",
            &"64..127",
            "of a controller: what counts as down",
        ),
        line("cues", "bank", &"any", ""),
        line("cues", "press", &"down", ""),
        line("cues", "long_ms", &LONG_MS, "how long a long press is held"),
        line("cues", "pass", &"no", "yes: the synth gets the message too"),
    ]
}

fn lamps(line: Line<'_>) -> Vec<Default> {
    vec![
        line("lamps", "value", &LAMP_VALUE, "how bright, or which colour"),
        line(
            "lamps",
            "channel",
            &"that of the keyboard, if it is heard on one, else 1",
            "",
        ),
    ]
}
