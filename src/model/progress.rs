//! How long work tells how far it is, without knowing who watches.

/// Receives progress and may ask for an early end. Called from several threads.
pub trait Progress: Sync {
    /// A phase begins; `total` is its predicted size in `unit`, where it can be predicted.
    fn begin(&self, phase: &str, unit: &str, total: Option<u64>);
    /// More of the phase is done.
    fn advance(&self, done: u64);
    /// The phase is over.
    fn end(&self);
    /// Whether the user asked to stop.
    fn interrupted(&self) -> bool;
}

/// Nobody watches and nobody interrupts.
#[derive(Debug, Clone, Copy, Default)]
pub struct Silent;

impl Progress for Silent {
    fn begin(&self, _phase: &str, _unit: &str, _total: Option<u64>) {}
    fn advance(&self, _done: u64) {}
    fn end(&self) {}
    fn interrupted(&self) -> bool {
        false
    }
}
