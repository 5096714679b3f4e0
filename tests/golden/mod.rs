//! Golden files: `TALLYSTONE_REWRITE_SNAPSHOTS=1` writes them anew, to be read before they are committed.

use std::fs;
use std::path::PathBuf;

/// Compares with a golden file, or writes it.
#[track_caller]
pub(crate) fn golden(name: &str, found: &str) {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/snapshots").join(name);
    if std::env::var_os("TALLYSTONE_REWRITE_SNAPSHOTS").is_some() {
        fs::write(&path, found).unwrap();
    }
    let expected = fs::read_to_string(&path).unwrap_or_default().replace("\r\n", "\n");
    assert!(found == expected, "{name} differs; if that is right, set TALLYSTONE_REWRITE_SNAPSHOTS=1 once:\n{found}");
}
