//! Ports as midir knows them, and opening them.

use crate::ports::Broken;
use midir::{MidiIO, MidiInput, MidiInputConnection, MidiOutput, MidiOutputConnection};

/// Between a look and a connection.
const GONE: &str = "it has gone";

/// A port as midir knows it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Known {
    pub id: String,
    pub name: String,
}

/// All that is there; midir's ports say what they are called each by itself.
pub fn look<M: MidiIO>(all: &M, id: impl Fn(&M::Port) -> String) -> Vec<Known> {
    let ports = all.ports();
    let known = ports.iter().filter_map(|port| {
        Some(Known {
            id: id(port),
            name: all.port_name(port).ok()?, // gone again already, otherwise
        })
    });
    known.collect()
}

/// An output to a port, or to whoever will come.
pub fn open_output(name: &str, known: Option<&Known>) -> Result<MidiOutputConnection, Broken> {
    let output = MidiOutput::new(name).map_err(broken)?;
    match known {
        Some(known) => {
            let port = output.find_port_by_id(&known.id);
            let port = port.ok_or_else(|| broken(GONE))?;
            output.connect(&port, name).map_err(broken)
        }
        None => own_output(output, name),
    }
}

/// An input from a port, or from whoever will come.
pub fn open_input(
    input: MidiInput,
    known: Option<&Known>,
    name: &str,
    callback: impl FnMut(u64, &[u8], &mut ()) + Send + 'static,
) -> Result<MidiInputConnection<()>, Broken> {
    match known {
        Some(known) => {
            let port = input.find_port_by_id(&known.id);
            let port = port.ok_or_else(|| broken(GONE))?;
            input.connect(&port, name, callback, ()).map_err(broken)
        }
        None => own_input(input, name, callback),
    }
}

#[cfg(unix)]
fn own_output(output: MidiOutput, name: &str) -> Result<MidiOutputConnection, Broken> {
    use midir::os::unix::VirtualOutput;
    output.create_virtual(name).map_err(broken)
}

#[cfg(unix)]
fn own_input(
    input: MidiInput,
    name: &str,
    callback: impl FnMut(u64, &[u8], &mut ()) + Send + 'static,
) -> Result<MidiInputConnection<()>, Broken> {
    use midir::os::unix::VirtualInput;
    input.create_virtual(name, callback, ()).map_err(broken)
}

#[cfg(not(unix))]
fn own_output(_: MidiOutput, _: &str) -> Result<MidiOutputConnection, Broken> {
    Err(no_ports_of_ours())
}

#[cfg(not(unix))]
fn own_input(
    _: MidiInput,
    _: &str,
    _: impl FnMut(u64, &[u8], &mut ()) + Send + 'static,
) -> Result<MidiInputConnection<()>, Broken> {
    Err(no_ports_of_ours())
}

#[cfg(not(unix))]
fn no_ports_of_ours() -> Broken {
    Broken {
        wrong: "This system has no `port: virtual`".to_string(),
        right: "name a port that is there".to_string(),
    }
}

/// Device and port. On Linux midir puts both in one name, and behind it where the port is.
pub fn split(known: &Known) -> (&str, &str) {
    let name = known.name.strip_suffix(&known.id).unwrap_or(&known.name);
    let name = name.trim_end();
    name.split_once(':').unwrap_or(("", name))
}

pub fn broken(error: impl std::fmt::Display) -> Broken {
    Broken {
        wrong: format!("midir refused ({error})"),
        right: "look with `trued ports` whether it is there".to_string(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn device_and_port(id: &str, name: &str) -> (String, String) {
        let (id, name) = (id.to_string(), name.to_string());
        let known = Known { id, name };
        let (device, port) = split(&known);
        (device.to_string(), port.to_string())
    }

    #[test]
    fn names_with_and_without_a_device() {
        let both = |device: &str, port: &str| (device.to_string(), port.to_string());
        assert_eq!(
            device_and_port("24:0", "Wharf Keys:Wharf Keys MIDI 1 24:0"),
            both("Wharf Keys", "Wharf Keys MIDI 1")
        );
        assert_eq!(
            device_and_port("-1837", "Wharf Keys"),
            both("", "Wharf Keys")
        );
    }
}
