//! The loop around `LspService`: reads messages, calls the service, writes replies.
//!
//! Every message is handed to the service in the order of arrival and its
//! handler runs up to its first wait before the next message is looked at;
//! what is left of it goes on beside the others. So edits keep their order, a
//! cancellation takes effect at once, and nothing can fill up and block.
//!
//! *Invariant*: neither the client's bytes nor a panic in a handler end the
//! session; only `exit`, the end of input or the end of the parent do.

use std::future::{Future, poll_fn};
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::pin::Pin;
use std::task::{Context, Poll, Waker};
use std::time::Duration;

use serde::Deserialize;
use serde_json::{Value, json};
use tokio::io::{AsyncRead, AsyncReadExt, AsyncWrite};
use tokio::task::JoinSet;
use tower::Service;
use tower_lsp::jsonrpc::{Error, Id, Request, Response};
use tower_lsp::lsp_types::notification::ShowMessage;
use tower_lsp::lsp_types::{
    DidChangeTextDocumentParams, DidCloseTextDocumentParams, DidOpenTextDocumentParams,
    MessageType, ShowMessageParams,
};
use tower_lsp::{ExitedError, LanguageServer, LspService};

use super::frame::{Frame, Framer};
use super::log::log;
use super::outgoing::{Outgoing, Parcels, write_all};
use super::parent;

/// How long the last replies may take to be written once the session is over.
const LAST_WORDS: Duration = Duration::from_secs(1);

type Answer = Pin<Box<dyn Future<Output = Result<Option<Response>, ExitedError>> + Send>>;

/// What happens after a message.
#[derive(Debug, PartialEq, Eq)]
enum Next {
    Read,
    Exit,
}

struct Session<S: LanguageServer> {
    service: LspService<S>,
    outgoing: Outgoing,
    /// Handlers that are still at work.
    tasks: JoinSet<()>,
    framer: Framer,
    shut_down: bool,
    parent: Option<u32>,
}

/// Serves until the session is over; the exit status: 0 after `shutdown`, else 1.
pub(super) async fn serve<S, R, W>(
    service: LspService<S>,
    outgoing: Outgoing,
    parcels: Parcels,
    input: R,
    output: W,
) -> i32
where
    S: LanguageServer,
    R: AsyncRead + Unpin,
    W: AsyncWrite + Unpin + Send + 'static,
{
    let mut writer = tokio::spawn(write_all(parcels, output));
    let mut session = Session {
        service,
        outgoing,
        tasks: JoinSet::new(),
        framer: Framer::default(),
        shut_down: false,
        parent: None,
    };
    tokio::select! {
        () = session.read(input) => {}
        // The client no longer reads, so there is nobody to serve.
        _ = &mut writer => return i32::from(!session.shut_down),
    }
    session.tasks.abort_all();
    session.outgoing.end();
    let _ = tokio::time::timeout(LAST_WORDS, writer).await;
    i32::from(!session.shut_down)
}

impl<S: LanguageServer> Session<S> {
    /// Reads until `exit`, the end of input or the end of the parent.
    async fn read<R: AsyncRead + Unpin>(&mut self, mut input: R) {
        let mut chunk = vec![0; 1 << 16];
        loop {
            let count = tokio::select! {
                count = input.read(&mut chunk) => count.unwrap_or(0),
                () = parent::gone(self.parent) => 0,
            };
            let bytes = chunk.get(..count).unwrap_or_default();
            if bytes.is_empty() {
                return;
            }
            self.framer.push(bytes);
            while let Some(frame) = self.framer.next() {
                if self.take(frame).await == Next::Exit {
                    return;
                }
            }
            while self.tasks.try_join_next().is_some() {}
        }
    }

    async fn take(&mut self, frame: Frame) -> Next {
        let body = match frame {
            Frame::Body(body) => body,
            Frame::Broken(why) => {
                log!("left out bytes that are no message: {why}");
                self.refuse(Value::Null, &Error::parse_error());
                return Next::Read;
            }
        };
        match serde_json::from_slice(&body) {
            Ok(message) => self.handle(message).await,
            Err(error) => {
                log!("a message is not JSON: {error}");
                self.framer.reclaim(&body);
                self.refuse(Value::Null, &Error::parse_error());
                Next::Read
            }
        }
    }

    async fn handle(&mut self, mut message: Value) -> Next {
        let Some(fields) = message.as_object_mut() else {
            // A batch or a bare value: the protocol has neither.
            self.refuse(Value::Null, &Error::invalid_request());
            return Next::Read;
        };
        let method = match fields.get("method") {
            Some(Value::String(method)) => method.clone(),
            Some(_) => String::new(),
            None if fields.contains_key("result") || fields.contains_key("error") => {
                self.outgoing.answered(&mut message);
                return Next::Read;
            }
            None => String::new(),
        };
        if method == "exit" {
            return Next::Exit;
        }
        if method == "shutdown" || fields.get("params").is_some_and(Value::is_null) {
            fields.remove("params");
        }
        if method == "initialize" {
            let id = message.pointer("/params/processId").and_then(Value::as_u64);
            self.parent = id
                .and_then(|id| u32::try_from(id).ok())
                .filter(|&id| parent::is_alive(id));
            mend_diagnostics_ability(&mut message);
        }
        if let Some(why) = misread(&method, &message) {
            self.complain(&method, &why);
            return Next::Read;
        }
        let id = message.get("id").cloned();
        match serde_json::from_value::<Request>(message) {
            Ok(request) if !method.is_empty() => self.call(request, &method).await,
            _ => self.refuse(id.unwrap_or(Value::Null), &Error::invalid_request()),
        }
        Next::Read
    }

    /// Calls the service; all but the first step of a long answer runs beside the reading.
    async fn call(&mut self, request: Request, method: &str) {
        let id = request.id().cloned();
        let called = catch_unwind(AssertUnwindSafe(|| self.service.call(request)));
        let Ok(mut answer) = called else {
            return excuse(&self.outgoing, id);
        };
        if method == "initialize" || method == "shutdown" {
            let response = guard(&mut answer).await;
            self.shut_down |=
                method == "shutdown" && matches!(&response, Ok(Some(response)) if response.is_ok());
            return self.reply(response, id);
        }
        match poll_guarded(&mut answer, &mut Context::from_waker(Waker::noop())) {
            Poll::Ready(response) => self.reply(response, id),
            Poll::Pending => {
                let outgoing = self.outgoing.clone();
                self.tasks.spawn(async move {
                    match guard(&mut answer).await {
                        Ok(Some(response)) => outgoing.send(&response),
                        Ok(None) => {}
                        Err(()) => excuse(&outgoing, id),
                    }
                });
            }
        }
    }

    fn reply(&mut self, response: Result<Option<Response>, ()>, id: Option<Id>) {
        match response {
            Ok(Some(response)) => self.outgoing.send(&response),
            Ok(None) => {}
            Err(()) => excuse(&self.outgoing, id),
        }
    }

    /// A notification has no answer, so an edit that cannot be read would be lost in silence.
    fn complain(&self, method: &str, why: &str) {
        log!("{method} cannot be read: {why}");
        let message = format!("crenate could not read {method} ({why}); reopen the file to go on");
        self.outgoing.notify::<ShowMessage>(ShowMessageParams {
            typ: MessageType::ERROR,
            message,
        });
    }

    fn refuse(&self, id: Value, error: &Error) {
        self.outgoing
            .send(&json!({"jsonrpc": "2.0", "id": id, "error": error}));
    }
}

/// Why the parameters of a notification about a document cannot be read.
fn misread(method: &str, message: &Value) -> Option<String> {
    let params = message.get("params").unwrap_or(&Value::Null);
    let error = match method {
        "textDocument/didOpen" => DidOpenTextDocumentParams::deserialize(params).err(),
        "textDocument/didChange" => DidChangeTextDocumentParams::deserialize(params).err(),
        "textDocument/didClose" => DidCloseTextDocumentParams::deserialize(params).err(),
        _ => None,
    };
    error.map(|error| error.to_string())
}

/// The protocol names a client's ability `workspace.diagnostics`; the types that we read it with, `workspace.diagnostic`.
fn mend_diagnostics_ability(message: &mut Value) {
    let workspace = message.pointer_mut("/params/capabilities/workspace");
    if let Some(Value::Object(workspace)) = workspace {
        if let Some(ability) = workspace.remove("diagnostics") {
            workspace.insert("diagnostic".into(), ability);
        }
    }
}

/// Answers a request whose handler panicked; a notification has no answer.
fn excuse(outgoing: &Outgoing, id: Option<Id>) {
    if let Some(id) = id {
        let mut error = Error::internal_error();
        error.message = "this request met a fault of the server; other work goes on".into();
        outgoing.send(&Response::from_error(id, error));
    }
}

/// Waits for an answer; `Err` where its handler panicked.
async fn guard(answer: &mut Answer) -> Result<Option<Response>, ()> {
    poll_fn(|context| poll_guarded(answer, context)).await
}

fn poll_guarded(
    answer: &mut Answer,
    context: &mut Context<'_>,
) -> Poll<Result<Option<Response>, ()>> {
    match catch_unwind(AssertUnwindSafe(|| answer.as_mut().poll(context))) {
        Ok(Poll::Ready(Ok(response))) => Poll::Ready(Ok(response)),
        Ok(Poll::Ready(Err(_))) => Poll::Ready(Ok(None)),
        Ok(Poll::Pending) => Poll::Pending,
        Err(_) => Poll::Ready(Err(())),
    }
}
