//! Watching the process that started the server, so that no server outlives its editor.

use std::time::Duration;

/// How often the parent is looked for.
const INTERVAL: Duration = Duration::from_secs(2);

/// Waits until the process `id` is gone; for ever where there is none to watch.
pub(super) async fn gone(id: Option<u32>) {
    match id {
        Some(id) => {
            while is_alive(id) {
                tokio::time::sleep(INTERVAL).await;
            }
        }
        None => std::future::pending().await,
    }
}

/// Whether a process of this id exists, as far as this can be known.
#[cfg(unix)]
pub(super) fn is_alive(id: u32) -> bool {
    let Some(id) = i32::try_from(id)
        .ok()
        .and_then(rustix::process::Pid::from_raw)
    else {
        return true;
    };
    // "Not permitted" still means that it is there.
    rustix::process::test_kill_process(id) != Err(rustix::io::Errno::SRCH)
}

/// Elsewhere the end of input tells as much.
#[cfg(not(unix))]
pub(super) fn is_alive(_id: u32) -> bool {
    true
}
