//! The desk thread: signals, connecting what is plugged in, the log, and whoever asks something at its front.

use super::edits::Edits;
use super::front::Front;
use super::orders::Orders;
use super::remember::Memory;
use super::remember::record::State;
use super::rig::RigWanted;
use super::score::News;
use super::status::Device;
use crate::engine::Ask;
use crate::ports::names::{Address, Choice, Port, Wanted, choose};
use crate::ports::{Broken, Link, Patchbay, Tally};
use crate::time::{Span, Time};
use rtrb::Consumer;
use signal_hook::consts::SIGHUP;
use signal_hook::iterator::Signals;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use tracing::{error, info, warn};

/// After how long a connection that was refused is tried again: a JACK client that has ports but is not yet active takes
/// none, and nobody says when it is.
const RETRY: Span = Span::from_millis(250);

pub struct Desk {
    pub rig: RigWanted,
    pub patch: Patch,
    pub front: Front,
    pub signals: Signals,
    pub orders: Orders,
    pub news: Consumer<News>,
    pub tally: Arc<Tally>,
    /// The score thread has left.
    pub done: Arc<AtomicBool>,
    pub edits: Edits,
    pub memory: Memory,
}

impl Desk {
    pub fn run(mut self) {
        // What changed while the first connections were made is looked at once more.
        let mut changes = 0;
        let mut losses = (0, 0);
        let mut loops = 0;
        let mut tried_at = Time::START;
        while !self.done.load(Ordering::Acquire) {
            for signal in self.signals.pending() {
                match signal {
                    SIGHUP => self.edits.reload.ask(),
                    _ => self.front.stop(&mut self.orders),
                }
            }
            self.log_news();
            if self.see_to_edits() {
                (changes, losses) = (0, (0, 0));
            }
            let (seen, now) = (self.tally.changes.load(Ordering::Relaxed), self.edits.now());
            if seen != changes || self.patch.is_refused() && now.since(tried_at) >= RETRY {
                (changes, tried_at) = (seen, now);
                self.reconnect();
            }
            let now = self.tally.loops.load(Ordering::Relaxed);
            if now != loops {
                loops = now;
                self.patch.cut_loops(&self.rig);
            }
            losses = self.log_losses(losses);
            self.front.status.real_time = self.tally.real_time.load(Ordering::Relaxed);
            self.front.status.server = self.tally.server();
            for asked in self.front.look(self.edits.patience(), &mut self.orders) {
                self.edits.ask(asked);
            }
            self.remember();
        }
        self.log_news();
        self.front.close();
        self.remember();
        self.memory.finish(self.edits.now());
        self.edits.reload.finish();
    }

    fn remember(&mut self) {
        // Until the score has the set that we have, its song's place means nothing here.
        let plans = self.edits.reload.plans_in_force();
        let Some((told, _)) = self.front.told.filter(|(_, taken)| plans == Some(*taken)) else {
            return;
        };
        let status = &mut self.front.status;
        let state = State::of(status.report.song, &told, &status.titles, &status.places);
        if self.memory.look(self.edits.now(), &status.stage, state) {
            status.resumed = None;
        }
    }

    /// Input that was lost since `before`; gives the counts for the next look.
    fn log_losses(&mut self, before: (u64, u64)) -> (u64, u64) {
        let overruns = self.tally.overruns.load(Ordering::Relaxed);
        let too_long = self.tally.too_long.load(Ordering::Relaxed);
        if overruns != before.0 {
            error!("MIDI came faster than it could be read and was lost; every key was let go");
        }
        if too_long != before.1 {
            warn!("a message from a keyboard was too long and was left out");
        }
        (self.front.status.overruns, self.front.status.too_long) = (overruns, too_long);
        (overruns, too_long)
    }

    pub(super) fn reconnect(&mut self) {
        let before = self.patch.connected();
        let ports = self.patch.connect(&self.rig);
        let now = self.patch.connected();
        let (keyboards, synths) = self.rig.devices(&now, &ports);
        self.front.status.keyboards = keyboards;
        for (synth, before) in synths.into_iter().zip(&mut self.front.status.synths) {
            let linked = before.linked;
            *before = Device { linked, ..synth };
        }
        if (&before.keyboards, &before.synths) != (&now.keyboards, &now.synths) {
            let rig = self.rig.describe("is", &now, &ports);
            info!("ports have changed: {}", rig.join("; "));
        }
    }

    fn log_news(&mut self) {
        // News may be older than an edit that took its device away.
        let name_of = |rig: &[Wanted], index: usize| {
            rig.get(index)
                .map_or(String::new(), |device| device.name.clone())
        };
        let synth_name = |rig: &RigWanted, index: usize| name_of(&rig.synths, index);
        while let Ok(news) = self.news.pop() {
            match news {
                News::Song(place) => {
                    let title = self.front.status.titles.get(usize::from(place));
                    let title = title.map_or("", String::as_str);
                    info!("song {}: {title}", place + 1);
                }
                News::Synth { synth, link } => {
                    let name = synth_name(&self.rig, synth);
                    if let Some(device) = self.front.status.synths.get_mut(synth) {
                        device.linked = link != Link::Down;
                    }
                    match link {
                        Link::Up | Link::Back => info!("{name} is set up"),
                        Link::Down => warn!("{name} has gone"),
                    }
                }
                News::Asked(Ask::Stop) => self.front.stop(&mut self.orders),
                News::Asked(Ask::Reload) => self.edits.reload.ask(),
                News::KeyboardLost { keyboard } => {
                    let name = name_of(&self.rig.keyboards, keyboard);
                    warn!("keyboard {name} has gone; all it held is let go");
                }
                News::Emptied { synth } => {
                    let name = synth_name(&self.rig, synth);
                    error!(
                        "{name} did not read for a while and has lost notes; it was silenced and set up again"
                    );
                }
                News::Choked { synth } => {
                    let name = synth_name(&self.rig, synth);
                    error!("{name} takes nothing any more; it is tried again every second");
                }
            }
        }
    }
}

/// Who is connected to whom, and the means to change it.
pub struct Patch {
    pub patchbay: Box<dyn Patchbay>,
    pub choice: Choice,
    /// Our own ports, in the order of the stage file.
    pub keyboards: Vec<Address>,
    pub synths: Vec<Address>,
    /// Said once each.
    pub said: Vec<String>,
    /// Connections that could not be made.
    pub refused: Vec<(Address, Address)>,
    /// Something else was refused.
    pub again: bool,
}

impl Patch {
    /// Connects every device to what it wants and is there; gives what is there.
    pub fn connect(&mut self, rig: &RigWanted) -> Vec<Port> {
        let ports = self.patchbay.ports();
        self.choice = choose(&ports, &rig.keyboards, &rig.synths, &self.choice);
        for remark in std::mem::take(&mut self.choice.remarks) {
            self.say(remark);
        }
        let keyboards = self.choice.keyboards.iter().zip(&self.keyboards);
        let synths = self.choice.synths.iter().zip(&self.synths);
        let ways: Vec<(Address, Address)> = keyboards
            .flat_map(|(from, own)| from.iter().map(move |from| (*from, *own)))
            .chain(synths.filter_map(|(to, own)| Some((*own, (*to)?))))
            .collect();
        self.refused.clear();
        self.again = false;
        if let Err(broken) = self.patchbay.offer(&rig.keyboards, &rig.synths) {
            self.again = true;
            self.say(broken.to_string());
        }
        for (from, to) in ways {
            // Also what we take for connected: it may have gone and come back between two looks.
            if let Err(Broken { wrong, .. }) = self.patchbay.connect(from, to) {
                self.refused.push((from, to));
                let shown = |address| self.patchbay.shown(address);
                let (from, to) = (shown(from), shown(to));
                self.say(format!("{from} cannot be connected to {to}: {wrong}"));
            }
        }
        ports
    }

    /// Not all is as it should be, so it is tried again.
    pub fn is_refused(&self) -> bool {
        self.again || !self.refused.is_empty()
    }

    /// What is chosen and has been connected.
    pub fn connected(&self) -> Choice {
        let mut choice = self.choice.clone();
        for (from, own) in choice.keyboards.iter_mut().zip(&self.keyboards) {
            from.retain(|from| !self.refused.contains(&(*from, *own)));
        }
        for (to, own) in choice.synths.iter_mut().zip(&self.synths) {
            *to = to.filter(|to| !self.refused.contains(&(*own, *to)));
        }
        choice
    }

    /// Undoes connections that bring our own notes back to us, and says so each time. The score thread has not heard a
    /// note of them.
    fn cut_loops(&self, rig: &RigWanted) {
        for (keyboard, own) in rig.keyboards.iter().zip(&self.keyboards) {
            for from in self.patchbay.cut_loops(*own, &self.synths) {
                let ports = self.patchbay.ports();
                let port = ports.iter().find(|port| port.address == from);
                let from = port.map_or_else(|| self.patchbay.shown(from), Port::full_name);
                error!(
                    "{from} was connected to keyboard {}, which would have played our own notes back to us, round and \
                     round; that connection is undone",
                    keyboard.name
                );
            }
        }
    }

    fn say(&mut self, text: String) {
        if !self.said.contains(&text) {
            warn!("{text}");
            self.said.push(text);
        }
    }
}
