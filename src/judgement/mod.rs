//! Readings against limits: the verdict on each part.
