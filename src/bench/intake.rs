//! From the scan to the identity of the lot: what is still missing is asked for, what contradicts is said.

use super::words;
use super::{Message, Tone};
use crate::diagnostic::file_name::fault_of;
use crate::diagnostic::is_hidden;
use crate::label::{self, Expected, Found, Label};
use crate::limits::Limits;
use chrono::NaiveDate;

/// What the order says the reel is; what is not known is not compared.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Order {
    pub part: Option<String>,
    pub lot: Option<String>,
    pub quantity: Option<u64>,
    pub supplier: Option<String>,
    pub order: Option<String>,
}

/// What the site knows.
pub trait Known {
    /// Part numbers that have a limit file.
    fn parts(&self) -> Vec<String>;
    /// The limit file of a part, where it is valid; a sentence where it is not.
    #[allow(missing_docs)]
    fn limits(&self, part: &str) -> Result<Limits, String>;
    /// Stations that have a file.
    fn stations(&self) -> Vec<String>;
    /// How the lot was judged before, in words: record, verdict, day.
    fn judged(&self, lot: &str) -> Vec<String>;
    /// Whether a run of the lot was begun and not ended.
    fn unfinished(&self, lot: &str) -> bool;
    /// The day on which the lot is measured.
    fn today(&self) -> NaiveDate;
}

/// What is known of the reel.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Identity {
    pub lot: String,
    pub part: String,
    pub quantity: u64,
    pub supplier: Option<String>,
    pub date_code: Option<String>,
    pub order: Option<String>,
    pub label: Option<String>,
    pub scans: Vec<String>,
    pub operator: String,
    pub station: String,
}

/// What is asked next.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum Want {
    Operator,
    Station,
    Label,
    Part,
    Lot,
    Quantity,
    DateCode,
    Supplier,
    Order,
    /// A person's word before the run may go on.
    Word(Doubt),
}

/// What a person has to answer for; the lot is held or superseded for it, and the words say so.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum Doubt {
    Label,
    Judged,
    DateCode,
}

/// What came of a line.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum Outcome {
    Want(Want),
    Ready(Box<Identity>),
    /// The lot was begun before: go on with it.
    Resume(String),
}

/// The scan so far.
#[derive(Debug, Clone, Default)]
pub struct Intake {
    order: Order,
    operator: Option<String>,
    station: Option<String>,
    scanned: bool,
    whole: Option<String>,
    scans: Vec<String>,
    label: Option<Label>,
    part: Option<String>,
    lot: Option<String>,
    quantity: Option<u64>,
    /// Asked for and left out, or given.
    date_code: Option<Option<String>>,
    supplier: Option<Option<String>>,
    purchase: Option<Option<String>>,
    settled: Vec<Doubt>,
}

/// The word that a doubt is answered with.
pub const YES: &str = "yes";

impl Intake {
    #[allow(missing_docs)]
    pub fn new(order: Order, operator: Option<String>, station: Option<String>) -> Intake {
        Intake {
            order,
            operator,
            station,
            ..Intake::default()
        }
    }

    /// The lot number, as soon as it is known.
    pub fn lot(&self) -> Option<&str> {
        self.lot.as_deref()
    }

    /// What is understood so far: name and value.
    pub fn fields(&self) -> Vec<(&'static str, String)> {
        let flat = |v: &Option<Option<String>>| v.clone().flatten();
        [
            (words::LOT, self.lot.clone()),
            (words::PART, self.part.clone()),
            (words::QUANTITY, self.quantity.map(|n| n.to_string())),
            (words::DATE_CODE, flat(&self.date_code)),
            (words::SUPPLIER, flat(&self.supplier)),
            (words::ORDER, flat(&self.purchase)),
            (words::OPERATOR, self.operator.clone()),
            (words::STATION, self.station.clone()),
        ]
        .into_iter()
        .filter_map(|(name, value)| Some((name, value?)))
        .collect()
    }

    /// What comes next, and what there is to say of it.
    pub fn next(&self, known: &dyn Known) -> (Outcome, Vec<Message>) {
        let want = |w| (Outcome::Want(w), Vec::new());
        if self.operator.is_none() {
            return want(Want::Operator);
        }
        if self.station.is_none() {
            return want(Want::Station);
        }
        if !self.scanned {
            return want(Want::Label);
        }
        if let Some(lot) = &self.lot
            && known.unfinished(lot)
        {
            return (Outcome::Resume(lot.clone()), Vec::new());
        }
        if let Some(doubt) = self.doubt(known) {
            return (Outcome::Want(Want::Word(doubt.0)), vec![doubt.1]);
        }
        let missing = [
            (self.part.is_none(), Want::Part),
            (self.lot.is_none(), Want::Lot),
            (self.quantity.is_none(), Want::Quantity),
            (self.date_code.is_none(), Want::DateCode),
            (self.supplier.is_none(), Want::Supplier),
            (self.purchase.is_none(), Want::Order),
        ];
        if let Some((_, w)) = missing.iter().find(|(missing, _)| *missing) {
            return want(*w);
        }
        match self.identity() {
            Some(identity) => (Outcome::Ready(Box::new(identity)), Vec::new()),
            None => want(Want::Label),
        }
    }

    fn identity(&self) -> Option<Identity> {
        Some(Identity {
            lot: self.lot.clone()?,
            part: self.part.clone()?,
            quantity: self.quantity?,
            supplier: self.supplier.clone().flatten(),
            date_code: self.date_code.clone().flatten(),
            order: self.purchase.clone().flatten(),
            label: self.whole.clone(),
            scans: self.scans.clone(),
            operator: self.operator.clone()?,
            station: self.station.clone()?,
        })
    }

    /// The first thing that a person has to answer for and has not.
    fn doubt(&self, known: &dyn Known) -> Option<(Doubt, Message)> {
        let open = |d: Doubt| !self.settled.contains(&d);
        if let Some(label) = self.label.as_ref().filter(|l| !l.confirm.is_empty())
            && open(Doubt::Label)
        {
            let all: Vec<&str> = label.confirm.iter().map(|n| n.text.as_str()).collect();
            return Some((
                Doubt::Label,
                Message::warn(words::to_confirm(&all.join("; "))),
            ));
        }
        if let Some(lot) = self.lot.as_ref().filter(|_| open(Doubt::Judged)) {
            let before = known.judged(lot);
            if !before.is_empty() {
                return Some((
                    Doubt::Judged,
                    Message::warn(words::judged_before(lot, &before)),
                ));
            }
        }
        let code = self.date_code.as_ref().and_then(Option::as_ref);
        if let (Some(code), Some(part)) = (code.filter(|_| open(Doubt::DateCode)), &self.part) {
            let most = known.limits(part).ok()?.conditions.date_code_age?;
            if let [week] = label::weeks(code).as_slice()
                && let Some(days) = week.days_before(known.today())
                && (days - 6) as f64 * 86_400.0 > most
            {
                let text = words::date_code_old(code, days / 7, most / 604_800.0);
                return Some((Doubt::DateCode, Message::warn(text)));
            }
        }
        None
    }

    /// Takes a line that answers `want`.
    pub fn line(&mut self, want: Want, line: &str, known: &dyn Known) -> Vec<Message> {
        let text = line.trim_matches(['\r', '\n', ' ', '\t']);
        match want {
            Want::Operator => self.name(text, words::OPERATOR, |s, v| s.operator = Some(v)),
            Want::Station => self.station(text, known),
            Want::Word(doubt) => self.word(doubt, text, known),
            Want::Label => self.scan(line, text, known),
            Want::Part | Want::Lot | Want::Quantity => {
                if text.is_empty() {
                    return vec![Message::warn(words::NEEDED)];
                }
                self.field(want, line, text, known)
            }
            Want::DateCode | Want::Supplier | Want::Order => {
                if text.is_empty() {
                    match want {
                        Want::DateCode => self.date_code = Some(None),
                        Want::Supplier => self.supplier = Some(None),
                        _ => self.purchase = Some(None),
                    }
                    return Vec::new();
                }
                self.field(want, line, text, known)
            }
        }
    }

    fn name(&mut self, text: &str, what: &str, set: fn(&mut Intake, String)) -> Vec<Message> {
        match fault_of(text) {
            Some(why) => vec![Message::warn(words::bad_name(what, &why))],
            None => {
                set(self, text.to_owned());
                Vec::new()
            }
        }
    }

    /// A text that names no file.
    fn text(&mut self, text: &str, set: fn(&mut Intake, String)) -> Vec<Message> {
        if text.is_empty() || text.chars().count() > 80 || text.chars().any(is_hidden) {
            return vec![Message::warn(words::NEEDED)];
        }
        set(self, text.to_owned());
        Vec::new()
    }

    fn station(&mut self, text: &str, known: &dyn Known) -> Vec<Message> {
        let all = known.stations();
        if all.iter().any(|s| s == text) {
            self.station = Some(text.to_owned());
            return Vec::new();
        }
        vec![Message::warn(words::unknown_station(
            text,
            &nearest(&all, text),
        ))]
    }

    fn word(&mut self, doubt: Doubt, text: &str, known: &dyn Known) -> Vec<Message> {
        if text.eq_ignore_ascii_case(YES) {
            self.settled.push(doubt);
            return Vec::new();
        }
        self.forget();
        if text.is_empty() {
            return vec![Message::plain(words::ANOTHER_REEL)];
        }
        self.scan(text, text, known)
    }

    /// Begins with the next reel.
    fn forget(&mut self) {
        *self = Intake::new(
            std::mem::take(&mut self.order),
            self.operator.take(),
            self.station.take(),
        );
    }

    /// The first scan of a reel.
    fn scan(&mut self, typed: &str, text: &str, known: &dyn Known) -> Vec<Message> {
        if text.is_empty() {
            return vec![Message::plain(words::SCAN_OR_TYPE)];
        }
        let label = match label::read(text) {
            Ok(label) => label,
            Err(why) if why.kind == label::ErrorKind::Ask => {
                // A bare word: it is asked for where it belongs.
                self.scanned = true;
                self.fill(known);
                return vec![Message::plain(words::WHICH_FIELD)];
            }
            Err(why) => return vec![Message::warn(words::refused(&why.to_string()))],
        };
        let mut said = self.take_label(typed, text, label, known);
        if said.iter().all(|m| m.tone != Tone::Bad) {
            self.scanned = true;
            self.fill(known);
        } else {
            said.push(Message::plain(words::ANOTHER_REEL));
            self.forget();
        }
        said
    }

    /// What the order says need not be asked for.
    fn fill(&mut self, known: &dyn Known) {
        let order = self.order.clone();
        if self.part.is_none()
            && let Some(part) = &order.part
        {
            self.part(part, known);
        }
        self.lot = self.lot.take().or(order.lot);
        self.quantity = self.quantity.or(order.quantity);
        self.supplier = self.supplier.take().or(order.supplier.map(Some));
        self.purchase = self.purchase.take().or(order.order.map(Some));
    }

    /// A label or a single code: what contradicts is said, and nothing of it kept.
    fn take_label(
        &mut self,
        typed: &str,
        text: &str,
        label: Label,
        known: &dyn Known,
    ) -> Vec<Message> {
        let mut said: Vec<Message> = label
            .notes
            .iter()
            .filter(|n| n.code != "trailer_missing" || label.fields.len() > 1)
            .map(|n| Message::quiet(n.text.clone()))
            .collect();
        let contradictions = self.contradictions(&label);
        if !contradictions.is_empty() {
            let all = contradictions.join("; ");
            return vec![Message::bad(words::contradicts(&all))];
        }
        for (what, found) in [(words::LOT, label.lot()), (words::PART, label.part())] {
            if let Found::Several(values) = found {
                return vec![Message::bad(words::several(what, &values.join(", ")))];
            }
        }
        let ahead = |code: &&str| match label::weeks(code).as_slice() {
            [week] => week.days_before(known.today()).is_some_and(|days| days < 0),
            _ => false,
        };
        if let Some(code) = label.date_code().one().filter(ahead) {
            return vec![Message::bad(words::date_code_ahead(code))];
        }
        said.extend(self.keep(&label, known));
        self.scans
            .push(typed.trim_end_matches(['\r', '\n']).to_owned());
        // One message holds the whole label; of several codes each is kept for itself.
        let envelope = label.fields.len() > 1;
        self.whole = (envelope && self.scans.len() == 1).then(|| text.to_owned());
        self.label = Some(label);
        said
    }

    fn contradictions(&self, label: &Label) -> Vec<String> {
        let or = |a: &Option<String>, b: &Option<String>| a.clone().or_else(|| b.clone());
        let part = or(&self.order.part, &self.part);
        let lot = or(&self.order.lot, &self.lot);
        let supplier = or(&self.order.supplier, &self.supplier.clone().flatten());
        let order = or(&self.order.order, &self.purchase.clone().flatten());
        let date_code = self.date_code.clone().flatten();
        let expected = Expected {
            part: part.as_deref(),
            lot: lot.as_deref(),
            quantity: self.order.quantity.or(self.quantity),
            date_code: date_code.as_deref(),
            supplier: supplier.as_deref(),
            order: order.as_deref(),
        };
        label::compare(label, &expected)
            .into_iter()
            .map(|m| words::contradiction(m.field, &m.on_label, &m.expected))
            .collect()
    }

    /// The fields of a label that agrees.
    fn keep(&mut self, label: &Label, known: &dyn Known) -> Vec<Message> {
        let mut said = Vec::new();
        if let Some(code) = label.date_code().one() {
            self.date_code = Some(Some(code.to_owned()));
        }
        if let Some(supplier) = label.supplier().one() {
            self.supplier = Some(Some(supplier.to_owned()));
        }
        if let Some(order) = label.order().one() {
            self.purchase = Some(Some(order.to_owned()));
        }
        match label.quantity() {
            Found::One(n) if n > 0 => self.quantity = Some(n),
            Found::Several(_) | Found::Unreadable(_) | Found::One(_) => {
                said.push(Message::warn(words::QUANTITY_UNCLEAR));
            }
            Found::Absent => {}
        }
        if let Some(lot) = label.lot().one() {
            said.extend(self.name(lot, words::LOT, |s, v| s.lot = Some(v)));
        }
        let numbers: Vec<&str> = label.values("P").chain(label.values("1P")).collect();
        let parts = known.parts();
        match numbers.iter().find(|n| parts.iter().any(|p| p == *n)) {
            Some(number) => said.extend(self.part(number, known)),
            None => {
                if let Some(number) = numbers.first() {
                    said.push(unknown_part(&parts, number));
                }
            }
        }
        said
    }

    fn part(&mut self, number: &str, known: &dyn Known) -> Vec<Message> {
        match known.limits(number) {
            Ok(_) => {
                self.part = Some(number.to_owned());
                Vec::new()
            }
            Err(why) => vec![Message::bad(why)],
        }
    }

    /// A field that was asked for, typed bare or scanned with its identifier; `=` in front says bare.
    fn field(&mut self, want: Want, typed: &str, text: &str, known: &dyn Known) -> Vec<Message> {
        let bare = text.strip_prefix('=');
        if bare.is_none()
            && let Ok(label) = label::read(text)
            && (label.fields.len() > 1 || answers(want, &label))
        {
            return self.take_label(typed, text, label, known);
        }
        let value = bare.unwrap_or(text).trim();
        match want {
            Want::Part => {
                let parts = known.parts();
                if !parts.iter().any(|p| p == value) {
                    return vec![unknown_part(&parts, value)];
                }
                if let Some(wanted) = self.order.part.as_deref().filter(|w| *w != value) {
                    let all = words::contradiction("part", value, wanted);
                    return vec![Message::bad(words::contradicts(&all))];
                }
                self.part(value, known)
            }
            Want::Lot => {
                if let Some(wanted) = self.order.lot.as_deref().filter(|w| *w != value) {
                    let all = words::contradiction("lot", value, wanted);
                    return vec![Message::bad(words::contradicts(&all))];
                }
                self.name(value, words::LOT, |s, v| s.lot = Some(v))
            }
            Want::Quantity => match value.parse::<u64>() {
                Ok(n) if (1..=1_000_000_000).contains(&n) => {
                    self.quantity = Some(n);
                    Vec::new()
                }
                _ => vec![Message::warn(words::QUANTITY_UNCLEAR)],
            },
            Want::DateCode => match label::weeks(value).as_slice() {
                [] => vec![Message::warn(words::date_code_unclear(value))],
                [week] if week.days_before(known.today()).is_some_and(|d| d < 0) => {
                    vec![Message::bad(words::date_code_ahead(value))]
                }
                _ => {
                    self.date_code = Some(Some(value.to_owned()));
                    Vec::new()
                }
            },
            Want::Supplier => self.text(value, |s, v| s.supplier = Some(Some(v))),
            Want::Order => self.text(value, |s, v| s.purchase = Some(Some(v))),
            _ => Vec::new(),
        }
    }
}

/// Whether a code with an identifier answers what was asked.
fn answers(want: Want, label: &Label) -> bool {
    match want {
        Want::Part => label.part() != Found::Absent,
        Want::Lot => label.lot() != Found::Absent,
        Want::Quantity => label.quantity() != Found::Absent,
        Want::DateCode => label.date_code() != Found::Absent,
        Want::Supplier => label.supplier() != Found::Absent,
        Want::Order => label.order() != Found::Absent,
        _ => false,
    }
}

fn unknown_part(parts: &[String], number: &str) -> Message {
    Message::bad(words::unknown_part(number, &nearest(parts, number)))
}

/// Up to three names like the one given, the most like first.
fn nearest(names: &[String], name: &str) -> Vec<String> {
    let mut all: Vec<&String> = names.iter().collect();
    all.sort_by(|a, b| {
        strsim::jaro_winkler(b, name)
            .total_cmp(&strsim::jaro_winkler(a, name))
            .then(a.cmp(b))
    });
    all.into_iter().take(3).cloned().collect()
}
