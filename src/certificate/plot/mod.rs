//! Drawings: axes, traces, histograms, strips, run charts. Geometry only; every number comes from
//! the record or the curves.

pub(super) mod axis;
pub(super) mod histogram;
pub(super) mod limit;
pub(super) mod lot_chart;
pub(super) mod probability;
pub(super) mod run_chart;
pub(super) mod scatter;
pub(super) mod strip;
pub(super) mod trace;
pub(super) mod view;
