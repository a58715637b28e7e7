//! `trued check`: where its words go, how it ends, and what its JSON holds.

use super::file;
use serde_json::Value;
use std::process::Command;

/// Exit code, standard output, standard error.
fn check(arguments: &[&str]) -> (i32, String, String) {
    let output = Command::new(env!("CARGO_BIN_EXE_trued"))
        .arg("check")
        .args(arguments)
        .current_dir(file(""))
        .output()
        .expect("the binary under test");
    let text = |bytes: Vec<u8>| String::from_utf8(bytes).expect("UTF-8");
    let code = output.status.code().expect("it ended by itself");
    (code, text(output.stdout), text(output.stderr))
}

fn json(text: &str) -> Value {
    serde_json::from_str(text).expect("one JSON object")
}

#[test]
fn a_good_file_is_told_what_to_expect() {
    let (code, out, err) = check(&["config/first-light.yaml"]);
    assert_eq!((code, err.as_str()), (0, ""));
    // 263.18 Hz and 35.7 c: A4 = 440 lies 889.735 c over C in quarter-comma meantone, whose wolf is 737.637 c wide
    // (B. Ratte 1991, p. 153); the pure fifth is 701.955 c.
    for said in [
        "First light: no mistakes",
        "quarter-comma-meantone",
        "C4 sounds 263.18 Hz, 10.3 c over equal at A4 = 440",
        "G#-Eb is the wolf, 35.7 c wide",
        "channel-bend, bend range 2, notes on channels 1-9, 11-16",
    ] {
        assert!(out.contains(said), "{said} in\n{out}");
    }
}

/// Sizes: a meantone fifth is 696.578 c and its minor third 310.265 c (Ratte, p. 153); 6/5 is 315.641 c.
#[test]
fn the_chords_of_the_key_are_measured() {
    let (code, out, _) = check(&["config/evening.yaml"]);
    assert_eq!(code, 0);
    for said in [
        "in D minor: the third D-F is 310.3 c, 5.4 c narrow",
        "in D minor: the third A-C# is 386.3 c, pure",
        "in D minor: the fifth D-A is 696.6 c, 5.4 c narrow",
    ] {
        assert!(out.contains(said), "{said} in\n{out}");
    }
}

#[test]
fn more_bends_than_channels_is_said() {
    let (code, out, _) = check(&["config/more-than-twelve.yaml"]);
    assert_eq!(code, 0);
    // Nineteen keys to the octave repeat after an octave; an MPE zone of sixteen has fifteen members.
    let crowded = "19 different bends and 15 channels on glass";
    assert_eq!(out.matches(crowded).count(), 1, "{out}");
}

#[test]
fn how_a_song_follows_its_harmony_is_said() {
    let (code, out, _) = check(&["config/rehearsal.yaml"]);
    assert_eq!(code, 0);
    for said in [
        "chord-root: every chord is pure; what sounds goes as far from the tuning as its notes carry it\n",
        "chord-root: every chord is pure; what sounds stays within 12 c of the tuning on average; beside fixed instruments write \
         `drift_limit_cents: 5`\n",
        "chord-root: every chord is pure, dominant sevenths 4:5:6:7; what sounds stays within 12 c",
    ] {
        assert!(out.contains(said), "{said} in\n{out}");
    }
    assert_eq!(out.matches("chord-root").count(), 3, "{out}");
    let (_, out, _) = check(&["config/rehearsal.yaml", "--json"]);
    let songs = &json(&out)["songs"];
    assert!(songs[0]["intonation"].is_null() && songs[5]["intonation"].is_string());
}

#[test]
fn a_bad_file_is_told_on_stderr() {
    let (code, out, err) = check(&["tests/stage/bad/key-twice.yaml"]);
    assert_eq!((code, out.as_str()), (65, ""));
    assert!(err.contains("key-twice.yaml:3:36: `tuning` is written twice; keep one of the two\n"));
    assert!(err.ends_with("2 mistakes\n"), "{err}");
}

#[test]
fn a_missing_file_and_a_missing_name_have_codes_of_their_own() {
    assert_eq!(check(&["nowhere.yaml"]).0, 66);
    assert_eq!(check(&[]).0, 64);
}

#[test]
fn advice_is_a_mistake_only_when_strict() {
    // Thirds of E major that quarter-comma meantone has not: its G#-Eb chain gives B no D#.
    let folder = std::env::temp_dir().join(format!("trued-strict-{}", std::process::id()));
    std::fs::create_dir_all(&folder).expect("can be made");
    let path = folder.join("stage.yaml");
    let text = "set:\n  - {song: Hymn, tuning: quarter-comma-meantone, in: E}\n";
    std::fs::write(&path, text).expect("can be written");
    let name = path.to_str().expect("a plain path");
    let (lax, strict) = (check(&[name]), check(&[name, "--strict"]));
    std::fs::remove_dir_all(&folder).expect("can be removed");
    assert_eq!((lax.0, strict.0), (0, 65));
    let advice = "Hymn in E: the third B-D# is 427.4 c, 41.1 c wide (D# is played on Eb)";
    assert!(lax.1.contains(advice), "{}", lax.1);
    assert!(strict.2.contains("--strict"));
    assert_eq!(check(&["config/evening.yaml", "--strict"]).0, 0);
}

#[test]
fn json_holds_complaints_advice_and_songs() {
    let (code, out, _) = check(&["tests/stage/bad/key-twice.yaml", "--json"]);
    assert_eq!(code, 65);
    let first = &json(&out)["complaints"][0];
    assert_eq!(first["file"], "tests/stage/bad/key-twice.yaml");
    assert_eq!((&first["line"], &first["column"]), (&3.into(), &36.into()));
    assert_eq!(first["wrong"], "`tuning` is written twice");
    assert_eq!(first["right"], "keep one of the two");

    let (code, out, err) = check(&["config/evening.yaml", "--json"]);
    assert_eq!((code, err.as_str()), (0, ""));
    let told = json(&out);
    assert_eq!(told["complaints"], Value::Array(Vec::new()));
    assert_eq!(told["advice"], Value::Array(Vec::new()));
    let songs = told["songs"].as_array().expect("a list");
    assert_eq!(songs.len(), 6);
    assert_eq!(songs[0]["title"], "Lantern hymn");
    assert_eq!(songs[0]["circle"][0], "G#-Eb is the wolf, 35.7 c wide");
    assert_eq!(told["synths"][0]["dialect"], "mpe");
    // Half a step at bend range 48 is 0.293 c (design of the 14-bit bend: 4800 / 8192 / 2).
    let worst = told["synths"][0]["worst_rounding_cents"]
        .as_f64()
        .expect("a number");
    assert!(worst > 0.1 && worst <= 0.293, "{worst}");
}

#[test]
fn defaults_are_listed_with_and_without_a_file() {
    let (code, out, _) = check(&["--defaults"]);
    assert_eq!(code, 0);
    for said in [
        "tail_ms: 1500",
        "dialect: channel-bend",
        "bend_range: 2 (mpe: 48)",
        "pitch: A4 = 440 Hz",
    ] {
        assert!(out.contains(said), "{said} in\n{out}");
    }
    let (code, both, _) = check(&["config/first-light.yaml", "--defaults"]);
    assert_eq!(code, 0);
    assert!(both.starts_with("First light") && both.contains(&out));
    assert!(json(&check(&["--defaults", "--json"]).1)["defaults"].is_array());
}

/// A full bend of a member is 48 semitones unless it says otherwise (MPE 1.1, 2.2.5).
#[test]
fn an_expressive_keyboard_and_a_synth_that_bends_less_are_said() {
    let stage = |synth: &str| {
        let text = format!(
            "keyboards: {{keys: {{port: virtual, sends: mpe}}}}\nsynths: {{lead: {{port: virtual{synth}}}}}\n\
             set: [{{song: One, tuning: equal-12}}]\n"
        );
        trued::stage::Stage::parse(std::path::Path::new("test.yaml"), &text).expect("good")
    };
    let told = "single notes of keys bend by up to 48 semitones, and lead by 2: further than that they stay there; \
                write `bend_range: 48` at lead, or `dialect: mpe` if it knows that";
    assert_eq!(stage("").advice, [told]);
    for wide in [", dialect: mpe", ", bend_range: 48"] {
        assert!(stage(wide).advice.is_empty());
    }
}
