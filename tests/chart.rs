//! `trued chart` as a player calls it: what comes out, where, and with which exit code.

use std::process::{Command, Output};

fn chart(arguments: &[&str]) -> Output {
    let mut command = Command::new(env!("CARGO_BIN_EXE_trued"));
    // No folder of the player's own may change what is tested.
    command
        .arg("chart")
        .args(arguments)
        .env("HOME", "/nonexistent");
    command.output().expect("trued starts")
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8_lossy(bytes).into_owned()
}

#[test]
fn data_goes_to_stdout() {
    let list = chart(&["--list"]);
    assert!(list.status.success() && list.stderr.is_empty());
    for name in ["equal-12 ", "neidhardt-1724-big-city ", "rast-al-farabi "] {
        assert!(text(&list.stdout).contains(name), "{name}");
    }
    let json = chart(&["--tuning", "equal-19", "--format", "json"]);
    let page: serde_json::Value = serde_json::from_slice(&json.stdout).expect("JSON");
    assert_eq!(page["tonic"], "C4");
    assert_eq!(page["keys"][69]["cents"], 6900.0);
    let pinned = chart(&[
        "--tuning", "equal-12", "--pitch", "C4 = 256", "--format", "csv",
    ]);
    assert!(text(&pinned.stdout).contains("60,C4,256,"));
}

#[test]
fn a_tuning_dump_is_one_message() {
    let plain = chart(&["--tuning", "vallotti", "--format", "syx"]).stdout;
    assert_eq!((plain.len(), plain[0], plain[407]), (408, 0xF0, 0xF7));
    assert_eq!(plain[..6], [0xF0, 0x7E, 0x7F, 8, 1, 0]);
    let banked = ["--format", "syx", "--bank", "2", "--program", "128"];
    let banked = chart(&[&["--tuning", "vallotti"], &banked[..]].concat()).stdout;
    assert_eq!(banked.len(), 409);
    assert_eq!(banked[..7], [0xF0, 0x7E, 0x7F, 8, 4, 1, 127]);
}

#[test]
fn mistakes_go_to_stderr_with_the_remedy() {
    for (arguments, code, said) in [
        (
            &["--tuning", "valloti"][..],
            64,
            "there is no tuning 'valloti'; did you mean 'vallotti'?",
        ),
        (
            &["--tuning", "vallotti", "--pitch", "415,3"],
            64,
            "decimals take a point: `415.3`",
        ),
        (
            &["--tuning", "vallotti", "--format", "svg"],
            64,
            "possible values: text, json, csv, syx",
        ),
        (
            &["no-such-stage.yaml"],
            66,
            "no-such-stage.yaml: there is no such file",
        ),
        (&[], 64, "STAGE"),
    ] {
        let output = chart(arguments);
        assert_eq!(output.status.code(), Some(code), "{arguments:?}");
        assert!(output.stdout.is_empty(), "{arguments:?}");
        assert!(
            text(&output.stderr).contains(said),
            "{arguments:?}: {}",
            text(&output.stderr)
        );
    }
}
