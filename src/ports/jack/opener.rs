//! From a server's name to a client with our ports that it calls: two questions to it, either of which may take for ever.

use super::asking::Asked;
use super::notices::Notices;
use super::process::Process;
use super::{Active, Ports, Shared, desk};
use crate::ports::hotplug::End;
use crate::ports::system::Bell;
use crate::ports::{Broken, Cycle};
use jack::{Client, ClientOptions, MidiIn, MidiOut};
use std::sync::Arc;
use std::sync::mpsc::RecvTimeoutError;
use std::time::Duration;
use tracing::info;

/// Changes of connections between two cycles.
const CHANGES: usize = 1024;

/// Looks for a server, again and again.
pub struct Opener {
    name: String,
    bell: Bell,
    asked: Option<Asked<Option<Client>>>,
}

impl Opener {
    /// The bell rings when there is an answer.
    pub fn new(name: &str, bell: Bell) -> Opener {
        Opener {
            name: name.replace('\0', " "),
            bell,
            asked: None,
        }
    }

    /// Asks, unless an answer is still waited for. A server is never started.
    pub fn ask(&mut self) {
        if self.asked.is_none() {
            let name = self.name.clone();
            self.asked = Asked::begin("opener", Some(self.bell.clone()), move || {
                let opened = Client::new(&name, ClientOptions::NO_START_SERVER);
                opened.ok().map(|(client, _)| client)
            });
        }
    }

    /// A client, if one has been given within this time.
    pub fn client(&mut self, at_most: Duration) -> Option<Client> {
        let answer = self.asked.as_ref()?.answer(at_most);
        if !matches!(answer, Err(RecvTimeoutError::Timeout)) {
            self.asked = None;
        }
        answer.ok().flatten()
    }
}

/// What our ports are called.
#[derive(Clone)]
pub struct Names {
    pub keyboards: Vec<String>,
    pub synths: Vec<String>,
}

/// Gives a client our ports and lets the server call it.
///
/// # Errors
/// The server has gone meanwhile (`None`), or refuses a port.
pub fn activate(
    client: Client,
    names: &Names,
    cycle: Box<dyn Cycle + Send>,
    shared: Arc<Shared>,
) -> Result<Active, Option<Broken>> {
    let Some((keyboards, synths)) = register(&client, names) else {
        return Err(refused(&client));
    };
    let ends = (0..keyboards.len()).map(End::Keyboard);
    let raw = keyboards.iter().map(|port| port.raw() as usize);
    let mut ports: Vec<(End, usize)> = ends.zip(raw).collect();
    let ends = (0..synths.len()).map(End::Synth);
    ports.extend(ends.zip(synths.iter().map(|port| port.raw() as usize)));

    let (changes_in, changes) = rtrb::RingBuffer::new(CHANGES);
    let notices = Notices::new(ports, changes_in, shared.clone());
    let rate = client.sample_rate();
    let process = Process::new(cycle, (keyboards, synths), rate, changes, shared);
    info!(
        "client {} of a JACK server at {rate} Hz, {} frames a cycle",
        client.name(),
        client.buffer_size()
    );
    client.activate_async(notices, process).map_err(|_| None)
}

/// One port each. A synth that is called like a keyboard is told apart.
fn register(client: &Client, names: &Names) -> Option<Ports> {
    let keyboards = names.keyboards.iter();
    let keyboards: Result<_, _> = keyboards
        .map(|name| client.register_port(&desk::short(name), MidiIn::default()))
        .collect();
    let synths = desk::synth_names(&names.keyboards, &names.synths).into_iter();
    let synths: Result<_, _> = synths
        .map(|name| client.register_port(&name, MidiOut::default()))
        .collect();
    Some((keyboards.ok()?, synths.ok()?))
}

/// A server that gives us a client but no ports: dying perhaps, else full.
fn refused(client: &Client) -> Option<Broken> {
    client.register_port("probe", MidiIn::default()).ok()?;
    Some(Broken {
        wrong: "The JACK server refuses a port's name".to_string(),
        right: "give every keyboard and synth a short name of its own".to_string(),
    })
}
