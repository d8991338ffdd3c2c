//! What each feature answers, once through the protocol; the views themselves are tested where they are made.
#![allow(clippy::unwrap_used, clippy::indexing_slicing)]

mod server_support;

use crenate::server::Settings;
use serde_json::{Value, json};
use server_support::{Client, LONG, able, place, rules, uri};

const TEXT: &str = "\
# What the wells are made of.
# Invented.
material basin
  mass 0.067 me
  edge 0 meV

material wall
  mass 0.092 me
  edge 235 meV

crystal tern
  let thick = 5.4 nm
  layer thick of basin
  layer 2.6 nm of wall
  measure line = level 2 at centre - level 1 at centre
  require line <= 320 meV
  require gap 1 >= 20 meV
";

const A: &str = "file:///models/a.cren";

async fn opened(text: &str) -> Client {
    let settings = Settings {
        patience: Some(LONG),
        ..Settings::default()
    };
    let mut client = Client::with(able(), &[], settings).await;
    client.open(A, 1, text).await;
    client
}

/// What `method` answers where `needle` stands.
async fn ask(client: &mut Client, method: &str, needle: &str, ahead: usize) -> Value {
    let (line, character) = place(TEXT, needle, ahead);
    let reply = client.at(method, A, line, character).await;
    assert!(reply.get("result").is_some(), "{reply}");
    reply["result"].clone()
}

async fn of_document(client: &mut Client, method: &str) -> Value {
    let reply = client
        .request(
            method,
            json!({"textDocument": {"uri": A}, "options": {"tabSize": 2, "insertSpaces": true}}),
        )
        .await;
    assert!(reply.get("result").is_some(), "{reply}");
    reply["result"].clone()
}

/// Edits as the changes that carry them out: from the last on, as each counts in the text before all of them.
fn changes(edits: &Value) -> Value {
    let edits = edits.as_array().unwrap().iter().rev();
    edits
        .map(|edit| json!({"range": edit["range"], "text": edit["newText"]}))
        .collect()
}

fn everywhere() -> Value {
    json!({"start": {"line": 0, "character": 0}, "end": {"line": 99, "character": 0}})
}

#[tokio::test]
async fn the_hover_tells_gaps_in_the_form_that_the_client_wants() {
    let mut client = opened(TEXT).await;
    let hover = ask(&mut client, "textDocument/hover", "tern", 0).await;
    assert_eq!(hover["contents"]["kind"], "markdown");
    // The lowest gap by the closed form of two layers a cell: editors/neovim/test/expected.py.
    assert!(
        hover["contents"]["value"]
            .as_str()
            .unwrap()
            .contains("127.3 meV"),
        "{hover}"
    );
    let mut plain = Client::with(
        json!({}),
        &[],
        Settings {
            patience: Some(LONG),
            ..Settings::default()
        },
    )
    .await;
    plain.open(A, 1, TEXT).await;
    let hover = ask(&mut plain, "textDocument/hover", "tern", 0).await;
    assert_eq!(hover["contents"]["kind"], "plaintext");
    assert!(
        !hover["contents"]["value"].as_str().unwrap().contains("**"),
        "{hover}"
    );
}

#[tokio::test]
async fn hints_stand_behind_headings() {
    let mut client = opened(TEXT).await;
    let reply = client
        .request(
            "textDocument/inlayHint",
            json!({"textDocument": {"uri": A}, "range": everywhere()}),
        )
        .await;
    let (line, _) = place(TEXT, "crystal tern", 0);
    let hints = reply["result"].as_array().unwrap();
    let heading = hints
        .iter()
        .find(|hint| hint["position"]["line"] == line)
        .unwrap_or_else(|| panic!("{reply}"));
    assert!(
        heading["label"].as_str().unwrap().contains("127.3"),
        "{heading}"
    );
}

#[tokio::test]
async fn a_fix_carries_its_diagnostic_and_mends_it() {
    let text = TEXT.replace("of wall", "of wal");
    let mut client = opened(&text).await;
    let findings = client.findings(A, 1).await;
    let finding = findings
        .iter()
        .find(|finding| finding["code"] == "unknown-name")
        .unwrap();
    let context = json!({"diagnostics": [finding], "only": ["quickfix"]});
    let params = json!({"textDocument": {"uri": A}, "range": finding["range"], "context": context});
    let reply = client.request("textDocument/codeAction", params).await;
    let actions = reply["result"].as_array().unwrap();
    assert!(
        actions.iter().all(|action| action["kind"] == "quickfix"),
        "{reply}"
    );
    let fix = actions
        .iter()
        .find(|action| action["title"].as_str().unwrap().contains("wall"))
        .unwrap_or_else(|| panic!("{reply}"));
    assert_eq!(fix["diagnostics"][0], *finding);
    let change = &fix["edit"]["documentChanges"][0];
    assert_eq!(
        (
            &change["textDocument"]["uri"],
            &change["textDocument"]["version"]
        ),
        (&json!(A), &json!(1))
    );
    client.change(A, 2, changes(&change["edits"])).await;
    assert!(!rules(&client.findings(A, 2).await).contains(&"unknown-name".to_owned()));
}

#[tokio::test]
async fn completion_and_signatures_know_the_place() {
    let mut client = opened(TEXT).await;
    let items = ask(&mut client, "textDocument/completion", "of wall", 3).await;
    let labels: Vec<&str> = items
        .as_array()
        .unwrap()
        .iter()
        .map(|item| item["label"].as_str().unwrap())
        .collect();
    assert_eq!(labels, ["basin", "wall"]);
    let (line, character) = place(TEXT, "of wall", 3);
    let range = json!({"start": {"line": line, "character": character}, "end": {"line": line, "character": character + 4}});
    assert_eq!(items[0]["textEdit"]["range"], range);
    let help = ask(&mut client, "textDocument/signatureHelp", "of wall", 3).await;
    let active = help["activeParameter"].as_u64().unwrap();
    let form = &help["signatures"][help["activeSignature"].as_u64().unwrap() as usize];
    let label = form["label"].as_str().unwrap();
    let part = &form["parameters"][active as usize]["label"];
    let (from, to) = (
        part[0].as_u64().unwrap() as usize,
        part[1].as_u64().unwrap() as usize,
    );
    assert_eq!(&label[from..to], "MATERIAL");
}

/// While the line is still being written, and for the lattice as it stands: a short axis has no Σ.
#[tokio::test]
async fn completion_names_the_points_of_the_zone() {
    for (axis, has) in [("5 nm", true), ("2 nm", false)] {
        let text = format!(
            "crystal tall\n  mass 1 me\n  lattice body-tetragonal 3 nm axis {axis}\n  require level 1 at \n"
        );
        let mut client = opened(&text).await;
        client.findings(A, 1).await;
        let (line, character) = place(&text, "at ", 3);
        let reply = client
            .at("textDocument/completion", A, line, character)
            .await;
        let items = reply["result"].as_array().unwrap().iter();
        let labels: Vec<&str> = items.map(|item| item["label"].as_str().unwrap()).collect();
        assert!(
            labels.contains(&"centre") && labels.contains(&"P"),
            "{labels:?}"
        );
        assert_eq!(labels.contains(&"Σ"), has, "{labels:?}");
    }
}

#[tokio::test]
async fn names_lead_to_where_they_are_given_and_used() {
    let mut client = opened(TEXT).await;
    let definition = ask(&mut client, "textDocument/definition", "layer thick", 8).await;
    let (line, character) = place(TEXT, "let thick", 4);
    assert_eq!(
        definition["range"]["start"],
        json!({"line": line, "character": character})
    );
    let highlights = ask(
        &mut client,
        "textDocument/documentHighlight",
        "let thick",
        5,
    )
    .await;
    assert_eq!(highlights.as_array().unwrap().len(), 2, "{highlights}");
    let used = ask(&mut client, "textDocument/definition", "require line", 9).await;
    assert_eq!(
        used["range"]["start"]["line"],
        place(TEXT, "measure line", 0).0
    );
}

#[tokio::test]
async fn a_name_is_changed_in_every_file_that_uses_it() {
    let folder = tempfile::tempdir().unwrap();
    let root = folder.path().canonicalize().unwrap();
    let (materials, crystal) = TEXT.split_at(TEXT.find("crystal").unwrap());
    std::fs::write(root.join("parts.cren"), materials).unwrap();
    std::fs::write(
        root.join("closed.cren"),
        format!("use \"parts.cren\"\n{crystal}"),
    )
    .unwrap();
    let mut client = Client::with(able(), &[&root], Settings::default()).await;
    let (parts, user, closed) = (
        uri(&root.join("parts.cren")),
        uri(&root.join("user.cren")),
        uri(&root.join("closed.cren")),
    );
    client.open(&parts, 1, materials).await;
    client
        .open(&user, 5, &format!("use \"parts.cren\"\n{crystal}"))
        .await;
    let (line, character) = place(materials, "wall", 0);
    let here =
        json!({"textDocument": {"uri": parts}, "position": {"line": line, "character": character}});

    let prepared = client
        .request("textDocument/prepareRename", here.clone())
        .await;
    assert_eq!(prepared["result"]["placeholder"], "wall");
    let mut wanted = here.clone();
    wanted["newName"] = json!("fence");
    let reply = client.request("textDocument/rename", wanted.clone()).await;
    let changed: Vec<(&str, &Value, usize)> = reply["result"]["documentChanges"]
        .as_array()
        .unwrap_or_else(|| panic!("{reply}"))
        .iter()
        .map(|change| {
            let document = &change["textDocument"];
            (
                document["uri"].as_str().unwrap(),
                &document["version"],
                change["edits"].as_array().unwrap().len(),
            )
        })
        .collect();
    assert_eq!(
        changed,
        [
            (closed.as_str(), &Value::Null, 1),
            (parts.as_str(), &json!(1), 1),
            (user.as_str(), &json!(5), 1)
        ]
    );

    for refused in ["basin", "two words", "5", ""] {
        wanted["newName"] = json!(refused);
        let reply = client.request("textDocument/rename", wanted.clone()).await;
        assert_eq!(reply["error"]["code"], -32602, "{refused:?}: {reply}");
    }
    let mut uses = here.clone();
    uses["context"] = json!({"includeDeclaration": true});
    let reply = client.request("textDocument/references", uses).await;
    assert_eq!(reply["result"].as_array().unwrap().len(), 3, "{reply}");
    let found = client
        .request("workspace/symbol", json!({"query": "trn"}))
        .await;
    assert_eq!(found["result"].as_array().unwrap().len(), 2, "{found}");
    let link = client
        .request(
            "textDocument/documentLink",
            json!({"textDocument": {"uri": user}}),
        )
        .await;
    assert_eq!(link["result"][0]["target"], parts);
    let definition = client.at("textDocument/definition", &user, 0, 7).await;
    assert_eq!(definition["result"]["uri"], parts);
}

#[tokio::test]
async fn the_shape_of_a_document_is_told() {
    let mut client = opened(TEXT).await;
    let symbols = of_document(&mut client, "textDocument/documentSymbol").await;
    let names: Vec<&str> = symbols
        .as_array()
        .unwrap()
        .iter()
        .map(|symbol| symbol["name"].as_str().unwrap())
        .collect();
    assert_eq!(names, ["basin", "wall", "tern"]);
    assert_eq!(symbols[2]["children"][0]["name"], "thick");
    let folds = of_document(&mut client, "textDocument/foldingRange").await;
    let fold = json!({"startLine": 10, "endLine": 16, "kind": "region"});
    assert!(folds.as_array().unwrap().contains(&fold), "{folds}");
    assert!(
        folds
            .as_array()
            .unwrap()
            .iter()
            .any(|fold| fold["kind"] == "comment"),
        "{folds}"
    );
    let (line, character) = place(TEXT, "2.6", 1);
    let params =
        json!({"textDocument": {"uri": A}, "positions": [{"line": line, "character": character}]});
    let reply = client.request("textDocument/selectionRange", params).await;
    let mut range = &reply["result"][0];
    let mut depth = 0;
    while !range["parent"].is_null() {
        range = &range["parent"];
        depth += 1;
    }
    assert!(depth >= 4, "{reply}");
    let tokens = of_document(&mut client, "textDocument/semanticTokens/full").await;
    let data = tokens["data"].as_array().unwrap();
    assert_eq!(data.len() % 5, 0);
    // The first token is the comment of the first line.
    assert_eq!(data[..3], [json!(0), json!(0), json!(29)]);
}

#[tokio::test]
async fn formatting_gives_edits_of_the_lines_that_change() {
    let mut client = opened(TEXT).await;
    let edits = of_document(&mut client, "textDocument/formatting").await;
    assert!(!edits.as_array().unwrap().is_empty());
    client.change(A, 2, changes(&edits)).await;
    let again = of_document(&mut client, "textDocument/formatting").await;
    assert_eq!(again, json!([]));
}

#[tokio::test]
async fn a_crystal_can_be_drawn_and_its_named_values_scanned() {
    let mut client = opened(TEXT).await;
    let lenses = of_document(&mut client, "textDocument/codeLens").await;
    let titles: Vec<&str> = lenses
        .as_array()
        .unwrap()
        .iter()
        .map(|lens| lens["command"]["title"].as_str().unwrap())
        .collect();
    assert_eq!(titles, ["draw", "scan thick by ±10 %"]);

    let picture = ask(&mut client, "crenate/picture", "crystal tern", 2).await;
    assert_eq!(picture["crystal"], "tern");
    let svg = picture["svg"].as_str().unwrap();
    assert!(
        svg.contains("<svg") && svg.trim_end().ends_with("</svg>"),
        "{svg}"
    );
    assert_eq!(
        ask(&mut client, "crenate/picture", "material wall", 2).await,
        Value::Null
    );

    for (lens, sample) in [(0, "<svg"), (1, "meV")] {
        let reply = client
            .request("workspace/executeCommand", lenses[lens]["command"].clone())
            .await;
        let path = reply["result"]
            .as_str()
            .unwrap_or_else(|| panic!("{reply}"));
        assert!(
            std::fs::read_to_string(path).unwrap().contains(sample),
            "{path}"
        );
        client
            .wait(|message| message["method"] == "window/showMessage")
            .await;
    }
    let mut nothing = lenses[0]["command"].clone();
    nothing["arguments"][0]["crystal"] = json!("nobody");
    let reply = client.request("workspace/executeCommand", nothing).await;
    assert_eq!(reply["error"]["code"], -32803, "{reply}");
}
