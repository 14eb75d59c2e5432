//! Placed items to the bytes of a PDF: page content by printpdf, then what an archive document
//! needs beside it by lopdf.

mod attach;
mod finish;
mod tags;
mod write;
mod xmp;

pub(super) use attach::Attachment;
pub(super) use finish::{Conformance, Description, Finish, finish};
pub(super) use write::write;
