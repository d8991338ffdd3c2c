//! How long an editor waits: one digit typed into a file of 5,000 lines and 300 crystals, on real pipes.
//!
//! `cargo bench --bench server_latency [-- EDITS]` prints, over the edits, the time from
//! sending the change to (a) the first findings of that version, (b) findings
//! that hold the verdict on the bands that the digit moved, (c) the hover with
//! the new gap, asked for at once with the change. The file is invented.
#![allow(
    clippy::unwrap_used,
    clippy::indexing_slicing,
    clippy::print_stdout,
    missing_docs
)]

use std::io::{BufRead, BufReader, Read, Write};
use std::process::{Child, ChildStdin, ChildStdout, Command, Stdio};
use std::time::{Duration, Instant};

use serde_json::{Value, json};

const CRYSTALS: usize = 300;
const LINES: usize = 5000;
const URI: &str = "file:///bench/large.cren";

fn main() {
    // Cargo passes flags of its own.
    let edits = std::env::args()
        .skip(1)
        .find_map(|argument| argument.parse().ok());
    let edits: usize = edits.unwrap_or(200);
    let (text, digits) = file();
    println!(
        "{} lines, {CRYSTALS} crystals, {edits} edits",
        text.lines().count()
    );
    let mut server = Server::start();
    let opened = server.open(&text);
    println!("opened, bands of all crystals known after {opened:.0?}");
    let mut times = [const { Vec::new() }; 3];
    for edit in 0..edits {
        let index = (edit * 131) % CRYSTALS;
        let thick = (edit / CRYSTALS) % 2 == 0;
        let measured = server.edit(digits[index], thick, i32::try_from(edit + 2).unwrap());
        for (all, one) in times.iter_mut().zip(measured) {
            all.push(one);
        }
        // A typist is no machine gun.
        std::thread::sleep(Duration::from_millis(20));
    }
    for (name, times) in [
        "first findings",
        "findings with the new verdict",
        "hover with the new gap",
    ]
    .iter()
    .zip(&mut times)
    {
        times.sort_unstable();
        let at = |share: f64| times[((times.len() - 1) as f64 * share).round() as usize];
        println!(
            "{name:30} median {:6.1?}  p99 {:6.1?}  worst {:6.1?}",
            at(0.5),
            at(0.99),
            at(1.0)
        );
    }
    println!("resident memory {} MB", server.memory());
}

/// The text, and the position of a digit in each crystal: with 2 there the target is met, with 9 it is missed.
fn file() -> (String, Vec<(usize, usize)>) {
    let mut lines: Vec<String> = [
        "material basin",
        "  mass 0.067 me",
        "  edge 0 meV",
        "",
        "material wall",
        "  mass 0.092 me",
        "  edge 235 meV",
        "",
    ]
    .map(str::to_owned)
    .to_vec();
    let mut digits = Vec::new();
    for index in 0..CRYSTALS {
        lines.push(format!(
            "# Crystal number {index}, like the others and yet its own."
        ));
        lines.push(format!("crystal tern_{index}"));
        lines.push(format!("  title \"number {index}\""));
        digits.push((lines.len(), "  layer ".len()));
        lines.push("  layer 2.4 nm of basin".to_owned());
        lines.push(format!("  layer 2.{:03} nm of wall", 500 + index));
        lines.push("  layer 1.1 nm of basin".to_owned());
        lines.push("  layer 0.9 nm of wall".to_owned());
        lines.push("  bands 4".to_owned());
        lines.push("  filling 2".to_owned());
        lines.push("  measure line = level 2 at centre - level 1 at centre".to_owned());
        lines.push("  require gap 1 >= 100 meV".to_owned());
        lines.push("  require width 1 <= 900 meV".to_owned());
        let wanted = (index + 1) * (LINES - 8) / CRYSTALS + 8;
        lines.resize(
            wanted.max(lines.len()),
            "  # nothing more to say".to_owned(),
        );
    }
    (lines.join("\n") + "\n", digits)
}

struct Server {
    child: Child,
    input: ChildStdin,
    output: BufReader<ChildStdout>,
}

impl Server {
    fn start() -> Self {
        let mut child = Command::new(env!("CARGO_BIN_EXE_crenate"))
            .arg("serve")
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .spawn()
            .unwrap();
        let (input, output) = (
            child.stdin.take().unwrap(),
            BufReader::new(child.stdout.take().unwrap()),
        );
        let mut server = Self {
            child,
            input,
            output,
        };
        server.send(&json!({"jsonrpc": "2.0", "id": 0, "method": "initialize", "params": {"capabilities": {}}}));
        server.read();
        server.send(&json!({"jsonrpc": "2.0", "method": "initialized", "params": {}}));
        server
    }

    fn send(&mut self, message: &Value) {
        let body = message.to_string();
        write!(self.input, "Content-Length: {}\r\n\r\n{body}", body.len()).unwrap();
        self.input.flush().unwrap();
    }

    fn read(&mut self) -> Value {
        let mut length = 0;
        loop {
            let mut line = String::new();
            assert!(
                self.output.read_line(&mut line).unwrap() > 0,
                "the server is gone"
            );
            match line.trim().strip_prefix("Content-Length: ") {
                Some(digits) => length = digits.parse().unwrap(),
                None => break,
            }
        }
        let mut body = vec![0; length];
        self.output.read_exact(&mut body).unwrap();
        serde_json::from_slice(&body).unwrap()
    }

    fn hover(&mut self, id: i32, line: usize) {
        self.send(
            &json!({"jsonrpc": "2.0", "id": id, "method": "textDocument/hover",
            "params": {"textDocument": {"uri": URI}, "position": {"line": line, "character": 9}}}),
        );
    }

    fn open(&mut self, text: &str) -> Duration {
        let start = Instant::now();
        self.send(
            &json!({"jsonrpc": "2.0", "method": "textDocument/didOpen", "params": {"textDocument":
            {"uri": URI, "languageId": "crenate", "version": 1, "text": text}}}),
        );
        // A hover waits only so long for the bands, so it is asked until it has them.
        for id in 1_000_000.. {
            self.hover(id, 9);
            let reply = loop {
                let message = self.read();
                if message["id"] == id {
                    break message;
                }
            };
            if reply["result"]["contents"]["value"]
                .as_str()
                .is_some_and(|text| text.contains("gap 1"))
            {
                break;
            }
        }
        start.elapsed()
    }

    /// Types one digit; the three times.
    fn edit(
        &mut self,
        (line, character): (usize, usize),
        thick: bool,
        version: i32,
    ) -> [Duration; 3] {
        let digit = if thick { "9" } else { "2" };
        let range = json!({"start": {"line": line, "character": character}, "end": {"line": line, "character": character + 1}});
        let start = Instant::now();
        self.send(&json!({"jsonrpc": "2.0", "method": "textDocument/didChange", "params": {"textDocument": {"uri": URI, "version": version},
            "contentChanges": [{"range": range, "text": digit}]}}));
        self.hover(version, line - 2);
        let mut times = [None; 3];
        while times.iter().any(Option::is_none) {
            let message = self.read();
            let now = start.elapsed();
            if message["id"] == version {
                assert!(
                    message["result"]["contents"]["value"]
                        .as_str()
                        .is_some_and(|text| text.contains("gap 1")),
                    "{message}"
                );
                times[2] = Some(now);
            } else if message["params"]["version"] == version {
                let found = message["params"]["diagnostics"].as_array().unwrap();
                let near = |finding: &&Value| {
                    (line..line + 9)
                        .contains(&(finding["range"]["start"]["line"].as_u64().unwrap() as usize))
                };
                let missed = found
                    .iter()
                    .filter(near)
                    .any(|finding| finding["code"] == "target-missed");
                times[0].get_or_insert(now);
                if missed == thick {
                    times[1].get_or_insert(now);
                }
            }
        }
        times.map(Option::unwrap)
    }

    fn memory(&self) -> u64 {
        let status = std::fs::read_to_string(format!("/proc/{}/status", self.child.id()))
            .unwrap_or_default();
        let line = status
            .lines()
            .find(|line| line.starts_with("VmRSS"))
            .unwrap_or("");
        line.split_whitespace()
            .nth(1)
            .and_then(|kilobytes| kilobytes.parse::<u64>().ok())
            .unwrap_or(0)
            / 1024
    }
}

impl Drop for Server {
    fn drop(&mut self) {
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}
