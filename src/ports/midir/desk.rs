//! The desk's view through midir: what is there, and opening and closing connections.
//!
//! Ports are known by what midir calls them and by its name for where they are, so an address here is a place in a list
//! that only grows.

use super::look::{Known, broken, look, open_input, open_output, split};
use super::{Done, End, Ends, Feed};
use crate::limits::SYNTHS_MAX;
use crate::ports::hotplug::PEERS_MAX;
use crate::ports::names::{Address, Port, Wanted, Wish};
use crate::ports::{Broken, Patchbay, Ring};
use midir::{Ignore, MidiInput, MidiInputConnection, MidiOutput, MidiOutputConnection};
use rtrb::{Consumer, Producer};
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::{Mutex, MutexGuard, PoisonError};
use tracing::warn;

/// Addresses of our own ends.
const OUR_KEYBOARDS: i32 = -1;
const OUR_SYNTHS: i32 = -2;

/// A look at all ports, and all connections.
pub struct Desk {
    /// Ports of this name are trued's as well: another one that runs.
    family: String,
    /// What each of our ends is called.
    keyboards: Vec<String>,
    synths: Vec<String>,
    feed: Feed,
    state: Mutex<State>,
}

struct State {
    inputs: MidiInput,
    outputs: MidiOutput,
    known: Vec<Known>,
    joined: Vec<Joined>,
    last_connection: i32,
    done: Producer<Done>,
    closing: Consumer<MidiOutputConnection>,
    sockets_said: bool,
}

/// A connection.
struct Joined {
    end: End,
    /// The other end, or a port of ours that others connect to.
    to: Option<Address>,
    number: i32,
    /// A synth's is with the loop.
    input: Option<MidiInputConnection<()>>,
}

impl Desk {
    pub(super) fn open(
        family: &str,
        keyboards: &[Wanted],
        synths: &[Wanted],
        ends: Ends,
    ) -> Result<Desk, Broken> {
        // midir's library would write to stderr by itself if there is none.
        #[cfg(target_os = "linux")]
        crate::ports::alsa::look_for_sequencer()?;
        let own = format!("{family} desk");
        let called = |kind: &str, wanted: &[Wanted]| -> Vec<String> {
            let name = |wanted: &Wanted| format!("{family} {kind} {}", wanted.name);
            wanted.iter().map(name).collect()
        };
        Ok(Desk {
            family: family.to_string(),
            keyboards: called("keyboard", keyboards),
            synths: called("synth", synths),
            feed: ends.feed,
            state: Mutex::new(State {
                inputs: MidiInput::new(&own).map_err(broken)?,
                outputs: MidiOutput::new(&own).map_err(broken)?,
                known: Vec::new(),
                joined: Vec::new(),
                last_connection: 0,
                done: ends.done,
                closing: ends.closing,
                sockets_said: false,
            }),
        })
    }

    /// Where a keyboard's bytes come in.
    pub fn keyboard_address(&self, index: usize) -> Address {
        Address {
            client: OUR_KEYBOARDS,
            port: index as i32,
        }
    }

    /// Where a synth's bytes go out.
    pub fn synth_address(&self, index: usize) -> Address {
        Address {
            client: OUR_SYNTHS,
            port: index as i32,
        }
    }

    fn state(&self) -> MutexGuard<'_, State> {
        self.state.lock().unwrap_or_else(PoisonError::into_inner)
    }

    /// Makes a connection, to a port or to whoever will come.
    fn join(&self, state: &mut State, end: End, to: Option<Address>) -> Result<(), Broken> {
        let same = |joined: &Joined| joined.end == end && joined.to == to;
        if state.joined.iter().any(same) {
            return Ok(());
        }
        if matches!(end, End::Synth(_)) {
            self.part(state, |joined| joined.end == end);
        }
        if !state.has_room(end) {
            return Err(Broken {
                wrong: "There are too many connections".to_string(),
                right: format!("give each keyboard a port; {PEERS_MAX} are heard at most"),
            });
        }
        let known = to.map(|to| state.known.get(to.port as usize).cloned());
        let known = match known {
            Some(None) => return Ok(()), // not a port that was ever seen
            Some(known) => known,
            None => None,
        };
        state.last_connection += 1;
        let number = state.last_connection;
        let input = match end {
            End::Keyboard(index) => Some(self.hear(state, index, number, known.as_ref())?),
            End::Synth(index) => {
                let output = open_output(&self.synths[index], known.as_ref())?;
                self.hand_over(state, Done::Output(index, output));
                self.hand_over(state, Done::Joined(end, number));
                None
            }
        };
        state.joined.push(Joined {
            end,
            to,
            number,
            input,
        });
        Ok(())
    }

    fn hear(
        &self,
        state: &mut State,
        index: usize,
        number: i32,
        known: Option<&Known>,
    ) -> Result<MidiInputConnection<()>, Broken> {
        let name = &self.keyboards[index];
        let mut input = MidiInput::new(name).map_err(broken)?;
        input.ignore(Ignore::Sysex);
        let feed = self.feed.clone();
        let mut hurried = false;
        let callback = move |_: u64, bytes: &[u8], (): &mut ()| {
            if !std::mem::replace(&mut hurried, true) {
                hurry();
            }
            feed.take(index, number, bytes);
        };
        // midir fails where the system has no room for one of its clocks.
        let opened = catch_unwind(AssertUnwindSafe(|| {
            open_input(input, known, name, callback)
        }));
        let opened = opened.unwrap_or_else(|_| Err(broken("the system is full")))?;
        self.hand_over(state, Done::Joined(End::Keyboard(index), number));
        Ok(opened)
    }

    /// Closes connections. The loop is told first: what held notes is let go at once.
    fn part(&self, state: &mut State, which: impl Fn(&Joined) -> bool) {
        let (gone, kept) = std::mem::take(&mut state.joined)
            .into_iter()
            .partition::<Vec<Joined>, _>(|joined| which(joined));
        state.joined = kept;
        for joined in gone {
            self.hand_over(state, Done::Left(joined.end, joined.number));
            drop(joined.input);
        }
    }

    fn hand_over(&self, state: &mut State, done: Done) {
        // There is room, or nothing would have been joined.
        let _ = state.done.push(done);
        self.feed.waker.ring();
    }

    fn port(&self, known: &Known, place: usize, (sends, hears): (bool, bool)) -> Port {
        let (device, name) = split(known);
        Port {
            address: Address {
                client: 0,
                port: place as i32,
            },
            device: device.to_string(),
            name: name.to_string(),
            aliases: vec![known.name.clone()],
            socket: None,
            sends,
            hears,
            ours: is_of(device, &self.family),
        }
    }

    /// Opens and closes the ports that others connect to.
    fn offer_ends(&self, wanted: &[Wanted], end: impl Fn(usize) -> End) -> Result<(), Broken> {
        let mut state = self.state();
        for (index, wanted) in wanted.iter().enumerate() {
            let end = end(index);
            if wanted.wish == Wish::Virtual {
                self.join(&mut state, end, None)?;
            } else {
                self.part(&mut state, |joined| {
                    joined.end == end && joined.to.is_none()
                });
            }
        }
        Ok(())
    }
}

impl Patchbay for Desk {
    /// In midir's order. What was connected and is not there any more is closed.
    fn ports(&self) -> Vec<Port> {
        let mut state = self.state();
        while state.closing.pop().is_ok() {}
        let senders = look(&state.inputs, midir::MidiInputPort::id);
        let hearers = look(&state.outputs, midir::MidiOutputPort::id);
        let only_hearers = hearers.iter().filter(|known| !senders.contains(known));
        let ports: Vec<Port> = senders
            .iter()
            .chain(only_hearers)
            .map(|known| {
                let ways = (senders.contains(known), hearers.contains(known));
                self.port(known, state.place(known), ways)
            })
            .collect();
        let there = |address: Address| ports.iter().any(|port| port.address == address);
        self.part(&mut state, |joined| joined.to.is_some_and(|to| !there(to)));
        ports
    }

    fn offer(&self, keyboards: &[Wanted], synths: &[Wanted]) -> Result<(), Broken> {
        let has_socket = |wanted: &Wanted| matches!(&wanted.wish, Wish::Named { socket, .. } if socket.is_some());
        let mut state = self.state();
        if keyboards.iter().chain(synths).any(has_socket) && !state.sockets_said {
            state.sockets_said = true;
            warn!("midir does not know sockets: a device with `socket:` waits for ever");
        }
        drop(state);
        self.offer_ends(keyboards, End::Keyboard)?;
        self.offer_ends(synths, End::Synth)
    }

    fn shown(&self, address: Address) -> String {
        let place = address.port as usize;
        let name = match address.client {
            OUR_KEYBOARDS => self.keyboards.get(place).cloned(),
            OUR_SYNTHS => self.synths.get(place).cloned(),
            _ => self.state().known.get(place).map(|k| k.name.clone()),
        };
        name.unwrap_or_default()
    }

    fn connect(&self, from: Address, to: Address) -> Result<(), Broken> {
        let (end, other) = end_of(from, to);
        self.join(&mut self.state(), end, Some(other))
    }

    fn disconnect(&self, from: Address, to: Address) -> Result<(), Broken> {
        let (end, other) = end_of(from, to);
        self.part(&mut self.state(), |joined| {
            joined.end == end && joined.to == Some(other)
        });
        Ok(())
    }
}

impl State {
    /// Whether one more can be joined, and all of them parted, before the loop has looked.
    fn has_room(&self, end: End) -> bool {
        let keyboards = self.joined.iter().filter(|joined| joined.input.is_some());
        let one_more = matches!(end, End::Synth(_)) || keyboards.count() < PEERS_MAX;
        one_more && self.done.slots() > PEERS_MAX + SYNTHS_MAX + 3
    }

    fn place(&mut self, known: &Known) -> usize {
        let place = self.known.iter().position(|other| other == known);
        place.unwrap_or_else(|| {
            self.known.push(known.clone());
            self.known.len() - 1
        })
    }
}

/// Which of our ends it is, and the port at the other.
fn end_of(from: Address, to: Address) -> (End, Address) {
    match to.client {
        OUR_KEYBOARDS => (End::Keyboard(to.port as usize), from),
        _ => (End::Synth(from.port as usize), to),
    }
}

/// `trued` on another backend, or `trued keyboard keys` through midir.
fn is_of(device: &str, family: &str) -> bool {
    let rest = device.strip_prefix(family);
    rest.is_some_and(|rest| {
        let mut kinds = [" keyboard ", " synth "].iter();
        rest.is_empty() || kinds.any(|kind| rest.starts_with(kind))
    })
}

/// A callback's thread runs like the loop's, so that neither waits for the other.
fn hurry() {
    #[cfg(target_os = "linux")]
    let _ = crate::ports::system::hurry();
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_is_trueds_own() {
        for device in ["trued", "trued keyboard keys", "trued synth organ"] {
            assert!(is_of(device, "trued"), "{device}");
        }
        // A daemon called like the maker of a keyboard takes nothing for its own.
        for device in ["Wharf Keys", "Wharf keyboards", "a Wharf"] {
            assert!(!is_of(device, "Wharf"), "{device}");
        }
    }
}
