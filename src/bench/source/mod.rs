//! Where the sweeps of a run come from.
//!
//! A source gives each sweep once, whole, and with the reason why it is taken for whole. What it
//! cannot give it says in words that an operator can act on.

mod event;
mod folder;
mod instrument;
mod trouble;

pub use event::{Event, Proof, Seen, Taken};
pub use folder::Folder;
pub use instrument::Instrument;
pub use trouble::Trouble;

use std::time::Duration;

/// Where the sweeps of a run come from.
pub trait Source {
    /// What it is, to stand in a sentence: `the folder D:/sweeps`.
    fn place(&self) -> String;

    /// The operator has placed a part or a standard and wants it measured; `stem` is for example
    /// `017`, `017~2` or `jig-03`. An instrument is triggered; a folder has nothing to do.
    ///
    /// # Errors
    /// A measurement cannot be started now.
    fn begin(&mut self, stem: &str) -> Result<(), Trouble>;

    /// The operator has changed their mind: nothing of the measurement that was begun comes any more.
    fn cancel(&mut self);

    /// Waits at most `wait` for what comes next.
    ///
    /// # Errors
    /// The measurement that was begun failed; the source can be used further.
    fn next(&mut self, wait: Duration) -> Result<Event, Trouble>;
}
