//! Which pairs of a sensor are left out by a rule of the study.

/// For each window and band, the first rule that leaves the pair out.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Exclusion {
    /// Rule number plus one, windows times bands, bands fastest; 0 for none. Empty without rules.
    marks: Vec<u16>,
    bands: usize,
}

impl Exclusion {
    /// Nothing left out yet; holds no memory where there are no rules.
    pub fn none(windows: usize, bands: usize, rules: usize) -> Self {
        Self { marks: if rules == 0 { Vec::new() } else { vec![0; windows * bands] }, bands }
    }

    /// Marks a pair, unless an earlier rule has.
    pub fn mark(&mut self, window: usize, band: usize, rule: usize) {
        let mark = &mut self.marks[window * self.bands + band];
        if *mark == 0 {
            *mark = rule as u16 + 1;
        }
    }

    /// The number of the rule that leaves a pair out.
    pub fn rule(&self, window: usize, band: usize) -> Option<usize> {
        let mark = self.marks.get(window * self.bands + band)?;
        usize::from(*mark).checked_sub(1)
    }
}
