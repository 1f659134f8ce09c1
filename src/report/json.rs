//! JSON text of a document: indented, members in the order of the type, one line end at the end.

use serde::Serialize;

/// The text of `document`. Numbers that are not finite become `null`.
pub fn json(document: &impl Serialize) -> Vec<u8> {
    // Writing to memory cannot fail, and the documents of this crate have only text keys.
    #[allow(clippy::expect_used)]
    let mut text = serde_json::to_vec_pretty(document).expect("documents have text keys");
    text.push(b'\n');
    text
}
