//! Whole sessions with the language server, in process.
#![allow(clippy::unwrap_used, clippy::indexing_slicing)]

mod server_support;

use std::time::Duration;

use crenate::server::Settings;
use serde_json::{Value, json};
use server_support::{Client, able, place, replace, rules, uri};

/// An eight-nanometre period with a thin wall; nothing to find in it.
const TERN: &str = "\
material basin
  mass 0.067 me
  edge 0 meV

material wall
  mass 0.092 me
  edge 235 meV

crystal tern_8
  layer 5.4 nm of basin
  layer 2.6 nm of wall
  require gap 1 >= 60 meV
";

const A: &str = "file:///models/a.cren";

#[tokio::test]
async fn findings_follow_the_edits_and_vanish_with_the_document() {
    let mut client = Client::new().await;
    client.open(A, 1, &TERN.replace("of wall", "of wal")).await;
    let findings = client.findings(A, 1).await;
    let unknown = findings
        .iter()
        .find(|finding| finding["code"] == "unknown-name")
        .unwrap_or_else(|| panic!("{findings:?}"));
    let (line, character) = place(TERN, "of wall", 3);
    assert_eq!(
        unknown["range"]["start"],
        json!({"line": line, "character": character})
    );
    assert_eq!(
        unknown["range"]["end"],
        json!({"line": line, "character": character + 3})
    );
    assert_eq!(
        (&unknown["severity"], &unknown["source"]),
        (&json!(1), &json!("crenate"))
    );

    client
        .change(
            A,
            2,
            json!([replace(line, character + 3, character + 3, "l")]),
        )
        .await;
    let findings = client.findings(A, 2).await;
    assert!(
        !rules(&findings).contains(&"unknown-name".to_owned()),
        "{findings:?}"
    );

    client.close(A).await;
    let gone = client
        .wait(|message| message["params"]["uri"] == A && message["params"]["version"].is_null())
        .await;
    assert_eq!(gone["params"]["diagnostics"], json!([]));
    assert_eq!(client.end().await, 0);
}

#[tokio::test]
async fn a_missed_target_is_found_and_its_number_follows_an_edit() {
    let mut client = Client::new().await;
    client.open(A, 1, TERN).await;
    let (line, character) = place(TERN, "60 meV", 0);
    client
        .change(
            A,
            2,
            json!([replace(line, character, character + 2, "600")]),
        )
        .await;
    let missed = |message: &Value| {
        message["params"]["diagnostics"]
            .as_array()
            .is_some_and(|all| all.iter().any(|finding| finding["code"] == "target-missed"))
    };
    let message = client.wait(missed).await;
    assert_eq!(message["params"]["version"], 2);
}

#[tokio::test]
async fn related_places_links_and_unused_names_are_told_where_the_client_can_show_them() {
    let text = format!("let idle = 3 nm\n{TERN}  mass 1 me\n  mass 1 me\n");
    let mut client = Client::new().await;
    client.open(A, 1, &text).await;
    let findings = client.findings(A, 1).await;
    let of = |rule: &str| {
        findings
            .iter()
            .find(|finding| finding["code"] == rule)
            .unwrap_or_else(|| panic!("{rule}: {findings:?}"))
    };
    assert_eq!(of("unused-name")["tags"], json!([1]));
    let repeated = of("repeated-statement");
    assert_eq!(repeated["relatedInformation"][0]["location"]["uri"], A);
    let page = repeated["codeDescription"]["href"]
        .as_str()
        .unwrap()
        .strip_prefix("file://")
        .unwrap();
    assert!(
        std::fs::read_to_string(page)
            .unwrap()
            .contains("repeated-statement")
    );

    let mut plain = Client::with(json!({}), &[], Settings::default()).await;
    plain.open(A, 1, &text).await;
    for finding in plain.findings(A, 1).await {
        for extra in ["tags", "relatedInformation", "codeDescription"] {
            assert!(finding.get(extra).is_none(), "{extra} in {finding}");
        }
    }
}

#[tokio::test]
async fn positions_are_counted_as_agreed() {
    let text = "crystal a\n  title \"🙂µ\" of\n";
    for (encodings, agreed, character) in [
        (json!(["utf-8", "utf-16"]), "utf-8", 17),
        (json!(["utf-16"]), "utf-16", 14),
        (Value::Null, "utf-16", 14),
    ] {
        let mut client = Client::start(Settings::default());
        let mut capabilities = able();
        if !encodings.is_null() {
            capabilities["general"] = json!({"positionEncodings": encodings});
        }
        let reply = client
            .request(
                "initialize",
                json!({"processId": null, "capabilities": capabilities}),
            )
            .await;
        assert_eq!(reply["result"]["capabilities"]["positionEncoding"], agreed);
        client.notify("initialized", json!({})).await;
        client.open(A, 1, text).await;
        let findings = client.findings(A, 1).await;
        let unreadable = findings
            .iter()
            .find(|finding| finding["code"] == "unreadable-line")
            .unwrap_or_else(|| panic!("{findings:?}"));
        assert_eq!(
            unreadable["range"]["start"],
            json!({"line": 1, "character": character}),
            "{agreed}"
        );
        // The same place, cut by an edit.
        client
            .change(A, 2, json!([replace(1, character - 1, character + 2, "")]))
            .await;
        let findings = client.findings(A, 2).await;
        assert!(
            !rules(&findings).contains(&"unreadable-line".to_owned()),
            "{findings:?}"
        );
    }
}

#[tokio::test]
async fn files_see_unsaved_buffers_that_they_use_and_the_disk_behind_them() {
    let folder = tempfile::tempdir().unwrap();
    let root = folder.path().canonicalize().unwrap();
    let (materials, crystal) = TERN.split_at(TERN.find("crystal").unwrap());
    std::fs::write(root.join("parts.cren"), materials).unwrap();
    let (parts, user) = (uri(&root.join("parts.cren")), uri(&root.join("user.cren")));
    let mut client = Client::with(able(), &[&root], Settings::default()).await;
    client
        .open(&user, 1, &format!("use \"parts.cren\"\n{crystal}"))
        .await;
    assert_eq!(
        rules(&client.findings(&user, 1).await),
        Vec::<String>::new()
    );

    // The used file is opened and its wall renamed, not saved: the user no longer finds it.
    client.open(&parts, 7, materials).await;
    client.findings(&parts, 7).await;
    let (line, character) = place(materials, "material wall", 9);
    client
        .change(
            &parts,
            8,
            json!([replace(line, character, character + 4, "fence")]),
        )
        .await;
    assert_eq!(
        rules(&client.findings(&user, 1).await),
        ["unknown-name", "target-untestable"]
    );

    // Closed without saving, the disk counts again.
    client.close(&parts).await;
    assert_eq!(
        rules(&client.findings(&user, 1).await),
        Vec::<String>::new()
    );

    // The disk changes, and the client says so.
    std::fs::write(root.join("parts.cren"), materials.replace("wall", "fence")).unwrap();
    client
        .notify(
            "workspace/didChangeWatchedFiles",
            json!({"changes": [{"uri": parts, "type": 2}]}),
        )
        .await;
    assert_eq!(
        rules(&client.findings(&user, 1).await),
        ["unknown-name", "target-untestable"]
    );
}

#[tokio::test]
async fn a_file_outside_every_folder_is_out_of_reach() {
    let (inside, outside) = (tempfile::tempdir().unwrap(), tempfile::tempdir().unwrap());
    std::fs::write(outside.path().join("far.cren"), "let far = 1 nm\n").unwrap();
    let text = format!(
        "use \"../{}/far.cren\"\n",
        outside.path().file_name().unwrap().to_string_lossy()
    );
    let root = inside.path().canonicalize().unwrap();
    let user = uri(&root.join("user.cren"));
    let mut client = Client::with(able(), &[&root], Settings::default()).await;
    client.open(&user, 1, &text).await;
    assert_eq!(rules(&client.findings(&user, 1).await), ["missing-file"]);
    let added = json!({"event": {"added": [{"uri": uri(&outside.path().canonicalize().unwrap()), "name": "far"}], "removed": []}});
    client
        .notify("workspace/didChangeWorkspaceFolders", added)
        .await;
    assert_eq!(
        rules(&client.findings(&user, 1).await),
        Vec::<String>::new()
    );
}

#[tokio::test]
async fn a_folder_named_by_its_path_alone_is_the_workspace() {
    let folder = tempfile::tempdir().unwrap();
    let root = folder.path().canonicalize().unwrap();
    std::fs::create_dir(root.join("deep")).unwrap();
    std::fs::write(root.join("far.cren"), "let far = 1 nm\n").unwrap();
    let user = uri(&root.join("deep/user.cren"));
    let mut client = Client::start(Settings::default());
    let params = json!({"processId": null, "rootPath": root, "capabilities": able()});
    client.request("initialize", params).await;
    client.notify("initialized", json!({})).await;
    client.open(&user, 1, "use \"../far.cren\"\n").await;
    assert_eq!(
        rules(&client.findings(&user, 1).await),
        Vec::<String>::new()
    );
}

#[tokio::test]
async fn watching_is_asked_of_clients_that_can() {
    let mut client = Client::new().await;
    let asked = client
        .wait(|message| message["method"] == "client/registerCapability")
        .await;
    assert_eq!(
        asked["params"]["registrations"][0]["method"],
        "workspace/didChangeWatchedFiles"
    );
    let mut plain = Client::with(json!({}), &[], Settings::default()).await;
    plain.open(A, 1, TERN).await;
    plain.findings(A, 1).await;
    assert!(
        !plain
            .comes(Duration::from_millis(50), |message| message
                .get("id")
                .is_some()
                && message.get("method").is_some())
            .await
    );
}

#[tokio::test]
async fn findings_are_pulled_where_the_client_pulls() {
    let mut capabilities = able();
    capabilities["textDocument"]["diagnostic"] = json!({});
    capabilities["workspace"]["diagnostics"] = json!({"refreshSupport": true});
    let mut client = Client::with(capabilities, &[], Settings::default()).await;
    client.open(A, 1, &TERN.replace("of wall", "of wal")).await;
    let reply = client
        .request(
            "textDocument/diagnostic",
            json!({"textDocument": {"uri": A}}),
        )
        .await;
    let items = reply["result"]["items"].as_array().unwrap().clone();
    assert!(
        rules(&items).contains(&"unknown-name".to_owned()),
        "{reply}"
    );
    assert!(
        !client
            .comes(Duration::from_millis(100), |message| message["method"]
                == "textDocument/publishDiagnostics")
            .await
    );
}

#[tokio::test]
async fn long_work_is_reported_and_can_be_stopped_by_an_edit() {
    let settings = Settings {
        slow_bands: Some(Duration::from_secs(30)),
        ..Settings::default()
    };
    let mut client = Client::with(able(), &[], settings).await;
    client.open(A, 1, TERN).await;
    client.findings(A, 1).await;
    let begun = client
        .wait(|message| message["params"]["value"]["kind"] == "begin")
        .await;
    let hover = client
        .ask(
            "textDocument/hover",
            json!({"textDocument": {"uri": A}, "position": {"line": 8, "character": 9}}),
        )
        .await;
    client.change(A, 2, json!([replace(0, 0, 0, "# \n")])).await;
    assert_eq!(
        client.reply(hover).await["error"]["code"],
        -32801,
        "content modified"
    );
    let token = begun["params"]["token"].clone();
    client
        .wait(|message| {
            message["params"]["value"]["kind"] == "end" && message["params"]["token"] == token
        })
        .await;
    client.findings(A, 2).await;
}

#[tokio::test]
async fn a_request_waits_for_the_bands_only_so_long() {
    let settings = Settings {
        slow_bands: Some(Duration::from_secs(4)),
        ..Settings::default()
    };
    let mut client = Client::with(able(), &[], settings).await;
    client.open(A, 1, TERN).await;
    let range = json!({"start": {"line": 0, "character": 0}, "end": {"line": 99, "character": 0}});
    let params = json!({"textDocument": {"uri": A}, "range": range});
    let early = client
        .request("textDocument/inlayHint", params.clone())
        .await;
    let gaps = |reply: &Value| {
        reply["result"]
            .as_array()
            .unwrap()
            .iter()
            .any(|hint| hint["position"]["line"] == 8)
    };
    assert!(!gaps(&early), "numbers that nobody has computed: {early}");
    client
        .wait(|message| message["method"] == "workspace/inlayHint/refresh")
        .await;
    let late = client.request("textDocument/inlayHint", params).await;
    assert!(gaps(&late), "{late}");
}

/// A square of tubes, whose targets want more than a first answer.
const TUBES: &str = "\
crystal tubes
  mass 10 u
  carriers bosons
  lattice square 500 nm
  recoil 1000 nm
  depth (1,0) = 8 Er
  depth (0,1) = 8 Er
  bands 2
  require gap 1 <= 1 Er
";

#[tokio::test]
async fn a_first_answer_comes_before_the_fine_one_and_an_edit_overtakes_both() {
    let settings = Settings {
        slow_bands: Some(Duration::from_millis(700)),
        ..Settings::default()
    };
    let mut client = Client::with(able(), &[], settings).await;
    client.open(A, 1, TUBES).await;
    let heading = json!({"textDocument": {"uri": A}, "position": {"line": 0, "character": 9}});
    let told = |reply: &Value| reply["result"]["contents"]["value"].to_string();
    let first = told(&client.request("textDocument/hover", heading.clone()).await);
    assert!(
        first.contains("first values") && first.contains("gap 1"),
        "{first}"
    );
    // The target's verdict needs the fine answer, and is waited for.
    let target = json!({"textDocument": {"uri": A}, "position": {"line": 8, "character": 4}});
    let verdict = told(&client.request("textDocument/hover", target).await);
    assert!(verdict.contains("missed"), "{verdict}");
    let fine = told(&client.request("textDocument/hover", heading.clone()).await);
    assert!(
        !fine.contains("first values") && fine.contains("gap 1"),
        "{fine}"
    );
    // An edit makes both stale: what was asked for before it is not answered with old numbers.
    client.change(A, 2, json!([replace(5, 16, 17, "9")])).await;
    let stale = client.ask("textDocument/hover", heading.clone()).await;
    client.change(A, 3, json!([replace(6, 16, 17, "9")])).await;
    assert_eq!(client.reply(stale).await["error"]["code"], -32801);
    let again = told(&client.request("textDocument/hover", heading).await);
    assert!(again.contains("first values"), "{again}");
}

#[tokio::test]
async fn a_fault_in_a_request_leaves_the_state_whole() {
    let settings = Settings {
        may_panic: true,
        ..Settings::default()
    };
    let mut client = Client::with(able(), &[], settings).await;
    client.open(A, 1, TERN).await;
    let reply = client.request("crenate/test/panic", Value::Null).await;
    assert_eq!(reply["error"]["code"], -32603);
    let (line, character) = place(TERN, "of wall", 6);
    client
        .change(A, 2, json!([replace(line, character, character + 1, "")]))
        .await;
    assert!(rules(&client.findings(A, 2).await).contains(&"unknown-name".to_owned()));
}

#[tokio::test]
async fn versions_may_go_back_when_a_document_is_opened_again() {
    let mut client = Client::new().await;
    client.open(A, 9, &TERN.replace("of wall", "of wal")).await;
    assert!(rules(&client.findings(A, 9).await).contains(&"unknown-name".to_owned()));
    client.close(A).await;
    client.open(A, 1, TERN).await;
    assert!(!rules(&client.findings(A, 1).await).contains(&"unknown-name".to_owned()));
}

#[tokio::test]
async fn edits_out_of_range_are_clamped() {
    let mut client = Client::new().await;
    client.open(A, 1, TERN).await;
    let wild = json!({"range": {"start": {"line": 4000, "character": 7}, "end": {"line": 5000, "character": 0}}, "text": "crystal late\n  nonsense\n"});
    client.change(A, 2, json!([wild])).await;
    assert!(rules(&client.findings(A, 2).await).contains(&"unknown-statement".to_owned()));
    let backwards = json!({"range": {"start": {"line": 14, "character": 900}, "end": {"line": 13, "character": 0}}, "text": ""});
    client.change(A, 3, json!([backwards])).await;
    assert!(!rules(&client.findings(A, 3).await).contains(&"unknown-statement".to_owned()));
}

#[tokio::test]
async fn a_name_that_another_file_uses_is_not_idle() {
    let folder = tempfile::tempdir().unwrap();
    let root = folder.path().canonicalize().unwrap();
    let text = format!("let spare = 3 nm\n{TERN}");
    let (shared, user) = (uri(&root.join("shared.cren")), uri(&root.join("user.cren")));
    std::fs::write(root.join("shared.cren"), &text).unwrap();
    let mut client = Client::with(able(), &[&root], Settings::default()).await;
    client.open(&shared, 1, &text).await;
    assert_eq!(rules(&client.findings(&shared, 1).await), ["unused-name"]);
    // An unsaved buffer uses it, and no longer does; then a file on the disk does.
    client.open(&user, 1, "use \"shared.cren\"\n").await;
    assert_eq!(
        rules(&client.findings(&shared, 1).await),
        Vec::<String>::new()
    );
    client
        .change(&user, 2, json!([replace(0, 0, 0, "# ")]))
        .await;
    assert_eq!(rules(&client.findings(&shared, 1).await), ["unused-name"]);
    client.close(&user).await;
    std::fs::write(root.join("user.cren"), "use \"shared.cren\"\n").unwrap();
    client
        .notify(
            "workspace/didChangeWatchedFiles",
            json!({"changes": [{"uri": user, "type": 1}]}),
        )
        .await;
    assert_eq!(
        rules(&client.findings(&shared, 1).await),
        Vec::<String>::new()
    );
}
