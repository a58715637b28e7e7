//! The sound of the listening synth: a small SoundFont 2.01 built in memory.
//!
//! A soft organ, eight harmonics strong, for beats are heard between harmonics: in a major third it is the fifth of the
//! lower note against the fourth of the upper. It holds still: no vibrato from wheel or pressure, no filter, no chorus,
//! and a pitch bend that reaches exactly as far as its range says.

use std::f64::consts::TAU;

/// Strengths of the harmonics, the fundamental first. The fourth and fifth are near each other, so that thirds beat deep.
const HARMONICS: [f64; 8] = [1.0, 0.5, 0.45, 0.4, 0.36, 0.2, 0.14, 0.1];
/// Highest key and how many harmonics it has; above a key's own the sampling rate would fold them back as false tones.
const ZONES: [(u8, usize); 4] = [(96, 8), (108, 4), (120, 2), (127, 1)];
/// Samples in one turn of the wave: so many that drawing straight lines between them is heard by nobody (-84 dB).
const PERIOD: usize = 1024;
/// At this rate one turn is 440 Hz, key 69, with nothing left over.
const RATE_HZ: u32 = 440 * PERIOD as u32;
/// Left free at each end of a sample, as SoundFont 2.01, 7.10 asks.
const QUIET: usize = 46;

// Generators, modulator sources and transforms by number (SoundFont 2.01, 8.1.2 and 8.2).
const VIBRATO_TO_PITCH: u16 = 6;
const ATTACK: u16 = 34;
const RELEASE: u16 = 38;
const INSTRUMENT: u16 = 41;
const KEY_RANGE: u16 = 43;
const FINE_TUNE: u16 = 52;
const SAMPLE: u16 = 53;
const LOOPED: u16 = 54;
const BIPOLAR: u16 = 1 << 9;
const BEND: u16 = 14 | BIPOLAR;
const BEND_RANGE: u16 = 16;
const PRESSURE: u16 = 13;
const MODULATION_WHEEL: u16 = 1 | 1 << 7;

/// The whole font, as a file would hold it: the organ as preset 0 of bank 0 and of bank 128.
pub fn organ() -> Vec<u8> {
    let info = [
        chunk(b"ifil", &words(&[2, 1])),
        chunk(b"isng", b"EMU8000\0"),
        chunk(b"INAM", b"organ\0"),
    ]
    .concat();
    let (samples, headers) = waves();
    let body = [
        &b"sfbk"[..],
        &chunk(b"LIST", &[&b"INFO"[..], &info].concat()),
        &chunk(b"LIST", &[&b"sdta"[..], &chunk(b"smpl", &samples)].concat()),
        &chunk(b"LIST", &[&b"pdta"[..], &presets(&headers)].concat()),
    ]
    .concat();
    chunk(b"RIFF", &body)
}

/// All waves one after another, and a header for each.
fn waves() -> (Vec<u8>, Vec<u8>) {
    let (mut samples, mut headers) = (Vec::new(), Vec::new());
    let peak = (0..PERIOD).fold(0f64, |peak, at| peak.max(wave(at, HARMONICS.len()).abs()));
    let mut start = 0;
    for (highest, harmonics) in ZONES {
        // A turn to begin with, a turn to go round in, and a turn so that the join has neighbours.
        for at in 0..3 * PERIOD {
            let value = (wave(at, harmonics) / peak * 30_000.0).round() as i16;
            samples.extend(value.to_le_bytes());
        }
        samples.extend([0; 2 * QUIET]);
        let places = [
            start,
            start + 3 * PERIOD,
            start + PERIOD,
            start + 2 * PERIOD,
        ];
        headers.extend(name(&format!("to {highest}")));
        headers.extend(places.iter().flat_map(|at| (*at as u32).to_le_bytes()));
        headers.extend(RATE_HZ.to_le_bytes());
        headers.extend([69, 0]);
        headers.extend(words(&[0, 1])); // no partner, mono
        start += 3 * PERIOD + QUIET;
    }
    headers.extend(name("EOS"));
    headers.extend([0; 26]);
    (samples, headers)
}

fn wave(at: usize, harmonics: usize) -> f64 {
    let turn = at as f64 / PERIOD as f64;
    let each = HARMONICS[..harmonics].iter().enumerate();
    each.map(|(n, strength)| strength * (TAU * turn * (n + 1) as f64).sin())
        .sum()
}

/// Two presets that play one instrument of four zones, and a zone before them for what they have in common.
fn presets(headers: &[u8]) -> Vec<u8> {
    let preset = |title: &str, bank: u16, bag: u16| {
        [name(title), words(&[0, bank, bag]), vec![0; 12]].concat()
    };
    let common = [ATTACK, timecents(0.03), RELEASE, timecents(0.5), LOOPED, 1];
    let mut generators = words(&common);
    let mut bags = words(&[0, 0]);
    let mut lowest = 0;
    for (number, (highest, _)) in ZONES.into_iter().enumerate() {
        bags.extend(words(&[3 + 2 * number as u16, MODULATORS]));
        let range = lowest as u16 | (highest as u16) << 8;
        generators.extend(words(&[KEY_RANGE, range, SAMPLE, number as u16]));
        lowest = highest + 1;
    }
    bags.extend(words(&[3 + 2 * ZONES.len() as u16, MODULATORS]));
    generators.extend(words(&[0, 0]));
    [
        chunk(
            b"phdr",
            &[
                preset("Soft organ", 0, 0),
                preset("Soft organ on 10", 128, 1),
                preset("EOP", 0, 2),
            ]
            .concat(),
        ),
        chunk(b"pbag", &words(&[0, 0, 1, 0, 2, 0])),
        chunk(b"pmod", &[0; 10]),
        chunk(b"pgen", &words(&[INSTRUMENT, 0, INSTRUMENT, 0, 0, 0])),
        chunk(
            b"inst",
            &[
                name("Soft organ"),
                words(&[0]),
                name("EOI"),
                words(&[1 + ZONES.len() as u16]),
            ]
            .concat(),
        ),
        chunk(b"ibag", &bags),
        chunk(b"imod", &modulators()),
        chunk(b"igen", &generators),
        chunk(b"shdr", headers),
    ]
    .concat()
}

/// How many [`modulators`] there are.
const MODULATORS: u16 = 3;

/// The bend at its whole size (some synths build in 127/128 of it), and nothing from wheel and pressure.
fn modulators() -> Vec<u8> {
    let entry = |source, target, amount, by| words(&[source, target, amount, by, 0]);
    [
        entry(BEND, FINE_TUNE, 12_800, BEND_RANGE),
        entry(MODULATION_WHEEL, VIBRATO_TO_PITCH, 0, 0),
        entry(PRESSURE, VIBRATO_TO_PITCH, 0, 0),
        vec![0; 10],
    ]
    .concat()
}

/// Seconds as SoundFonts count them: 1200 to a doubling.
fn timecents(seconds: f64) -> u16 {
    (1200.0 * seconds.log2()).round() as i16 as u16
}

fn words(words: &[u16]) -> Vec<u8> {
    words.iter().flat_map(|word| word.to_le_bytes()).collect()
}

fn name(text: &str) -> Vec<u8> {
    let mut bytes = text.as_bytes().to_vec();
    bytes.resize(20, 0);
    bytes
}

fn chunk(tag: &[u8; 4], data: &[u8]) -> Vec<u8> {
    let mut bytes = tag.to_vec();
    bytes.extend((data.len() as u32).to_le_bytes());
    bytes.extend(data);
    bytes.resize(bytes.len() + data.len() % 2, 0);
    bytes
}
