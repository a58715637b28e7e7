//! Every form of the language loads: the examples of its description, completed to whole files where they are parts.

use super::load;

const SMALLEST: &str = "
stage: First light
set:
  - {song: Lantern hymn, tuning: quarter-comma-meantone}
";

const DEVICES: &str = r#"
keyboards:
  keys:   {port: ["*Keys*", "*Rental*"], wheel: 2}       # globs, any case, in order of preference
  great:  {port: "*Console*", channel: 1}
  pads:   {port: "*Pads*", channel: 10}
  grand:  {port: "*Piano*", local_sound: false}           # keyboard and synth in one
synths:
  organ:
    port: virtual                    # opens a port others connect to; or a glob
    dialect: mpe                     # mpe | channel-bend | tuning-messages | octave-table | best
    channels: 1-16
    bend_range: 48                   # semitones, told by RPN 0
    tail_ms: 1500
    drums: []                        # channels never touched on this synth
"#;

const PARTS: &str = "
parts:                               # without it: every key of every keyboard plays the first synth
  - {from: keys, keys: C2..B3, to: organ, channel: 2, transpose: 0, offset: -50 c, pass: [wheel, pedals, pressure], \
     tune: yes, follow: yes}
";

const TUNINGS: &str = "
tunings:
  slow-meantone:
    about: Quarter-comma with Ab for G#
    fifths:
      chain: [Ab, Eb, Bb, F, C, G, D, A, E, B, F#, C#]      # may be longer than twelve: see black_keys
      each: narrow 1/4 syntonic                             # -1/4 syntonic is the same
  kitchen-well:
    fifths:
      chain: [Eb, Bb, F, C, G, D, A, E, B, F#, C#, G#]
      alter: {C-G: narrow 1/4 pythagorean, G-D: narrow 1/4 pythagorean, D-A: narrow 1/4 pythagorean, B-F#: narrow 1/4 pythagorean}
  tuners-sheet:
    offsets: {C: +5.9, C#: 0, D: +2, Eb: +3.9, E: -2, F: +7.8, F#: -2, G: +3.9, G#: +2, A: 0, Bb: +5.9, B: -3.9}   # cents
  bayati:
    about: Bayati on D, a teacher's measurements
    tonic: D
    notes: {D: 1/1, E: 145 c, F: 32/27, G: 4/3, A: 3/2, Bb: 792 c, B: 850 c, C: 16/9}    # each above the tonic
    others: equal                    # keys not named: equal | silent
    also: {E: {natural: 9/8, flat: 90 c}, G: {flat: 400 c}, B: {natural: 27/16}}           # other places of a key
    turns: {saba: {G: flat}}         # several at once, under one name
  bright-five:
    pitches: [1/1, 16/15, 9/8, 6/5, 5/4, 4/3, 45/32, 3/2, 8/5, 27/16, 9/5, 15/8]
    period: 2/1                      # default
  nineteen:
    equal: {steps: 19, of: 2/1}
    keys: {C: 0, C#: 1, D: 3, Eb: 5, E: 6, F: 8, F#: 9, G: 11, G#: 12, A: 14, Bb: 16, B: 17}   # without it: one key a step
  overtones:
    harmonics: {from: 8, to: 16}
    keys: {C: 0, D: 1, E: 2, F: 3, G: 4, A: 5, Bb: 6, B: 7}      # keys not named are silent
  vallotti-and-a-hair:
    like: vallotti                   # build on any tuning, shipped or own
    change: {Bb: +3 c}
";

const SONGS: &str = "
songs:                               # the book, by title
  Lantern hymn:  {tuning: quarter-comma-meantone, in: D minor, pitch: A4 = 415 Hz}
  Slow canzona:  {tuning: slow-meantone, in: [G, E minor], black_keys: [C#, Eb or D#, F#, G# or Ab, Bb]}
  Harbour tag:   {tuning: equal-12, intonation: {method: chord-root, ratios: pure-with-7, drift_limit_cents: 12}}
  Samai:         {tuning: bayati, begin_with: {B: natural}, by_line: {E: {up: natural, down: home}}}
  Two manuals:   {tuning: equal-12, transpose: -2, parts: [{from: great, to: organ}], send: [{program: 20, to: organ}]}
set: [Lantern hymn, Slow canzona, Harbour tag, Samai, Harbour tag]     # the order tonight
";

const CUES: &str = "
cues:
  - {when: {program: any, channel: 16}, do: song}                       # program n: the n-th of the set
  - {when: {controller: 82, from: keys}, do: next, at: quiet}            # armed now, in force when all is up
  - {when: {controller: 84, from: keys, press: either}, do: next}        # a latching footswitch
  - {when: {controller: 82, from: keys, press: long, long_ms: 1500}, do: panic}
  - {when: {note: D2, from: pads}, do: inflect B natural, while: held}
  - {when: {controller: 67, from: keys}, do: root hold, while: held}
lamps:
  - {show: turn saba, send: {note: E2, to: pads}}                        # feedback to a controller
";

/// One song, to complete a part to a whole.
fn with_song(tuning: &str, song: &str) -> String {
    format!("{tuning}\nset:\n  - {{song: A song, {song}}}\n")
}

#[test]
fn the_smallest_stage_file() {
    let stage = load(SMALLEST);
    assert_eq!(stage.name, "First light");
    assert_eq!(stage.set[0].title, "Lantern hymn");
    assert_eq!(stage.advice, [""; 0]);
}

#[test]
fn the_rig() {
    let stage = load(&with_song(&format!("{DEVICES}{PARTS}"), "tuning: vallotti"));
    let names: Vec<&str> = stage.keyboards.iter().map(|k| k.name.as_str()).collect();
    assert_eq!(names, ["keys", "great", "pads", "grand"]);
    assert_eq!(stage.plan().parts[0].pool.0, 0b10);
}

#[test]
fn a_rig_in_a_file_of_its_own() {
    let stage = load(&with_song("rig: rigs/wharf.yaml", "tuning: vallotti"));
    assert_eq!(stage.synths[0].name, "organ");
    assert_eq!(stage.files.len(), 2);
    assert!(stage.files[1].ends_with("rigs/wharf.yaml"));
}

#[test]
fn pitches() {
    for pitch in [
        "A4 = 415 Hz",
        "{key: A4, hz: 415, pin: key}",
        "{key: A4, hz: 415, pin: tonic}",
        "C4 = 256 Hz",
        "A4=442.5 Hz",
    ] {
        load(&with_song("", &format!("tuning: vallotti, pitch: {pitch}")));
        load(&format!("pitch: {pitch}\n{SMALLEST}"));
    }
}

#[test]
fn tunings_of_both_kinds() {
    for (tuning, more) in [
        ("slow-meantone", ""),
        ("slow-meantone", ", turned_to: D"),
        ("kitchen-well", ""),
        ("tuners-sheet", ""),
        ("bayati", ""),
        ("bright-five", ", tonic: Eb"),
        ("nineteen", ", tonic: D"),
        ("overtones", ", tonic: A"),
        ("vallotti-and-a-hair", ""),
        ("equal-31", ", tonic: D3"),
        ("equal-31", ", tonic: D"),
    ] {
        load(&with_song(TUNINGS, &format!("tuning: {tuning}{more}")));
    }
}

#[test]
fn songs_cues_and_lamps() {
    let stage = load(&format!(
        "stage: Whole\n{DEVICES}{PARTS}{TUNINGS}{SONGS}{CUES}"
    ));
    let titles: Vec<&str> = stage.set.iter().map(|song| song.title.as_str()).collect();
    assert_eq!(
        titles,
        [
            "Lantern hymn",
            "Slow canzona",
            "Harbour tag",
            "Samai",
            "Harbour tag"
        ]
    );
    // Everything is played.
    let not_played = |line: &&String| line.contains("not played by this version");
    assert_eq!(stage.advice.iter().filter(not_played).count(), 0);
    assert_eq!((stage.plan().cues.len(), stage.plan().lamps.len()), (6, 1));
}

#[test]
fn chords_that_are_followed() {
    let text = "
songs:
  Bare word:   {intonation: chord-root}
  Map:         {tuning: five-limit-scale, tonic: D, intonation: {method: chord-root}}
  At rest:     {intonation: {method: fixed, drift_limit_cents: 5}}
  Every knob:
    tuning: werckmeister-3
    intonation:
      method: chord-root
      ratios: pure-with-7
      drift_limit_cents: none
      return_cents_per_s: 2
      settle_ms: 50
      hold_limit_cents: 6
      glide_cents_per_s: 30
      memory_s: 3
  Own ratios:
    intonation:
      method: chord-root
      ratios: [1/1, 16/15, 9/8, 6/5, 5/4, 4/3, 7/5, 3/2, 8/5, 5/3, 7/4, 15/8]
parts:
  - {keys: ..B2, follow: no}
  - {keys: C3..B4, follow: yes}
  - {keys: C5..B5, follow: uncounted}
  - {keys: C6.., follow: own}
cues:
  - {when: {controller: 66}, do: root hold, while: held}
  - {when: {controller: 67}, do: sevenths harmonic, while: held}
  - {when: {controller: 80}, do: sevenths plain}
  - {when: {controller: 81}, do: root next-key}
  - {when: {controller: 82}, do: root free}
  - {when: {controller: 83, press: either}, do: plain}
";
    let stage = load(text);
    assert_eq!(stage.advice, [""; 0]);
    assert_eq!(stage.plan().cues.len(), 6);
    let adaptive = |song: &trued::engine::plan::SongPlan| song.method.settings().is_some();
    let methods: Vec<bool> = stage.plan().set.iter().map(adaptive).collect();
    assert_eq!(methods, [true, true, false, true, true]);
}

#[test]
fn words_about_chords_that_nobody_follows_are_told_of() {
    let stage = load(
        "cues: [{when: {controller: 66}, do: root hold}, {when: {controller: 67}, do: sevenths plain}]\n\
         set: [{song: One}]\n",
    );
    let about =
        "is about chords that are followed, and no song tonight has `intonation: chord-root`";
    assert_eq!(
        stage.advice,
        [format!("cue 1 {about}"), format!("cue 2 {about}")]
    );
}

#[test]
fn chords_that_are_followed_want_a_channel_for_each_pitch_class() {
    let crowding = |channels: &str| {
        let text = format!(
            "synths: {{organ: {{channels: {channels}}}}}\nset: [{{song: One, intonation: chord-root}}]\n"
        );
        trued::stage::outlook::crowding(&load(&text).plan(), 0)
    };
    let few = "8 channels on organ, and chords that are followed: with more than 8 pitch classes held at once, one \
               goes along with another";
    assert_eq!(crowding("1-8").as_deref(), Some(few));
    assert_eq!(crowding("1-13"), None, "twelve without the drums");
}

#[test]
fn a_number_is_as_good_a_title_as_any() {
    let stage = load("songs: {1812: , 1.50: {tuning: vallotti}}\nset: [1812, 1.50, 1812]\n");
    assert_eq!(stage.set.len(), 3);
    assert_eq!(stage.set[1].tuning_name, "vallotti");
}

#[test]
fn a_song_of_the_book_may_be_named_as_a_map() {
    let stage = load("songs: {Hymn: {tuning: vallotti}}\nset: [{song: Hymn}]\n");
    assert_eq!(stage.set[0].tuning_name, "vallotti");
}

#[test]
fn without_a_set_the_book_is_played_in_its_order() {
    let stage = load("songs: {Second: {}, First: {}}\n");
    let titles: Vec<&str> = stage.set.iter().map(|song| song.title.as_str()).collect();
    assert_eq!(titles, ["Second", "First"]);
}
