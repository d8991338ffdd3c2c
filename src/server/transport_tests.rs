//! Sessions of the transport with a server that does next to nothing.
#![allow(clippy::unwrap_used, clippy::indexing_slicing)]

use std::sync::Mutex;
use std::time::Duration;

use serde_json::{Value, json};
use tokio::io::{
    AsyncBufReadExt, AsyncReadExt, AsyncWriteExt, BufReader, DuplexStream, ReadHalf, WriteHalf,
};
use tower_lsp::jsonrpc::Result;
use tower_lsp::lsp_types::{
    ConfigurationParams, DidOpenTextDocumentParams, Hover, HoverParams, InitializeParams,
    InitializeResult, InitializedParams, request,
};
use tower_lsp::{LanguageServer, LspService};

use super::outgoing::Outgoing;
use super::transport::serve;

/// Answers `wait` never, panics at once or later, and asks the client things.
struct Simple {
    outgoing: Outgoing,
    opened: Mutex<Vec<i32>>,
}

#[tower_lsp::async_trait]
impl LanguageServer for Simple {
    async fn initialize(&self, _: InitializeParams) -> Result<InitializeResult> {
        tokio::time::sleep(Duration::from_millis(20)).await;
        Ok(InitializeResult::default())
    }

    async fn initialized(&self, _: InitializedParams) {}

    async fn shutdown(&self) -> Result<()> {
        Ok(())
    }

    async fn did_open(&self, params: DidOpenTextDocumentParams) {
        self.opened
            .lock()
            .unwrap()
            .push(params.text_document.version);
    }

    async fn hover(&self, _: HoverParams) -> Result<Option<Hover>> {
        std::future::pending().await
    }
}

impl Simple {
    async fn opened(&self) -> Result<Value> {
        Ok(json!(*self.opened.lock().unwrap()))
    }

    async fn panic_at_once(&self) -> Result<Value> {
        panic!("as asked");
    }

    async fn panic_later(&self) -> Result<Value> {
        tokio::task::yield_now().await;
        panic!("as asked");
    }

    async fn ask(&self, item: i64) -> Result<Value> {
        let configuration = ConfigurationParams { items: Vec::new() };
        let answer = self
            .outgoing
            .request::<request::WorkspaceConfiguration>(configuration)
            .await;
        Ok(json!([item, answer]))
    }
}

struct Client {
    input: WriteHalf<DuplexStream>,
    output: BufReader<ReadHalf<DuplexStream>>,
    server: tokio::task::JoinHandle<i32>,
}

impl Client {
    fn start() -> Self {
        let (outgoing, parcels) = Outgoing::new();
        let own = outgoing.clone();
        let (service, _) = LspService::build(|_| Simple {
            outgoing: own,
            opened: Mutex::default(),
        })
        .custom_method("test/opened", Simple::opened)
        .custom_method("test/now", Simple::panic_at_once)
        .custom_method("test/later", Simple::panic_later)
        .custom_method("test/ask", Simple::ask)
        .finish();
        let (near, far) = tokio::io::duplex(1 << 12);
        let (reader, writer) = tokio::io::split(far);
        let server = tokio::spawn(serve(service, outgoing, parcels, reader, writer));
        let (output, input) = tokio::io::split(near);
        Self {
            input,
            output: BufReader::new(output),
            server,
        }
    }

    async fn started() -> Self {
        let mut client = Self::start();
        client.send(&json!({"jsonrpc": "2.0", "id": 0, "method": "initialize", "params": {"capabilities": {}}})).await;
        assert_eq!(client.read().await["id"], 0);
        client
    }

    async fn raw(&mut self, bytes: &[u8]) {
        self.input.write_all(bytes).await.unwrap();
    }

    async fn send(&mut self, message: &Value) {
        self.raw(framed(message).as_bytes()).await;
    }

    async fn read(&mut self) -> Value {
        let read = async {
            let mut length = 0;
            loop {
                let mut line = String::new();
                self.output.read_line(&mut line).await.unwrap();
                match line.trim().strip_prefix("Content-Length: ") {
                    Some(digits) => length = digits.parse().unwrap(),
                    None => break,
                }
            }
            let mut body = vec![0; length];
            self.output.read_exact(&mut body).await.unwrap();
            serde_json::from_slice(&body).unwrap()
        };
        tokio::time::timeout(Duration::from_secs(10), read)
            .await
            .expect("the server is silent")
    }

    async fn request(&mut self, id: i64, method: &str, params: Value) -> Value {
        self.send(&json!({"jsonrpc": "2.0", "id": id, "method": method, "params": params}))
            .await;
        self.read().await
    }

    async fn status(self) -> i32 {
        tokio::time::timeout(Duration::from_secs(10), self.server)
            .await
            .expect("the server goes on")
            .unwrap()
    }
}

fn framed(message: &Value) -> String {
    let body = message.to_string();
    format!("Content-Length: {}\r\n\r\n{body}", body.len())
}

fn open(version: i32) -> Value {
    json!({"jsonrpc": "2.0", "method": "textDocument/didOpen", "params": {"textDocument":
        {"uri": "file:///a.cren", "languageId": "crenate", "version": version, "text": ""}}})
}

#[tokio::test]
async fn a_burst_before_the_first_answer_loses_nothing() {
    let mut client = Client::start();
    let burst = framed(
        &json!({"jsonrpc": "2.0", "id": 0, "method": "initialize", "params": {"capabilities": {}}}),
    ) + &framed(&json!({"jsonrpc": "2.0", "method": "initialized", "params": {}}))
        + &framed(&open(1))
        + &framed(&open(2));
    client.raw(burst.as_bytes()).await;
    assert_eq!(client.read().await["id"], 0);
    let opened = client.request(1, "test/opened", Value::Null).await;
    assert_eq!(opened["result"], json!([1, 2]));
}

#[tokio::test]
async fn exit_status_tells_whether_shutdown_came_first() {
    let exit = json!({"jsonrpc": "2.0", "method": "exit"});
    let mut client = Client::started().await;
    client.send(&exit).await;
    assert_eq!(client.status().await, 1);

    let mut client = Client::started().await;
    assert_eq!(
        client.request(1, "shutdown", Value::Null).await["result"],
        Value::Null
    );
    let late = client.request(2, "test/opened", Value::Null).await;
    assert_eq!(late["error"]["code"], -32600);
    client.send(&exit).await;
    assert_eq!(client.status().await, 0);
}

#[tokio::test]
async fn end_of_input_ends_the_session() {
    let client = Client::started().await;
    let Client {
        mut input, server, ..
    } = client;
    input.shutdown().await.unwrap();
    drop(input);
    let status = tokio::time::timeout(Duration::from_secs(10), server)
        .await
        .unwrap()
        .unwrap();
    assert_eq!(status, 1);
}

#[tokio::test]
async fn broken_messages_are_answered_and_survived() {
    let mut client = Client::started().await;
    let bodies: [(&[u8], i64); 6] = [
        (b"{\"json\":,}", -32700),
        (b"\"\xff\xfe\"", -32700),
        (b"[]", -32600),
        (b"7", -32600),
        (b"{\"jsonrpc\":\"2.0\"", -32700),
        (b"{\"id\":4,\"method\":[]}", -32600),
    ];
    let mut broken = vec![(b"Content-Length: x\r\n\r\n".to_vec(), -32700)];
    for (body, code) in bodies {
        let header = format!("Content-Length: {}\r\n\r\n", body.len());
        broken.push(([header.as_bytes(), body].concat(), code));
    }
    for (bytes, code) in broken {
        client.raw(&bytes).await;
        client
            .send(&json!({"jsonrpc": "2.0", "id": 5, "method": "test/opened"}))
            .await;
        let refusal = client.read().await;
        assert_eq!(
            refusal["error"]["code"],
            code,
            "{refusal} for {:?}",
            String::from_utf8_lossy(&bytes)
        );
        assert_eq!(
            client.read().await["id"],
            5,
            "after {:?}",
            String::from_utf8_lossy(&bytes)
        );
    }
}

#[tokio::test]
async fn a_batch_is_refused_once() {
    let mut client = Client::started().await;
    client.send(&json!([{"jsonrpc": "2.0", "id": 1, "method": "test/opened"}, {"jsonrpc": "2.0", "id": 2, "method": "test/opened"}])).await;
    let refusal = client.read().await;
    assert_eq!(
        (&refusal["id"], &refusal["error"]["code"]),
        (&Value::Null, &json!(-32600))
    );
    assert_eq!(client.request(3, "test/opened", Value::Null).await["id"], 3);
}

#[tokio::test]
async fn unknown_methods_and_bad_parameters_are_errors() {
    let mut client = Client::started().await;
    assert_eq!(
        client.request(1, "test/nothing", Value::Null).await["error"]["code"],
        -32601
    );
    assert_eq!(
        client
            .request(2, "textDocument/hover", json!({"a": 1}))
            .await["error"]["code"],
        -32602
    );
    client
        .send(&json!({"jsonrpc": "2.0", "method": "$/setTrace", "params": {"value": "off"}}))
        .await;
    client
        .send(&json!({"jsonrpc": "2.0", "method": "test/nothing"}))
        .await;
    assert_eq!(client.request(3, "test/opened", Value::Null).await["id"], 3);
}

#[tokio::test]
async fn a_panic_is_an_error_of_that_request_alone() {
    let mut client = Client::started().await;
    client.send(&open(4)).await;
    for (id, method) in [(1, "test/now"), (2, "test/later")] {
        let reply = client.request(id, method, Value::Null).await;
        assert_eq!(
            (&reply["id"], &reply["error"]["code"]),
            (&json!(id), &json!(-32603))
        );
    }
    assert_eq!(
        client.request(3, "test/opened", Value::Null).await["result"],
        json!([4])
    );
}

#[tokio::test]
async fn cancellation_is_heard_behind_a_hundred_waiting_requests() {
    let mut client = Client::started().await;
    let hover =
        json!({"textDocument": {"uri": "file:///a.cren"}, "position": {"line": 0, "character": 0}});
    for id in 1..=100 {
        client.send(&json!({"jsonrpc": "2.0", "id": id, "method": "textDocument/hover", "params": hover})).await;
    }
    client
        .send(&json!({"jsonrpc": "2.0", "method": "$/cancelRequest", "params": {"id": 70}}))
        .await;
    let reply = client.read().await;
    assert_eq!(
        (&reply["id"], &reply["error"]["code"]),
        (&json!(70), &json!(-32800))
    );
}

#[tokio::test]
async fn three_hundred_waiting_questions_do_not_block_the_reader() {
    let mut client = Client::started().await;
    for id in 1..=300 {
        client
            .send(&json!({"jsonrpc": "2.0", "id": id, "method": "test/ask", "params": id}))
            .await;
    }
    assert_eq!(
        client.request(999, "test/opened", Value::Null).await["method"],
        "workspace/configuration"
    );
    let mut questions = vec![0];
    while questions.len() < 300 {
        let message = client.read().await;
        if message["method"] == "workspace/configuration" {
            questions.push(message["id"].as_i64().unwrap());
        } else {
            assert_eq!(message["id"], 999);
        }
    }
    // A reply to a cancelled request, one to nobody and an error must not matter either.
    client
        .send(&json!({"jsonrpc": "2.0", "method": "$/cancelRequest", "params": {"id": 1}}))
        .await;
    client
        .send(&json!({"jsonrpc": "2.0", "id": 7777, "result": []}))
        .await;
    client
        .send(&json!({"jsonrpc": "2.0", "id": "odd", "result": []}))
        .await;
    for id in questions {
        client
            .send(&json!({"jsonrpc": "2.0", "id": id, "result": [id]}))
            .await;
    }
    let mut answered = 0;
    while answered < 300 {
        let message = client.read().await;
        answered += i32::from(message["id"] != 999);
    }
    assert_eq!(
        client.request(1000, "test/opened", Value::Null).await["id"],
        1000
    );
}

#[tokio::test]
async fn an_edit_that_cannot_be_read_is_complained_about() {
    let mut client = Client::started().await;
    let document = json!({"uri": "file:///a.cren", "version": 2});
    let change = json!({"textDocument": document, "contentChanges": [{"newText": "x"}]});
    client
        .send(&json!({"jsonrpc": "2.0", "method": "textDocument/didChange", "params": change}))
        .await;
    let message = client.read().await;
    assert_eq!(message["method"], "window/showMessage");
    assert!(
        message["params"]["message"]
            .as_str()
            .unwrap()
            .contains("textDocument/didChange")
    );
}
