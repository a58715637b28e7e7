//! The compiled stage file, ready to play. Built by `stage/`, played by the engine, changed by nobody.

pub use super::by_hand::{ByHand, ByLine, NameId, OtherPlace, TurnStep, TwoNames};
pub use super::zones::Zones;
use crate::intonation::Method;
use crate::limits::{KEYBOARDS_MAX, PART_PLACES, SYNTHS_MAX};
use crate::pitch::word::BendRange;
use crate::pitch::{Interval, Pitch};
use crate::time::Span;
use crate::tuning::{Key, Tuning};
use std::sync::Arc;

/// A keyboard, by place in the plan, or a place beyond those of the plan for one more device that plays as one of them;
/// always below `KEYBOARDS_MAX`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct KeyboardId(u8);

/// A synth, by place in the plan; always below `SYNTHS_MAX`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct SynthId(u8);

/// A part, by place among those that play and those that still ring; always below `PART_PLACES`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct PartId(u8);

macro_rules! place {
    ($name:ident, $max:expr) => {
        impl $name {
            /// `None` beyond the limit.
            pub const fn new(index: usize) -> Option<$name> {
                if index < $max {
                    Some($name(index as u8))
                } else {
                    None
                }
            }

            pub const fn index(self) -> usize {
                self.0 as usize
            }
        }
    };
}
place!(KeyboardId, KEYBOARDS_MAX);
place!(SynthId, SYNTHS_MAX);
place!(PartId, PART_PLACES);

/// A set of MIDI channels, bit 0 = channel 1.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct ChannelSet(pub u16);

impl ChannelSet {
    pub const ALL: ChannelSet = ChannelSet(0xFFFF);
    pub const NONE: ChannelSet = ChannelSet(0);

    /// `channel` 0-15.
    pub const fn has(self, channel: u8) -> bool {
        self.0 >> channel & 1 == 1
    }

    pub const fn with(self, channel: u8) -> ChannelSet {
        ChannelSet(self.0 | 1 << channel)
    }

    pub const fn without(self, others: ChannelSet) -> ChannelSet {
        ChannelSet(self.0 & !others.0)
    }

    pub const fn count(self) -> u32 {
        self.0.count_ones()
    }

    /// From the lowest channel up, 0-15.
    pub fn iter(self) -> impl Iterator<Item = u8> {
        let mut rest = self.0;
        std::iter::from_fn(move || {
            let lowest = (rest != 0).then(|| rest.trailing_zeros() as u8);
            rest &= rest.wrapping_sub(1);
            lowest
        })
    }
}

/// Everything the engine needs to play an evening.
#[derive(Clone, Debug, PartialEq)]
pub struct Plan {
    /// At most `KEYBOARDS_MAX`, at least one.
    pub keyboards: Vec<KeyboardPlan>,
    /// At most `SYNTHS_MAX`, at least one.
    pub synths: Vec<SynthPlan>,
    /// Of songs that have none of their own; at most `PARTS_MAX`, at least one.
    pub parts: Vec<PartPlan>,
    /// In tonight's order; at most `SONGS_MAX`, at least one.
    pub set: Vec<SongPlan>,
    pub cues: Vec<CuePlan>,
    /// At most `LAMPS_MAX`.
    pub lamps: Vec<LampPlan>,
    /// Keyboards that have lamps. To each leads a port, behind those of the synths and in this order; with them at most
    /// `SYNTHS_MAX`.
    pub lamp_ports: Vec<KeyboardId>,
    /// Whether a song whose own settings were edited takes them at once or at its next beginning.
    pub edits_at_once: bool,
    /// Where twelve-equal stands at the evening's reference, above A4 = 440 Hz.
    pub plain_offset: Interval,
}

impl Plan {
    /// The parts of a song.
    pub fn parts_of<'p>(&'p self, song: &'p SongPlan) -> &'p [PartPlan] {
        song.parts.as_deref().unwrap_or(&self.parts)
    }
}

#[derive(Clone, Debug, PartialEq)]
pub struct KeyboardPlan {
    pub name: Box<str>,
    /// Only these input channels are the keyboard; others are not heard at all.
    pub channels: ChannelSet,
    /// What a full push of its wheel means, in semitones, until it says otherwise by RPN 0.
    pub wheel_semitones: u8,
    /// The MPE zones that it sends, until it says otherwise; none: it is an ordinary keyboard, whatever it says.
    pub zones: Zones,
    /// What a full bend of a single note means there, in semitones, until it says otherwise by RPN 0.
    pub finger_semitones: u8,
}

impl KeyboardPlan {
    /// Each of its notes comes on a channel of its own.
    pub fn sends_mpe(&self) -> bool {
        self.zones != Zones::NONE
    }
}

/// How pitch is spelt on the wire.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Dialect {
    /// An MPE zone. Members keep a released note's pitch whatever their bend does after (MPE 1.1, 2.2.6).
    Mpe { manager: u8 },
    /// A multitimbral synth: every channel bends all that rings on it.
    ChannelBend,
}

/// Which held note gives way when no channel is left.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Steal {
    /// The channel whose youngest note is the oldest.
    #[default]
    Oldest,
    /// The channel whose loudest note was struck softest.
    Quietest,
    /// None: the new note is refused.
    Nothing,
}

/// How a synth is left when trued stops.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Leave {
    /// As a stranger would want it: bends centred, range 2, zone off, local control on.
    #[default]
    Plain,
    /// As it is, silent.
    AsIs,
}

#[derive(Clone, Debug, PartialEq)]
pub struct SynthPlan {
    pub name: Box<str>,
    pub dialect: Dialect,
    /// Channels that carry notes: never a drum channel, never an MPE manager.
    pub members: ChannelSet,
    pub bend_range: BendRange,
    /// What still rings after a note-off.
    pub tail: Span,
    /// Channels passed through untouched.
    pub drums: ChannelSet,
    /// The device is also a keyboard whose own sound is to be off: it is told Local Control off on set-up, on at the end.
    pub local_off: bool,
    /// Whether keys of equal bend may sound on one channel.
    pub share: bool,
    pub steal: Steal,
    pub leave: Leave,
    /// Time between the pieces of a set-up, so that it never holds up a key on a slow wire; zero says it all at once.
    pub pace: Span,
    /// What the wire carries, at least 1; gestures are thinned to it, notes never. `None`: no limit worth the name.
    pub bytes_per_s: Option<u32>,
}

/// Which of a player's gestures reach a part.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Pass {
    pub wheel: bool,
    pub pedals: bool,
    pub pressure: bool,
    pub controllers: bool,
    pub programs: bool,
}

impl Pass {
    pub const ALL: Pass = Pass {
        wheel: true,
        pedals: true,
        pressure: true,
        controllers: true,
        programs: true,
    };
}

/// How a part stands to the harmony.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Follow {
    /// Its notes are the harmony, with those of all parts of this kind, and go with it.
    #[default]
    Harmony,
    /// Its notes go with the harmony but do not make it: a melody.
    Uncounted,
    /// It has a harmony of its own.
    Own,
    /// Its notes stand where the tuning puts them and are not counted: a drone.
    Nothing,
}

#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PartPlan {
    /// `None`: every keyboard.
    pub from: Option<KeyboardId>,
    /// Input channels that belong to this part; usually all.
    pub hears: ChannelSet,
    /// First and last key, inclusive, as pressed.
    pub keys: (Key, Key),
    pub to: SynthId,
    /// Channels of the synth that are this part's own; a subset of its members.
    pub pool: ChannelSet,
    pub transpose_keys: i8,
    /// Added to every pitch of the part.
    pub offset: Interval,
    pub pass: Pass,
    /// False: plays plain twelve-equal at A4 = 440 Hz, whatever the song.
    pub tune: bool,
    /// One channel, on which the newest key sounds.
    pub mono: bool,
    /// How it stands to the harmony, in songs that follow one.
    pub follow: Follow,
    /// This part shares an MPE manager with another, in this song or the next, so its pedals are played by late note-offs instead.
    pub late_offs: bool,
}

#[derive(Clone, Debug, PartialEq)]
pub struct SongPlan {
    pub title: Box<str>,
    /// Shared between the songs that use it; built when the plan is, never touched after.
    pub tuning: Arc<Tuning>,
    /// The frequency of its reference key, as a pitch.
    pub reference: Pitch,
    pub transpose_keys: i8,
    pub method: Method,
    /// Its own in place of the plan's; at most `PARTS_MAX`, at least one.
    pub parts: Option<Arc<[PartPlan]>>,
    /// What can be changed of it by hand; shared as the tuning is.
    pub by_hand: Arc<ByHand>,
    /// Whole messages given to a synth when the song begins, once no key is held, as if a player of it had sent them:
    /// their own channel is ignored, the synth's parts spread them as they do a player's.
    pub sends: Vec<(SynthId, Box<[u8]>)>,
}

impl Plan {
    /// Output ports: synths, then keyboards with lamps.
    pub fn ports(&self) -> usize {
        self.synths.len() + self.lamp_ports.len()
    }
}

/// A light of a keyboard's device, and what it shows.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LampPlan {
    pub show: Shown,
    /// Place in `lamp_ports`.
    pub port: u8,
    /// The message for lit, and for out.
    pub on: [u8; 3],
    pub off: [u8; 3],
}

/// What can be shown: something that lasts.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Shown {
    /// The song of this place is playing.
    Song(u16),
    /// A song of the same title as that of this place is playing.
    Title(u16),
    /// All is as this command makes it.
    Told(super::traffic::Command),
}

/// A gesture and what it does.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CuePlan {
    pub from: Option<KeyboardId>,
    /// Input channels on which the gesture counts.
    pub channels: ChannelSet,
    pub gesture: Gesture,
    pub press: Press,
    pub act: Act,
    /// What it does lasts as long as the control is down.
    pub held: bool,
    /// Armed on the gesture, in force once every key and pedal of every keyboard is up.
    pub at_quiet: bool,
    /// The message also goes on to the synth.
    pub pass: bool,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Gesture {
    Program {
        /// 0-127 as on the wire; `None` for any.
        number: Option<u8>,
        bank: Bank,
    },
    /// Song select, 0-127 as on the wire; `None` for any. It comes on no channel.
    SongSelect(Option<u8>),
    /// Down while its value is one of these.
    Controller { number: u8, values: Values },
    /// Channel pressure, likewise.
    Pressure(Values),
    /// A key. It sounds nothing unless `pass`.
    Note(Key),
}

impl Gesture {
    pub const ANY_PROGRAM: Gesture = Gesture::Program {
        number: None,
        bank: Bank::ANY,
    };

    /// A pedal or a switch: down from 64 up.
    pub const fn switch(number: u8) -> Gesture {
        Gesture::Controller {
            number,
            values: Values::SWITCH,
        }
    }

    /// Whether it goes down and comes up again; the others are over at once.
    pub const fn is_pressed(self) -> bool {
        !matches!(self, Gesture::Program { .. } | Gesture::SongSelect(_))
    }
}

/// The bank of a program change: what controllers 0 and 32 said before it, 0 where they said nothing. `None` for any.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Bank {
    pub msb: Option<u8>,
    pub lsb: Option<u8>,
}

impl Bank {
    pub const ANY: Bank = Bank {
        msb: None,
        lsb: None,
    };
}

/// Values of a controller or of pressure, first and last, both among them.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Values {
    pub first: u8,
    pub last: u8,
}

impl Values {
    pub const SWITCH: Values = Values {
        first: 64,
        last: 127,
    };

    pub const fn has(self, value: u8) -> bool {
        self.first <= value && value <= self.last
    }
}

/// When a control fires its cue. A program change always does.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Press {
    /// On going down; where the control has a `Long` too, on being let go before that.
    Down,
    /// On being let go, unless it was a long press.
    Up,
    /// On both: a latching switch.
    Either,
    /// Once it has been held so long.
    Long(Span),
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Act {
    /// The song with the number of the program or of the song select.
    SongByNumber,
    Command(super::traffic::Command),
}
