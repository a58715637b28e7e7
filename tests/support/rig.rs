//! The engine on a scripted clock, with an independent receiver on every synth port.

use super::receiver::{Kind, Receiver, Stream};
use std::fmt::Write;
use std::path::Path;
use std::time::Duration;
use trued::engine::plan::Dialect;
use trued::engine::{
    Ask, Command, Engine, Input, KeyboardId, Link, Onset, Output, Plan, SynthId, Weight,
};
use trued::stage::Stage;
use trued::stage::words::Words;
use trued::time::Time;

/// Strange on purpose, so that a range never told is heard at once.
const RANGE_AT_POWER_ON: u8 = 7;
/// Deadlines at one moment, before a test calls it a loop.
const DEADLINES_MAX: usize = 100_000;

/// What went out.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Sent {
    pub at: Time,
    pub synth: usize,
    pub weight: Weight,
    pub bytes: Vec<u8>,
}

pub struct Rig {
    pub engine: Engine,
    /// Where it came from one.
    pub stage: Option<Stage>,
    pub now: Time,
    /// One for each synth of the plan.
    pub receivers: Vec<Receiver>,
    pub sent: Vec<Sent>,
    /// To keyboards with lamps, whose ports stand behind those of the synths.
    pub lamps: Vec<Sent>,
    /// The port of everything that went out, in order.
    pub order: Vec<usize>,
    pub onsets: Vec<(Time, Onset)>,
    /// Sounding notes that were moved, where to.
    pub moved: Vec<(Time, Onset)>,
    pub asked: Vec<(Time, Ask)>,
}

impl Rig {
    /// Synths are still down.
    pub fn new(plan: &Plan) -> Rig {
        let receivers = plan.synths.iter().map(|synth| {
            let kind = match synth.dialect {
                Dialect::Mpe { .. } => Kind::Mpe,
                Dialect::ChannelBend => Kind::Plain,
            };
            let tail = Duration::from_nanos(synth.tail.nanos());
            Receiver::new(kind, tail, RANGE_AT_POWER_ON)
        });
        let mut engine = Engine::new(Box::new(plan.clone()));
        engine.keep_records();
        Rig {
            stage: None,
            receivers: receivers.collect(),
            engine,
            now: Time::START,
            sent: Vec::new(),
            lamps: Vec::new(),
            order: Vec::new(),
            onsets: Vec::new(),
            moved: Vec::new(),
            asked: Vec::new(),
        }
    }

    /// A stage file's text, all up and ready.
    pub fn of(text: &str) -> Rig {
        let stage = Stage::parse(Path::new("test.yaml"), text);
        let stage = stage.unwrap_or_else(|complaints| panic!("{text}\n{complaints:#?}"));
        let mut rig = Rig::ready(&stage.plan_offline());
        rig.stage = Some(stage);
        rig
    }

    /// A stage file that comes with trued, all up and ready.
    pub fn of_file(path: &Path) -> Rig {
        let stage = Stage::read(path).unwrap_or_else(|complaints| panic!("{complaints:#?}"));
        let mut rig = Rig::ready(&stage.plan_offline());
        rig.stage = Some(stage);
        rig
    }

    /// Words of `tell`, by the same grammar as the daemon's.
    pub fn tell(&mut self, words: &str) {
        let parsed = Words::parse(words).unwrap_or_else(|mistake| panic!("{words}: {mistake:?}"));
        let stage = self.stage.as_ref().expect("a rig of a stage file");
        let command = stage.resolve(&parsed);
        self.command(command.unwrap_or_else(|mistake| panic!("{words}: {mistake:?}")));
    }

    /// All synths are up and set up; the clock stands where set-up has been said.
    pub fn ready(plan: &Plan) -> Rig {
        let mut rig = Rig::new(plan);
        for place in 0..plan.ports() {
            rig.link(place, Link::Up);
        }
        rig
    }

    /// Runs every deadline up to `at`, each at its own time.
    pub fn until(&mut self, at: Time) {
        let mut deadlines = 0;
        while let Some(due) = self.engine.poll_timeout().filter(|due| *due <= at) {
            self.now = self.now.max(due);
            self.engine.handle_timeout(self.now);
            self.drain();
            deadlines += 1;
            assert!(
                deadlines < DEADLINES_MAX,
                "deadlines without end at {:?}",
                self.now
            );
        }
        self.now = self.now.max(at);
    }

    /// Time stands still; the next input comes at this very moment.
    pub fn input(&mut self, input: Input<'_>) {
        self.engine.handle_input(self.now, input);
        self.drain();
    }

    pub fn midi(&mut self, keyboard: usize, bytes: &[u8]) {
        self.input(Input::Midi {
            keyboard: keyboard_id(keyboard),
            bytes,
        });
    }

    pub fn command(&mut self, command: Command) {
        self.input(Input::Command(command));
    }

    /// A synth that comes up has just been switched on.
    pub fn link(&mut self, place: usize, link: Link) {
        if link == Link::Down
            && let Some(receiver) = self.receivers.get_mut(place)
        {
            receiver.power_cycle(elapsed(self.now));
        }
        let synth = SynthId::new(place).expect("a synth of the plan");
        self.input(Input::Synth { synth, link });
    }

    pub fn plan(&mut self, plan: &Plan) {
        let old = self.engine.handle_plan(self.now, Box::new(plan.clone()));
        drop(old);
        self.drain();
    }

    /// Messages from the `mark`-th output on, each whole, spelt in hexadecimal.
    pub fn sent_since(&self, mark: usize) -> Vec<String> {
        let spelt = |m: Vec<u8>| {
            let bytes: Vec<String> = m.iter().map(|b| format!("{b:02X}")).collect();
            bytes.join(" ")
        };
        let whole = |sent: &Sent| Stream::default().cut(&sent.bytes);
        self.sent[mark..]
            .iter()
            .flat_map(whole)
            .map(spelt)
            .collect()
    }

    /// The receiver of the first synth.
    pub fn heard(&self) -> &Receiver {
        &self.receivers[0]
    }

    /// Every byte sent, in order, with time and port.
    pub fn transcript_of_bytes(&self) -> String {
        let mut out = String::new();
        for sent in &self.sent {
            let _ = write!(out, "{} {}:", sent.at.nanos(), sent.synth);
            for byte in &sent.bytes {
                let _ = write!(out, " {byte:02X}");
            }
            out.push('\n');
        }
        out
    }

    fn drain(&mut self) {
        let at = self.now;
        while let Some(output) = self.engine.poll_output() {
            match output {
                Output::Send {
                    synth,
                    weight,
                    bytes,
                } => {
                    let synth = synth.index();
                    let sent = Sent {
                        at,
                        synth,
                        weight,
                        bytes: bytes.to_vec(),
                    };
                    self.order.push(synth);
                    match self.receivers.get_mut(synth) {
                        Some(receiver) => {
                            receiver.hear(elapsed(at), bytes);
                            self.sent.push(sent);
                        }
                        None => self.lamps.push(sent),
                    }
                }
                Output::Onset(onset) => self.onsets.push((at, onset)),
                Output::Moved(onset) => self.moved.push((at, onset)),
                Output::Ask(ask) => self.asked.push((at, ask)),
            }
        }
    }
}

/// The receiver's own kind of time.
pub fn elapsed(at: Time) -> Duration {
    Duration::from_nanos(at.nanos())
}

pub fn keyboard_id(place: usize) -> KeyboardId {
    KeyboardId::new(place).expect("a keyboard of the plan")
}
