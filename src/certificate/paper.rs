//! Paper sizes and the one grid that every page is set on. Lengths in points (1/72 inch), measured
//! from the top left corner of the page.

/// The paper a lot record is set for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Paper {
    /// 210 mm × 297 mm (ISO 216).
    #[default]
    A4,
    /// 8.5 in × 11 in.
    Letter,
}

const POINTS_PER_MM: f64 = 72.0 / 25.4;

/// A page's edges and margins.
#[derive(Debug, Clone, Copy)]
pub(super) struct Sheet {
    pub width: f64,
    pub height: f64,
    pub left: f64,
    pub right: f64,
    /// Where content begins, below the running head.
    pub top: f64,
    /// Where content ends, above the running foot.
    pub bottom: f64,
}

impl Sheet {
    pub fn new(paper: Paper) -> Self {
        let (width, height) = match paper {
            Paper::A4 => (210.0 * POINTS_PER_MM, 297.0 * POINTS_PER_MM),
            Paper::Letter => (612.0, 792.0),
        };
        Sheet {
            width,
            height,
            left: 56.0,
            right: width - 48.0,
            top: 66.0,
            bottom: height - 58.0,
        }
    }

    /// Width between the margins.
    pub fn measure(&self) -> f64 {
        self.right - self.left
    }
}
