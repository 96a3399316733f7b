//! The layout of the tables: their columns, the words they know and the numbers they allow.

use super::table::{Bounds, Column, needed, optional};
use super::{EmitterKind, Form, PriorClass, SourceKind, Standing, SubstanceKind};

pub(super) const SUBSTANCE_KINDS: [(&str, SubstanceKind); 4] = [
    ("element", SubstanceKind::Element),
    ("molecule", SubstanceKind::Molecule),
    ("phosphor", SubstanceKind::Phosphor),
    ("lamp", SubstanceKind::Lamp),
];
pub(super) const PRIOR_CLASSES: [(&str, PriorClass); 5] = [
    ("ubiquitous", PriorClass::Ubiquitous),
    ("background", PriorClass::Background),
    ("usual", PriorClass::Usual),
    ("rare", PriorClass::Rare),
    ("never", PriorClass::Never),
];
pub(super) const SOURCE_KINDS: [(&str, SourceKind); 3] = [
    ("flame", SourceKind::Flame),
    ("discharge", SourceKind::Discharge),
    ("absorption", SourceKind::Absorption),
];
pub(super) const EMITTER_KINDS: [(&str, EmitterKind); 4] = [
    ("atom", EmitterKind::Atom),
    ("ion", EmitterKind::Ion),
    ("molecule", EmitterKind::Molecule),
    ("phosphor", EmitterKind::Phosphor),
];
pub(super) const FORMS: [(&str, Form); 3] = [
    ("line", Form::Line),
    ("band_head", Form::BandHead),
    ("band_max", Form::BandMax),
];
pub(super) const STANDINGS: [(&str, Standing); 5] = [
    ("published", Standing::Published),
    ("computed", Standing::Computed),
    ("measured", Standing::Measured),
    ("memory", Standing::Memory),
    ("shaky", Standing::Shaky),
];
pub(super) const DEGRADES: [(&str, Option<&str>); 4] = [
    ("", None),
    ("red", Some("red")),
    ("violet", Some("violet")),
    ("headless", Some("headless")),
];
pub(super) const PERSISTENT: [(&str, bool); 2] = [("", false), ("yes", true)];

pub(super) const WAVELENGTH_NM: Bounds = Bounds::between(240.0, 1100.0);
pub(super) const UNCERTAINTY_NM: Bounds = Bounds::above(0.0, 20.0);
pub(super) const WIDTH_NM: Bounds = Bounds::above(0.0, 500.0);
pub(super) const STRENGTH_DEX: Bounds = Bounds::between(-100.0, 100.0);
pub(super) const SCATTER_DEX: Bounds = Bounds::between(0.0, 5.0);
pub(super) const SHOWS: Bounds = Bounds::between(0.0, 1.0);
pub(super) const LEVEL_DEX: Bounds = Bounds::between(-20.0, 0.0);
pub(super) const LEVEL_SPREAD_DEX: Bounds = Bounds::between(0.0, 5.0);
pub(super) const COMPLETE_TO_DEX: Bounds = Bounds::between(-20.0, 0.0);
pub(super) const POSITIVE: Bounds = Bounds::above(0.0, f64::INFINITY);
pub(super) const ENERGY_PER_CM: Bounds = Bounds::between(0.0, 1.0e6);

pub(super) const SOURCES: [Column; 5] = [
    needed("key"),
    needed("citation"),
    optional("version"),
    optional("licence"),
    needed("standing"),
];
pub(super) const CAUTIONS: [Column; 2] = [needed("key"), needed("text")];
pub(super) const SUBSTANCES: [Column; 11] = [
    needed("id"),
    needed("name"),
    needed("symbol"),
    needed("kind"),
    optional("aliases"),
    needed("prior_flame"),
    needed("prior_discharge"),
    needed("prior_absorption"),
    optional("flame_colour"),
    optional("cautions"),
    optional("note"),
];
pub(super) const EMITTERS: [Column; 10] = [
    needed("emitter"),
    needed("substance"),
    needed("source_kind"),
    needed("kind"),
    needed("shows"),
    needed("level_dex"),
    needed("level_spread_dex"),
    needed("complete_to_dex"),
    optional("remark"),
    needed("source"),
];
pub(super) const FEATURES: [Column; 19] = [
    needed("emitter"),
    needed("form"),
    needed("wavelength_air_nm"),
    needed("uncertainty_nm"),
    optional("degrades"),
    optional("width_nm"),
    optional("strength_flame_dex"),
    optional("strength_discharge_dex"),
    optional("strength_absorption_dex"),
    needed("scatter_dex"),
    optional("persistent"),
    optional("transition_rate_per_s"),
    optional("upper_weight"),
    optional("lower_level_cm-1"),
    optional("upper_level_cm-1"),
    needed("source_position"),
    needed("source_strength"),
    optional("note"),
    optional("published_intensity"),
];
pub(super) const COMPOSED: [Column; 3] = [needed("name"), needed("parts"), optional("where_met")];
pub(super) const LISTS: [Column; 2] = [needed("list"), needed("substance")];
