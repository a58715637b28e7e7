//! What those who keep records are told of notes: `retune`, `rehearse` and the tests. On stage nobody keeps any.

use super::Engine;
use super::plan::SynthId;
use super::traffic::Onset;
use super::voices::Voice;
use crate::pitch::word::Bend;
use crate::pitch::{Interval, Pitch};

impl Engine {
    /// From now on `Output::Onset` and `Output::Moved` are told too.
    pub fn keep_records(&mut self) {
        self.out.recorded = true;
    }

    /// A voice starts, so far from its number.
    pub(super) fn record_onset(&mut self, voice: &Voice, offset: Interval, word: Bend) {
        if self.out.recorded {
            let onset = self.record(voice, offset, word);
            self.out.onset(onset);
        }
    }

    /// All that a channel sounds has been moved.
    pub(super) fn record_moved(&mut self, id: SynthId, number: u8, offset: Interval, word: Bend) {
        if !self.out.recorded {
            return;
        }
        for index in 0..self.voices.len() {
            let voice = self.voices.iter().nth(index).copied();
            if let Some(voice) = voice.filter(|v| v.synth == id && v.channel == number) {
                let moved = self.record(&voice, offset, word);
                self.out.moved(moved);
            }
        }
    }

    fn record(&self, voice: &Voice, offset: Interval, word: Bend) -> Onset {
        let equal = Pitch::of_key(voice.number);
        let range = self.synths[voice.synth.index()].rig.bend_range;
        let harmony = |harmony: u8| self.harmonies[harmony as usize].standing();
        Onset {
            part: voice.part,
            keyboard: self.plays_as(voice.keyboard),
            key: voice.key,
            velocity: voice.velocity,
            synth: voice.synth,
            channel: voice.channel,
            number: voice.number,
            target: equal + offset,
            sent: equal + word.decode(range),
            standing: voice.followed.map(|followed| harmony(followed.harmony)),
        }
    }
}
