//! The operator's run: scan, plan, jig check, measure, tell, end.
//!
//! A run is what its journal says happened ([`event`]); [`run`] makes a state of it and says what comes next;
//! [`operate`] turns what is typed and what arrives into events; [`desk`] judges one sweep; [`plain`] and
//! [`screen`] show. None of these touches a file, the clock or the terminal; [`source`] does, and the command
//! that drives them all.

pub mod cautions;
pub mod command;
pub mod desk;
pub mod draw;
pub mod event;
pub mod intake;
pub mod operate;
pub mod plain;
pub mod run;
pub mod scene;
pub mod screen;
pub mod source;
pub mod tag;
pub mod words;

/// How a message is meant; a word and a mark always say it too.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum Tone {
    Plain,
    Quiet,
    Good,
    Warn,
    Bad,
}

/// One thing said to the operator.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Message {
    pub tone: Tone,
    pub text: String,
}

impl Message {
    fn new(tone: Tone, text: impl Into<String>) -> Message {
        let text = text.into();
        Message { tone, text }
    }

    #[allow(missing_docs)]
    pub fn plain(text: impl Into<String>) -> Message {
        Message::new(Tone::Plain, text)
    }

    #[allow(missing_docs)]
    pub fn quiet(text: impl Into<String>) -> Message {
        Message::new(Tone::Quiet, text)
    }

    #[allow(missing_docs)]
    pub fn good(text: impl Into<String>) -> Message {
        Message::new(Tone::Good, text)
    }

    #[allow(missing_docs)]
    pub fn warn(text: impl Into<String>) -> Message {
        Message::new(Tone::Warn, text)
    }

    #[allow(missing_docs)]
    pub fn bad(text: impl Into<String>) -> Message {
        Message::new(Tone::Bad, text)
    }
}
