//! Where the switching rules stand, in words: the same for every command.

use super::text::wrapped;
use crate::lot::{ClassState, Switching};

/// The severity in force and why, once for the classes of which the same is true.
pub fn states(switching: &Switching) -> String {
    let mut said: Vec<(String, Vec<&str>)> = Vec::new();
    for (name, state) in &switching.classes {
        let words = format!("{}: {}", severity(state), state.why);
        match said.iter_mut().find(|(other, _)| *other == words) {
            Some((_, names)) => names.push(name),
            None => said.push((words, vec![name])),
        }
    }
    said.iter()
        .map(|(words, names)| {
            let classes = if names.len() == 1 { "class" } else { "classes" };
            let line = format!("{classes} {}, {words}", names.join(", "));
            wrapped(&line, "  ", "    ")
        })
        .collect()
}

/// Whose lots were looked at, how many, and where that leads.
pub fn screen(switching: &Switching, supplier: Option<&str>) -> String {
    let of = match supplier {
        Some(supplier) => format!("Lots from {supplier}"),
        None => "Lots that name no supplier (see --supplier)".to_owned(),
    };
    let lots = match switching.history.len() {
        0 => "none recorded yet".to_owned(),
        1 => "one record looked at".to_owned(),
        many => format!("{many} records looked at"),
    };
    let heading = wrapped(&format!("{of}: {lots}"), "", "  ");
    format!("\n{heading}{}", states(switching))
}

fn severity(state: &ClassState) -> String {
    if state.discontinued {
        "inspection discontinued".to_owned()
    } else {
        format!("{} inspection", state.severity)
    }
}
