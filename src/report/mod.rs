//! Reports: plain view structs and one pure function per format.
//!
//! [`IdentifyView`] is the whole report of `identify`; both the text and the JSON are made of it
//! alone, so that every number of the text stands in the JSON too.

mod build;
pub mod catalogue;
mod escape;
mod json;
mod layout;
mod picture;
mod text;
mod view;

pub use build::{IdentifyRun, identify_view};
pub use escape::plain;
pub use json::identify_json;
pub use text::{Detail, identify_text};
pub use view::{
    CauseView, CompositionView, IdentifyView, InputView, LaneView, LibraryView, MarkView,
    MissingLineView, NextReadingView, PosteriorView, ReadingView, RefusalView, SampleView,
    SetAsideView, SubstanceView, WarningView,
};

#[cfg(test)]
mod tests;
