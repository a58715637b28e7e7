//! What the desk does when the stage file is edited: wakes the score thread, connects what has changed, and asks the
//! main thread for other ports where the devices are not those of before.

use super::desk::{Desk, Patch};
use super::open::{OurEnds, Ports};
use super::reload::{Reload, Todo};
use super::rig::{Moved, Moves, RigWanted};
use super::run::Evening;
use super::score::Slot;
use super::socket::ClientId;
use crate::ports::clock::Clock;
use crate::ports::names::{Address, Choice};
use crate::ports::{Broken, Ring, Tally};
use crate::time::{Span, Time};
use std::sync::Arc;
use std::sync::mpsc::{Receiver, Sender, channel};
use std::time::Duration;
use tracing::warn;

/// What a synth was told last, its silence above all, has left the score but need not have arrived: JACK passes it on a
/// cycle later where its server does not wait for its clients, or where they stand in a ring. Two cycles of 2048 frames.
/// A sequencer has it at once.
const LAST_WORDS: Duration = Duration::from_millis(100);

/// The desk's side.
pub struct Edits {
    pub reload: Reload,
    clock: Clock,
    /// The supervisor has been told that a reload is under way.
    told: bool,
    /// Whoever waits to hear what has become of a reload.
    asked: Vec<ClientId>,
    wanted: Sender<(RigWanted, Moved)>,
    opened: Receiver<Opened>,
}

/// The main thread's side.
pub struct Turn {
    wanted: Receiver<(RigWanted, Moved)>,
    opened: Sender<Opened>,
}

/// Ports for another rig.
enum Opened {
    /// Opened in place of those before.
    Others {
        patch: Patch,
        bell: Box<dyn Ring>,
        tally: Arc<Tally>,
    },
    /// The same, but for devices that came or went.
    Rearranged(OurEnds),
}

impl Edits {
    pub fn new(reload: Reload, clock: Clock) -> (Edits, Turn) {
        let (wanted, wanted_out) = channel();
        let (opened_in, opened) = channel();
        let edits = Edits {
            reload,
            clock,
            told: false,
            asked: Vec::new(),
            wanted,
            opened,
        };
        let turn = Turn {
            wanted: wanted_out,
            opened: opened_in,
        };
        (edits, turn)
    }

    pub fn now(&self) -> Time {
        self.clock.now()
    }

    /// How long the next look may wait.
    pub fn patience(&self) -> Span {
        self.reload.patience(self.clock.now())
    }

    /// Reads the files at the next look, and answers when that is done.
    pub fn ask(&mut self, client: ClientId) {
        self.reload.ask();
        self.asked.push(client);
    }
}

impl Turn {
    /// Plays until the score has come to its end; where an edit needs other ports, goes on with those.
    ///
    /// # Errors
    /// The ports are gone for good, or others cannot be had.
    pub fn play(self, mut ports: Ports, slot: &Arc<Slot>, evening: &Evening) -> Result<(), Broken> {
        loop {
            ports.play(slot)?;
            if !slot.takes_other_ports() {
                return Ok(());
            }
            // Fails only where the desk has failed; then there is nobody to connect anything.
            let Ok((rig, moved)) = self.wanted.recv() else {
                return Ok(());
            };
            let opened = match ports.rearrange(&rig, &moved)? {
                Some(ends) => Opened::Rearranged(ends),
                None => {
                    let clock = ports.clock();
                    drop(ports);
                    let (others, patch) = Ports::open(evening.asked, &rig, &evening.name, clock)?;
                    ports = others;
                    let (bell, tally) = (ports.bell(), ports.tally());
                    Opened::Others { patch, bell, tally }
                }
            };
            // As above.
            let _ = self.opened.send(opened);
        }
    }
}

impl Desk {
    /// Sees to edits of the stage file. True if the ports are others now.
    pub(super) fn see_to_edits(&mut self) -> bool {
        let now = self.edits.clock.now();
        if self.edits.reload.begins(now) {
            self.tell_reloading();
        }
        let others = match self.edits.reload.look(now) {
            Todo::Nothing => false,
            Todo::Ring => {
                self.tell_reloading();
                self.orders.ring();
                false
            }
            Todo::InForce(moved) => self.in_force(&moved),
        };
        self.edits.reload.show(&mut self.front.status);
        if self.edits.reload.is_settled() {
            if std::mem::take(&mut self.edits.told) {
                self.front.ready();
            }
            self.answer();
        }
        others
    }

    fn tell_reloading(&mut self) {
        if !std::mem::replace(&mut self.edits.told, true) {
            self.front.reloading();
        }
    }

    fn answer(&mut self) {
        for client in std::mem::take(&mut self.edits.asked) {
            match self.edits.reload.complaint() {
                Some(complaint) => self.front.answer(client, 65, &complaint),
                None => {
                    let text = "the stage file is in force as it is now";
                    self.front.answer(client, 0, text);
                }
            }
        }
    }

    fn in_force(&mut self, moved: &Moved) -> bool {
        let stage = self.edits.reload.stage();
        self.rig = RigWanted::of(&stage);
        self.front.show_stage(stage);
        if moved.is_nothing() {
            return false;
        }
        let at_once = self.edits.reload.keeps_ports();
        let last_words = if at_once { Duration::ZERO } else { LAST_WORDS };
        if !moved.renamed() {
            self.patch.part(moved, last_words);
            self.reconnect();
            return false;
        }
        // The main thread waits for this, unless it is about to end; then it answers nothing.
        self.patch.part(moved, last_words);
        let wanted = (self.rig.clone(), moved.clone());
        let _ = self.edits.wanted.send(wanted);
        let Ok(opened) = self.edits.opened.recv() else {
            return false;
        };
        let before = std::mem::take(&mut self.front.status.synths);
        let others = match opened {
            Opened::Others { patch, bell, tally } => {
                (self.patch, self.tally) = (patch, tally);
                self.orders.ring_at(bell);
                true
            }
            Opened::Rearranged(ends) => {
                (self.patch.keyboards, self.patch.synths) = ends;
                false
            }
        };
        let (_, synths) = self.rig.devices(&self.patch.connected(), &[]);
        self.front.status.synths = synths;
        let devices = self.front.status.synths.iter_mut().zip(before);
        for ((now, before), renewed) in devices.zip(moved.synths.renewed(&self.rig.synths)) {
            now.linked = !others && renewed.same && before.linked;
        }
        self.reconnect();
        others
    }
}

impl Patch {
    /// Disconnects the devices that want other ports than before; the rest stays as it is.
    fn part(&mut self, moved: &Moved, last_words: Duration) {
        let old = std::mem::take(&mut self.choice);
        let keyboards = old.keyboards.iter().zip(&self.keyboards).enumerate();
        let from_keyboards = keyboards
            .filter(|(place, _)| !moved.keyboards.stays(*place))
            .flat_map(|(_, (from, own))| from.iter().map(move |from| (*from, *own)));
        let synths = old.synths.iter().zip(&self.synths).enumerate();
        let to_synths = synths
            .filter(|(place, _)| !moved.synths.stays(*place))
            .filter_map(|(_, (to, own))| Some((*own, (*to)?)));
        let from_keyboards: Vec<(Address, Address)> = from_keyboards.collect();
        let to_synths: Vec<(Address, Address)> = to_synths.collect();
        self.disconnect(&from_keyboards);
        if !to_synths.is_empty() {
            std::thread::sleep(last_words);
        }
        self.disconnect(&to_synths);
        self.choice = Choice {
            keyboards: kept(&moved.keyboards, &old.keyboards),
            synths: kept(&moved.synths, &old.synths),
            ..old
        };
    }

    fn disconnect(&self, ways: &[(Address, Address)]) {
        for (from, to) in ways {
            if let Err(Broken { wrong, .. }) = self.patchbay.disconnect(*from, *to) {
                warn!("a port could not be disconnected: {wrong}");
            }
        }
    }
}

/// What each device of the new rig has from before.
fn kept<T: Clone + Default>(moves: &Moves, old: &[T]) -> Vec<T> {
    let from = |place: &Option<usize>| place.and_then(|place| old.get(place).cloned());
    let kept = moves.from.iter().map(from);
    kept.map(Option::unwrap_or_default).collect()
}
