//! A client for sessions in process: it keeps what the server says until somebody asks for it.
#![allow(
    dead_code,
    missing_docs,
    clippy::unwrap_used,
    clippy::indexing_slicing,
    clippy::missing_panics_doc
)]

pub mod pipes;
pub mod random;

use std::collections::VecDeque;
use std::path::Path;
use std::time::Duration;

use crenate::server::{Settings, serve_with};
use serde_json::{Value, json};
use tokio::io::{
    AsyncBufReadExt, AsyncReadExt, AsyncWriteExt, BufReader, DuplexStream, ReadHalf, WriteHalf,
};
use tokio::time::timeout;

/// No answer takes longer than this, even where the bands are solved on a busy machine.
pub const LONG: Duration = Duration::from_secs(60);

pub struct Client {
    input: WriteHalf<DuplexStream>,
    output: BufReader<ReadHalf<DuplexStream>>,
    server: tokio::task::JoinHandle<i32>,
    kept: VecDeque<Value>,
    next: i64,
    /// Questions of the server are answered by null at once.
    pub answers: bool,
}

/// What editors of today can do, UTF-16 positions aside.
pub fn able() -> Value {
    json!({
        "textDocument": {
            "hover": {"contentFormat": ["markdown", "plaintext"]},
            "publishDiagnostics": {"relatedInformation": true, "versionSupport": true, "codeDescriptionSupport": true,
                                   "tagSupport": {"valueSet": [1]}},
            "codeAction": {"codeActionLiteralSupport": {"codeActionKind": {"valueSet": ["quickfix"]}}, "isPreferredSupport": true},
            "documentSymbol": {"hierarchicalDocumentSymbolSupport": true},
            "signatureHelp": {"signatureInformation": {"parameterInformation": {"labelOffsetSupport": true}}}
        },
        "workspace": {
            "workspaceEdit": {"documentChanges": true},
            "didChangeWatchedFiles": {"dynamicRegistration": true},
            "inlayHint": {"refreshSupport": true},
            "workspaceFolders": true
        },
        "window": {"workDoneProgress": true}
    })
}

impl Client {
    pub fn start(settings: Settings) -> Self {
        let (near, far) = tokio::io::duplex(1 << 16);
        let (reader, writer) = tokio::io::split(far);
        let server = tokio::spawn(serve_with(reader, writer, settings));
        let (output, input) = tokio::io::split(near);
        Self {
            input,
            output: BufReader::new(output),
            server,
            kept: VecDeque::new(),
            next: 1,
            answers: true,
        }
    }

    /// A session with a client of these abilities and folders.
    pub async fn with(capabilities: Value, folders: &[&Path], settings: Settings) -> Self {
        let mut client = Self::start(settings);
        let folder = |path: &&Path| json!({"uri": uri(path), "name": "folder"});
        let folders: Vec<Value> = folders.iter().map(folder).collect();
        let params = json!({"processId": null, "rootUri": null, "capabilities": capabilities, "workspaceFolders": folders});
        let reply = client.request("initialize", params).await;
        assert!(reply["result"]["capabilities"].is_object(), "{reply}");
        client.notify("initialized", json!({})).await;
        client
    }

    pub async fn new() -> Self {
        Self::with(able(), &[], Settings::default()).await
    }

    pub async fn send(&mut self, message: &Value) {
        let body = message.to_string();
        let text = format!("Content-Length: {}\r\n\r\n{body}", body.len());
        self.input.write_all(text.as_bytes()).await.unwrap();
    }

    pub async fn notify(&mut self, method: &str, params: Value) {
        self.send(&json!({"jsonrpc": "2.0", "method": method, "params": params}))
            .await;
    }

    /// Sends a request and gives its number.
    pub async fn ask(&mut self, method: &str, params: Value) -> i64 {
        let id = self.next;
        self.next += 1;
        self.send(&json!({"jsonrpc": "2.0", "id": id, "method": method, "params": params}))
            .await;
        id
    }

    pub async fn request(&mut self, method: &str, params: Value) -> Value {
        let id = self.ask(method, params).await;
        self.reply(id).await
    }

    pub async fn reply(&mut self, id: i64) -> Value {
        self.wait(|message| message["id"] == id && message.get("method").is_none())
            .await
    }

    /// The first message, kept or to come, that is wanted; all others stay kept.
    pub async fn wait(&mut self, wanted: impl Fn(&Value) -> bool) -> Value {
        let mut seen = 0;
        loop {
            if let Some(index) = self.kept.iter().skip(seen).position(&wanted) {
                return self.kept.remove(seen + index).unwrap();
            }
            seen = self.kept.len();
            let message = timeout(LONG, self.read())
                .await
                .unwrap_or_else(|_| panic!("silence; kept: {:?}", self.kept));
            self.kept.push_back(message);
        }
    }

    /// Whether such a message comes within a while.
    pub async fn comes(&mut self, within: Duration, wanted: impl Fn(&Value) -> bool) -> bool {
        timeout(within, self.wait(wanted)).await.is_ok()
    }

    async fn read(&mut self) -> Value {
        let mut length = 0;
        loop {
            let mut line = String::new();
            let count = self.output.read_line(&mut line).await.unwrap();
            assert!(count > 0, "the server is gone; kept: {:?}", self.kept);
            match line.trim().strip_prefix("Content-Length: ") {
                Some(digits) => length = digits.parse().unwrap(),
                None => break,
            }
        }
        let mut body = vec![0; length];
        self.output.read_exact(&mut body).await.unwrap();
        let message: Value = serde_json::from_slice(&body).unwrap();
        if self.answers && message.get("method").is_some() && message.get("id").is_some() {
            self.send(&json!({"jsonrpc": "2.0", "id": message["id"], "result": null}))
                .await;
        }
        message
    }

    pub async fn open(&mut self, uri: &str, version: i32, text: &str) {
        let document =
            json!({"uri": uri, "languageId": "crenate", "version": version, "text": text});
        self.notify("textDocument/didOpen", json!({"textDocument": document}))
            .await;
    }

    pub async fn change(&mut self, uri: &str, version: i32, changes: Value) {
        let document = json!({"uri": uri, "version": version});
        self.notify(
            "textDocument/didChange",
            json!({"textDocument": document, "contentChanges": changes}),
        )
        .await;
    }

    pub async fn close(&mut self, uri: &str) {
        self.notify(
            "textDocument/didClose",
            json!({"textDocument": {"uri": uri}}),
        )
        .await;
    }

    /// The next findings of a document in this version.
    pub async fn findings(&mut self, uri: &str, version: i32) -> Vec<Value> {
        let wanted = |message: &Value| {
            message["method"] == "textDocument/publishDiagnostics"
                && message["params"]["uri"] == uri
                && message["params"]["version"] == version
        };
        let message = self.wait(wanted).await;
        message["params"]["diagnostics"].as_array().unwrap().clone()
    }

    /// What a feature answers at a position.
    pub async fn at(&mut self, method: &str, uri: &str, line: u32, character: u32) -> Value {
        let params = json!({"textDocument": {"uri": uri}, "position": {"line": line, "character": character}});
        self.request(method, params).await
    }

    /// Ends the session in order; the exit status.
    pub async fn end(mut self) -> i32 {
        let reply = self.request("shutdown", Value::Null).await;
        assert!(reply.get("result").is_some(), "{reply}");
        self.notify("exit", Value::Null).await;
        timeout(LONG, self.server).await.unwrap().unwrap()
    }
}

pub fn uri(path: &Path) -> String {
    format!("file://{}", path.display())
}

/// The rules of some findings, in order.
pub fn rules(findings: &[Value]) -> Vec<String> {
    findings
        .iter()
        .map(|finding| finding["code"].as_str().unwrap().to_owned())
        .collect()
}

/// Line and character of the first `needle` in a text of plain ASCII, `ahead` characters on.
pub fn place(text: &str, needle: &str, ahead: usize) -> (u32, u32) {
    let at = text.find(needle).unwrap_or_else(|| panic!("no {needle:?}")) + ahead;
    let before = &text[..at];
    let line = before.matches('\n').count();
    let column = at - before.rfind('\n').map_or(0, |end| end + 1);
    (u32::try_from(line).unwrap(), u32::try_from(column).unwrap())
}

/// A change of the characters between two positions of one line.
pub fn replace(line: u32, from: u32, to: u32, text: &str) -> Value {
    json!({"range": {"start": {"line": line, "character": from}, "end": {"line": line, "character": to}}, "text": text})
}
