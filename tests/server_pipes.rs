//! Sessions on real pipes with a server that a test may set: it is this very test program, started again.
#![cfg(unix)]
#![allow(clippy::unwrap_used, clippy::indexing_slicing)]

mod server_support;

use std::process::Command;

use crenate::server::{Settings, serve_with};
use serde_json::{Value, json};
use server_support::pipes::{A, Server};
use server_support::random::{Dice, Model, START, batch};
use server_support::{LONG, able, place};

/// Set where the program is to serve.
const SERVE: &str = "CRENATE_TEST_SERVE";

const TERN: &str = "\
material basin
  mass 0.067 me
  edge 0 meV

material wall
  mass 0.092 me
  edge 235 meV

crystal tern
  layer 5.4 nm of basin
  layer 2.6 nm of wall
  require gap 1 >= 20 meV
";

#[test]
#[ignore = "the server that the other tests start"]
fn serving() {
    if std::env::var_os(SERVE).is_none() {
        return;
    }
    let settings = Settings {
        patience: Some(LONG),
        may_panic: true,
        ..Settings::default()
    };
    let runtime = tokio::runtime::Builder::new_multi_thread()
        .worker_threads(2)
        .enable_all()
        .build()
        .unwrap();
    let served = serve_with(tokio::io::stdin(), tokio::io::stdout(), settings);
    let status = runtime.block_on(served);
    std::process::exit(status);
}

/// A server that waits for the bands as long as it takes, and panics when asked to.
fn session() -> Server {
    let mut command = Command::new(std::env::current_exe().unwrap());
    command
        .args(["--exact", "serving", "--ignored", "--nocapture"])
        .env(SERVE, "yes");
    let mut server = Server::start(&mut command, Some("running 1 test"));
    server.greet(None, &able());
    server
}

/// The lowest gap that the hover tells, in meV.
fn gap(server: &mut Server, id: i32, text: &str) -> f64 {
    let (line, character) = place(text, "tern", 0);
    server.hover(id, line, character);
    let reply = server.reply(id);
    let value = reply["result"]["contents"]["value"].as_str();
    let before = value.and_then(|value| value.split(" meV").next());
    let digits = before.and_then(|before| before.rsplit([' ', '*', '\u{a0}', '`', '|']).next());
    digits
        .and_then(|digits| digits.parse().ok())
        .unwrap_or_else(|| panic!("{reply}"))
}

#[test]
fn a_panic_in_a_request_is_an_error_and_leaves_the_state_whole() {
    let mut server = session();
    server.open(1, TERN);
    // By the closed form of two layers a cell: editors/neovim/test/expected.py.
    assert!((gap(&mut server, 1, TERN) - 127.3371).abs() < 0.06);
    let asked = 10..20;
    for id in asked.clone() {
        server.ask(id, "crenate/test/panic", Value::Null);
    }
    let mut open: Vec<i32> = asked.collect();
    while !open.is_empty() {
        let reply = server.wait(|message| message["id"].is_i64());
        assert_eq!(reply["error"]["code"], -32603, "{reply}");
        open.retain(|id| reply["id"] != *id);
    }
    let complaints = server.complaints();
    assert!(complaints.contains("met a fault"), "{complaints}");
    // The document is still there, and edits still count.
    let (line, character) = place(TERN, "5.4", 0);
    let edited = TERN.replace("5.4", "8.4");
    server.change(2, json!([replace(line, character, "8")]));
    assert!((gap(&mut server, 30, &edited) - 82.8358).abs() < 0.06);
    let (line, character) = place(TERN, "of wall", 6);
    server.change(3, json!([replace(line, character, "")]));
    server.findings(3, |codes| codes.contains(&"unknown-name"));
    server.ask(31, "shutdown", Value::Null);
    server.reply(31);
    server.notify("exit", Value::Null);
    assert_eq!(server.status(LONG), 0);
}

/// A change of one character.
fn replace(line: u32, character: u32, text: &str) -> Value {
    json!({"range": {"start": {"line": line, "character": character}, "end": {"line": line, "character": character + 1}}, "text": text})
}

#[test]
fn versions_may_go_back_when_a_document_is_opened_again() {
    let mut server = session();
    server.open(9, &TERN.replace("of wall", "of wal"));
    server.findings(9, |codes| codes.contains(&"unknown-name"));
    server.notify("textDocument/didClose", json!({"textDocument": {"uri": A}}));
    server.open(1, TERN);
    server.findings(1, |codes| !codes.contains(&"unknown-name"));
    let (line, character) = place(TERN, "of wall", 6);
    server.change(2, json!([replace(line, character, "")]));
    server.findings(2, |codes| codes.contains(&"unknown-name"));
    // Opened again without being closed, as some editors do after a crash of their own.
    server.open(1, TERN);
    server.findings(1, |codes| !codes.contains(&"unknown-name"));
}

#[test]
fn edits_out_of_range_are_clamped() {
    let mut server = session();
    server.open(1, TERN);
    let most = u32::MAX;
    let wild = json!({"range": {"start": {"line": 4000, "character": 7}, "end": {"line": most, "character": most}},
        "text": "crystal late\n  nonsense\n"});
    server.change(2, json!([wild]));
    server.findings(2, |codes| codes.contains(&"unknown-statement"));
    let backwards = json!({"range": {"start": {"line": 13, "character": 900}, "end": {"line": 12, "character": 0}}, "text": ""});
    server.change(3, json!([backwards]));
    server.findings(3, |codes| !codes.contains(&"unknown-statement"));
}

/// What is known of the document once all is known: findings, names and tokens.
fn state(server: &mut Server) -> Vec<Value> {
    let methods = [
        "textDocument/diagnostic",
        "textDocument/documentSymbol",
        "textDocument/semanticTokens/full",
    ];
    let mut answers = Vec::new();
    for (id, method) in (1..).zip(methods) {
        server.ask(id, method, json!({"textDocument": {"uri": A}}));
        let reply = server.reply(id);
        assert!(reply.get("result").is_some(), "{reply}");
        answers.push(reply["result"].clone());
    }
    answers
}

#[test]
fn after_random_batches_of_edits_all_is_as_if_freshly_opened() {
    let mut dice = Dice(20_261_201);
    for round in 0..12 {
        let mut edited = session();
        edited.open(1, START);
        let mut model = Model::new(START);
        for version in 2..16 {
            edited.change(version, batch(&mut dice, &mut model));
        }
        let mut fresh = session();
        fresh.open(1, &model.text());
        let (edited, fresh) = (state(&mut edited), state(&mut fresh));
        assert_eq!(edited, fresh, "round {round}, text {:?}", model.text());
    }
}
