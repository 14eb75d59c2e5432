//! What the document says and in which order, for whoever has it read aloud: headings, paragraphs,
//! tables with their heads, drawings with a description (ISO 32000-1, 14.7 and 14.8).
//!
//! Placed items belong to runs; a run belongs to an element. What belongs to none is furniture.

/// What an element is.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Role {
    Document,
    /// 1 a section, 2 within one.
    Heading(u8),
    Paragraph,
    Table,
    Row,
    /// A cell that says what its column or row is.
    Head(Scope),
    Cell,
    /// A drawing, with words for those who cannot see it.
    Figure(String),
}

/// What the head of a table is the head of.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Scope {
    Column,
    Row,
}

impl Role {
    /// Standard structure type (ISO 32000-1, 14.8.4).
    pub fn name(&self) -> &'static str {
        match self {
            Role::Document => "Document",
            Role::Heading(1) => "H1",
            Role::Heading(_) => "H2",
            Role::Paragraph => "P",
            Role::Table => "Table",
            Role::Row => "TR",
            Role::Head(_) => "TH",
            Role::Cell => "TD",
            Role::Figure(_) => "Figure",
        }
    }

    /// Whether it only holds other elements.
    fn groups(&self) -> bool {
        matches!(self, Role::Document | Role::Table | Role::Row)
    }
}

/// What an element holds, in reading order.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Kid {
    Element(usize),
    Run(usize),
}

/// One element.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Element {
    pub role: Role,
    pub parent: Option<usize>,
    pub kids: Vec<Kid>,
}

/// The tree while the document grows.
#[derive(Debug)]
pub(super) struct Structure {
    pub elements: Vec<Element>,
    /// The element of each run.
    pub runs: Vec<usize>,
    /// The element at the cursor; none for furniture.
    current: Option<usize>,
}

impl Default for Structure {
    fn default() -> Self {
        Structure {
            elements: vec![Element {
                role: Role::Document,
                parent: None,
                kids: Vec::new(),
            }],
            runs: Vec::new(),
            current: Some(0),
        }
    }
}

impl Structure {
    /// A new element within the one at the cursor (within the document where that is none).
    pub fn add(&mut self, role: Role) -> usize {
        let parent = self.current.unwrap_or(0);
        let id = self.elements.len();
        self.elements.push(Element {
            role,
            parent: Some(parent),
            kids: Vec::new(),
        });
        if let Some(parent) = self.elements.get_mut(parent) {
            parent.kids.push(Kid::Element(id));
        }
        id
    }

    /// Moves the cursor; answers where it was.
    pub fn go(&mut self, to: Option<usize>) -> Option<usize> {
        std::mem::replace(&mut self.current, to)
    }

    /// A new run for what is placed from here on; `None` where that is furniture.
    pub fn run(&mut self) -> Option<usize> {
        let element = self.current?;
        let of = self.elements.get_mut(element)?;
        if of.role.groups() {
            return None;
        }
        let run = self.runs.len();
        self.runs.push(element);
        of.kids.push(Kid::Run(run));
        Some(run)
    }

    /// Name of the element of a run.
    pub fn name(&self, run: usize) -> &'static str {
        let element = self.runs.get(run).and_then(|e| self.elements.get(*e));
        element.map_or("P", |e| e.role.name())
    }
}
