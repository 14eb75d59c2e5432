//! Where the sweeps of a run come from: a watched folder, an instrument on the network.

mod folder;
mod made;
mod soak;
