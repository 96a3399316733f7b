use super::*;
use proptest::prelude::*;

/// Rows on a coarse lattice, so that ties and repeats are frequent.
fn some_rows() -> impl Strategy<Value = Vec<Reading>> {
    let row = (
        0u32..60,
        1u32..5,
        prop::option::of(1u32..50),
        prop::option::of(prop::sample::select(vec!["Ada", "Ben"])),
        prop::option::weighted(0.2, prop::sample::select(vec!["a", "b"])),
    );
    prop::collection::vec(row, 0..14).prop_map(|rows| {
        let reading =
            |(i, (x, u, s, observer, mark)): (usize, (u32, u32, Option<u32>, _, _))| Reading {
                strength: s.map(|s| Strength::Number(f64::from(s))),
                observer: Option::<&str>::map(observer, str::to_owned),
                repeat_of: Option::<&str>::map(mark, str::to_owned),
                ..nm(i + 2, 500.0 + 0.1 * f64::from(x), 0.05 * f64::from(u))
            };
        rows.into_iter().enumerate().map(reading).collect()
    })
}

/// The same numbers but for rounding.
fn alike(a: &ReducedSample, b: &ReducedSample) -> bool {
    let strength = |r: &ReducedReading| r.strength.map_or(-1.0, |s| s.above_faintest_dex);
    a.readings.len() == b.readings.len()
        && a.readings.iter().zip(&b.readings).all(|(a, b)| {
            a.rows == b.rows
                && close(a.wavelength_nm, b.wavelength_nm)
                && close(a.uncertainty_nm, b.uncertainty_nm)
                && close(strength(a), strength(b))
        })
}

proptest! {
    #[test]
    fn permuted_rows_reduce_to_the_same(
        (rows, shuffled) in some_rows().prop_flat_map(|rows| (Just(rows.clone()), Just(rows).prop_shuffle()))
    ) {
        prop_assert_eq!(reduced(rows, ccd()), reduced(shuffled, ccd()));
    }

    #[test]
    fn a_table_written_in_another_order_reduces_to_the_same_numbers(
        (rows, shuffled) in some_rows().prop_flat_map(|rows| (Just(rows.clone()), Just(rows).prop_shuffle()))
    ) {
        let renumbered = shuffled.into_iter().enumerate().map(|(i, row)| Reading { row: i + 2, ..row });
        let numbers = |sample: ReducedSample| {
            let row = |r: ReducedReading| {
                let y = r.strength.map_or(-1.0, |s| s.above_faintest_dex);
                [r.wavelength_nm, r.uncertainty_nm, y].map(|number| (number * 1e6).round())
            };
            let mut numbers: Vec<[f64; 3]> = sample.readings.into_iter().map(row).collect();
            numbers.sort_by(|a, b| a.partial_cmp(b).unwrap());
            numbers
        };
        let again = reduced(renumbered.collect(), ccd());
        prop_assert_eq!(numbers(reduced(rows, ccd())), numbers(again));
    }

    #[test]
    fn every_row_is_in_exactly_one_place(rows in some_rows()) {
        let expected: Vec<usize> = rows.iter().map(|row| row.row).collect();
        let sample = reduced(rows, ccd());
        let mut found: Vec<usize> = sample.readings.iter().flat_map(|r| r.rows.clone()).collect();
        found.extend(sample.set_aside.iter().map(|aside| aside.row));
        found.sort_unstable();
        prop_assert_eq!(found, expected);
        prop_assert!(sample.readings.windows(2).all(|p| p[0].wavelength_nm <= p[1].wavelength_nm));
        let top = heights(&sample).into_iter().fold(0.0, f64::max);
        prop_assert!(heights(&sample).iter().all(|y| *y >= 0.0) && top + 0.29 < sample.dynamic_range_dex);
    }

    #[test]
    fn angstrom_twins_reduce_to_the_same(rows in prop::collection::vec((390.0..790.0f64, 0.01..1.0f64), 0..12)) {
        let one = |unit: fn(f64) -> Position, factor: f64| {
            let row = |(i, (x, u)): (usize, &(f64, f64))| at(i + 2, unit(x * factor), Some(u * factor));
            reduced(rows.iter().enumerate().map(row).collect(), ccd())
        };
        prop_assert!(alike(&one(Position::Nanometre, 1.0), &one(Position::Angstrom, 10.0)));
    }

    #[test]
    fn a_row_out_of_range_changes_nothing_else(rows in some_rows(), s in 0.001..1e6f64) {
        // A faintest strength keeps the count of the list out of play.
        let said = || SetupOverrides { faintest: Some(0.5), ..ccd() };
        let mut more = rows.clone();
        more.push(strong(s, nm(99, 900.0, 0.2)));
        let (plain, with) = (reduced(rows, said()), reduced(more, said()));
        prop_assert_eq!(&plain.readings, &with.readings);
        prop_assert_eq!(plain.dynamic_range_dex, with.dynamic_range_dex);
    }

    #[test]
    fn pooling_lies_between_its_rows_and_never_widens_beyond_them(
        x in 400.0..700.0f64, gap in 0.0..5.0f64, u in 0.01..2.0f64, v in 0.01..2.0f64
    ) {
        let pooled = reduced(vec![marked("a", nm(2, x, u)), marked("a", nm(3, x + gap, v))], ccd());
        let reading = &pooled.readings[0];
        prop_assert!((x - 1e-9..=x + gap + 1e-9).contains(&reading.wavelength_nm));
        prop_assert!(reading.uncertainty_nm <= u.max(v).max(gap) + 1e-12);
        prop_assert!(reading.uncertainty_nm >= (u.powi(-2) + v.powi(-2)).powf(-0.5) - 1e-12);
    }
}
