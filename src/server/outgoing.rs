//! What goes to the client: replies, notifications and questions of our own.
//!
//! *Invariant*: sending never waits, and no reply of the client can end the
//! server, whether it was asked for or not.

use std::collections::HashMap;
use std::sync::atomic::{AtomicI64, Ordering};
use std::sync::{Arc, Mutex, PoisonError};

use serde::Serialize;
use serde_json::{Value, json};
use tokio::io::{AsyncWrite, AsyncWriteExt};
use tokio::sync::{mpsc, oneshot};
use tower_lsp::lsp_types::{notification, request};

/// From so many bytes on, messages are not gathered any more before they are written.
const WRITTEN_AT_ONCE: usize = 1 << 20;

/// Something for the writer.
enum Parcel {
    /// A message, its header not yet written.
    Message(Vec<u8>),
    /// Nothing more will come.
    End,
}

/// The sending side; cheap to clone.
#[derive(Clone)]
pub(super) struct Outgoing {
    sender: mpsc::UnboundedSender<Parcel>,
    asked: Arc<Asked>,
}

/// A notification as it is written.
#[derive(Serialize)]
struct Notice<'p, P> {
    jsonrpc: &'static str,
    method: &'static str,
    params: &'p P,
}

/// Our questions that the client has not answered.
#[derive(Default)]
struct Asked {
    next: AtomicI64,
    waiting: Mutex<HashMap<i64, oneshot::Sender<Value>>>,
}

/// The other end of an [`Outgoing`], for [`write_all`].
pub(super) struct Parcels(mpsc::UnboundedReceiver<Parcel>);

impl Outgoing {
    /// A sender and what it sends to.
    pub(super) fn new() -> (Self, Parcels) {
        let (sender, receiver) = mpsc::unbounded_channel();
        let asked = Arc::new(Asked::default());
        (Self { sender, asked }, Parcels(receiver))
    }

    /// Sends a whole message.
    pub(super) fn send(&self, message: &impl Serialize) {
        if let Ok(bytes) = serde_json::to_vec(message) {
            // The receiver is gone only when the session is over.
            let _ = self.sender.send(Parcel::Message(bytes));
        }
    }

    /// Sends a notification.
    pub(super) fn notify<N: notification::Notification>(&self, params: N::Params) {
        self.tell::<N>(&params);
    }

    /// Sends a notification whose parameters are lent: findings may be many.
    pub(super) fn tell<N: notification::Notification>(&self, params: &impl Serialize) {
        self.send(&Notice {
            jsonrpc: "2.0",
            method: N::METHOD,
            params,
        });
    }

    /// Asks the client; `None` where it answers with an error or with something odd.
    pub(super) async fn request<R: request::Request>(
        &self,
        params: R::Params,
    ) -> Option<R::Result> {
        let id = self.asked.next.fetch_add(1, Ordering::Relaxed);
        let (sender, receiver) = oneshot::channel();
        self.waiting().insert(id, sender);
        self.send(&json!({"jsonrpc": "2.0", "id": id, "method": R::METHOD, "params": params}));
        let result = receiver.await.ok()?;
        serde_json::from_value(result).ok()
    }

    /// Asks the client and does not wait for what it says.
    pub(super) fn ask<R: request::Request>(&self, params: R::Params) {
        let id = self.asked.next.fetch_add(1, Ordering::Relaxed);
        self.send(&json!({"jsonrpc": "2.0", "id": id, "method": R::METHOD, "params": params}));
    }

    /// Hands the client's reply to whoever waits for it; others are left alone.
    pub(super) fn answered(&self, reply: &mut Value) {
        let Some(id) = reply.get("id").and_then(Value::as_i64) else {
            return;
        };
        let waiting = self.waiting().remove(&id);
        if let (Some(waiting), Some(result)) = (waiting, reply.get_mut("result")) {
            let _ = waiting.send(result.take());
        }
    }

    /// Tells the writer to stop once all that was sent before is out.
    pub(super) fn end(&self) {
        let _ = self.sender.send(Parcel::End);
    }

    fn waiting(&self) -> std::sync::MutexGuard<'_, HashMap<i64, oneshot::Sender<Value>>> {
        self.asked
            .waiting
            .lock()
            .unwrap_or_else(PoisonError::into_inner)
    }
}

/// Writes messages until the last; an error means that the client is gone.
pub(super) async fn write_all<W: AsyncWrite + Unpin>(
    mut parcels: Parcels,
    mut output: W,
) -> std::io::Result<()> {
    // Each write may cost a change of threads, so all that waits is written at once.
    let mut waiting = Vec::new();
    while let Some(parcel) = parcels.0.recv().await {
        let mut next = Some(parcel);
        let mut last = false;
        while let Some(parcel) = next {
            let Parcel::Message(bytes) = parcel else {
                last = true;
                break;
            };
            let header = format!("Content-Length: {}\r\n\r\n", bytes.len());
            waiting.extend_from_slice(header.as_bytes());
            waiting.extend_from_slice(&bytes);
            next = match waiting.len() < WRITTEN_AT_ONCE {
                true => parcels.0.try_recv().ok(),
                false => None,
            };
        }
        output.write_all(&waiting).await?;
        output.flush().await?;
        waiting.clear();
        waiting.shrink_to(WRITTEN_AT_ONCE);
        if last {
            return Ok(());
        }
    }
    Ok(())
}
