//! trued's output into FluidSynth, a sine SoundFont, and the pitch of the WAV that comes out.
//!
//! FluidSynth 2.3 looks up pitch by the whole cent and rounds down (`fluid_ct2hz_real`; measured), so what sounds is the
//! whole cent at or just below what was sent.

use crate::support::estimator::partial_cents;
use crate::support::hex;
use crate::support::midi_file::midi_file;
use crate::support::published::{FIVE_TUNINGS, Published};
use crate::support::rig::Rig;
use crate::support::sine_font::sine_font;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;
use trued::stage::Stage;
use trued::time::Time;

/// C4 E4 G4 Bb4, all sounding together: far enough apart to be told apart, all within one rendering.
const CHORD: [u8; 4] = [60, 64, 67, 70];
const ON_MS: u64 = 500;
const OFF_MS: u64 = 3500;
const SLACK_CENTS: f64 = 0.01;

#[test]
fn a_chord_in_each_of_five_tunings_sounds_as_sent() {
    println!("tuning                  key       sent   sounding");
    for tuning in FIVE_TUNINGS {
        let (messages, sent_cents) = played_by_trued(tuning);
        let sound = render(tuning.name, &midi_file(&messages, OFF_MS + 500));
        for (key, sent) in CHORD.into_iter().zip(sent_cents) {
            let sounding = partial_cents(&sound, RATE_HZ, sent);
            println!("{:<24}{key:>3}{sent:>11.4}{sounding:>11.4}", tuning.name);
            let wanted = tuning.key_cents(key);
            assert!(
                (sent - wanted).abs() < 0.0123,
                "{key} of {}: sent {sent}, should be {wanted}",
                tuning.name
            );
            assert!(
                is_whole_cent_below(sounding, sent),
                "{key} of {}: {sent} sent, {sounding} heard",
                tuning.name
            );
        }
    }
}

#[test]
fn the_synth_and_the_measurement_are_what_we_take_them_for() {
    // Bends of our own at range 2 and 12; expected as measured on FluidSynth 2.3.1 with this font. If one of these
    // fails, the synth has changed, not trued.
    for (name, bytes, cents) in [
        ("up 42 steps", "B0 65 00 64 00 06 02 E0 2A 40", 6901.0),
        ("up 41 steps", "B0 65 00 64 00 06 02 E0 29 40", 6901.0),
        ("up 40 steps", "B0 65 00 64 00 06 02 E0 28 40", 6900.0),
        ("down 1 step", "B0 65 00 64 00 06 02 E0 7F 3F", 6899.0),
        (
            "half of 12 semitones",
            "B0 65 00 64 00 06 0C E0 00 60",
            7500.0,
        ),
    ] {
        let messages = [
            (0, hex(bytes)),
            (ON_MS, hex("90 45 40")),
            (OFF_MS, hex("80 45 40")),
        ];
        let sound = render(&name.replace(' ', "-"), &midi_file(&messages, OFF_MS + 500));
        let heard = partial_cents(&sound, RATE_HZ, cents);
        assert!(
            (heard - cents).abs() < SLACK_CENTS,
            "{name}: {heard}, not {cents}"
        );
    }
    assert!(is_whole_cent_below(6386.0, 6386.3) && !is_whole_cent_below(6387.0, 6386.3));
    assert!(!is_whole_cent_below(6385.0, 6386.3) && !is_whole_cent_below(6386.3, 6386.3));
    assert!(is_whole_cent_below(6386.0, 6386.995) && is_whole_cent_below(6387.0, 6386.995));
    assert!(is_whole_cent_below(6385.0, 6386.005) && is_whole_cent_below(6386.0, 6386.005));
}

/// The whole cent at or just below; a pitch sent within a hundredth of a whole cent may fall to either side.
fn is_whole_cent_below(sounding: f64, sent: f64) -> bool {
    let floors = [sent, sent - SLACK_CENTS, sent + SLACK_CENTS].map(f64::floor);
    floors
        .iter()
        .any(|whole| (sounding - whole).abs() < SLACK_CENTS)
}

/// What trued sends for the chord, and the pitches in it as an independent receiver reads them.
fn played_by_trued(tuning: &Published) -> (Vec<(u64, Vec<u8>)>, Vec<f64>) {
    let text = format!(
        "stage: Chord\nset:\n  - {{song: Chord, tuning: {}}}\n",
        tuning.name
    );
    let stage = Stage::parse(Path::new("chord.yaml"), &text).unwrap_or_else(|c| panic!("{c:#?}"));
    let mut rig = Rig::ready(&stage.plan_offline());
    for (at_ms, status) in [(ON_MS, 0x90), (OFF_MS, 0x80)] {
        rig.until(Time::from_millis(at_ms));
        for key in CHORD {
            rig.midi(0, &[status, key, 64]);
        }
    }
    let millis = |at: Time| at.nanos() / 1_000_000;
    let sent = rig
        .sent
        .iter()
        .map(|sent| (millis(sent.at), sent.bytes.clone()));
    let cents = rig.heard().notes.iter().map(|note| note.onset_cents());
    (sent.collect(), cents.collect())
}

const RATE_HZ: f64 = 48_000.0;

/// Plays a MIDI file into a WAV and gives the steady middle of its left channel.
fn render(name: &str, midi: &[u8]) -> Vec<f64> {
    let folder = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join("fluidsynth");
    fs::create_dir_all(&folder).expect("a folder for the sound");
    let file = |ending: &str| folder.join(format!("{name}.{ending}"));
    let (font, song, wav) = (file("sf2"), file("mid"), file("wav"));
    fs::write(&font, sine_font()).expect("the font written");
    fs::write(&song, midi).expect("the song written");
    let _ = fs::remove_file(&wav);
    let options = "-n -i -q -R 0 -C 0 -g 0.4 -r 48000 -o synth.cpu-cores=1 -O s32 -F";
    let output = Command::new("fluidsynth")
        .args(options.split(' '))
        .args([&wav, &font, &song])
        .output()
        .unwrap_or_else(|error| {
            panic!("fluidsynth does not start ({error}); run `sh tests/setup --tests`")
        });
    let said = String::from_utf8_lossy(&output.stderr);
    assert!(
        output.status.success() && wav.exists(),
        "fluidsynth rendered nothing: {said}"
    );
    let mut reader = hound::WavReader::open(&wav).expect("the WAV that fluidsynth wrote");
    let spec = reader.spec();
    assert_eq!((spec.sample_rate, spec.bits_per_sample), (48_000, 32));
    let left = reader
        .samples::<i32>()
        .step_by(spec.channels as usize)
        .map(|sample| sample.expect("a sample") as f64 / i32::MAX as f64);
    let from = (ON_MS + 500) as usize * 48;
    let sound: Vec<f64> = left.skip(from).take(2 * 48_000).collect();
    assert_eq!(sound.len(), 2 * 48_000, "the WAV is too short: {said}");
    sound
}
