//! Which ports an evening is played on: opens the backend that was asked for, or the one that is there.

use super::desk::Patch;
use super::rig::RigWanted;
use super::score::{Player, Slot};
use crate::ports::alsa::{Alsa, desk::Desk as Sequencer};
use crate::ports::clock::Clock;
use crate::ports::names::{Choice, Wanted};
use crate::ports::system::{self, Bell};
use crate::ports::{Backend, Broken, Tally};
use std::sync::Arc;
use tracing::info;

/// What carries the MIDI.
pub enum Ports {
    Alsa(Alsa),
}

impl Ports {
    /// # Errors
    /// They cannot be had, or there is no room for us.
    pub fn open(
        rig: &RigWanted,
        client_name: &str,
        clock: Clock,
    ) -> Result<(Ports, Patch), Broken> {
        let names = |wanted: &[Wanted]| -> Vec<String> {
            wanted.iter().map(|device| device.name.clone()).collect()
        };
        let (keyboards, synths) = (names(&rig.keyboards), names(&rig.synths));
        let mut alsa = Alsa::open(client_name, &keyboards, &synths)?;
        alsa.keep_time(clock);
        let mut sequencer = Sequencer::open(client_name)?;
        sequencer.add_ours(alsa.client());
        let patch = Patch {
            patchbay: Box::new(sequencer),
            choice: Choice::default(),
            keyboards: (0..keyboards.len())
                .map(|n| alsa.keyboard_address(n))
                .collect(),
            synths: (0..synths.len()).map(|n| alsa.synth_address(n)).collect(),
            said: Vec::new(),
            refused: false,
        };
        Ok((Ports::Alsa(alsa), patch))
    }

    /// The score's time.
    pub fn clock(&self) -> Clock {
        match self {
            Ports::Alsa(alsa) => alsa.clock(),
        }
    }

    /// Ends a wait early, so that the desk's commands are looked at.
    pub fn bell(&self) -> Bell {
        match self {
            Ports::Alsa(alsa) => alsa.bell(),
        }
    }

    pub fn tally(&self) -> Arc<Tally> {
        match self {
            Ports::Alsa(alsa) => alsa.tally(),
        }
    }

    /// Lets the calling thread, which is to play, run before all ordinary ones. Says whether it does.
    pub fn hurry(&self) -> bool {
        let hurried = system::hurry();
        if let Err(error) = &hurried {
            info!("no real-time priority ({error}): notes may be late on a busy machine");
        }
        hurried.is_ok()
    }

    /// Plays the score until it leaves. The calling thread becomes the score thread where the backend has none.
    ///
    /// # Errors
    /// The ports are gone for good.
    pub fn play(&mut self, slot: &Arc<Slot>) -> Result<(), Broken> {
        match self {
            Ports::Alsa(alsa) => alsa.run(&mut Player::new(slot.clone())),
        }
    }
}
