//! What the tests of the command line share: folders to work in, and the command.
#![allow(dead_code, missing_docs, clippy::unwrap_used)]

use std::fs;
use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};

/// A folder that vanishes with the test.
pub struct Folder(tempfile::TempDir);

impl Folder {
    pub fn new() -> Self {
        Self(tempfile::tempdir().unwrap())
    }

    pub fn root(&self) -> &Path {
        self.0.path()
    }

    pub fn path(&self, name: &str) -> PathBuf {
        self.root().join(name)
    }

    pub fn write(&self, name: &str, text: &str) {
        self.write_bytes(name, text.as_bytes());
    }

    pub fn write_bytes(&self, name: &str, bytes: &[u8]) {
        let path = self.path(name);
        fs::create_dir_all(path.parent().unwrap()).unwrap();
        fs::write(path, bytes).unwrap();
    }

    pub fn read(&self, name: &str) -> String {
        fs::read_to_string(self.path(name)).unwrap()
    }
}

/// The command, started in the folder.
pub fn crenate(folder: &Folder) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_crenate"));
    command.current_dir(folder.root());
    command
}

pub fn run(folder: &Folder, arguments: &[&str]) -> Output {
    crenate(folder).args(arguments).output().unwrap()
}

pub fn run_with_input(folder: &Folder, arguments: &[&str], input: &str) -> Output {
    let mut command = crenate(folder);
    let child = command
        .args(arguments)
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped());
    let mut child = child.spawn().unwrap();
    child
        .stdin
        .take()
        .unwrap()
        .write_all(input.as_bytes())
        .unwrap();
    child.wait_with_output().unwrap()
}

pub fn stdout(output: &Output) -> String {
    String::from_utf8(output.stdout.clone()).unwrap()
}

pub fn stderr(output: &Output) -> String {
    String::from_utf8(output.stderr.clone()).unwrap()
}
