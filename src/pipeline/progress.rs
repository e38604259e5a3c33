//! Progress of long work, told to whoever draws it.

/// Told how far long work has come. Computation never draws by itself.
pub trait Progress: Sync {
    /// Work begins: this many units of it (0: not known), and what it is in words.
    fn start(&self, total: u64, what: &str);
    /// That many units more are done.
    fn advance(&self, units: u64);
    /// The work is done.
    fn finish(&self);
}

/// Tells nobody.
#[derive(Debug, Clone, Copy, Default)]
pub struct Silent;

impl Progress for Silent {
    fn start(&self, _: u64, _: &str) {}
    fn advance(&self, _: u64) {}
    fn finish(&self) {}
}
