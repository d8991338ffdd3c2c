//! The language server: it translates, orders, cancels and publishes, and knows nothing of physics.
//!
//! A message walks through these files: `frame` cuts it off the stream,
//! `transport` hands it to the service in order, `backend` and `protocol` hold the
//! handlers, `owner` and `state` keep the documents, `lane` and `checker` are the workers,
//! and one file a feature words the results for the client.

mod abilities;
mod backend;
mod cache;
mod cancel;
mod capabilities;
mod checker;
mod completion;
mod edits;
mod explanations;
mod files;
mod findings;
mod frame;
mod lane;
mod log;
mod navigation;
mod offers;
mod outgoing;
mod owner;
mod parent;
mod positions;
mod protocol;
mod record;
mod scene;
mod state;
mod structure;
mod symbols;
mod tokens;
mod transport;
#[cfg(test)]
mod transport_tests;
mod views;

use std::process::ExitCode;
use std::time::Duration;

use tokio::io::{AsyncRead, AsyncWrite};
use tower_lsp::LspService;

/// What a test may change about a session.
#[derive(Clone, Debug, Default)]
pub struct Settings {
    /// Lets the bands of every document take this long.
    pub slow_bands: Option<Duration>,
    /// Lets requests wait this long for the bands before they are answered without them.
    pub patience: Option<Duration>,
    /// Answers the request `crenate/test/panic` by a panic.
    pub may_panic: bool,
}

/// Serves on standard input and output until the client is done; 0 after an orderly end, else 1.
#[must_use]
pub fn run() -> ExitCode {
    let runtime = tokio::runtime::Builder::new_multi_thread()
        .worker_threads(2)
        .enable_all()
        .build();
    let runtime = match runtime {
        Ok(runtime) => runtime,
        Err(error) => {
            log::log!("cannot start: {error}");
            return ExitCode::from(2);
        }
    };
    let status = runtime.block_on(serve(tokio::io::stdin(), tokio::io::stdout()));
    // A thread may still wait for input that nobody will send.
    runtime.shutdown_background();
    ExitCode::from(u8::try_from(status).unwrap_or(1))
}

/// Serves one session on any pair of streams; the exit status that it ends with.
pub async fn serve<R, W>(input: R, output: W) -> i32
where
    R: AsyncRead + Unpin,
    W: AsyncWrite + Unpin + Send + 'static,
{
    serve_with(input, output, Settings::default()).await
}

/// Serves one session under settings of a test.
pub async fn serve_with<R, W>(input: R, output: W, settings: Settings) -> i32
where
    R: AsyncRead + Unpin,
    W: AsyncWrite + Unpin + Send + 'static,
{
    let (outgoing, parcels) = outgoing::Outgoing::new();
    let backend = |_| backend::Backend::new(outgoing.clone(), &settings);
    let mut service = LspService::build(backend);
    if settings.may_panic {
        service = service.custom_method("crenate/test/panic", backend::Backend::panic);
    }
    let (service, _) = service
        .custom_method("crenate/picture", backend::Backend::picture)
        .custom_method(
            "window/workDoneProgress/cancel",
            backend::Backend::stop_work,
        )
        .finish();
    transport::serve(service, outgoing, parcels, input, output).await
}
