//! Words for the colour of a line.

/// The colour an eye gives a line at this wavelength, nm. Common practice, no source: people part
/// the spectrum a little differently.
pub fn colour_word(wavelength_nm: f64) -> &'static str {
    const UPPER_NM: [(f64, &str); 10] = [
        (390.0, "ultraviolet"),
        (440.0, "violet"),
        (485.0, "blue"),
        (505.0, "blue-green"),
        (560.0, "green"),
        (575.0, "yellow-green"),
        (592.0, "yellow"),
        (620.0, "orange"),
        (700.0, "red"),
        (780.0, "deep red"),
    ];
    UPPER_NM
        .iter()
        .find(|(upper, _)| wavelength_nm < *upper)
        .map_or("infrared", |(_, word)| word)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_everybody_knows_have_the_colour_everybody_gives_them() {
        // Handbook descriptions of these lines, from memory.
        for (nm, word) in [
            (253.65, "ultraviolet"),
            (404.66, "violet"),
            (435.83, "violet"),
            (460.73, "blue"),
            (486.13, "blue-green"),
            (546.07, "green"),
            (589.0, "yellow"),
            (610.36, "orange"),
            (670.78, "red"),
            (766.49, "deep red"),
            (852.11, "infrared"),
        ] {
            assert_eq!(colour_word(nm), word, "{nm}");
        }
    }
}
