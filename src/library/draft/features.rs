//! Rows of the feature tables.

use super::super::Feature;
use super::super::layout::{
    DEGRADES, ENERGY_PER_CM, FEATURES, FORMS, PERSISTENT, POSITIVE, SCATTER_DEX, STRENGTH_DEX,
    UNCERTAINTY_NM, WAVELENGTH_NM, WIDTH_NM,
};
use super::super::table::{Cell, Row, TableFile, read};
use super::{DraftSubstance, Faults, Keys, resolve};
use crate::reduction::air::AirWavelength;

/// Reads `features/<substance>.csv` into the emitters of that substance.
pub fn features(
    table: &TableFile<'_>,
    sources: &Keys,
    draft: &mut DraftSubstance,
    faults: &mut Faults,
) {
    let mut previous_nm = WAVELENGTH_NM.low;
    let known = format!("an emitter of {} in emitters.csv", draft.substance.id);
    read(table, &FEATURES, faults, |cells, row| {
        let [emitter, form, wavelength, ..] = cells;
        // A wavelength that is no number says nothing of the order.
        let nm = (row.sound_number(wavelength, WAVELENGTH_NM)).unwrap_or(previous_nm);
        if nm < previous_nm {
            row.fault(
                wavelength,
                format!("comes after {previous_nm} (sort by wavelength)"),
            );
        }
        previous_nm = nm;
        let feature = feature(cells, nm, sources, row);
        let home = (draft.emitters.iter_mut()).find(|e| e.emitter.name == emitter.text);
        let Some(home) = home else {
            let names = draft.emitters.iter().map(|e| e.emitter.name.as_str());
            row.unresolved(emitter, emitter.text, &known, names);
            return;
        };
        let Some(feature) = feature else { return };
        let twin = (home.emitter.features.iter().rev())
            .take_while(|f| f.wavelength.nm() == nm)
            .find(|f| f.form == feature.form);
        match twin {
            Some(twin) => row.fault(
                form,
                format!("stands at this wavelength already in row {}", twin.row),
            ),
            None => home.emitter.features.push(feature),
        }
    });
}

fn feature(
    cells: [Cell<'_>; FEATURES.len()],
    nm: f64,
    sources: &Keys,
    row: &mut Row<'_>,
) -> Option<Feature> {
    let [
        _,
        form,
        wavelength,
        uncertainty,
        degrades,
        width,
        flame,
        discharge,
        absorption,
        scatter,
        persistent,
        rate,
        weight,
        lower,
        upper,
        from,
        strength_from,
        note,
        intensity,
    ] = cells;
    let strength_dex =
        [flame, discharge, absorption].map(|cell| row.number_if_any(cell, STRENGTH_DEX));
    if strength_dex == [None; 3] {
        row.fault(
            flame,
            "is empty, as are the others (a feature has a strength in some kind of source)",
        );
    }
    let lower_level_per_cm = row.number_if_any(lower, ENERGY_PER_CM);
    let upper_level_per_cm = row.number_if_any(upper, ENERGY_PER_CM);
    if let (Some(low), Some(high)) = (lower_level_per_cm, upper_level_per_cm)
        && low >= high
    {
        row.fault(upper, format!("is not above the lower level {low}"));
    }
    // Of use to the rules only, not to the program.
    row.number_if_any(intensity, POSITIVE);
    let Some(wavelength) = AirWavelength::new(nm) else {
        row.fault(wavelength, "is not a wavelength in air");
        return None;
    };
    Some(Feature {
        form: row.word(form, &FORMS),
        wavelength,
        uncertainty_nm: row.number(uncertainty, UNCERTAINTY_NM),
        degrades: row.word(degrades, &DEGRADES).map(str::to_owned),
        width_nm: row.number_if_any(width, WIDTH_NM),
        strength_dex,
        scatter_dex: row.number(scatter, SCATTER_DEX),
        persistent: row.word(persistent, &PERSISTENT),
        transition_rate_per_s: row.number_if_any(rate, POSITIVE),
        upper_weight: row.number_if_any(weight, POSITIVE),
        lower_level_per_cm,
        upper_level_per_cm,
        source_position: resolve(row, from, sources, "a key of sources.csv"),
        source_strength: resolve(row, strength_from, sources, "a key of sources.csv"),
        note: note.text.to_owned(),
        row: row.line,
    })
}
