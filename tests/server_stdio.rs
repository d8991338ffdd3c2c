//! The real process on real pipes: how it ends, and what it survives.
#![cfg(unix)]
#![allow(clippy::unwrap_used, clippy::indexing_slicing)]

mod server_support;

use std::io::Write;
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

use serde_json::{Value, json};
use server_support::pipes::{A, Server, framed, initialize};

const SOON: Duration = Duration::from_secs(20);

fn shutdown() -> Value {
    json!({"jsonrpc": "2.0", "id": "bye", "method": "shutdown", "params": null})
}

fn exit() -> Value {
    json!({"jsonrpc": "2.0", "method": "exit", "params": null})
}

fn open(text: &str) -> Value {
    json!({"jsonrpc": "2.0", "method": "textDocument/didOpen", "params": {"textDocument":
        {"uri": A, "languageId": "crenate", "version": 1, "text": text}}})
}

/// The line of the unknown statement among published findings.
fn unknown(published: &Value) -> Option<u64> {
    let findings = published["params"]["diagnostics"].as_array()?;
    let found = findings
        .iter()
        .find(|finding| finding["code"] == "unknown-statement")?;
    found["range"]["start"]["line"].as_u64()
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
    assert_eq!(server.status(SOON), 0);

    let mut server = Server::initialized(None);
    server.send(&exit());
    assert_eq!(server.status(SOON), 1);

    let mut server = Server::program();
    server.send(&exit());
    assert_eq!(server.status(SOON), 1);
}

#[test]
fn the_end_of_input_ends_the_process() {
    let mut server = Server::initialized(None);
    server.input = None;
    assert_eq!(server.status(SOON), 1);

    let mut server = Server::initialized(None);
    server.send(&shutdown());
    server.wait(|message| message["id"] == "bye");
    server.input = None;
    assert_eq!(server.status(SOON), 0);
}

#[test]
fn input_that_ends_within_a_message_ends_the_process() {
    for half in ["Content-Le", "Content-Length: 30\r\n\r\n{\"jsonrpc\":"] {
        let mut server = Server::initialized(None);
        server.raw(half.as_bytes());
        server.input = None;
        assert_eq!(server.status(SOON), 1, "{half:?}");
    }
}

#[test]
fn a_client_that_no_longer_reads_ends_the_process() {
    let mut child = Command::new(env!("CARGO_BIN_EXE_crenate"))
        .arg("serve")
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let mut input = child.stdin.take().unwrap();
    let message = framed(&initialize(None, &json!({})));
    input.write_all(message.as_bytes()).unwrap();
    let end = Instant::now() + SOON;
    let status = loop {
        if let Some(status) = child.try_wait().unwrap() {
            break status;
        }
        if Instant::now() > end {
            child.kill().unwrap();
            panic!("the server goes on");
        }
        std::thread::sleep(Duration::from_millis(10));
    };
    assert_eq!(status.code(), Some(1));
}

#[test]
fn a_server_does_not_outlive_its_parent() {
    let mut parent = Command::new("sleep").arg("600").spawn().unwrap();
    let mut server = Server::initialized(Some(parent.id()));
    parent.kill().unwrap();
    parent.wait().unwrap();
    assert_eq!(server.status(SOON), 1);
}

#[test]
fn a_parent_that_cannot_be_seen_is_not_missed() {
    // Larger than any process number that Linux gives out.
    let mut server = Server::initialized(Some(0x7fff_fffe));
    std::thread::sleep(Duration::from_millis(2500));
    server.hover(1, 0, 0);
    assert_eq!(server.reply(1)["result"], Value::Null);
}

#[test]
fn one_burst_from_the_first_byte_loses_nothing() {
    let mut server = Server::program();
    let burst = framed(&initialize(None, &json!({})))
        + &framed(&json!({"jsonrpc": "2.0", "method": "initialized", "params": {}}))
        + &framed(&open("crystal a\n  nonsense\n"));
    server.raw(burst.as_bytes());
    assert_eq!(server.receive()["id"], 0);
    let published = server.wait(|message| message["method"] == "textDocument/publishDiagnostics");
    assert_eq!(unknown(&published), Some(1), "{published}");
}

#[test]
fn malformed_messages_are_answered_told_and_survived() {
    const UNREADABLE: i64 = -32700;
    const NO_REQUEST: i64 = -32600;
    let body = |body: &str| framed_text(body);
    let deep = "[".repeat(100_000);
    let cases: [(&str, Vec<u8>, i64); 11] = [
        ("no header", b"\r\n\r\n".to_vec(), UNREADABLE),
        (
            "invalid UTF-8",
            b"Content-Length: 7\r\n\r\n{\"a\":\xff}".to_vec(),
            UNREADABLE,
        ),
        (
            "half of an object",
            body("{\"jsonrpc\": \"2.0\", "),
            UNREADABLE,
        ),
        ("no JSON at all", body("hello"), UNREADABLE),
        ("deeply nested", body(&deep), UNREADABLE),
        ("a list", body("[1]"), NO_REQUEST),
        (
            "a batch of two requests",
            body(
                "[{\"jsonrpc\":\"2.0\",\"id\":91,\"method\":\"shutdown\"},{\"jsonrpc\":\"2.0\",\"id\":92,\"method\":\"shutdown\"}]",
            ),
            NO_REQUEST,
        ),
        ("no method", body("{\"jsonrpc\":\"2.0\"}"), NO_REQUEST),
        (
            "a length in words",
            b"Content-Length: no\r\n\r\n".to_vec(),
            UNREADABLE,
        ),
        (
            "a length past all bounds",
            b"Content-Length: 99999999999\r\n\r\n{}".to_vec(),
            UNREADABLE,
        ),
        ("a header without an end", vec![b'x'; 20_000], UNREADABLE),
    ];
    let mut server = Server::initialized(None);
    for (id, (name, bytes, code)) in (1..).zip(cases) {
        let told = server.complaints().lines().count();
        server.raw(&bytes);
        // The header of the next message is where reading starts again.
        server.hover(id, 0, 0);
        let refusal = server.receive();
        assert_eq!(refusal["error"]["code"], code, "{name}: {refusal}");
        assert_eq!(refusal["id"], Value::Null, "{name}: {refusal}");
        let answer = server.receive();
        assert_eq!(answer["id"], id, "{name}: {answer}");
        assert_eq!(answer["result"], Value::Null, "{name}: {answer}");
        if code == UNREADABLE {
            let end = Instant::now() + SOON;
            while server.complaints().lines().count() == told {
                assert!(Instant::now() < end, "{name}: nothing on standard error");
                std::thread::sleep(Duration::from_millis(5));
            }
        }
    }
    assert!(
        server
            .complaints()
            .lines()
            .all(|line| line.starts_with("crenate serve: ")),
        "{}",
        server.complaints()
    );
    server.send(&shutdown());
    server.wait(|message| message["id"] == "bye");
    server.send(&exit());
    assert_eq!(server.status(SOON), 0);
}

fn framed_text(body: &str) -> Vec<u8> {
    format!("Content-Length: {}\r\n\r\n{body}", body.len()).into_bytes()
}

#[test]
fn cancelling_under_load_answers_every_request_once() {
    let mut server = Server::initialized(None);
    server.send(&open(
        "crystal a\n  layer 5 nm at 0 eV mass 1 me\n  layer 2 nm at 1 eV mass 1 me\n",
    ));
    for id in 1..=200 {
        server.hover(id, 0, 0);
        if id % 2 == 0 {
            server.notify("$/cancelRequest", json!({"id": id}));
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
fn three_hundred_unanswered_questions_and_their_late_answers_block_nothing() {
    let cache = tempfile::tempdir().unwrap();
    let mut server = Server::start(
        Command::new(env!("CARGO_BIN_EXE_crenate"))
            .arg("serve")
            .env("XDG_CACHE_HOME", cache.path()),
        None,
    );
    server.greet(
        None,
        &json!({"window": {"showDocument": {"support": true}}}),
    );
    server.open(
        1,
        "crystal a\n  layer 5 nm at 0 eV mass 1 me\n  layer 2 nm at 1 eV mass 1 me\n",
    );
    // Each drawing ends in a question to the client, which keeps silent.
    let order = json!({"command": "crenate.draw", "arguments": [{"uri": A, "crystal": "a"}]});
    for id in 1..=300 {
        server.ask(id, "workspace/executeCommand", order.clone());
    }
    let (mut questions, mut drawn) = (Vec::new(), 0);
    while questions.len() < 300 || drawn < 300 {
        let message = server.receive();
        if message["method"] == "window/showDocument" {
            questions.push(message["id"].clone());
        } else if message["id"].is_i64() {
            assert!(message["result"].is_string(), "{message}");
            drawn += 1;
        }
    }
    server.hover(1000, 0, 8);
    assert!(server.reply(1000)["result"].is_object());
    // All answers at once, each sent twice, and some to what was never asked; an edit and a request stand behind them.
    let mut replies = String::new();
    for id in questions.iter().chain(&questions) {
        let reply = json!({"jsonrpc": "2.0", "id": id, "result": {"success": true}});
        replies += &framed(&reply);
    }
    replies += &framed(&json!({"jsonrpc": "2.0", "id": 987_654, "result": null}));
    replies +=
        &framed(&json!({"jsonrpc": "2.0", "id": "odd", "error": {"code": 1, "message": ""}}));
    server.raw(replies.as_bytes());
    server.change(2, json!([{"text": "crystal a\n  nonsense\n"}]));
    server.findings(2, |codes| codes.contains(&"unknown-statement"));
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
    server.change(2, json!([{"range": range, "text": ""}]));
    server.wait(published(2, lines - 2));
    assert!(
        before.elapsed() < Duration::from_secs(5),
        "an edit took {:?}",
        before.elapsed()
    );
}
