//! The real process on real pipes: how it ends, and what it survives.
#![cfg(unix)]
#![allow(clippy::unwrap_used, clippy::indexing_slicing)]

use std::io::{BufRead, BufReader, Write};
use std::process::{Child, ChildStdin, Command, Stdio};
use std::sync::mpsc::{Receiver, channel};
use std::time::{Duration, Instant};

use serde_json::{Value, json};

const A: &str = "file:///models/a.cren";
const LONG: Duration = Duration::from_secs(60);

struct Server {
    child: Child,
    input: Option<ChildStdin>,
    messages: Receiver<Value>,
}

impl Server {
    fn start(arguments: &[&str]) -> Self {
        let mut child = Command::new(env!("CARGO_BIN_EXE_crenate"))
            .args(arguments)
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(Stdio::null())
            .spawn()
            .unwrap();
        let input = child.stdin.take();
        let mut output = BufReader::new(child.stdout.take().unwrap());
        let (sender, messages) = channel();
        std::thread::spawn(move || {
            while let Some(message) = read(&mut output) {
                if sender.send(message).is_err() {
                    return;
                }
            }
        });
        Self {
            child,
            input,
            messages,
        }
    }

    fn initialized(process: Option<u32>) -> Self {
        let mut server = Self::start(&["serve", "--stdio"]);
        server.send(&initialize(process));
        assert_eq!(server.receive()["id"], 0);
        server.send(&json!({"jsonrpc": "2.0", "method": "initialized", "params": {}}));
        server
    }

    fn raw(&mut self, bytes: &[u8]) {
        let input = self.input.as_mut().unwrap();
        input.write_all(bytes).unwrap();
        input.flush().unwrap();
    }

    fn send(&mut self, message: &Value) {
        self.raw(framed(message).as_bytes());
    }

    fn receive(&self) -> Value {
        self.messages
            .recv_timeout(LONG)
            .expect("the server is silent")
    }

    fn wait(&self, wanted: impl Fn(&Value) -> bool) -> Value {
        loop {
            let message = self.receive();
            if wanted(&message) {
                return message;
            }
        }
    }

    fn status(&mut self, within: Duration) -> i32 {
        let end = Instant::now() + within;
        while Instant::now() < end {
            if let Some(status) = self.child.try_wait().unwrap() {
                return status.code().expect("ended by a signal");
            }
            std::thread::sleep(Duration::from_millis(10));
        }
        panic!("the server goes on");
    }
}

impl Drop for Server {
    fn drop(&mut self) {
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

fn read(output: &mut impl BufRead) -> Option<Value> {
    let mut length = None;
    loop {
        let mut line = String::new();
        if output.read_line(&mut line).ok()? == 0 {
            return None;
        }
        match line.trim().strip_prefix("Content-Length: ") {
            Some(digits) => length = digits.parse::<usize>().ok(),
            None => break,
        }
    }
    let mut body = vec![0; length?];
    output.read_exact(&mut body).ok()?;
    serde_json::from_slice(&body).ok()
}

fn framed(message: &Value) -> String {
    let body = message.to_string();
    format!("Content-Length: {}\r\n\r\n{body}", body.len())
}

fn initialize(process: Option<u32>) -> Value {
    json!({"jsonrpc": "2.0", "id": 0, "method": "initialize", "params": {"processId": process, "capabilities": {}}})
}

fn open(text: &str) -> Value {
    json!({"jsonrpc": "2.0", "method": "textDocument/didOpen", "params": {"textDocument":
        {"uri": A, "languageId": "crenate", "version": 1, "text": text}}})
}

fn shutdown() -> Value {
    json!({"jsonrpc": "2.0", "id": "bye", "method": "shutdown", "params": null})
}

fn exit() -> Value {
    json!({"jsonrpc": "2.0", "method": "exit", "params": null})
}

/// The line of the unknown statement among published findings.
fn unknown(published: &Value) -> Option<u64> {
    let findings = published["params"]["diagnostics"].as_array()?;
    let found = findings
        .iter()
        .find(|finding| finding["code"] == "unknown-statement")?;
    found["range"]["start"]["line"].as_u64()
}

fn hover(id: i32) -> Value {
    json!({"jsonrpc": "2.0", "id": id, "method": "textDocument/hover",
        "params": {"textDocument": {"uri": A}, "position": {"line": 0, "character": 0}}})
}

#[test]
fn exit_ends_the_process_though_its_input_stays_open() {
    let mut server = Server::initialized(None);
    server.send(&shutdown());
    assert_eq!(
        server.wait(|message| message["id"] == "bye")["result"],
        Value::Null
    );
    server.send(&exit());
    assert_eq!(server.status(Duration::from_secs(5)), 0);

    let mut server = Server::initialized(None);
    server.send(&exit());
    assert_eq!(server.status(Duration::from_secs(5)), 1);

    let mut server = Server::start(&["serve"]);
    server.send(&exit());
    assert_eq!(server.status(Duration::from_secs(5)), 1);
}

#[test]
fn the_end_of_input_ends_the_process() {
    let mut server = Server::initialized(None);
    server.input = None;
    assert_eq!(server.status(Duration::from_secs(5)), 1);

    let mut server = Server::initialized(None);
    server.send(&shutdown());
    server.wait(|message| message["id"] == "bye");
    server.input = None;
    assert_eq!(server.status(Duration::from_secs(5)), 0);
}

#[test]
fn a_server_does_not_outlive_its_parent() {
    let mut parent = Command::new("sleep").arg("600").spawn().unwrap();
    let mut server = Server::initialized(Some(parent.id()));
    parent.kill().unwrap();
    parent.wait().unwrap();
    assert_eq!(server.status(Duration::from_secs(10)), 1);
}

#[test]
fn a_parent_that_cannot_be_seen_is_not_missed() {
    // Larger than any process number that Linux gives out.
    let mut server = Server::initialized(Some(0x7fff_fffe));
    std::thread::sleep(Duration::from_millis(2500));
    server.send(&hover(1));
    assert_eq!(
        server.wait(|message| message["id"] == 1)["result"],
        Value::Null
    );
}

#[test]
fn one_burst_from_the_first_byte_loses_nothing() {
    let mut server = Server::start(&["serve"]);
    let burst = framed(&initialize(None))
        + &framed(&json!({"jsonrpc": "2.0", "method": "initialized", "params": {}}))
        + &framed(&open("crystal a\n  nonsense\n"))
        + &framed(&hover(1));
    server.raw(burst.as_bytes());
    assert_eq!(server.receive()["id"], 0);
    let published = server.wait(|message| message["method"] == "textDocument/publishDiagnostics");
    assert!(unknown(&published).is_some(), "{published}");
}

#[test]
fn malformed_frames_do_not_end_it() {
    let mut server = Server::initialized(None);
    for junk in [
        &b"\r\n\r\n"[..],
        b"Content-Length: 7\r\n\r\n{\"a\":\xff}",
        b"Content-Length: 3\r\n\r\n[1]",
        b"Content-Length: no\r\n\r\n",
    ] {
        server.raw(junk);
    }
    server.send(&hover(7));
    let mut refusals = 0;
    loop {
        let message = server.receive();
        if message["id"] == 7 {
            assert!(message.get("error").is_none(), "{message}");
            break;
        }
        refusals += i32::from(message["id"].is_null() && message["error"]["code"].is_i64());
    }
    assert_eq!(refusals, 4);
}

#[test]
fn cancelling_under_load_answers_every_request_once() {
    let mut server = Server::initialized(None);
    server.send(&open(
        "crystal a\n  layer 5 nm at 0 eV mass 1 me\n  layer 2 nm at 1 eV mass 1 me\n",
    ));
    for id in 1..=200 {
        server.send(&hover(id));
        if id % 2 == 0 {
            server.send(
                &json!({"jsonrpc": "2.0", "method": "$/cancelRequest", "params": {"id": id}}),
            );
        }
    }
    let mut answered = std::collections::BTreeMap::new();
    while answered.len() < 200 {
        let message = server.receive();
        let Some(id) = message["id"].as_i64() else {
            continue;
        };
        let fine = message.get("result").is_some() || message["error"]["code"] == -32800;
        assert!(fine, "{message}");
        assert!(answered.insert(id, ()).is_none(), "{id} was answered twice");
    }
}

#[test]
fn ten_megabytes_are_read_and_edited() {
    let mut text = String::new();
    while text.len() < 10 << 20 {
        text += "# A line of no interest, of which there are very many in this file.\n";
    }
    text += "crystal a\n  nonsense\n";
    let lines = text.matches('\n').count();
    let mut server = Server::initialized(None);
    server.send(&open(&text));
    let lines = u64::try_from(lines).unwrap();
    let published = |version, line| {
        move |message: &Value| {
            message["params"]["version"] == version && unknown(message) == Some(line)
        }
    };
    server.wait(published(1, lines - 1));
    let before = Instant::now();
    let range = json!({"start": {"line": 0, "character": 0}, "end": {"line": 1, "character": 0}});
    server.send(&json!({"jsonrpc": "2.0", "method": "textDocument/didChange", "params": {"textDocument": {"uri": A, "version": 2},
        "contentChanges": [{"range": range, "text": ""}]}}));
    server.wait(published(2, lines - 2));
    assert!(
        before.elapsed() < Duration::from_secs(5),
        "an edit took {:?}",
        before.elapsed()
    );
}
