//! The desk's view of a JACK server: its MIDI ports by name, and connecting them.
//!
//! JACK knows ports by name, so an address here is a place in a list of names that only grows: a port that comes back
//! has the address it had.

use super::{Place, asking, lock};
use crate::ports::names::{Address, Port};
use crate::ports::{Broken, Patchbay, Server, Tally};
use jack::{Client, Error, PortFlags};
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Arc, Mutex, PoisonError};
use std::time::Duration;

/// Addresses of our own ports, whatever the server calls our client today.
const OUR_KEYBOARDS: i32 = -1;
const OUR_SYNTHS: i32 = -2;
/// How long the desk waits for an answer of the server.
const ANSWER: Duration = Duration::from_millis(500);
const MIDI: &str = "8 bit raw midi";

/// A look at all MIDI ports of the server, while there is one.
pub struct Desk {
    place: Place,
    tally: Arc<Tally>,
    /// Clients of this name are trued's as well: another one that runs.
    family: String,
    keyboards: Vec<String>,
    synths: Vec<String>,
    names: Mutex<Vec<String>>,
    /// A question to the server has not been answered yet.
    asked: Arc<AtomicBool>,
}

/// A question under way.
struct Asked(Arc<AtomicBool>);

impl Drop for Asked {
    fn drop(&mut self) {
        self.0.store(false, Ordering::Release);
    }
}

impl Desk {
    pub(super) fn new(
        (place, tally): (Place, Arc<Tally>),
        family: &str,
        keyboards: &[String],
        synths: &[String],
    ) -> Desk {
        Desk {
            place,
            tally,
            family: family.to_string(),
            keyboards: keyboards.iter().map(|name| short(name)).collect(),
            synths: synth_names(keyboards, synths),
            names: Mutex::default(),
            asked: Arc::default(),
        }
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

    fn port(&self, client: &Client, full_name: &str, sends: bool) -> Port {
        let (device, name) = full_name.split_once(':').unwrap_or(("", full_name));
        let port = client.port_by_name(full_name);
        let mut aliases = port.and_then(|p| p.aliases().ok()).unwrap_or_default();
        aliases.push(full_name.to_string());
        Port {
            address: self.address(full_name),
            device: device.to_string(),
            name: name.to_string(),
            aliases,
            socket: None,
            sends,
            hears: !sends,
            ours: device == client.name() || is_of(device, &self.family),
        }
    }

    fn address(&self, name: &str) -> Address {
        let mut names = self.names.lock().unwrap_or_else(PoisonError::into_inner);
        let place = names.iter().position(|known| known == name);
        let place = place.unwrap_or_else(|| {
            names.push(name.to_string());
            names.len() - 1
        });
        Address {
            client: 0,
            port: place as i32,
        }
    }

    /// Lets the server connect two ports or take them apart, unless they are as wanted already: that is known without
    /// asking it, and it may stand still.
    fn change(
        &self,
        from: Address,
        to: Address,
        joined: bool,
        ask: fn(&Client, &str, &str) -> Result<(), Broken>,
    ) -> Result<(), Broken> {
        // Without a server there is nothing to connect, and nothing to complain of but the server.
        let Some(active) = lock(&self.place).clone() else {
            return Ok(());
        };
        let client = active.as_client();
        let names = self.full_name(client, from).zip(self.full_name(client, to));
        let Some((from, to)) = names else {
            return Ok(());
        };
        let port = client.port_by_name(&from);
        if port.and_then(|port| port.is_connected_to(&to).ok()) == Some(joined) {
            return Ok(());
        }
        let no_answer = || Broken {
            wrong: "the JACK server does not answer".to_string(),
            right: "it is asked again; if it does not go on, start it anew".to_string(),
        };
        // One that is kept is enough.
        if self.tally.server() == Server::StandsStill || self.asked.swap(true, Ordering::AcqRel) {
            return Err(no_answer());
        }
        let asked = Asked(self.asked.clone());
        let answer = asking::ask("patcher", ANSWER, move || {
            let _asked = asked;
            ask(active.as_client(), &from, &to)
        });
        answer.unwrap_or_else(|| Err(no_answer()))
    }

    fn full_name(&self, client: &Client, address: Address) -> Option<String> {
        let place = address.port as usize;
        let ours = |names: &[String]| Some(format!("{}:{}", client.name(), names.get(place)?));
        match address.client {
            OUR_KEYBOARDS => ours(&self.keyboards),
            OUR_SYNTHS => ours(&self.synths),
            _ => {
                let names = self.names.lock().unwrap_or_else(PoisonError::into_inner);
                names.get(place).cloned()
            }
        }
    }
}

impl Patchbay for Desk {
    /// In the order of the server; none while there is no server.
    fn ports(&self) -> Vec<Port> {
        let place = lock(&self.place);
        let Some(client) = place.as_ref().map(|active| active.as_client()) else {
            return Vec::new();
        };
        let names = |flags| client.ports(None, Some(MIDI), flags).into_iter();
        let senders = names(PortFlags::IS_OUTPUT).map(|name| self.port(client, &name, true));
        let hearers = names(PortFlags::IS_INPUT).map(|name| self.port(client, &name, false));
        senders.chain(hearers).collect()
    }

    fn shown(&self, address: Address) -> String {
        let place = lock(&self.place);
        let client = place.as_ref().map(|active| active.as_client());
        let name = client.and_then(|client| self.full_name(client, address));
        name.unwrap_or_else(|| "a port of the server that has gone".to_string())
    }

    fn connect(&self, from: Address, to: Address) -> Result<(), Broken> {
        self.change(from, to, true, |client, from, to| {
            match client.connect_ports_by_name(from, to) {
                Ok(()) | Err(Error::PortAlreadyConnected(..)) => Ok(()),
                Err(_) => Err(Broken {
                    wrong: "JACK refused".to_string(),
                    right: "look with jack_lsp -c whether both are there".to_string(),
                }),
            }
        })
    }

    fn disconnect(&self, from: Address, to: Address) -> Result<(), Broken> {
        self.change(from, to, false, |client, from, to| {
            // Refused only where the two are not connected, which is as good.
            let _ = client.disconnect_ports_by_name(from, to);
            Ok(())
        })
    }
}

/// `trued`, or a second one that the server has called `trued-01`.
fn is_of(device: &str, family: &str) -> bool {
    let rest = device.strip_prefix(family);
    rest.is_some_and(|rest| {
        let number = rest.strip_prefix('-');
        rest.is_empty()
            || number.is_some_and(|n| !n.is_empty() && n.bytes().all(|b| b.is_ascii_digit()))
    })
}

/// What a port is called after a name of the stage file.
pub(super) fn short(name: &str) -> String {
    name.replace('\0', " ")
}

/// The synths' ports; all ports of a client need names of their own.
pub(super) fn synth_names(keyboards: &[String], synths: &[String]) -> Vec<String> {
    let named = |name: &String| {
        let name = short(name);
        if keyboards.iter().any(|keyboard| short(keyboard) == name) {
            format!("{name} out")
        } else {
            name
        }
    };
    synths.iter().map(named).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn others_of_our_name_are_ours() {
        for device in ["trued", "trued-01", "trued-12"] {
            assert!(is_of(device, "trued"), "{device}");
        }
        for device in ["true", "trued-", "trued-x1", "trued keys", "a trued"] {
            assert!(!is_of(device, "trued"), "{device}");
        }
    }

    #[test]
    fn a_synth_called_like_a_keyboard_is_told_apart() {
        let names =
            |names: &[&str]| -> Vec<String> { names.iter().map(|name| name.to_string()).collect() };
        let synths = synth_names(&names(&["keys", "stage"]), &names(&["stage", "organ"]));
        assert_eq!(synths, ["stage out", "organ"]);
    }
}
