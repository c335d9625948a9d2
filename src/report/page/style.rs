//! The style sheet and the content-security policy that admits it, pictures
//! that stand in the page itself, and nothing else: no script, no font, no address.

use sha2::{Digest, Sha256};

use crate::report::base64::base64;

/// The style sheet, as it stands in the page.
pub(in crate::report) const STYLE: &str = include_str!("../templates/page.css");

/// The policy: the style sheet by its hash, pictures of the page's own bytes, everything else refused.
pub(in crate::report) fn policy() -> String {
    let hash = base64(&Sha256::digest(STYLE.as_bytes()));
    format!(
        "default-src 'none'; style-src 'sha256-{hash}'; img-src data:; base-uri 'none'; form-action 'none'"
    )
}
