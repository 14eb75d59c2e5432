//! Where the sweeps of a run come from: a watched folder, an instrument on the network.

mod folder;
mod instrument;
mod made;
mod simulated;
mod soak;
