//! Finding things of the library by the names people type.

use super::{Composed, Library, Substance};
use std::collections::BTreeSet;

/// A name that cannot be followed.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum NameError {
    /// Nothing goes by that name.
    #[error(
        "{text:?} is not a {what} of the library ({})",
        hint(what, suggestions)
    )]
    Unknown {
        /// `substance` or `list`.
        what: &'static str,
        /// The name as typed.
        text: String,
        /// Up to three names that come close, the closest first.
        suggestions: Vec<String>,
    },
    /// Several substances go by that name.
    #[error("{text:?} may mean {} (write one of these)", among.join(" or "))]
    Ambiguous {
        /// The name as typed.
        text: String,
        /// Ids of the substances, sorted.
        among: Vec<String>,
    },
}

fn hint(what: &str, suggestions: &[String]) -> String {
    match suggestions {
        [] => format!("no {what} has a name close to it"),
        near => format!("did you mean {}?", near.join(" or ")),
    }
}

/// A name as compared without regard to case, to blanks about it, and to whether its words are
/// parted by blanks, hyphens or underscores.
fn folded(name: &str) -> String {
    let words = name.split(|c: char| c.is_whitespace() || c == '-' || c == '_');
    let words: Vec<&str> = words.filter(|word| !word.is_empty()).collect();
    words.join("-").to_lowercase()
}

/// Up to `most` of the known names that `text` may be a slip for, the closest first.
///
/// Close means: at most a third of the letters wrong, missing or exchanged, or a beginning of at
/// least three letters. Marks of one or two letters have no near names.
pub(super) fn closest<'k>(
    text: &str,
    known: impl Iterator<Item = &'k str>,
    most: usize,
) -> Vec<&'k str> {
    let wanted = folded(text);
    let length = wanted.chars().count();
    if length < 3 {
        return Vec::new();
    }
    let mut near: Vec<(usize, &str)> = known
        .filter_map(|name| {
            let other = folded(name);
            let other_length = other.chars().count();
            let room = length.min(other_length) / 3;
            if other_length + room < length {
                return None;
            }
            let distance = strsim::damerau_levenshtein(&wanted, &other);
            (distance <= room || other.starts_with(&wanted)).then_some((distance, name))
        })
        .collect();
    near.sort_unstable();
    near.dedup();
    near.truncate(most);
    near.into_iter().map(|(_, name)| name).collect()
}

impl Library {
    /// The index of the substance that goes by `text`.
    ///
    /// Tried in this order: the id; the symbol with its case (`Co` is cobalt, `CO` carbon
    /// monoxide); id, name and aliases without case; the symbol without case; the name of an
    /// emitter (`Sr I`, `SrOH`), which stands for its substance. Blanks, hyphens and underscores
    /// are one.
    ///
    /// # Errors
    /// [`NameError::Unknown`] with close names, or [`NameError::Ambiguous`] if the first of these
    /// that fits fits several substances.
    pub fn find(&self, text: &str) -> Result<usize, NameError> {
        let text = text.trim();
        let wanted = folded(text);
        let same = |name: &str| folded(name) == wanted;
        let tiers: [&dyn Fn(&Substance) -> bool; 6] = [
            &|s| s.id == text,
            &|s| !text.is_empty() && s.symbol == text,
            &|s| same(&s.id) || same(&s.name) || s.aliases.iter().any(|a| same(a)),
            &|s| same(&s.symbol),
            &|s| s.emitters.iter().any(|e| e.name == text),
            &|s| s.emitters.iter().any(|e| same(&e.name)),
        ];
        if !wanted.is_empty() {
            for fits in tiers {
                let found: Vec<usize> = (self.substances.iter().enumerate())
                    .filter_map(|(index, s)| fits(s).then_some(index))
                    .collect();
                match found.as_slice() {
                    [] => {}
                    [one] => return Ok(*one),
                    several => return Err(self.ambiguous(text, several)),
                }
            }
        }
        Err(NameError::Unknown {
            what: "substance",
            text: text.to_owned(),
            suggestions: self.near_substances(text),
        })
    }

    fn ambiguous(&self, text: &str, found: &[usize]) -> NameError {
        let ids = found.iter().filter_map(|index| self.substances.get(*index));
        NameError::Ambiguous {
            text: text.to_owned(),
            among: ids.map(|s| s.id.clone()).collect(),
        }
    }

    /// Close names, at most one for each substance and three in all.
    fn near_substances(&self, text: &str) -> Vec<String> {
        let names = self.substances.iter().flat_map(|s| {
            let aliases = s.aliases.iter().map(String::as_str);
            [s.id.as_str(), s.name.as_str()].into_iter().chain(aliases)
        });
        let mut seen = BTreeSet::new();
        let mut suggestions = Vec::new();
        for name in closest(text, names, usize::MAX) {
            let owner = (self.substances.iter()).position(|s| {
                s.id == name || s.name == name || s.aliases.iter().any(|a| a == name)
            });
            if seen.insert(owner) {
                suggestions.push(name.to_owned());
            }
        }
        suggestions.truncate(3);
        suggestions
    }

    /// The substance ids of a named candidate list.
    ///
    /// # Errors
    /// [`NameError::Unknown`] with close names.
    pub fn list(&self, name: &str) -> Result<&[String], NameError> {
        let wanted = folded(name);
        let found = self.lists.iter().find(|(list, _)| folded(list) == wanted);
        found.map(|(_, ids)| ids.as_slice()).ok_or_else(|| {
            let lists = self.lists.iter().map(|(list, _)| list.as_str());
            NameError::Unknown {
                what: "list",
                text: name.trim().to_owned(),
                suggestions: closest(name, lists, 3)
                    .into_iter()
                    .map(str::to_owned)
                    .collect(),
            }
        })
    }

    /// The text of a caution.
    pub fn caution(&self, key: &str) -> Option<&str> {
        let place = self
            .cautions
            .binary_search_by(|(known, _)| known.as_str().cmp(key))
            .ok()?;
        self.cautions.get(place).map(|(_, text)| text.as_str())
    }

    /// Composed names all of whose parts are among the substance ids `found`: those with the most
    /// parts first, then by name.
    pub fn composed_for(&self, found: &[impl AsRef<str>]) -> Vec<&Composed> {
        let has = |part: &String| found.iter().any(|id| id.as_ref() == part);
        let mut names: Vec<&Composed> = (self.composed.iter())
            .filter(|c| !c.parts.is_empty() && c.parts.iter().all(has))
            .collect();
        names.sort_by(|a, b| (b.parts.len(), &a.name).cmp(&(a.parts.len(), &b.name)));
        names
    }
}

#[cfg(test)]
mod tests {
    use super::super::load::tiny;
    use super::*;

    fn id(text: &str) -> String {
        let library = tiny();
        match library.find(text) {
            Ok(index) => library.substances[index].id.clone(),
            Err(error) => error.to_string(),
        }
    }

    #[test]
    fn substances_go_by_id_name_symbol_alias_and_emitter() {
        for (text, expected) in [
            ("strontium", "strontium"),
            (" Strontium ", "strontium"),
            ("Sr", "strontium"),
            ("sr", "strontium"),
            ("strontium CHLORIDE", "strontium"),
            ("carbon_monoxide", "carbon-monoxide"),
            ("Sr I", "strontium"),
            ("sroh", "strontium"),
        ] {
            assert_eq!(id(text), expected, "{text:?}");
        }
    }

    #[test]
    fn the_case_of_a_symbol_counts_where_it_must() {
        assert_eq!(id("Co"), "cobalt");
        assert_eq!(id("CO"), "carbon-monoxide");
        assert_eq!(
            id("co"),
            "\"co\" may mean carbon-monoxide or cobalt (write one of these)"
        );
    }

    #[test]
    fn slips_are_answered_with_what_was_likely_meant() {
        assert_eq!(
            id("strontum"),
            "\"strontum\" is not a substance of the library (did you mean strontium?)"
        );
        assert_eq!(
            id("natirum"),
            "\"natirum\" is not a substance of the library (did you mean natrium?)"
        );
        for nothing in ["", "  ", "-", "Qq", "unobtainium"] {
            let text = id(nothing);
            assert!(
                text.contains("no substance has a name close to it"),
                "{text}"
            );
        }
    }

    #[test]
    fn a_suggestion_leads_to_a_substance() {
        let library = tiny();
        for typo in ["stronti", "sodum", "carbon monoxid", "cobal"] {
            let Err(NameError::Unknown { suggestions, .. }) = library.find(typo) else {
                panic!("{typo} was found");
            };
            assert!(!suggestions.is_empty(), "{typo}");
            assert!(
                suggestions.iter().all(|s| library.find(s).is_ok()),
                "{suggestions:?}"
            );
        }
    }

    #[test]
    fn lists_and_cautions_go_by_name() {
        let library = tiny();
        assert_eq!(library.list("Teaching salts").map(<[String]>::len), Ok(2));
        let error = library.list("teaching-sats").map_err(|e| e.to_string());
        assert_eq!(
            error,
            Err(
                "\"teaching-sats\" is not a list of the library (did you mean teaching-salts?)"
                    .into()
            )
        );
        assert!(
            library
                .caution("flame-open")
                .is_some_and(|text| text.starts_with("Open flame"))
        );
        assert_eq!(library.caution("flame"), None);
    }

    #[test]
    fn composed_names_need_all_their_parts_and_the_longest_comes_first() {
        let library = tiny();
        let names = |found: &[&str]| -> Vec<&str> {
            library
                .composed_for(found)
                .iter()
                .map(|c| c.name.as_str())
                .collect()
        };
        assert_eq!(names(&["sodium"]), Vec::<&str>::new());
        assert_eq!(names(&["strontium", "sodium"]), ["red and yellow fire"]);
        assert_eq!(
            names(&["cobalt", "strontium", "sodium"]),
            ["parade fire", "red and yellow fire"]
        );
    }
}
