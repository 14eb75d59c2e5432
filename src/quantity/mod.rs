//! Quantities as people write them (`4.7 µF`, `4u7`, `±10 %`, `18 °C .. 28 °C`) and SI values.
//!
//! One direction each way: text to a finite `f64` in the SI unit of the expected dimension, and a
//! value to text in engineering notation. Nothing here knows what a limit or a capacitor is.

mod code;
mod description;
mod dimension;
mod error;
mod format;
mod free_text;
mod letter;
mod number;
mod parse;
mod rounded;
mod scale;
mod separators;
mod text;
mod tolerance;
mod uncertain;
mod unit;
mod unit_table;
mod window;

pub use code::capacitance_code;
pub use description::find_capacitances;
pub use dimension::Dimension;
pub use error::QuantityError;
pub use format::{NO_VALUE, engineering, frequency_key, shortest};
pub use parse::parse;
pub(crate) use scale::PREFIXES;
pub use scale::{scale, scaled_unit};
pub use tolerance::{Deviation, Tolerance, parse_tolerance};
pub use uncertain::with_uncertainty;
pub use window::parse_window;
