//! What `trued chart --format json` says of a song: what its notes are held to.

use std::path::Path;
use std::process::Command;

pub struct Chart([Option<f64>; 128]);

impl Chart {
    /// As the binary prints it.
    pub fn of(stage: &Path, title: &str) -> Chart {
        let out = Command::new(env!("CARGO_BIN_EXE_trued"))
            .arg("chart")
            .arg(stage)
            .args(["--song", title, "--format", "json"])
            .output()
            .expect("trued");
        let said = String::from_utf8_lossy(&out.stderr);
        assert!(out.status.success(), "{title}: {said}");
        let page: serde_json::Value = serde_json::from_slice(&out.stdout).expect("JSON");
        let mut cents = [None; 128];
        for line in page["keys"].as_array().expect("a list of keys") {
            let key = line["key"].as_u64().expect("a key number") as usize;
            cents[key] = line["cents"].as_f64();
        }
        Chart(cents)
    }

    /// Cents (100 x MIDI key) of a key that sounds.
    #[track_caller]
    pub fn cents(&self, key: u8) -> f64 {
        self.get(key).expect("a key that sounds")
    }

    pub fn get(&self, key: u8) -> Option<f64> {
        self.0.get(key as usize).copied().flatten()
    }
}
