//! What a user of the server is promised, feature by feature, on the protocol; see also `server_features` and `server_sessions`.
#![allow(clippy::unwrap_used, clippy::indexing_slicing)]

mod server_support;

use std::time::Duration;

use crenate::server::Settings;
use serde_json::{Value, json};
use server_support::{Client, LONG, able, place, replace, rules, uri};

const A: &str = "file:///models/a.cren";

/// A cell of 8 nm with a thin wall; its lowest gap by the closed form: editors/neovim/test/expected.py.
const TERN: &str = "\
material basin
  mass 0.067 me
  edge 0 meV

material wall
  mass 0.092 me
  edge 235 meV ± 5 meV

crystal tern
  monolayer 0.283 nm
  layer 5.4 nm of basin
  layer 2.6 nm ± 0.14 nm of wall
  waive part-monolayer because \"as grown\"
  filling 2
  require gap 1 >= 120 meV
";

fn patient() -> Settings {
    Settings {
        patience: Some(LONG),
        ..Settings::default()
    }
}

async fn opened(text: &str) -> Client {
    let mut client = Client::with(able(), &[], patient()).await;
    client.open(A, 1, text).await;
    client
}

/// The hover where `needle` stands, `ahead` characters on.
async fn hover(client: &mut Client, text: &str, needle: &str, ahead: usize) -> String {
    let (line, character) = place(text, needle, ahead);
    let reply = client.at("textDocument/hover", A, line, character).await;
    let value = reply["result"]["contents"]["value"].as_str();
    value.unwrap_or_else(|| panic!("{needle}: {reply}")).into()
}

#[tokio::test]
async fn the_hover_speaks_of_whatever_it_is_on() {
    let mut client = opened(TERN).await;
    for (needle, ahead, told) in [
        (
            "crystal tern",
            9,
            &["127.3", "µm", "mass", "mean", "per cell", "━"][..],
        ),
        (
            "5.4 nm",
            0,
            &["Å", "ML", "gap 1", "per nm", "per ML", "per %"],
        ),
        ("2.6 nm", 0, &["per ML", "over its tolerance"]),
        ("layer 5.4", 1, &["19.08 ML", "0.067 me", "basin"]),
        ("of basin", 4, &["material", "used by tern"]),
        ("235 meV", 5, &["THz", "per %", "over its tolerance"]),
        ("filling 2", 2, &["filling"]),
        ("part-monolayer", 2, &["monolayer"]),
        (
            "require",
            2,
            &["margin", "worst", "235 meV ± 5 meV", "2.6 nm ± 0.14 nm"],
        ),
    ] {
        let text = hover(&mut client, TERN, needle, ahead).await;
        for word in told {
            assert!(text.contains(word), "{needle}: no {word:?} in\n{text}");
        }
    }
    let atoms = "crystal swell\n  carriers bosons\n  mass 87 u\n  recoil 840 nm\n  lattice chain 420 nm\n  depth 1 = 12 Er\n";
    let mut client = opened(atoms).await;
    for (needle, ahead, told) in [
        ("crystal swell", 9, &["Er", "kHz"][..]),
        ("recoil 840", 1, &["kHz", "nK"]),
        ("depth 1", 1, &["gap 1", "|V(G)|"]),
    ] {
        let text = hover(&mut client, atoms, needle, ahead).await;
        for word in told {
            assert!(text.contains(word), "{needle}: no {word:?} in\n{text}");
        }
    }
}

#[tokio::test]
async fn hints_tell_gaps_monolayers_and_margins() {
    let mut client = opened(TERN).await;
    let range = json!({"start": {"line": 0, "character": 0}, "end": {"line": 99, "character": 0}});
    let params = json!({"textDocument": {"uri": A}, "range": range});
    let reply = client.request("textDocument/inlayHint", params).await;
    let label = |needle: &str| {
        let line = place(TERN, needle, 0).0;
        let hints = reply["result"].as_array().unwrap().iter();
        let here = hints.filter(|hint| hint["position"]["line"] == line);
        let labels = here.map(|hint| hint["label"].as_str().unwrap().to_owned());
        labels.collect::<Vec<_>>().join(" | ")
    };
    assert!(label("crystal tern").contains("127.3"), "{reply}");
    assert!(label("layer 5.4").contains("19.08 ML"), "{reply}");
    assert!(label("require").contains("127.3 meV"), "{reply}");
}

#[tokio::test]
async fn code_actions_waive_round_name_and_require() {
    let mut client = opened(TERN).await;
    for (needle, ahead, title, kind) in [
        ("5.4 nm", 0, "make it 19 ML", "refactor.rewrite"),
        ("5.4 nm", 0, "name it `", "refactor.extract"),
        (
            "crystal tern",
            9,
            "add `require gap 1 >= ",
            "refactor.rewrite",
        ),
    ] {
        let (line, character) = place(TERN, needle, ahead);
        let at = json!({"line": line, "character": character});
        let params = json!({"textDocument": {"uri": A}, "range": {"start": at, "end": at}, "context": {"diagnostics": []}});
        let reply = client.request("textDocument/codeAction", params).await;
        let found = reply["result"].as_array().unwrap().iter();
        let mut found = found.filter(|action| action["kind"] == kind);
        assert!(
            found.any(|action| action["title"].as_str().unwrap().starts_with(title)),
            "{title}: {reply}"
        );
    }
    let text = TERN.replace("  waive part-monolayer because \"as grown\"\n", "");
    client.open(A, 5, &text).await;
    let finding = |found: &[Value]| {
        let mut found = found.iter();
        found
            .find(|finding| finding["code"] == "part-monolayer")
            .cloned()
    };
    let found = finding(&client.findings(A, 5).await).unwrap();
    let context = json!({"diagnostics": [found], "only": ["quickfix"]});
    let params = json!({"textDocument": {"uri": A}, "range": found["range"], "context": context});
    let reply = client.request("textDocument/codeAction", params).await;
    let mut actions = reply["result"].as_array().unwrap().iter();
    let waive = actions
        .find(|action| action["title"] == "waive part-monolayer here, with a reason")
        .unwrap_or_else(|| panic!("{reply}"));
    let edit = &waive["edit"]["documentChanges"][0]["edits"][0];
    let change = json!([{"range": edit["range"], "text": edit["newText"]}]);
    client.change(A, 6, change).await;
    assert_eq!(finding(&client.findings(A, 6).await), None);
}

#[tokio::test]
async fn completion_follows_the_place() {
    let text = "use \"\"\n\nlet thick = 8 nm\n\nmaterial wall\n  edge 1 \n\ncrystal a\n  lattice \n  layer thick of \n  require \n  waive \n  \n";
    let mut client = opened(text).await;
    for (line, character, wanted, not) in [
        (2, 0, "use", "edge"),
        (5, 9, "meV", "fcc"),
        (8, 10, "fcc", "nm"),
        (9, 17, "wall", "nm"),
        (9, 8, "thick", "fcc"),
        (10, 10, "gap", "fcc"),
        (11, 8, "thin-layer", "gap"),
        (12, 2, "layer", "edge"),
    ] {
        let reply = client
            .at("textDocument/completion", A, line, character)
            .await;
        let items = reply["result"].as_array();
        let items = items.unwrap_or_else(|| panic!("{line}: {reply}")).iter();
        let labels: Vec<&str> = items.map(|item| item["label"].as_str().unwrap()).collect();
        assert!(labels.contains(&wanted), "{line}: {labels:?}");
        assert!(!labels.contains(&not), "{line}: {labels:?}");
    }
    let folder = tempfile::tempdir().unwrap();
    let root = folder.path().canonicalize().unwrap();
    std::fs::write(root.join("parts.cren"), "let far = 1 nm\n").unwrap();
    let mut client = Client::with(able(), &[&root], patient()).await;
    let user = uri(&root.join("user.cren"));
    client
        .open(&user, 1, "use \"par\"\n\ncrystal a\n  layer f\n")
        .await;
    let reply = client.at("textDocument/completion", &user, 0, 8).await;
    assert_eq!(reply["result"][0]["label"], "parts.cren", "{reply}");
}

#[tokio::test]
async fn semantic_tokens_of_a_range_are_those_of_the_whole() {
    let mut client = opened(TERN).await;
    let document = json!({"textDocument": {"uri": A}});
    let whole = client
        .request("textDocument/semanticTokens/full", document)
        .await;
    let range = json!({"start": {"line": 8, "character": 0}, "end": {"line": 9, "character": 0}});
    let part = client
        .request(
            "textDocument/semanticTokens/range",
            json!({"textDocument": {"uri": A}, "range": range}),
        )
        .await;
    // Line, character, length, type and modifiers of each token, from the differences that the protocol sends.
    let places = |reply: &Value| {
        let data = reply["result"]["data"].as_array().unwrap();
        let numbers: Vec<u64> = data.iter().map(|number| number.as_u64().unwrap()).collect();
        let (mut line, mut character) = (0, 0);
        let mut tokens = Vec::new();
        for token in numbers.chunks(5) {
            character = if token[0] == 0 {
                character + token[1]
            } else {
                token[1]
            };
            line += token[0];
            tokens.push((line, character, token[2], token[3], token[4]));
        }
        tokens
    };
    let mut heading = places(&whole);
    heading.retain(|token| token.0 == 8);
    assert_eq!(heading.len(), 2, "{whole}");
    assert_eq!(places(&part), heading);
}

#[tokio::test]
async fn pulled_findings_are_asked_for_again_when_another_file_changes_them() {
    let mut capabilities = able();
    capabilities["textDocument"]["diagnostic"] = json!({});
    capabilities["workspace"]["diagnostics"] = json!({"refreshSupport": true});
    let folder = tempfile::tempdir().unwrap();
    let root = folder.path().canonicalize().unwrap();
    let (materials, crystal) = TERN.split_at(TERN.find("crystal").unwrap());
    let (parts, user) = (uri(&root.join("parts.cren")), uri(&root.join("user.cren")));
    let mut client = Client::with(capabilities, &[&root], patient()).await;
    client.open(&parts, 1, materials).await;
    client
        .open(&user, 1, &format!("use \"parts.cren\"\n{crystal}"))
        .await;
    let pull = json!({"textDocument": {"uri": user}});
    let reply = client
        .request("textDocument/diagnostic", pull.clone())
        .await;
    assert_eq!(reply["result"]["items"], json!([]));
    let (line, character) = place(materials, "material wall", 9);
    let change = json!([replace(line, character, character + 4, "fence")]);
    client.change(&parts, 2, change).await;
    client
        .wait(|message| message["method"] == "workspace/diagnostic/refresh")
        .await;
    let reply = client.request("textDocument/diagnostic", pull).await;
    let found = rules(reply["result"]["items"].as_array().unwrap());
    assert!(found.contains(&"unknown-name".to_owned()), "{reply}");
}

#[tokio::test]
async fn several_folders_count_from_the_start_and_until_they_go() {
    let (near, far) = (tempfile::tempdir().unwrap(), tempfile::tempdir().unwrap());
    let (near, far) = (
        near.path().canonicalize().unwrap(),
        far.path().canonicalize().unwrap(),
    );
    std::fs::create_dir_all(&far).unwrap();
    let name = far.file_name().unwrap().to_string_lossy().into_owned();
    std::fs::write(far.join("far.cren"), "let far = 1 nm\n").unwrap();
    let user = uri(&near.join("user.cren"));
    let mut client = Client::with(able(), &[&near, &far], patient()).await;
    client
        .open(&user, 1, &format!("use \"../{name}/far.cren\"\n"))
        .await;
    assert_eq!(
        rules(&client.findings(&user, 1).await),
        Vec::<String>::new()
    );
    let found = client
        .request("workspace/symbol", json!({"query": "far"}))
        .await;
    assert_eq!(found["result"].as_array().unwrap().len(), 1, "{found}");
    let event = json!({"added": [], "removed": [{"uri": uri(&far), "name": "far"}]});
    client
        .notify(
            "workspace/didChangeWorkspaceFolders",
            json!({"event": event}),
        )
        .await;
    assert_eq!(rules(&client.findings(&user, 1).await), ["missing-file"]);
}

#[tokio::test]
async fn a_table_that_changes_on_the_disk_is_read_again() {
    let folder = tempfile::tempdir().unwrap();
    let root = folder.path().canonicalize().unwrap();
    let user = uri(&root.join("user.cren"));
    let mut client = Client::with(able(), &[&root], patient()).await;
    let text = "crystal a\n  lattice chain 2 nm\n  table \"bump.csv\" in nm, meV\n";
    client.open(&user, 1, text).await;
    assert!(rules(&client.findings(&user, 1).await).contains(&"missing-file".to_owned()));
    std::fs::write(root.join("bump.csv"), "0,0\n0.5,10\n1,20\n1.5,10\n").unwrap();
    let changes = json!({"changes": [{"uri": uri(&root.join("bump.csv")), "type": 1}]});
    client
        .notify("workspace/didChangeWatchedFiles", changes)
        .await;
    assert!(!rules(&client.findings(&user, 1).await).contains(&"missing-file".to_owned()));
}

#[tokio::test]
async fn long_work_can_be_stopped_by_its_user() {
    let settings = Settings {
        slow_bands: Some(Duration::from_secs(40)),
        ..Settings::default()
    };
    let mut client = Client::with(able(), &[], settings).await;
    client.open(A, 1, TERN).await;
    let begun = client
        .wait(|message| message["params"]["value"]["kind"] == "begin")
        .await;
    assert_eq!(begun["params"]["value"]["cancellable"], true);
    let token = begun["params"]["token"].clone();
    client
        .notify("window/workDoneProgress/cancel", json!({"token": token}))
        .await;
    let ended = client
        .comes(Duration::from_secs(20), |message| {
            message["params"]["value"]["kind"] == "end" && message["params"]["token"] == token
        })
        .await;
    assert!(ended, "the work goes on");
    // The server answers on.
    let document = json!({"textDocument": {"uri": A}});
    let reply = client
        .request("textDocument/documentSymbol", document)
        .await;
    assert_eq!(reply["result"].as_array().unwrap().len(), 3, "{reply}");
}
