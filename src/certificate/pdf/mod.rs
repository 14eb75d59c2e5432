//! Placed items to the bytes of a PDF: fonts and the tree of pages by printpdf, what an archive
//! document needs beside them as objects of lopdf. What there is much of is written here: the
//! content of the pages (`content`) and the file (`file`).

mod attach;
mod content;
mod file;
mod finish;
pub(super) mod object;
mod tags;
mod write;
mod xmp;

pub(super) use attach::Attachment;
pub(super) use finish::{Conformance, Description, Finish, finish};
pub(super) use write::write;
