//! The language server: it translates, orders, cancels and publishes, and knows nothing of physics.
mod abilities;
mod frame;
mod log;
mod outgoing;
mod parent;
mod transport;
#[cfg(test)]
mod transport_tests;
