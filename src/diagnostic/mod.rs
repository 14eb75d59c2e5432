//! What went wrong, where, and what to do: faults of files that people write, and coded notes.
//!
//! `Source` holds the text of one file with its lines; `yaml` reads it into nodes that know where
//! they stand; `yaml::Reader` walks them and collects every `Fault`; `render` shows them.

mod fault;
pub mod file_name;
mod note;
mod printable;
mod render;
mod source;
pub mod yaml;

pub use fault::{Fault, Faults, Quote};
pub use note::Note;
pub use printable::{excerpt, is_hidden, printable, wrap};
pub use render::{as_json, render};
pub use source::{MAX_BYTES, Source, Span};
