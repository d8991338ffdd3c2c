//! Code lenses, the commands behind them, and pictures.
//!
//! What a command makes is written into the user's cache folder and shown from
//! there, as every editor can open a file.

use std::path::PathBuf;

use serde::{Deserialize, Serialize};
use serde_json::{Value, json};
use tower_lsp::jsonrpc::{Error, ErrorCode, Result};
use tower_lsp::lsp_types::{
    CodeLens, Command, ExecuteCommandParams, MessageType, ShowDocumentParams, ShowMessageParams,
    TextDocumentPositionParams, Url, notification, request,
};

use super::backend::Backend;
use super::cache;
use super::checker::Depth;
use super::scene::Scene;
use crate::report::editor_picture::{OfferSort, crystal_at, offers, picture, scanned};

/// Draws a crystal.
const DRAW: &str = "crenate.draw";
/// Scans a crystal's bands over a named value.
const SCAN: &str = "crenate.scan";

/// The commands that the server carries out.
pub(super) const COMMANDS: [&str; 2] = [DRAW, SCAN];

/// What a command is told.
#[derive(Clone, Debug, Deserialize, Serialize)]
struct Order {
    /// The document.
    uri: Url,
    /// The crystal.
    crystal: String,
    /// The value to vary.
    #[serde(skip_serializing_if = "Option::is_none")]
    name: Option<String>,
}

/// The answer to `crenate/picture`.
#[derive(Debug, Serialize, Deserialize)]
pub(super) struct Picture {
    /// The crystal.
    crystal: String,
    /// The picture.
    svg: String,
}

/// What is offered beside the text.
pub(super) fn lenses(scene: &Scene) -> Option<Vec<CodeLens>> {
    let offers = offers(scene.analysis()?, &scene.path()).into_iter();
    let lenses = offers.map(|offer| {
        let (command, name) = match offer.sort {
            OfferSort::Draw => (DRAW, None),
            OfferSort::Scan(name) => (SCAN, Some(name)),
        };
        let order = Order {
            uri: scene.view.file.uri.clone(),
            crystal: offer.crystal,
            name,
        };
        CodeLens {
            range: scene.range(offer.span),
            command: Some(Command::new(
                offer.title,
                command.to_owned(),
                Some(vec![json!(order)]),
            )),
            data: None,
        }
    });
    Some(lenses.collect())
}

impl Backend {
    /// The picture of the crystal at a position.
    pub(super) async fn picture(
        &self,
        params: TextDocumentPositionParams,
    ) -> Result<Option<Picture>> {
        let position = params.position;
        let made = self.look(
            &params.text_document.uri,
            Some(Depth::Cheap),
            move |scene| {
                let crystal = crystal_at(scene.analysis()?, &scene.path(), scene.offset(position))?;
                Some(drawn(scene, &crystal).map(|svg| Picture { crystal, svg }))
            },
        );
        made.await?.transpose().map_err(failed)
    }

    /// Carries out a command; the answer is the path of the file that it made.
    pub(super) async fn carry_out(&self, params: ExecuteCommandParams) -> Result<Option<Value>> {
        let order = params.arguments.into_iter().next().unwrap_or_default();
        let order: Order = serde_json::from_value(order)
            .map_err(|error| Error::invalid_params(error.to_string()))?;
        let told = order.clone();
        let (ending, made) = match (params.command.as_str(), order.name.clone()) {
            (DRAW, _) => {
                let made = self.look(&order.uri, Some(Depth::Cheap), move |scene| {
                    Some(drawn(scene, &told.crystal))
                });
                ("svg", made.await?)
            }
            (SCAN, Some(name)) => {
                let made = self.look(&order.uri, Some(Depth::Cheap), move |scene| {
                    Some(table(scene, &told.crystal, &name))
                });
                ("txt", made.await?)
            }
            _ => return Err(Error::invalid_params("there is no such command")),
        };
        let Some(text) = made.transpose().map_err(failed)? else {
            return Ok(None);
        };
        let path = kept(&order, ending, &text).map_err(|error| failed(error.to_string()))?;
        self.show(&path);
        Ok(Some(json!(path)))
    }

    /// Has the client show a file, or tells where it is.
    fn show(&self, path: &std::path::Path) {
        let uri = Url::from_file_path(path)
            .ok()
            .filter(|_| self.abilities().show_document);
        match uri {
            Some(uri) => self
                .outgoing
                .ask::<request::ShowDocument>(ShowDocumentParams {
                    external: Some(path.extension().is_some_and(|ending| ending == "svg")),
                    uri,
                    take_focus: Some(true),
                    selection: None,
                }),
            None => self
                .outgoing
                .notify::<notification::ShowMessage>(ShowMessageParams {
                    typ: MessageType::INFO,
                    message: format!("crenate wrote {}", path.display()),
                }),
        }
    }
}

fn drawn(scene: &Scene, crystal: &str) -> std::result::Result<String, String> {
    let overtaken = &scene.view.file.overtaken;
    let analysis = scene.analysis().ok_or("nothing is known of this file")?;
    picture(&scene.analyst, analysis, &scene.path(), crystal, &|| {
        overtaken.is_cancelled()
    })
}

fn table(scene: &Scene, crystal: &str, name: &str) -> std::result::Result<String, String> {
    let analysis = scene.analysis().ok_or("nothing is known of this file")?;
    scanned(
        &scene.analyst,
        &*scene.view.files,
        analysis,
        &scene.path(),
        crystal,
        name,
    )
}

/// Writes what a command made; a later one of the same name takes its place.
fn kept(order: &Order, ending: &str, text: &str) -> std::io::Result<PathBuf> {
    let folder = cache::folder().unwrap_or_else(std::env::temp_dir);
    let name = match &order.name {
        Some(name) => format!("{}-{name}.{ending}", order.crystal),
        None => format!("{}.{ending}", order.crystal),
    };
    let path = folder.join("made").join(name);
    cache::write(&path, text)?;
    Ok(path)
}

/// The request was right and could not be carried out.
fn failed(why: String) -> Error {
    Error {
        code: ErrorCode::ServerError(-32803),
        message: why.into(),
        data: None,
    }
}
