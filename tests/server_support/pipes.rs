//! A server process on real pipes.

use std::io::{BufRead, BufReader, Write};
use std::process::{Child, ChildStdin, Command, Stdio};
use std::sync::mpsc::{Receiver, channel};
use std::sync::{Arc, Mutex};
use std::time::{Duration, Instant};

use serde_json::{Value, json};

use super::LONG;

/// The document that most sessions speak of.
pub const A: &str = "file:///models/a.cren";

pub struct Server {
    pub child: Child,
    /// Its standard input, until it is closed.
    pub input: Option<ChildStdin>,
    messages: Receiver<Value>,
    complaints: Arc<Mutex<String>>,
}

impl Server {
    /// `ahead` is the last line that the process writes before it serves, where it writes any.
    pub fn start(command: &mut Command, ahead: Option<&str>) -> Self {
        let mut child = command
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap();
        let input = child.stdin.take();
        let mut output = BufReader::new(child.stdout.take().unwrap());
        let mut line = String::new();
        while ahead.is_some_and(|ahead| line.trim() != ahead) {
            line.clear();
            assert!(output.read_line(&mut line).unwrap() > 0, "no server");
        }
        let (sender, messages) = channel();
        std::thread::spawn(move || {
            while let Some(message) = read(&mut output) {
                if sender.send(message).is_err() {
                    return;
                }
            }
        });
        let complaints = Arc::new(Mutex::new(String::new()));
        let errors = BufReader::new(child.stderr.take().unwrap());
        let heard = Arc::clone(&complaints);
        std::thread::spawn(move || {
            for line in errors.lines().map_while(Result::ok) {
                *heard.lock().unwrap() += &(line + "\n");
            }
        });
        Self {
            child,
            input,
            messages,
            complaints,
        }
    }

    /// A process of the program that is not yet initialised.
    pub fn program() -> Self {
        let mut command = Command::new(env!("CARGO_BIN_EXE_crenate"));
        Self::start(command.args(["serve", "--stdio"]), None)
    }

    /// One that is, by a client of no abilities.
    pub fn initialized(process: Option<u32>) -> Self {
        let mut server = Self::program();
        server.greet(process, &json!({}));
        server
    }

    pub fn greet(&mut self, process: Option<u32>, capabilities: &Value) {
        self.send(&initialize(process, capabilities));
        assert_eq!(self.receive()["id"], 0);
        self.notify("initialized", json!({}));
    }

    pub fn raw(&mut self, bytes: &[u8]) {
        let input = self.input.as_mut().unwrap();
        input.write_all(bytes).unwrap();
        input.flush().unwrap();
    }

    pub fn send(&mut self, message: &Value) {
        self.raw(framed(message).as_bytes());
    }

    pub fn notify(&mut self, method: &str, params: Value) {
        self.send(&json!({"jsonrpc": "2.0", "method": method, "params": params}));
    }

    pub fn ask(&mut self, id: i32, method: &str, params: Value) {
        self.send(&json!({"jsonrpc": "2.0", "id": id, "method": method, "params": params}));
    }

    /// The answer to a question of this number.
    pub fn reply(&self, id: i32) -> Value {
        self.wait(|message| message["id"] == id && message.get("method").is_none())
    }

    pub fn receive(&self) -> Value {
        self.messages
            .recv_timeout(LONG)
            .unwrap_or_else(|_| panic!("the server is silent; it said: {}", self.complaints()))
    }

    pub fn wait(&self, wanted: impl Fn(&Value) -> bool) -> Value {
        loop {
            let message = self.receive();
            if wanted(&message) {
                return message;
            }
        }
    }

    pub fn open(&mut self, version: i32, text: &str) {
        let document = json!({"uri": A, "languageId": "crenate", "version": version, "text": text});
        self.notify("textDocument/didOpen", json!({"textDocument": document}));
    }

    pub fn change(&mut self, version: i32, changes: Value) {
        let document = json!({"uri": A, "version": version});
        self.notify(
            "textDocument/didChange",
            json!({"textDocument": document, "contentChanges": changes}),
        );
    }

    /// Asks for the hover at a place of the document.
    pub fn hover(&mut self, id: i32, line: u32, character: u32) {
        self.ask(
            id,
            "textDocument/hover",
            json!({"textDocument": {"uri": A}, "position": {"line": line, "character": character}}),
        );
    }

    /// The codes of the findings of a version, once they are as wanted.
    pub fn findings(&self, version: i32, wanted: impl Fn(&[&str]) -> bool) {
        self.wait(|message| {
            let here = message["method"] == "textDocument/publishDiagnostics"
                && message["params"]["version"] == version;
            let all = message["params"]["diagnostics"].as_array();
            let codes = |all: &Vec<Value>| {
                let codes = all.iter().filter_map(|finding| finding["code"].as_str());
                wanted(&codes.collect::<Vec<_>>())
            };
            here && all.is_some_and(codes)
        });
    }

    /// What it wrote to standard error so far.
    pub fn complaints(&self) -> String {
        self.complaints.lock().unwrap().clone()
    }

    /// The exit status of a process that ends within this time.
    pub fn status(&mut self, within: Duration) -> i32 {
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

pub fn framed(message: &Value) -> String {
    let body = message.to_string();
    format!("Content-Length: {}\r\n\r\n{body}", body.len())
}

pub fn initialize(process: Option<u32>, capabilities: &Value) -> Value {
    json!({"jsonrpc": "2.0", "id": 0, "method": "initialize", "params": {"processId": process, "capabilities": capabilities}})
}
