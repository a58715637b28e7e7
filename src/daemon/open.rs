//! Which ports an evening is played on: opens the backend that was asked for, or the one that is there.

use super::desk::Patch;
use super::rig::{Moved, RigWanted};
use super::score::{Player, Slot};
use crate::ports::alsa::{Alsa, desk::Desk as Sequencer};
use crate::ports::clock::Clock;
use crate::ports::jack::Jack;
use crate::ports::midir::Midir;
use crate::ports::names::{Address, Choice, Wanted};
use crate::ports::{Backend, Broken, Ring, Tally, system};
use std::panic::resume_unwind;
use std::sync::Arc;
use std::sync::atomic::Ordering;
use tracing::info;

/// What carries the MIDI.
pub enum Ports {
    Alsa(Alsa),
    Jack(Jack),
    Midir(Midir),
}

/// Our own ports, keyboards' and synths', in the order of the stage file.
pub type OurEnds = (Vec<Address>, Vec<Address>);

/// Which backend is asked for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Asked {
    /// The sequencer if there is one, else a JACK server if one runs.
    Auto,
    Alsa,
    Jack,
    Midir,
}

impl Ports {
    /// # Errors
    /// They cannot be had, or there is no room for us.
    pub fn open(
        asked: Asked,
        rig: &RigWanted,
        client_name: &str,
        clock: Clock,
    ) -> Result<(Ports, Patch), Broken> {
        let names = |wanted: &[Wanted]| -> Vec<String> {
            wanted.iter().map(|device| device.name.clone()).collect()
        };
        let (keyboards, synths) = (&names(&rig.keyboards)[..], &names(&rig.synths)[..]);
        match asked {
            Asked::Alsa => Ports::open_alsa(client_name, keyboards, synths, clock),
            Asked::Jack => Jack::open(client_name, keyboards, synths, clock).map(Ports::with_jack),
            Asked::Midir => Ports::open_midir(rig, client_name, clock),
            Asked::Auto => {
                let no_alsa = match Ports::open_alsa(client_name, keyboards, synths, clock) {
                    Err(broken) => broken,
                    opened => return opened,
                };
                match Jack::open(client_name, keyboards, synths, clock) {
                    Ok(jack) if jack.found_server() => Ok(Ports::with_jack(jack)),
                    Ok(_) => Err(neither(&no_alsa, "start a JACK server")),
                    Err(_) => Err(neither(
                        &no_alsa,
                        "install and start a JACK server: sudo apt-get install jackd2",
                    )),
                }
            }
        }
    }

    fn open_alsa(
        client_name: &str,
        keyboards: &[String],
        synths: &[String],
        clock: Clock,
    ) -> Result<(Ports, Patch), Broken> {
        let mut alsa = Alsa::open(client_name, keyboards, synths)?;
        alsa.keep_time(clock);
        let mut sequencer = Sequencer::open(client_name)?;
        sequencer.add_ours(alsa.client());
        let (keyboards, synths) = our_ends(&alsa, keyboards.len(), synths.len());
        let patch = Patch {
            patchbay: Box::new(sequencer),
            choice: Choice::default(),
            keyboards,
            synths,
            said: Vec::new(),
            again: false,
            refused: Vec::new(),
        };
        Ok((Ports::Alsa(alsa), patch))
    }

    fn with_jack(jack: Jack) -> (Ports, Patch) {
        let desk = jack.desk();
        let (keyboards, synths) = jack.counts();
        let patch = Patch {
            choice: Choice::default(),
            keyboards: (0..keyboards).map(|n| desk.keyboard_address(n)).collect(),
            synths: (0..synths).map(|n| desk.synth_address(n)).collect(),
            patchbay: Box::new(desk),
            again: false,
            refused: Vec::new(),
            said: Vec::new(),
        };
        (Ports::Jack(jack), patch)
    }

    fn open_midir(
        rig: &RigWanted,
        client_name: &str,
        clock: Clock,
    ) -> Result<(Ports, Patch), Broken> {
        let (keyboards, synths) = (&rig.keyboards, &rig.synths);
        let (midir, desk) = Midir::open(client_name, keyboards, synths, clock)?;
        let patch = Patch {
            choice: Choice::default(),
            keyboards: (0..keyboards.len())
                .map(|n| desk.keyboard_address(n))
                .collect(),
            synths: (0..synths.len()).map(|n| desk.synth_address(n)).collect(),
            patchbay: Box::new(desk),
            said: Vec::new(),
            again: false,
            refused: Vec::new(),
        };
        Ok((Ports::Midir(midir), patch))
    }

    /// Whether devices that stay as they are keep their ports when others come or go.
    pub fn keep(&self) -> bool {
        matches!(self, Ports::Alsa(_))
    }

    /// Takes on another rig, if that is possible without opening everything anew.
    ///
    /// # Errors
    /// There is no room for one more port.
    pub fn rearrange(&mut self, rig: &RigWanted, moved: &Moved) -> Result<Option<OurEnds>, Broken> {
        let Ports::Alsa(alsa) = self else {
            return Ok(None);
        };
        let keyboards = moved.keyboards.renewed(&rig.keyboards);
        let synths = moved.synths.renewed(&rig.synths);
        alsa.rearrange(&keyboards, &synths)?;
        Ok(Some(our_ends(alsa, keyboards.len(), synths.len())))
    }

    /// What it is called in `--backend` and in status.
    pub fn name(&self) -> &'static str {
        match self {
            Ports::Alsa(_) => "alsa",
            Ports::Jack(_) => "jack",
            Ports::Midir(_) => "midir",
        }
    }

    /// The score's time.
    pub fn clock(&self) -> Clock {
        match self {
            Ports::Alsa(alsa) => alsa.clock(),
            Ports::Jack(jack) => jack.clock(),
            Ports::Midir(midir) => midir.clock(),
        }
    }

    /// Ends a wait early, so that the desk's commands are looked at.
    pub fn bell(&self) -> Box<dyn Ring> {
        match self {
            Ports::Alsa(alsa) => Box::new(alsa.bell()),
            Ports::Jack(jack) => Box::new(jack.bell()),
            Ports::Midir(midir) => Box::new(midir.waker()),
        }
    }

    pub fn tally(&self) -> Arc<Tally> {
        match self {
            Ports::Alsa(alsa) => alsa.tally(),
            Ports::Jack(jack) => jack.tally(),
            Ports::Midir(midir) => midir.tally(),
        }
    }

    /// Plays the score until it leaves. The calling thread becomes the score thread where the backend has none.
    ///
    /// # Errors
    /// The ports are gone for good.
    pub fn play(&mut self, slot: &Arc<Slot>) -> Result<(), Broken> {
        match self {
            Ports::Alsa(alsa) => {
                hurry(&alsa.tally());
                alsa.run(&mut Player::new(slot.clone()))
            }
            // The server decides for the thread that it gives us.
            Ports::Jack(jack) => jack.run(&|| Box::new(Player::new(slot.clone()))),
            Ports::Midir(midir) => play_beside(midir, slot),
        }
    }
}

/// Lets the calling thread, which is to play, run before all ordinary ones.
fn hurry(tally: &Tally) {
    let hurried = system::hurry();
    if let Err(error) = &hurried {
        info!("no real-time priority ({error}): notes may be late on a busy machine");
    }
    tally.real_time.store(hurried.is_ok(), Ordering::Relaxed);
}

fn our_ends(alsa: &Alsa, keyboards: usize, synths: usize) -> OurEnds {
    let keyboards = (0..keyboards).map(|n| alsa.keyboard_address(n));
    let synths = (0..synths).map(|n| alsa.synth_address(n));
    (keyboards.collect(), synths.collect())
}

/// On a thread of its own that asks for priority like those of the callbacks, whatever a unit file gave to this one: a
/// score that ran before a callback could wait for it and keep it from running.
fn play_beside(midir: &mut Midir, slot: &Arc<Slot>) -> Result<(), Broken> {
    std::thread::scope(|scope| {
        let score = scope.spawn(|| {
            hurry(&midir.tally());
            midir.run(&mut Player::new(slot.clone()))
        });
        score.join().unwrap_or_else(|panic| resume_unwind(panic))
    })
}

fn neither(no_alsa: &Broken, jack: &str) -> Broken {
    Broken {
        wrong: format!("{}, and no JACK server runs", no_alsa.wrong),
        right: format!("{}; or {jack}", no_alsa.right),
    }
}
