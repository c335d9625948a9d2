//! A panic in one file becomes one row: its place in the code is kept, its
//! message is not, since that may hold patient data.

use std::cell::RefCell;
use std::panic::{self, AssertUnwindSafe};

thread_local! {
    static LAST_PLACE: RefCell<Option<String>> = const { RefCell::new(None) };
}

/// Keeps panics from being printed; only their place is remembered. Called once by the program.
pub fn quiet_panics() {
    panic::set_hook(Box::new(|info| {
        let place = info
            .location()
            .map(|place| format!("{}:{}", place.file(), place.line()));
        LAST_PLACE.with(|last| *last.borrow_mut() = place);
    }));
}

/// The value, or a sentence about the panic that took its place.
pub(super) fn guarded<T>(work: impl FnOnce() -> T) -> Result<T, String> {
    panic::catch_unwind(AssertUnwindSafe(work)).map_err(|_| {
        let place = LAST_PLACE.with(|last| last.borrow_mut().take());
        format!(
            "internal error at {}; the file was not audited, please report it (without patient data)",
            place.as_deref().unwrap_or("an unknown place")
        )
    })
}

#[cfg(test)]
mod tests {
    #[test]
    fn verify_a_panic_becomes_a_sentence_without_its_message() {
        let result: Result<(), String> = super::guarded(|| panic!("Name^Of^Patient"));
        let sentence = result.unwrap_err();
        assert!(sentence.contains("internal error"));
        assert!(!sentence.contains("Patient"));
    }
}
