//! One virtual machine for all: boots, runs the scripts beside this folder, and gives back what they left.

use super::edits;
use std::path::{Path, PathBuf};
use std::process::Command;

/// What the guest left.
pub struct Guest {
    out: PathBuf,
    folder: PathBuf,
}

impl Guest {
    /// It is stopped after so long.
    pub fn run(folder: PathBuf, timeout_s: usize) -> Guest {
        for tool in ["qemu-system-x86_64", "busybox", "cpio", "aseqdump"] {
            let found = Command::new("sh")
                .args(["-c", &format!("command -v {tool}")])
                .output()
                .is_ok_and(|output| output.status.success());
            assert!(found, "{tool} is missing; run tests/setup");
        }
        let here = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/outside");
        let out = folder.join("out");
        let files = [
            "stage.yaml",
            "plugged.yaml",
            "ports.yaml",
            "many.yaml",
            "layer.yaml",
            "lamps.yaml",
            "counts",
            "evening.mid",
            "held.mid",
            "run.mid",
            "few.mid",
            "flood.mid",
        ];
        let done = Command::new(here.join("alsa_vm.sh"))
            .arg(here.join("alsa_guest.sh"))
            .arg(&out)
            .arg(env!("CARGO_BIN_EXE_trued"))
            .args(
                files
                    .iter()
                    .chain(&edits::FILES)
                    .map(|file| folder.join(file)),
            )
            .args(
                [
                    "alsa_waits.sh",
                    "alsa_ports.sh",
                    "alsa_edits.sh",
                    "alsa_lamps.sh",
                ]
                .map(|script| here.join(script)),
            )
            .env("VM_TIMEOUT_S", timeout_s.to_string())
            .output()
            .expect("bash runs");
        let guest = Guest { out, folder };
        assert!(
            done.status.success(),
            "the guest ended with {}\n{}\n{}\n{}",
            done.status,
            String::from_utf8_lossy(&done.stdout),
            String::from_utf8_lossy(&done.stderr),
            guest.text("missing.txt"),
        );
        guest
    }

    pub fn bytes(&self, file: &str) -> Vec<u8> {
        std::fs::read(self.out.join(file)).unwrap_or_default()
    }

    pub fn text(&self, file: &str) -> String {
        String::from_utf8_lossy(&self.bytes(file)).into_owned()
    }
}

impl Drop for Guest {
    fn drop(&mut self) {
        // Left for a look when a test has failed.
        if !std::thread::panicking() {
            let _ = std::fs::remove_dir_all(&self.folder);
        }
    }
}
