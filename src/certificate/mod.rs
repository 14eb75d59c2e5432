//! The PDF lot record.
