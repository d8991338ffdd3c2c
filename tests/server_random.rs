//! Random batches of edits: the server's text and findings are those of a fresh session with the text
//! that a naive model of the protocol gives.
#![allow(clippy::unwrap_used, clippy::indexing_slicing)]

mod server_support;

use crenate::server::Settings;
use serde_json::{Value, json};
use server_support::random::{Dice, Model, START, batch};
use server_support::{Client, LONG, able};

const A: &str = "file:///models/a.cren";

/// What is known of the document once all is known: findings, names and tokens.
async fn state(client: &mut Client) -> [Value; 3] {
    let document = json!({"textDocument": {"uri": A}});
    let mut state = [Value::Null, Value::Null, Value::Null];
    let methods = [
        "textDocument/diagnostic",
        "textDocument/documentSymbol",
        "textDocument/semanticTokens/full",
    ];
    for (slot, method) in state.iter_mut().zip(methods) {
        let reply = client.request(method, document.clone()).await;
        assert!(reply.get("result").is_some(), "{reply}");
        *slot = reply["result"].clone();
    }
    state
}

async fn session() -> Client {
    let settings = Settings {
        patience: Some(LONG),
        ..Settings::default()
    };
    Client::with(able(), &[], settings).await
}

#[tokio::test(flavor = "multi_thread")]
async fn after_any_edits_all_is_as_if_freshly_opened() {
    let mut dice = Dice(20_260_101);
    for round in 0..80 {
        let mut edited = session().await;
        edited.open(A, 1, START).await;
        let mut model = Model::new(START);
        for version in 2..10 {
            edited
                .change(A, version, batch(&mut dice, &mut model))
                .await;
        }
        let mut fresh = session().await;
        fresh.open(A, 1, &model.text()).await;
        let (edited, fresh) = (state(&mut edited).await, state(&mut fresh).await);
        for (edited, fresh) in edited.iter().zip(&fresh) {
            assert_eq!(edited, fresh, "round {round}, text {:?}", model.text());
        }
    }
}
