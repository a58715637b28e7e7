//! The unit file, looked at by systemd's own tools (Debian package systemd). Nothing is started.

use super::stand::Folder;
use std::process::Command;

/// The unit as shipped, but for the binary, which is not installed here.
fn unit(folder: &Folder) -> String {
    let shipped = concat!(env!("CARGO_MANIFEST_DIR"), "/systemd/trued.service");
    let text = std::fs::read_to_string(shipped).expect("the unit file");
    assert!(text.contains("\nExecStart=/usr/bin/trued run /etc/trued/stage.yaml\n"));
    let path = folder.at("trued.service");
    assert!(text.contains("\nExecReload=/usr/bin/trued tell reload\n"));
    let here = text.replace("/usr/bin/trued", env!("CARGO_BIN_EXE_trued"));
    std::fs::write(&path, here).unwrap();
    path.to_str().expect("UTF-8").to_string()
}

fn analyze(arguments: &[&str]) -> (bool, String) {
    let output = Command::new("systemd-analyze")
        .args(arguments)
        .output()
        .expect("systemd-analyze; tests/setup --tests installs it");
    let text = [output.stdout, output.stderr].concat();
    (
        output.status.success(),
        String::from_utf8_lossy(&text).into_owned(),
    )
}

#[test]
fn systemd_finds_nothing_wrong_with_the_unit() {
    let folder = Folder::new("verify");
    let (well, text) = analyze(&["verify", &unit(&folder)]);
    assert!(well, "{text}");
    assert_eq!(text.trim(), "", "systemd-analyze verify");
    println!("systemd-analyze verify: clean");
}

#[test]
fn systemd_finds_the_unit_safe() {
    let folder = Folder::new("security");
    let unit = unit(&folder);
    // The threshold is in tenths.
    let (well, text) = analyze(&[
        "security",
        "--offline=true",
        "--no-pager",
        "--threshold=10",
        &unit,
    ]);
    assert!(well, "{text}");
    let line = text
        .lines()
        .find(|line| line.contains("Overall exposure level"))
        .expect("a level");
    let level: f64 = line
        .split(':')
        .nth(1)
        .and_then(|rest| rest.split_whitespace().next())
        .and_then(|level| level.parse().ok())
        .expect("a figure");
    assert!(level <= 1.0, "{line}");
    println!("{line}");
}
