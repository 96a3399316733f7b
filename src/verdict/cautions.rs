//! Cautions for the substances that an answer speaks of.

use super::case::Case;
use crate::library::SourceKind;

/// The texts of the cautions, each once, in the order of the substances they belong to.
pub(super) fn cautions(case: &Case) -> Vec<String> {
    let mut keys: Vec<&str> = Vec::new();
    for substance in case
        .spoken_of()
        .into_iter()
        .filter_map(|candidate| case.substance(candidate))
    {
        for key in &substance.cautions {
            if applies(key, case.setup.source()) && !keys.contains(&key.as_str()) {
                keys.push(key);
            }
        }
    }
    keys.into_iter()
        .filter_map(|key| case.library.caution(key))
        .map(str::to_owned)
        .collect()
}

/// A key that starts with the name of a source is for that source only.
fn applies(key: &str, source: SourceKind) -> bool {
    match key.split_once('-').map(|(first, _)| first) {
        Some("flame") => source == SourceKind::Flame,
        Some("discharge") => source == SourceKind::Discharge,
        Some("absorption") => source == SourceKind::Absorption,
        _ => true,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn keys_name_their_source() {
        assert!(applies("flame-goggles", SourceKind::Flame));
        assert!(!applies("flame-goggles", SourceKind::Discharge));
        assert!(applies("discharge-high-voltage", SourceKind::Discharge));
        assert!(!applies("discharge-high-voltage", SourceKind::Absorption));
        assert!(applies("absorption-sun", SourceKind::Absorption));
        assert!(!applies("absorption-sun", SourceKind::Flame));
        assert!(applies("toxic", SourceKind::Absorption));
    }
}
