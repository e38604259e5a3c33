//! Panics of file libraries on damaged bytes, turned into errors.

use std::cell::Cell;
use std::panic::AssertUnwindSafe;
use std::sync::Once;

thread_local! {
    /// Whether panics on this thread are expected and caught.
    static CAUGHT: Cell<bool> = const { Cell::new(false) };
}

/// Runs a library so that a panic on damaged bytes is an error: its words. Libraries trust much of what a file says, and a
/// panic is a usual answer to bytes that contradict each other. The message that a panic prints is kept back on this thread.
pub(super) fn contain<T>(act: impl FnOnce() -> T) -> Result<T, String> {
    static HOOK: Once = Once::new();
    HOOK.call_once(|| {
        let before = std::panic::take_hook();
        std::panic::set_hook(Box::new(move |info| {
            if !CAUGHT.get() {
                before(info);
            }
        }));
    });
    CAUGHT.set(true);
    let ended = std::panic::catch_unwind(AssertUnwindSafe(act));
    CAUGHT.set(false);
    ended.map_err(|panic| {
        let text = panic.downcast_ref::<String>().cloned();
        let text = text.or_else(|| panic.downcast_ref::<&str>().map(|text| (*text).to_owned()));
        text.unwrap_or_else(|| "no reason given".to_owned())
    })
}
