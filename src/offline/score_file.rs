//! MIDI files: read into one list in order of time, written with one track of channel messages a synth.

use super::score_clock::Clock;
use crate::time::Time;
use midly::num::{u4, u15, u24, u28};
use midly::{Format, Header, MetaMessage, Timing, TrackEvent, TrackEventKind};

/// A score as read. Text and system exclusive data stay in the file's own bytes.
#[derive(Clone, Debug, PartialEq)]
pub struct Score<'a> {
    timing: Timing,
    pub clock: Clock,
    /// What a keyboard would have sent, in order of tick, then track.
    pub events: Vec<Event>,
    /// Tempo, metre, text and the like, in order of tick, then track.
    meta: Vec<(u64, MetaMessage<'a>)>,
    /// Where the last track ends.
    pub end_tick: u64,
}

/// Something a keyboard would have sent.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Event {
    pub tick: u64,
    /// From 0, in order of the file.
    pub track: usize,
    /// Channel messages whole, with their status; system exclusive data in the portions of the file.
    pub bytes: Vec<u8>,
}

/// What is to be written to one synth's track.
pub struct Track<'a> {
    pub name: &'a str,
    /// Whole messages or bundles of them, each with its status byte, in order of tick.
    pub messages: Vec<(u64, &'a [u8])>,
}

/// Ticks beyond this cannot be written as one delta time.
const TICKS_MAX: u64 = 0x0FFF_FFFF;

impl<'a> Score<'a> {
    /// Reads a MIDI file of format 0 or 1.
    ///
    /// # Errors
    /// What is wrong and what would be right, for people.
    pub fn read(file: &'a [u8]) -> Result<Score<'a>, String> {
        // midly turns this frame rate, which none has, about its sign and overflows.
        if file
            .windows(13)
            .any(|at| at.starts_with(b"MThd") && at[12] == 0x80)
        {
            return Err(NO_DIVISION.into());
        }
        let (header, tracks) = midly::parse(file).map_err(|_| {
            "this is no MIDI file; give a standard MIDI file of format 0 or 1".to_string()
        })?;
        if header.format == Format::Sequential {
            return Err(
                "this MIDI file is of format 2, a row of patterns with no common time; \
                 save it as format 0 or 1"
                    .into(),
            );
        }
        check_division(header.timing)?;
        let declared = tracks.size_hint().0;
        let mut read = Contents::default();
        let mut count = 0;
        for (number, track) in tracks.take(declared).enumerate() {
            read.take_track(number, track.map_err(|_| damaged(number))?)?;
            count = number + 1;
        }
        if count < declared.max(1) {
            return Err(format!(
                "this MIDI file should have {} tracks and holds {count}; export it again from the program that made it",
                declared.max(1)
            ));
        }
        // Stable, so tracks keep their order within a tick and messages theirs within a track.
        read.events.sort_by_key(|event| event.tick);
        read.meta.sort_by_key(|(tick, _)| *tick);
        Ok(Score {
            timing: header.timing,
            clock: make_clock(header.timing, &read.meta)?,
            events: read.events,
            meta: read.meta,
            end_tick: read.end_tick,
        })
    }

    pub fn time(&self, tick: u64) -> Time {
        self.clock.time(tick)
    }

    /// A MIDI file of format 1 with this score's division, tempi and texts, and these tracks instead of its notes.
    ///
    /// # Errors
    /// If something is too long for a MIDI file.
    pub fn write(&self, tracks: &[Track<'_>]) -> Result<Vec<u8>, String> {
        let mut written = vec![self.conductor()];
        for track in tracks {
            let mut events = vec![(
                0,
                TrackEventKind::Meta(MetaMessage::TrackName(track.name.as_bytes())),
            )];
            for (tick, bundle) in &track.messages {
                events.extend(split_bundle(bundle).map(|kind| (*tick, kind)));
            }
            written.push(with_deltas(events, self.end_tick));
        }
        let header = Header::new(Format::Parallel, self.timing);
        let mut file = Vec::new();
        midly::write_std(&header, written.iter(), &mut file)
            .map_err(|error| format!("this does not fit into a MIDI file: {error}"))?;
        Ok(file)
    }

    fn conductor(&self) -> Vec<TrackEvent<'_>> {
        let meta = self
            .meta
            .iter()
            .map(|(tick, meta)| (*tick, TrackEventKind::Meta(*meta)))
            .collect();
        with_deltas(meta, self.end_tick)
    }
}

/// A new MIDI file of format 0 at 120 quarters a minute, for a score made here.
///
/// # Errors
/// If something is too long for a MIDI file.
pub fn write_new(
    ticks_per_quarter: u16,
    title: &str,
    events: &[(u64, [u8; 3], usize)],
    end_tick: u64,
) -> Result<Vec<u8>, String> {
    let mut all = vec![
        (
            0,
            TrackEventKind::Meta(MetaMessage::TrackName(title.as_bytes())),
        ),
        (
            0,
            TrackEventKind::Meta(MetaMessage::Tempo(u24::from(500_000))),
        ),
    ];
    for (tick, bytes, length) in events {
        all.extend(split_bundle(&bytes[..*length]).map(|kind| (*tick, kind)));
    }
    let header = Header::new(
        Format::SingleTrack,
        Timing::Metrical(u15::from(ticks_per_quarter)),
    );
    let track = with_deltas(all, end_tick);
    let mut file = Vec::new();
    midly::write_std(&header, std::iter::once(&track), &mut file)
        .map_err(|error| format!("this does not fit into a MIDI file: {error}"))?;
    Ok(file)
}

/// What tracks hold, as they are read one after another.
#[derive(Default)]
struct Contents<'a> {
    events: Vec<Event>,
    meta: Vec<(u64, MetaMessage<'a>)>,
    end_tick: u64,
}

impl<'a> Contents<'a> {
    fn take_track(&mut self, number: usize, track: midly::EventIter<'a>) -> Result<(), String> {
        let mut tick = 0u64;
        let mut ended = false;
        for event in track {
            let event = event.map_err(|_| damaged(number))?;
            tick += event.delta.as_int() as u64;
            if tick > TICKS_MAX {
                return Err(format!(
                    "track {} is longer than a MIDI file can say ({TICKS_MAX} ticks); cut it in two",
                    number + 1
                ));
            }
            let bytes = match event.kind {
                TrackEventKind::Midi { channel, message } => channel_bytes(channel, message),
                TrackEventKind::SysEx(data) => [&[0xF0], data].concat(),
                TrackEventKind::Escape(data) => data.to_vec(),
                TrackEventKind::Meta(MetaMessage::EndOfTrack) => {
                    ended = true;
                    break;
                }
                TrackEventKind::Meta(meta) => {
                    if is_kept(&meta, number) {
                        self.meta.push((tick, meta));
                    }
                    continue;
                }
            };
            self.events.push(Event {
                tick,
                track: number,
                bytes,
            });
        }
        if !ended {
            return Err(damaged(number));
        }
        self.end_tick = self.end_tick.max(tick);
        Ok(())
    }
}

fn make_clock(timing: Timing, meta: &[(u64, MetaMessage<'_>)]) -> Result<Clock, String> {
    let mut tempi = Vec::new();
    for (tick, meta) in meta {
        match meta {
            MetaMessage::Tempo(us) if us.as_int() == 0 => {
                return Err(format!(
                    "the tempo at tick {tick} is 0, infinitely fast; give a tempo a person could play"
                ));
            }
            MetaMessage::Tempo(us) => tempi.push((*tick, us.as_int())),
            _ => {}
        }
    }
    Ok(match timing {
        Timing::Metrical(ticks) => Clock::metrical(ticks.as_int(), &tempi),
        Timing::Timecode(fps, ticks) => Clock::frames(fps.as_int(), ticks),
    })
}

const NO_DIVISION: &str = "this MIDI file does not say how it divides time into ticks; \
                           export it again with 480 ticks a quarter";

fn damaged(track: usize) -> String {
    format!(
        "track {} of this MIDI file is damaged or breaks off; export the file again from the program that made it",
        track + 1
    )
}

fn check_division(timing: Timing) -> Result<(), String> {
    let none = match timing {
        Timing::Metrical(ticks) => ticks.as_int() == 0,
        Timing::Timecode(_, ticks) => ticks == 0,
    };
    if none {
        return Err(NO_DIVISION.into());
    }
    Ok(())
}

fn channel_bytes(channel: u4, message: midly::MidiMessage) -> Vec<u8> {
    let mut bytes = Vec::with_capacity(3);
    let live = midly::live::LiveEvent::Midi { channel, message };
    live.write_std(&mut bytes)
        .expect("a vector takes all that is written to it");
    bytes
}

/// Routings speak of channel messages that no longer stand behind them; names, of tracks that are not written again.
fn is_kept(meta: &MetaMessage<'_>, track: usize) -> bool {
    match meta {
        MetaMessage::MidiChannel(_) | MetaMessage::MidiPort(_) | MetaMessage::DeviceName(_) => {
            false
        }
        MetaMessage::TrackNumber(_)
        | MetaMessage::TrackName(_)
        | MetaMessage::InstrumentName(_)
        | MetaMessage::ProgramName(_) => track == 0,
        _ => true,
    }
}

/// The messages of a bundle as a file spells them: system exclusive with its length, what else is not a channel
/// message as an escape.
fn split_bundle(bundle: &[u8]) -> impl Iterator<Item = TrackEventKind<'_>> {
    let mut rest = bundle;
    std::iter::from_fn(move || {
        let status = *rest.first()?;
        let more = rest[1..].iter().position(|byte| *byte >= 0x80);
        let length = match status {
            0xF0 => rest.len(), // goes alone
            _ => more.map_or(rest.len(), |at| at + 1),
        };
        let (message, after) = rest.split_at(length);
        rest = after;
        Some(match midly::live::LiveEvent::parse(message) {
            Ok(midly::live::LiveEvent::Midi { channel, message }) => {
                TrackEventKind::Midi { channel, message }
            }
            _ if status == 0xF0 => TrackEventKind::SysEx(&message[1..]),
            _ => TrackEventKind::Escape(message),
        })
    })
}

fn with_deltas(events: Vec<(u64, TrackEventKind<'_>)>, end_tick: u64) -> Vec<TrackEvent<'_>> {
    let end = events
        .last()
        .map_or(end_tick, |(tick, _)| end_tick.max(*tick));
    let mut now = 0;
    events
        .into_iter()
        .chain([(end, TrackEventKind::Meta(MetaMessage::EndOfTrack))])
        .map(|(tick, kind)| {
            let delta = u28::from((tick - now).min(TICKS_MAX) as u32);
            now = tick;
            TrackEvent { delta, kind }
        })
        .collect()
}

#[cfg(test)]
mod tests;
