//! The score: an engine and its queues, and what is done with them in one cycle.

mod edits;
mod pulse;

pub use edits::Handover;
pub use pulse::Pulse;

use crate::engine::{self, Ask, Command, Engine, Input, KeyboardId, Output, Report, SynthId};
use crate::limits::{CHANNELS, KEYBOARDS_MAX, SYNTHS_MAX};
use crate::midi::controller::{ALL_NOTES_OFF, ALL_SOUND_OFF, DAMPER, SOSTENUTO};
use crate::midi::status;
use crate::ports::{self, Cycle, Inbox, Next, Outlet, Room, What};
use crate::time::{Span, Time};
use rtrb::{Consumer, Producer};
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::{Arc, Mutex, TryLockError};

/// What the score thread tells the desk, for the log.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum News {
    /// The song now playing, by place in the set.
    Song(u16),
    Synth {
        synth: usize,
        link: ports::Link,
    },
    KeyboardLost {
        keyboard: usize,
    },
    /// A player asks for something that only the desk can do.
    Asked(Ask),
    /// A synth's port takes nothing any more; it is tried again from time to time.
    Choked {
        synth: usize,
    },
    /// A synth's port did not read for a while and has lost messages; it was silenced and set up again.
    Emptied {
        synth: usize,
    },
}

/// Why a score came to its end.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ending {
    /// Everything has been said.
    Stopped,
    /// Told to stop, but tails or a full port took too long.
    GaveUp,
    /// A bug of ours; all synths have been told to be silent.
    Panicked,
}

/// Inputs of one instant that go into the engine before its output is asked for. Few enough for the engine's room.
const TOGETHER: usize = 32;
/// Packets longer than any short message are handled one by one.
const SHORT_BYTES: usize = 12;
/// Deadlines run at one time before the loop goes on; only an engine that stands still comes near.
const DEADLINES_MAX: usize = 10_000;
/// How long after a stop the last tail is waited for.
const STOP: Span = Span::from_millis(4_000);
/// How long a port that took nothing any more is left alone.
const CHOKED: Span = Span::from_millis(1_000);
/// How long a port that has lost messages is left alone once it reads again: the kernel throws a queue that ran over
/// away at its reader's next read, with whatever has come in until then.
const EMPTIED: Span = Span::from_millis(60);

/// The engine with its queues. Lives in a [`Slot`], so that no backend that dies takes it along.
pub struct Score {
    engine: Engine,
    synths: usize,
    commands: Consumer<Command>,
    news: Producer<News>,
    edits: Option<edits::Edits>,
    /// A plan has come that needs other ports, for so many synths.
    ports_due: Option<usize>,
    pulses: pulse::Pulses,
    obeyed: u64,
    plans_taken: u64,
    song: u16,
    /// Synths whose port is there.
    up: [bool; SYNTHS_MAX],
    /// As which keyboard of the stage file each device plays.
    seats: [usize; KEYBOARDS_MAX],
    /// When a choked port is tried again.
    reopen_at: [Option<Time>; SYNTHS_MAX],
    give_up_at: Option<Time>,
    ending: Option<Ending>,
}

impl Score {
    pub fn new(
        engine: Engine,
        synths: usize,
        commands: Consumer<Command>,
        news: Producer<News>,
    ) -> Score {
        Score {
            song: engine.report().song,
            engine,
            synths: synths.min(SYNTHS_MAX),
            commands,
            news,
            edits: None,
            ports_due: None,
            pulses: pulse::Pulses::default(),
            obeyed: 0,
            plans_taken: 0,
            up: [false; SYNTHS_MAX],
            seats: std::array::from_fn(|seat| seat),
            reopen_at: [None; SYNTHS_MAX],
            give_up_at: None,
            ending: None,
        }
    }

    pub fn report(&self) -> Report {
        self.engine.report()
    }

    /// `None` as long as the loop should go on.
    pub fn ending(&self) -> Option<Ending> {
        self.ending
    }

    /// Takes in everything up to `to`, each thing at its own time, and sends what comes of it.
    fn cycle(&mut self, to: Time, inbox: &mut Inbox, outlet: &mut Outlet<'_>) -> Next {
        let (mut instant, mut together) = (None, 0);
        for (time, what) in inbox.sorted() {
            let long = matches!(what, What::Midi { bytes, .. } if bytes.len() > SHORT_BYTES);
            if instant != Some(time) || together == TOGETHER || long {
                self.drain(instant.unwrap_or(time), outlet);
                self.run_due(time, outlet);
                (instant, together) = (Some(time), 0);
            }
            self.take_in(time, what, outlet);
            together += if long { TOGETHER } else { 1 };
        }
        self.drain(instant.unwrap_or(to), outlet);
        self.run_due(to, outlet);
        while let Ok(command) = self.commands.pop() {
            self.obey(to, command, outlet);
            self.obeyed += 1;
        }
        self.take_plan(to, outlet);
        self.reopen(to, outlet);
        self.tell_song();
        let pulse_at = self.beat(to, outlet);
        self.next(to, pulse_at, outlet)
    }

    fn take_in(&mut self, time: Time, what: What<'_>, outlet: &mut Outlet<'_>) {
        match what {
            What::Midi { keyboard, bytes } => {
                if let Some(keyboard) = KeyboardId::new(keyboard) {
                    let input = Input::Midi { keyboard, bytes };
                    self.engine.handle_input(time, input);
                }
            }
            What::KeyboardLost { keyboard } => {
                if let Some(id) = KeyboardId::new(keyboard) {
                    self.engine.handle_input(time, Input::KeyboardLost(id));
                }
                let keyboard = self.seats[keyboard];
                self.tell(News::KeyboardLost { keyboard });
            }
            What::Seat { keyboard, plays_as } => self.seat(time, keyboard, plays_as),
            What::Synth { synth, link } => {
                let lost = link == ports::Link::Down;
                // What waits for a port that has gone, or had choked, is of no use to the one that comes.
                if self.reopen_at[synth].take().is_some() || lost {
                    outlet.forget(synth);
                }
                if !lost && !self.up[synth] {
                    // An earlier run that was killed, or a cable pulled while notes sounded, may have left it so. (Not
                    // when a second device joins: the first plays on.) Bends are not said here: the engine takes none
                    // for granted.
                    outlet.at(time);
                    let quiet = [DAMPER, SOSTENUTO, ALL_NOTES_OFF, ALL_SOUND_OFF];
                    outlet.at(time);
                    self.hush(outlet, synth, &quiet);
                }
                self.up[synth] = !lost;
                self.link(time, synth, link.into());
                self.tell(News::Synth { synth, link });
            }
        }
    }

    fn seat(&mut self, time: Time, keyboard: usize, plays_as: usize) {
        self.seats[keyboard] = plays_as;
        if let (Some(keyboard), Some(plays_as)) =
            (KeyboardId::new(keyboard), KeyboardId::new(plays_as))
        {
            let input = Input::Seat { keyboard, plays_as };
            self.engine.handle_input(time, input);
        }
    }

    fn obey(&mut self, now: Time, command: Command, outlet: &mut Outlet<'_>) {
        if command == Command::Stop {
            self.give_up_at.get_or_insert(now + STOP);
            // There is no later: what hangs on a choked port is let go now, as far as it hears.
            self.reopen_at.iter_mut().flatten().for_each(|at| *at = now);
            self.reopen(now, outlet);
        }
        self.engine.handle_input(now, Input::Command(command));
        self.drain(now, outlet);
    }

    /// Every deadline of the engine up to a time, each at its own time: lateness is not passed on.
    fn run_due(&mut self, until: Time, outlet: &mut Outlet<'_>) {
        for _ in 0..DEADLINES_MAX {
            let Some(due) = self.engine.poll_timeout().filter(|due| *due <= until) else {
                return;
            };
            self.engine.handle_timeout(due);
            self.drain(due, outlet);
        }
    }

    /// Sends all that the engine has to say, and tells it when a port runs short.
    fn drain(&mut self, now: Time, outlet: &mut Outlet<'_>) {
        loop {
            while let Some(output) = self.engine.poll_output() {
                // Only now: a deadline before this time may be still to come.
                outlet.at(now);
                match output {
                    Output::Send {
                        synth,
                        weight,
                        bytes,
                    } => outlet.send(synth.index(), weight.into(), bytes),
                    Output::Ask(ask) => {
                        let _ = self.news.push(News::Asked(ask));
                    }
                    Output::Onset(_) | Output::Moved(_) => {}
                }
            }
            let news = (0..self.synths).find_map(|s| Some((s, outlet.room_news(s)?)));
            let Some((synth, room)) = news else {
                return;
            };
            match room {
                Room::Easy => self.link(now, synth, engine::Link::Easy),
                Room::Tight => self.link(now, synth, engine::Link::Tight),
                Room::None => {
                    self.reopen_at[synth] = Some(now + CHOKED);
                    self.tell(News::Choked { synth });
                    self.link(now, synth, engine::Link::Down);
                }
                Room::Emptied => {
                    self.tell(News::Emptied { synth });
                    self.reopen_at[synth] = Some(now + EMPTIED);
                    self.link(now, synth, engine::Link::Down);
                }
            }
        }
    }

    /// A port that has lost messages, or perhaps has: what hangs there is let go, then it is set up.
    fn begin_anew(&mut self, now: Time, synth: usize, outlet: &mut Outlet<'_>) {
        outlet.at(now);
        outlet.forget(synth);
        self.hush(outlet, synth, &[DAMPER, ALL_NOTES_OFF]);
        self.link(now, synth, engine::Link::Back);
    }

    /// Tries choked ports again, as if they had just come back.
    fn reopen(&mut self, now: Time, outlet: &mut Outlet<'_>) {
        for synth in 0..self.synths {
            if self.reopen_at[synth].is_some_and(|at| at <= now) {
                self.reopen_at[synth] = None;
                self.begin_anew(now, synth, outlet);
                self.drain(now, outlet);
            }
        }
    }

    fn link(&mut self, now: Time, synth: usize, link: engine::Link) {
        if let Some(synth) = SynthId::new(synth) {
            self.engine.handle_input(now, Input::Synth { synth, link });
        }
    }

    fn tell_song(&mut self) {
        let song = self.engine.report().song;
        if song != self.song {
            self.song = song;
            self.tell(News::Song(song));
        }
    }

    /// A desk that does not listen misses a line in its log; nothing waits for it.
    fn tell(&mut self, news: News) {
        let _ = self.news.push(news);
    }

    fn next(&mut self, to: Time, pulse_at: Option<Time>, outlet: &Outlet<'_>) -> Next {
        if self.engine.report().stopped && !outlet.is_waiting() {
            self.ending = Some(Ending::Stopped);
        } else if self.give_up_at.is_some_and(|at| at <= to) {
            self.ending = Some(Ending::GaveUp);
        }
        if self.ending.is_some() || self.ports_due.is_some() {
            return Next::Leave;
        }
        let own = self.reopen_at.iter().copied().flatten();
        let deadlines = own.chain(self.give_up_at).chain(pulse_at);
        Next::Wait(deadlines.chain(self.engine.poll_timeout()).min())
    }

    /// After a panic: what the engine still knows to be open, then silence for every channel whatever it knows.
    fn silence(&mut self, now: Time, outlet: &mut Outlet<'_>) {
        self.ending = Some(Ending::Panicked);
        let _ = catch_unwind(AssertUnwindSafe(|| self.obey(now, Command::Stop, outlet)));
        for synth in 0..self.synths {
            self.hush(outlet, synth, &[DAMPER, ALL_NOTES_OFF, ALL_SOUND_OFF]);
        }
    }

    /// Sets controllers to zero on every channel of a synth, whatever anybody knows to be sounding. Lamps make no sound.
    fn hush(&self, outlet: &mut Outlet<'_>, synth: usize, numbers: &[u8]) {
        if synth >= self.engine.synths() {
            return;
        }
        for channel in 0..CHANNELS as u8 {
            for number in numbers {
                let message = [status::CONTROLLER | channel, *number, 0];
                outlet.send(synth, ports::Weight::Owed, &message);
            }
        }
    }
}

/// Where the score lies between two cycles. A cycle takes it and puts it back; who finds it here when the loop has
/// ended, has the engine with all it knows.
#[derive(Default)]
pub struct Slot(Mutex<Option<Box<Score>>>);

impl Slot {
    pub fn new(score: Score) -> Arc<Slot> {
        Arc::new(Slot(Mutex::new(Some(Box::new(score)))))
    }

    /// Never waits: nobody else reaches in while a loop runs, and if somebody does, there is no score for this cycle.
    pub fn take(&self) -> Option<Box<Score>> {
        match self.0.try_lock() {
            Ok(mut place) => place.take(),
            Err(TryLockError::Poisoned(poisoned)) => poisoned.into_inner().take(),
            Err(TryLockError::WouldBlock) => None,
        }
    }

    /// Whether the loop has ended only because an edit needs other ports.
    pub(super) fn takes_other_ports(&self) -> bool {
        let Some(mut score) = self.take() else {
            return false;
        };
        let due = score.take_ports_due();
        self.put(score);
        due
    }

    fn put(&self, score: Box<Score>) {
        if let Ok(mut place) = self.0.try_lock() {
            *place = Some(score);
        }
    }
}

/// What a backend's loop runs.
pub struct Player {
    slot: Arc<Slot>,
}

impl Player {
    pub fn new(slot: Arc<Slot>) -> Player {
        Player { slot }
    }
}

impl Cycle for Player {
    fn run(&mut self, to: Time, inbox: &mut Inbox, outlet: &mut Outlet<'_>) -> Next {
        let Some(mut score) = self.slot.take() else {
            return Next::Leave;
        };
        let cycle = AssertUnwindSafe(|| score.cycle(to, inbox, outlet));
        let next = catch_unwind(cycle).unwrap_or_else(|_| {
            score.silence(to, outlet);
            Next::Leave
        });
        self.slot.put(score);
        next
    }
}

impl From<engine::Weight> for ports::Weight {
    fn from(weight: engine::Weight) -> ports::Weight {
        match weight {
            engine::Weight::Owed => ports::Weight::Owed,
            engine::Weight::Note => ports::Weight::Note,
            engine::Weight::Control => ports::Weight::Control,
            engine::Weight::Through => ports::Weight::Through,
        }
    }
}

impl From<ports::Link> for engine::Link {
    fn from(link: ports::Link) -> engine::Link {
        match link {
            ports::Link::Up => engine::Link::Up,
            ports::Link::Back => engine::Link::Back,
            ports::Link::Down => engine::Link::Down,
        }
    }
}
