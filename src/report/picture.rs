//! The picture: one lane per substance under a lane of readings with their error bars.

use super::escape::plain;
use super::view::{LaneView, ReadingView, SampleView};
use unicode_width::UnicodeWidthStr;

/// Width of the names before the lanes, columns.
const NAME_WIDTH: usize = 12;

/// Width of the lanes, columns.
const LANE_WIDTH: usize = 64;

/// Air left and right of the outermost mark, nm.
const MARGIN_NM: f64 = 8.0;

/// Where a wavelength falls among the columns.
#[derive(Debug, Clone, Copy)]
struct Scale {
    low_nm: f64,
    nm_per_column: f64,
}

impl Scale {
    /// A scale that shows everything of the sample; none if there is nothing to show.
    fn of(sample: &SampleView) -> Option<Self> {
        let readings = sample
            .readings
            .iter()
            .filter_map(|reading| reading.wavelength_nm);
        let marks = sample
            .picture
            .iter()
            .flat_map(|lane| &lane.marks)
            .map(|mark| mark.wavelength_nm);
        let shown: Vec<f64> = readings.chain(marks).collect();
        let low = shown.iter().copied().fold(f64::INFINITY, f64::min);
        let high = shown.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        let low_nm = ((low - MARGIN_NM) / 10.0).floor() * 10.0;
        let high_nm = ((high + MARGIN_NM) / 10.0).ceil() * 10.0;
        let nm_per_column = (high_nm - low_nm) / LANE_WIDTH as f64;
        (nm_per_column.is_finite() && nm_per_column > 0.0).then_some(Self {
            low_nm,
            nm_per_column,
        })
    }

    fn column(self, wavelength_nm: f64) -> Option<usize> {
        let column = ((wavelength_nm - self.low_nm) / self.nm_per_column).floor();
        (0.0..LANE_WIDTH as f64)
            .contains(&column)
            .then_some(column as usize)
    }
}

/// The lines of the picture; none if there is nothing to show.
pub(super) fn picture(sample: &SampleView) -> Vec<String> {
    let Some(scale) = Scale::of(sample) else {
        return Vec::new();
    };
    let mut lines = vec![named("readings", &readings_lane(&sample.readings, scale))];
    lines.extend(
        sample
            .picture
            .iter()
            .map(|lane| named(&lane.name, &substance_lane(lane, scale))),
    );
    lines.extend(axis(scale));
    lines.push(
        "o reading, x unexplained reading, 2-9 several, |- -| its standard uncertainty".to_owned(),
    );
    lines.push("# causes a reading, ? expected and not seen, . listed".to_owned());
    lines
}

fn named(name: &str, lane: &[char]) -> String {
    let name = fitted(&plain(name), NAME_WIDTH - 1);
    let fill = NAME_WIDTH.saturating_sub(name.width());
    let lane: String = lane.iter().collect();
    format!("{name}{:fill$}{}", "", lane.trim_end())
}

/// The beginning of a text that fits a width.
fn fitted(text: &str, width: usize) -> String {
    let mut fitted = String::new();
    for letter in text.chars() {
        fitted.push(letter);
        if fitted.width() > width {
            fitted.pop();
            break;
        }
    }
    fitted
}

fn readings_lane(readings: &[ReadingView], scale: Scale) -> Vec<char> {
    let mut lane = vec![' '; LANE_WIDTH];
    for reading in readings {
        draw_bar(&mut lane, reading, scale);
    }
    // Positions over bars: a neighbour's bar must not hide a reading.
    let mut counts = vec![0usize; LANE_WIDTH];
    for reading in readings {
        let Some(column) = reading.wavelength_nm.and_then(|nm| scale.column(nm)) else {
            continue;
        };
        let Some((cell, count)) = lane.get_mut(column).zip(counts.get_mut(column)) else {
            continue;
        };
        *count += 1;
        *cell = match (*count, reading.standing) {
            (1, "unexplained") => 'x',
            (1, _) => 'o',
            (several, _) => char::from_digit(several.min(9) as u32, 10).unwrap_or('9'),
        };
    }
    lane
}

fn draw_bar(lane: &mut [char], reading: &ReadingView, scale: Scale) {
    let (Some(nm), Some(u)) = (reading.wavelength_nm, reading.uncertainty_nm) else {
        return;
    };
    let last = LANE_WIDTH - 1;
    let left = scale.column(nm - u).unwrap_or(0);
    let right = scale.column(nm + u).unwrap_or(last);
    for (column, cell) in lane.iter_mut().enumerate().take(right + 1).skip(left) {
        if column == left || column == right {
            *cell = '|';
        } else if *cell == ' ' {
            *cell = '-';
        }
    }
}

fn substance_lane(lane: &LaneView, scale: Scale) -> Vec<char> {
    let mut cells = vec![' '; LANE_WIDTH];
    // The weightier mark wins a column that two fall into.
    for (mark, sign) in [("listed", '.'), ("missing", '?'), ("matched", '#')] {
        for feature in lane.marks.iter().filter(|feature| feature.mark == mark) {
            let column = scale.column(feature.wavelength_nm);
            if let Some(cell) = column.and_then(|column| cells.get_mut(column)) {
                *cell = sign;
            }
        }
    }
    cells
}

/// A line of ticks and a line of their wavelengths.
fn axis(scale: Scale) -> [String; 2] {
    let span = scale.nm_per_column * LANE_WIDTH as f64;
    let steps = [5.0, 10.0, 20.0, 50.0, 100.0, 200.0, 500.0];
    // Labels of four figures and a gap need about seven columns each.
    let step = steps
        .into_iter()
        .find(|step| span / step <= LANE_WIDTH as f64 / 8.0)
        .unwrap_or(1000.0);
    let mut ticks = vec!['-'; LANE_WIDTH];
    let mut labels = String::new();
    let mut tick = (scale.low_nm / step).ceil() * step;
    while let Some(column) = scale.column(tick) {
        if let Some(cell) = ticks.get_mut(column) {
            *cell = '+';
        }
        let label = format!("{tick:.0}");
        if column >= labels.len() && column + label.len() <= LANE_WIDTH {
            labels.push_str(&" ".repeat(column - labels.len()));
            labels.push_str(&label);
        }
        tick += step;
    }
    let labels: Vec<char> = labels.chars().collect();
    [named("", &ticks), named("nm", &labels)]
}
