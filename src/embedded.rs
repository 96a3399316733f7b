//! The library that is part of the program, read and checked when the program was built.

use crate::library::{Library, LibraryError};

/// What `compile_library.rs` made of the folder `library`.
const COMPILED: &[u8] = include_bytes!(concat!(env!("OUT_DIR"), "/library.bin"));

/// The embedded library.
///
/// # Errors
/// [`LibraryError::Unreadable`] if the program is damaged, which the tests rule out for a build.
pub fn library() -> Result<Library, LibraryError> {
    postcard::from_bytes(COMPILED).map_err(|error| LibraryError::Unreadable {
        path: "embedded".into(),
        reason: error.to_string(),
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::library::load_folder;
    use std::path::Path;

    #[test]
    fn what_is_embedded_is_what_the_tables_say() {
        let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("library");
        assert_eq!(library(), load_folder(&folder));
    }
}
