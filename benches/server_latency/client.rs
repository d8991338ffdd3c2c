//! An editor on the pipes of a language server, with a clock.

use std::io::{BufRead, BufReader, Read, Write};
use std::process::{Child, ChildStdin, ChildStdout, Command, Stdio};
use std::time::{Duration, Instant};

use serde_json::{Value, json};

use super::samples::Sample;

/// From sending a change to its first findings, its findings with the new verdict, and its hover.
pub type Times = [Option<Duration>; 3];

/// A server and the one file that is open in it.
pub struct Client<'s> {
    sample: &'s Sample,
    child: Child,
    input: ChildStdin,
    output: BufReader<ChildStdout>,
    version: i32,
    /// How many characters each typed number has now.
    lengths: Vec<usize>,
}

impl<'s> Client<'s> {
    /// Starts a server and opens the file; how long it took until all is known.
    pub fn open(command: &[String], sample: &'s Sample) -> (Self, Duration) {
        let (program, arguments) = command.split_first().expect("a command");
        let mut child = Command::new(program)
            .args(arguments)
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(Stdio::null())
            .spawn()
            .unwrap_or_else(|error| panic!("{program} does not start: {error}"));
        let input = child.stdin.take().unwrap();
        let output = BufReader::new(child.stdout.take().unwrap());
        let mut client = Self {
            sample,
            child,
            input,
            output,
            version: 1,
            lengths: vec![sample.fraction.len() + 1; sample.digits.len()],
        };
        client.greet();
        let start = Instant::now();
        client.notify(
            "textDocument/didOpen",
            &json!({"textDocument": {"uri": sample.uri, "languageId": sample.language, "version": 1, "text": sample.text}}),
        );
        client.settle();
        (client, start.elapsed())
    }

    fn greet(&mut self) {
        let folder = "file:///bench";
        let capabilities =
            json!({"textDocument": {"publishDiagnostics": {"versionSupport": true}, "hover": {}}});
        self.send(
            &json!({"jsonrpc": "2.0", "id": 0, "method": "initialize", "params": {
            "processId": null, "rootUri": folder, "capabilities": capabilities,
            "workspaceFolders": [{"uri": folder, "name": "bench"}]}}),
        );
        while self.read().0["id"] != 0 {}
        self.notify("initialized", &json!({}));
    }

    /// Waits for the first findings, and for a hover that holds what it must: a server may answer early without.
    fn settle(&mut self) {
        while !self.next_is_findings() {}
        for id in 1_000_000.. {
            let Some((above, character)) = self.sample.hover else {
                return;
            };
            self.hover(id, self.sample.digits[0].0 - above, character);
            let reply = loop {
                let (message, _) = self.read();
                if message["id"] == id && message.get("method").is_none() {
                    break message;
                }
            };
            if self.tells(&reply) {
                return;
            }
        }
    }

    fn next_is_findings(&mut self) -> bool {
        let (message, _) = self.read();
        message["method"] == "textDocument/publishDiagnostics"
            && message["params"]["version"] == self.version
    }

    /// Types the digit of this index, or with `fresh` a whole number that never stood there; returns once all that is
    /// measured has come.
    pub fn edit(&mut self, index: usize, wrong: bool, fresh: bool) -> Times {
        let (line, character) = self.sample.digits[index];
        let digit = if wrong {
            self.sample.wrong
        } else {
            self.sample.sound
        };
        self.version += 1;
        let version = self.version;
        let (mut text, mut length) = (digit.to_owned(), 1);
        if fresh {
            text = format!("{digit}{}{version:07}", self.sample.fraction);
            length = std::mem::replace(&mut self.lengths[index], text.len());
        }
        let range = json!({"start": {"line": line, "character": character}, "end": {"line": line, "character": character + length}});
        let change = json!({"textDocument": {"uri": self.sample.uri, "version": version}, "contentChanges": [{"range": range, "text": text}]});
        let start = Instant::now();
        self.notify("textDocument/didChange", &change);
        if let Some((above, character)) = self.sample.hover {
            self.hover(version, line - above, character);
        }
        let mut times: Times = [None; 3];
        while times[1].is_none() || times[2].is_none() && self.sample.hover.is_some() {
            let (message, at) = self.read();
            let now = at - start;
            if message["id"] == version && message.get("method").is_none() {
                assert!(self.tells(&message), "{message}");
                times[2] = Some(now);
            } else if message["params"]["version"] == version {
                times[0].get_or_insert(now);
                if self.found(&message, line) == wrong {
                    times[1].get_or_insert(now);
                }
            }
        }
        times
    }

    /// Whether published findings hold the one that the digit brings.
    fn found(&self, message: &Value, line: usize) -> bool {
        let near = line..=line + self.sample.reach;
        let mut all = message["params"]["diagnostics"].as_array().unwrap().iter();
        all.any(|finding| {
            let at = finding["range"]["start"]["line"].as_u64().unwrap() as usize;
            near.contains(&at) && finding["code"] == self.sample.code
        })
    }

    fn tells(&self, reply: &Value) -> bool {
        let text = reply["result"]["contents"]["value"].as_str();
        text.is_some_and(|text| text.contains(self.sample.hovered))
    }

    fn hover(&mut self, id: i32, line: usize, character: usize) {
        let params = json!({"textDocument": {"uri": self.sample.uri}, "position": {"line": line, "character": character}});
        self.send(
            &json!({"jsonrpc": "2.0", "id": id, "method": "textDocument/hover", "params": params}),
        );
    }

    fn notify(&mut self, method: &str, params: &Value) {
        self.send(&json!({"jsonrpc": "2.0", "method": method, "params": params}));
    }

    fn send(&mut self, message: &Value) {
        let body = message.to_string();
        let message = format!("Content-Length: {}\r\n\r\n{body}", body.len());
        self.input.write_all(message.as_bytes()).unwrap();
        self.input.flush().unwrap();
    }

    /// The next message, and when its last byte was here. A question of the server is answered by what says least.
    fn read(&mut self) -> (Value, Instant) {
        let mut length = 0;
        loop {
            let mut line = String::new();
            let count = self.output.read_line(&mut line).unwrap();
            assert!(count > 0, "the server is gone");
            match line.trim().split_once(": ") {
                Some((name, digits)) if name.eq_ignore_ascii_case("content-length") => {
                    length = digits.parse().unwrap();
                }
                Some(_) => {}
                None => break,
            }
        }
        let mut body = vec![0; length];
        self.output.read_exact(&mut body).unwrap();
        let now = Instant::now();
        let message: Value = serde_json::from_slice(&body).unwrap();
        if message.get("method").is_some() && message.get("id").is_some() {
            let items = message["params"]["items"].as_array();
            let answer = items.map(|items| vec![Value::Null; items.len()]);
            self.send(&json!({"jsonrpc": "2.0", "id": message["id"], "result": answer}));
        }
        (message, now)
    }

    /// Resident memory of the server, in kB.
    pub fn memory(&self) -> u64 {
        let status = std::fs::read_to_string(format!("/proc/{}/status", self.child.id()));
        let status = status.unwrap_or_default();
        let line = status.lines().find(|line| line.starts_with("VmRSS"));
        let number = line.and_then(|line| line.split_whitespace().nth(1));
        number.and_then(|number| number.parse().ok()).unwrap_or(0)
    }
}

impl Drop for Client<'_> {
    fn drop(&mut self) {
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}
