//! `reelgate bench`: the operator's run, from the scan of the reel to its record and label.

mod feed;
mod folder;
mod front;
mod lot_file;
mod shop;
mod sitting;
mod terminal;

use super::judge::PaperArg;
use super::signing::SigningArgs;
use super::site::Site;
use super::{Context, exit};
use crate::bench::intake::Order;
use crate::diagnostic::printable;
use crate::lot::{LotVerdict, SEED_MAX};
use chrono::{DateTime, FixedOffset};
use front::{Front, Plain};
use shop::Shop;
use sitting::{Over, Sitting, Wishes};
use std::io::IsTerminal;
use std::path::{Path, PathBuf};
use std::sync::mpsc::channel;
use terminal::Screen;

/// Lead an operator through lots: scan, measure, verdict
///
/// Run the same command again to go on with a lot that was not finished.
#[derive(Debug, clap::Args)]
pub struct Args {
    /// Line by line, without a screen: for screen readers; so it is too where there is no terminal
    #[arg(long)]
    plain: bool,
    /// Who measures [default: asked for]
    #[arg(long, value_name = "CODE")]
    operator: Option<String>,
    /// The station [default: asked for]
    #[arg(long, env = "REELGATE_STATION", value_name = "STATION")]
    station: Option<String>,
    /// What the order says: part number
    #[arg(long, value_name = "PART")]
    part: Option<String>,
    /// What the order says: lot number
    #[arg(long, value_name = "LOT")]
    lot: Option<String>,
    /// What the order says: parts on the reel
    #[arg(long, value_name = "N")]
    quantity: Option<u64>,
    /// What the order says: supplier
    #[arg(long, value_name = "CODE")]
    supplier: Option<String>,
    /// Number of the order
    #[arg(long, value_name = "ORDER")]
    order: Option<String>,
    /// Seed that the places along the reel are drawn with [default: drawn, and kept]
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u64).range(0..=SEED_MAX))]
    seed: Option<u64>,
    /// Folder in which lot folders are made [default: lots in the site]
    #[arg(long, value_name = "DIR")]
    lots: Option<PathBuf>,
    /// Ring the terminal's bell with each verdict: once where good, three times where not
    #[arg(long)]
    bell: bool,
    /// Time of everything that happens, RFC 3339 with offset [default: now]
    #[arg(long, env = "REELGATE_NOW", value_name = "TIME", value_parser = DateTime::parse_from_rfc3339)]
    now: Option<DateTime<FixedOffset>>,
    /// Paper of the PDF lot record
    #[arg(long, value_enum, default_value = "a4")]
    paper: PaperArg,
    /// Key that a new ledger begins with [default: one is made]
    #[arg(long, env = "REELGATE_LEDGER_KEY", value_name = "FILE")]
    ledger_key: Option<PathBuf>,
    /// File on another machine or share that gets each new checkpoint
    #[arg(long, env = "REELGATE_WITNESS", value_name = "FILE")]
    witness: Option<PathBuf>,
    #[command(flatten)]
    signing: SigningArgs,
}

/// Leads through lots until the operator leaves; the exit status is that of the worst lot, as with `judge`.
pub fn run(args: &Args, context: &mut Context) -> u8 {
    let site = Site::new(&context.site);
    // Paths are shown to people: no `./` in front of them.
    let root = if context.site == Path::new(".") {
        PathBuf::new()
    } else {
        context.site.clone()
    };
    let shop = Shop {
        root: root.clone(),
        site,
        lots: args.lots.clone().unwrap_or_else(|| root.join("lots")),
        fixed: args.now,
        key: args.ledger_key.clone(),
        witness: args.witness.clone(),
        signing: args.signing.clone(),
    };
    let (door, come) = channel();
    let on_terminal = std::io::stdin().is_terminal() && std::io::stdout().is_terminal();
    let over = if args.plain || !on_terminal {
        feed::lines(door.clone());
        let mut front = Plain::new(context.out, args.bell);
        sit(args, &shop, &mut front, (door, come))
    } else {
        match Screen::open(colour(), args.bell) {
            Ok(mut front) => {
                feed::terminal(door.clone());
                let over = sit(args, &shop, &mut front, (door, come));
                front.close();
                over
            }
            Err(error) => Over::Failed(format!(
                "the terminal cannot be used ({error}): try --plain"
            )),
        }
    };
    match over {
        Over::Left(verdicts) => status(&verdicts),
        Over::Paused(text) => {
            if !args.plain && on_terminal {
                let _ = writeln!(context.out, "{text}");
            }
            exit::PAUSED
        }
        Over::Failed(why) => {
            let lines: Vec<String> = why.lines().map(printable).collect();
            let _ = writeln!(context.err, "error: {}", lines.join("\n"));
            exit::FAILED
        }
    }
}

type Channel = (
    std::sync::mpsc::Sender<front::In>,
    std::sync::mpsc::Receiver<front::In>,
);

fn sit(args: &Args, shop: &Shop, front: &mut dyn Front, (door, come): Channel) -> Over {
    let wishes = Wishes {
        order: Order {
            part: args.part.clone(),
            lot: args.lot.clone(),
            quantity: args.quantity,
            supplier: args.supplier.clone(),
            order: args.order.clone(),
        },
        operator: args.operator.clone(),
        station: args.station.clone(),
        seed: args.seed,
        paper: args.paper.into(),
    };
    let mut sitting = Sitting {
        shop,
        wishes,
        front,
        come,
        door,
        verdicts: Vec::new(),
    };
    sitting.run()
}

/// NO_COLOR, set to anything, forbids colours.
fn colour() -> bool {
    std::env::var_os("NO_COLOR").is_none_or(|v| v.is_empty())
}

fn status(verdicts: &[LotVerdict]) -> u8 {
    if verdicts.contains(&LotVerdict::Reject) {
        exit::REJECT
    } else if verdicts.contains(&LotVerdict::Hold) {
        exit::HOLD
    } else {
        exit::OK
    }
}
