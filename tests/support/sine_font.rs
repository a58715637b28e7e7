//! A one-preset SoundFont that plays a bare sine, so that sounding pitch can be measured.
//!
//! 100 samples at 44,000 Hz are 440 Hz, key 69. The instrument carries its own bend modulator of amount 12800: with its
//! built-in one FluidSynth 2.3.1 bends by 127/128 of what is asked (measured; its modulator sources are divided by 128
//! while the amount stayed 12700).

const SAMPLE_RATE_HZ: u32 = 44_000;
const PERIOD: u32 = 100;
const LEAD: u32 = 4 * PERIOD;
const LOOP: u32 = 40 * PERIOD;

/// The file, ready to write. (SoundFont 2.01: chunk order, records and their terminals.)
pub fn sine_font() -> Vec<u8> {
    let mut info = chunk(b"ifil", &words(&[2, 1]));
    info.extend(chunk(b"isng", b"EMU8000\0"));
    info.extend(chunk(b"INAM", b"sine\0\0"));
    let mut body = b"sfbk".to_vec();
    body.extend(list(b"INFO", &info));
    body.extend(list(b"sdta", &chunk(b"smpl", &samples())));
    body.extend(list(b"pdta", &records()));
    chunk(b"RIFF", &body)
}

fn samples() -> Vec<u8> {
    let sine = |i: u32| (std::f64::consts::TAU * i as f64 / PERIOD as f64).sin() * 20_000.0;
    let mut out: Vec<u8> = (0..LEAD + LOOP + LEAD)
        .flat_map(|i| (sine(i).round() as i16).to_le_bytes())
        .collect();
    out.resize(out.len() + 92, 0); // 46 samples of silence after each (SoundFont 2.01, 6.2)
    out
}

fn records() -> Vec<u8> {
    let preset = |text: &str, bank: u16, bag: u16| {
        let mut record = name(text);
        record.extend(words(&[0, bank, bag, 0, 0, 0, 0, 0, 0]));
        record
    };
    let mut out = chunk(
        b"phdr",
        &[
            preset("Sine", 0, 0),
            preset("Drum", 128, 1),
            preset("EOP", 0, 2),
        ]
        .concat(),
    );
    out.extend(chunk(b"pbag", &words(&[0, 0, 1, 0, 2, 0])));
    out.extend(chunk(b"pmod", &[0; 10]));
    out.extend(chunk(b"pgen", &words(&[41, 0, 41, 0, 0, 0]))); // instrument 0
    let instruments = [name("Sine"), words(&[0]), name("EOI"), words(&[1])].concat();
    out.extend(chunk(b"inst", &instruments));
    out.extend(chunk(b"ibag", &words(&[0, 0, 2, 1])));
    // Pitch wheel (14, two-sided), scaled by its sensitivity (16), to fine tune (52).
    let bend = words(&[14 | 1 << 9, 52, 12_800, 16, 0]);
    out.extend(chunk(b"imod", &[bend, vec![0; 10]].concat()));
    out.extend(chunk(b"igen", &words(&[54, 1, 53, 0, 0, 0]))); // loop on; sample 0
    let mut sample = name("sine");
    for word in [0, LEAD + LOOP + LEAD, LEAD, LEAD + LOOP, SAMPLE_RATE_HZ] {
        sample.extend(word.to_le_bytes());
    }
    sample.extend([69, 0, 0, 0, 1, 0]); // root key, no correction, mono
    let end = [name("EOS"), vec![0; 26]].concat();
    out.extend(chunk(b"shdr", &[sample, end].concat()));
    out
}

fn chunk(tag: &[u8; 4], data: &[u8]) -> Vec<u8> {
    let mut out = tag.to_vec();
    out.extend((data.len() as u32).to_le_bytes());
    out.extend(data);
    out.resize(out.len() + data.len() % 2, 0);
    out
}

fn list(tag: &[u8; 4], data: &[u8]) -> Vec<u8> {
    chunk(b"LIST", &[tag, data].concat())
}

fn name(text: &str) -> Vec<u8> {
    let mut out = text.as_bytes().to_vec();
    out.resize(20, 0);
    out
}

fn words(values: &[u16]) -> Vec<u8> {
    values.iter().flat_map(|v| v.to_le_bytes()).collect()
}
