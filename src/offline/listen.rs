//! A recording as sound: the listening synth, and the WAV file.

use super::font;
use super::receiver::Receiver;
use super::retune::{Recording, Sent};
use crate::engine::plan::ChannelSet;
use crate::midi::Splitter;
use crate::time::{Span, Time};
use std::io::{Seek, Write};

pub const RATE_HZ: u32 = 48_000;
/// After the end of the score, for the last notes to die away.
const AFTERGLOW: Span = Span::from_millis(1_000);
/// The loudest sample: -18 dB under full scale.
const PEAK: f32 = 0.125_892_54;
/// The first sound comes in over this long, so that a volume left too high is noticed in time.
pub const FADE_IN: Span = Span::from_millis(2_000);

/// Two sides, equally long.
pub struct Stereo {
    pub left: Vec<f32>,
    pub right: Vec<f32>,
}

/// What all synths of a recording sound like together, from the bytes they were sent and nothing else.
pub fn render(recording: &Recording) -> Stereo {
    let samples = sample_at(recording.end + AFTERGLOW);
    let mut sound = Stereo {
        left: vec![0.0; samples],
        right: vec![0.0; samples],
    };
    for (place, synth) in recording.synths.iter().enumerate() {
        let sent = recording.sent.iter();
        render_synth(
            sent.filter(|sent| sent.synth.index() == place),
            synth.drums,
            &mut sound,
        );
    }
    set_level(&mut sound);
    sound
}

fn render_synth<'a>(sent: impl Iterator<Item = &'a Sent>, drums: ChannelSet, sound: &mut Stereo) {
    let mut receiver = Receiver::new(&font::organ(), RATE_HZ, drums).expect("our own font is one");
    let mut splitter = Splitter::new();
    let mut done = 0;
    for sent in sent {
        let now = sample_at(sent.time).min(sound.left.len());
        receiver.render(&mut sound.left[done..now], &mut sound.right[done..now]);
        done = now;
        for byte in &sent.bytes {
            if let Some(message) = splitter.push(*byte) {
                receiver.take(message);
            }
        }
    }
    receiver.render(&mut sound.left[done..], &mut sound.right[done..]);
}

fn sample_at(time: Time) -> usize {
    (time.nanos() as u128 * RATE_HZ as u128 / 1_000_000_000) as usize
}

/// Fades in from the first sound on, then brings the loudest sample to `PEAK`.
fn set_level(sound: &mut Stereo) {
    let loud = |(l, r): (&f32, &f32)| l.abs().max(r.abs());
    let both = sound.left.iter().zip(&sound.right);
    let Some(first) = both.map(loud).position(|level| level > 0.0) else {
        return;
    };
    let fade = sample_at(Time::START + FADE_IN);
    for side in [&mut sound.left, &mut sound.right] {
        for (n, sample) in side[first..].iter_mut().take(fade).enumerate() {
            *sample *= n as f32 / fade as f32;
        }
    }
    let peak = sound
        .left
        .iter()
        .zip(&sound.right)
        .map(loud)
        .fold(0f32, f32::max);
    for sample in sound.left.iter_mut().chain(&mut sound.right) {
        *sample *= PEAK / peak;
    }
}

/// Writes 16-bit stereo.
///
/// # Errors
/// What the writer says.
pub fn write_wav<W: Write + Seek>(sound: &Stereo, writer: W) -> Result<(), hound::Error> {
    let spec = hound::WavSpec {
        channels: 2,
        sample_rate: RATE_HZ,
        bits_per_sample: 16,
        sample_format: hound::SampleFormat::Int,
    };
    let mut file = hound::WavWriter::new(writer, spec)?;
    for (left, right) in sound.left.iter().zip(&sound.right) {
        for sample in [left, right] {
            file.write_sample((sample * 32767.0).round() as i16)?;
        }
    }
    file.finalize()
}

#[cfg(test)]
mod tests;
