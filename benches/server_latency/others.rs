//! General-purpose servers to stand beside, had by pip.

use std::path::{Path, PathBuf};
use std::process::Command;

use super::samples::{self, Sample};

/// What is installed.
const PACKAGES: [&str; 2] = ["ruff==0.17.6", "basedpyright==1.40.2"];

/// Name, command and file of each.
pub fn servers() -> Vec<(&'static str, Vec<String>, Sample)> {
    let programs = installed();
    let command = |name: &str, argument: &str| {
        let path = programs.join(name).display().to_string();
        vec![path, argument.to_owned()]
    };
    vec![
        ("ruff server", command("ruff", "server"), samples::formats()),
        (
            "basedpyright-langserver",
            command("basedpyright-langserver", "--stdio"),
            samples::pairs(),
        ),
    ]
}

/// The folder of the programs, made where it is not there.
fn installed() -> PathBuf {
    let target = Path::new(env!("CARGO_TARGET_TMPDIR"));
    let tools = target.join("latency-tools");
    let programs = tools.join("bin");
    if !programs.join("basedpyright-langserver").exists() {
        run(Command::new("python3").args(["-m", "venv"]).arg(&tools));
        let pip = programs.join("pip");
        run(Command::new(pip)
            .args(["install", "--quiet"])
            .args(PACKAGES));
    }
    programs
}

fn run(command: &mut Command) {
    let status = command.status();
    assert!(
        status.as_ref().is_ok_and(std::process::ExitStatus::success),
        "{command:?}: {status:?}"
    );
}
