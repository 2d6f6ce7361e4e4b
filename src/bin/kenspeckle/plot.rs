//! The picture of a rehearsal: the share sorted right over the number of examples, with the interval as a band.
//!
//! Written by hand: a few lines, bands and words need no plotting library, and those at hand know neither the reader's
//! dark colours nor a description for a reader who can't see the picture. Contenders differ by colour, dash and marker.

use std::fmt::Write;

use crate::{rehearse::examples, report::Report};

const WIDTH: f64 = 760.0;
const HEIGHT: f64 = 440.0;
const LEFT: f64 = 64.0;
const RIGHT: f64 = 620.0;
const TOP: f64 = 84.0;
const BOTTOM: f64 = 370.0;

/// Space between two labels at the lines' ends, or between two numbers on the axis.
const LABEL_GAP: f64 = 20.0;

const STYLE: &str = "\
    svg { --paper: #fff; --ink: #1c1c1c; --faint: #5c5c5c; --grid: #dcdcdc;
      --c0: #0b5fa5; --c1: #b5480a; --c2: #0b7a5b; --c3: #93388f; }
    @media (prefers-color-scheme: dark) {
      svg { --paper: #17191c; --ink: #f0f0f0; --faint: #b4b4b4; --grid: #3b3e43;
        --c0: #6cb4f5; --c1: #f0a35e; --c2: #5fd0a5; --c3: #e59ae0; }
    }
    text { font: 14px system-ui, sans-serif; fill: var(--ink); }
    .title { font-size: 18px; font-weight: 600; }
    .faint { fill: var(--faint); }
    .paper { fill: var(--paper); }
    .grid { stroke: var(--grid); }
    .k0 { --c: var(--c0); } .k1 { --c: var(--c1); } .k2 { --c: var(--c2); } .k3 { --c: var(--c3); }
    .band { fill: var(--c); opacity: 0.14; }
    .line { fill: none; stroke: var(--c); stroke-width: 2; }
    .leader { stroke: var(--c); opacity: 0.5; }
    .k0 .line { stroke-width: 3; }
    .k1 .line { stroke-dasharray: 7 4; } .k2 .line { stroke-dasharray: 2 3; } .k3 .line { stroke-dasharray: 10 3 2 3; }
    .mark { fill: var(--c); stroke: var(--paper); }
    .name { fill: var(--c); font-weight: 600; }
";

/// A point of a contender's line, in % and in the picture.
struct Point {
    x: f64,
    mean: f64,
    low: f64,
    high: f64,
}

/// A curve: a name, and for each number on the axis the mean with its interval, in %.
pub struct Curve {
    /// What it is called.
    pub name: String,
    /// (number, mean, low, high).
    pub points: Vec<(usize, f64, f64, f64)>,
}

/// What is drawn, and what is written around it.
pub struct Picture<'a> {
    /// The heading.
    pub title: &'a str,
    /// One line below it.
    pub subtitle: String,
    /// The picture in words: every number that matters in it.
    pub description: String,
    /// What the numbers on the axis count.
    pub axis: &'a str,
    /// At most four curves over the same numbers.
    pub curves: Vec<Curve>,
}

/// The picture of learners' shares over the number of examples.
pub fn draw(report: &Report) -> String {
    let shots = report.design.shots();
    let curve = |contender: usize| {
        let point = |(at, &shot): (usize, &usize)| {
            let found = report.summary.accuracy(contender, at);
            let (mean, half) = (100.0 * found.mean, 100.0 * found.half_width);
            (shot, mean, (mean - half).max(0.0), (mean + half).min(100.0))
        };
        Curve { name: report.contenders[contender].to_owned(), points: shots.iter().enumerate().map(point).collect() }
    };
    svg(&Picture {
        title: "Sorted right, by number of examples",
        subtitle: format!("{} draws of {} categories; bands are 95 % intervals", report.episodes, report.ways),
        description: description(report),
        axis: "examples of each category",
        curves: shown(report.contenders.len()).into_iter().map(curve).collect(),
    })
}

/// The picture as an SVG file.
pub fn svg(picture: &Picture) -> String {
    let numbers: Vec<usize> = picture.curves[0].points.iter().map(|&(number, ..)| number).collect();
    let lines: Vec<Vec<Point>> = picture
        .curves
        .iter()
        .enumerate()
        .map(|(position, curve)| {
            let point = |&(number, mean, low, high): &(usize, f64, f64, f64)| Point {
                x: across(number, &numbers, position, picture.curves.len()),
                mean,
                low,
                high,
            };
            curve.points.iter().map(point).collect()
        })
        .collect();
    let points = || lines.iter().flatten();
    let scale = Scale::over(
        points().map(|point| point.low).fold(100.0, f64::min),
        points().map(|point| point.high).fold(0.0, f64::max),
    );

    let mut svg = format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 {WIDTH} {HEIGHT}\" width=\"{WIDTH}\" \
         height=\"{HEIGHT}\" role=\"img\" aria-labelledby=\"title desc\">\n\
         <title id=\"title\">{}</title>\n\
         <desc id=\"desc\">{}</desc>\n\
         <style>\n{STYLE}</style>\n\
         <rect class=\"paper\" width=\"{WIDTH}\" height=\"{HEIGHT}\"/>\n\
         <text class=\"title\" x=\"{LEFT}\" y=\"34\">{}</text>\n\
         <text class=\"faint\" x=\"{LEFT}\" y=\"56\">{}</text>\n",
        escaped(picture.title),
        escaped(&picture.description),
        escaped(picture.title),
        escaped(&picture.subtitle),
    );
    axes(&mut svg, &scale, &numbers, picture.axis);
    let heights = apart(lines.iter().map(|line| line.last().map_or(BOTTOM, |point| scale.down(point.mean))).collect());
    for (position, line) in lines.iter().enumerate().rev() {
        let label = Label { name: &picture.curves[position].name, height: heights[position] };
        contender_line(&mut svg, &scale, position, line, &label);
    }
    svg + "</svg>\n"
}

/// Which contenders are drawn: all that can be told apart, else the first without and with a starter.
fn shown(contenders: usize) -> Vec<usize> {
    if contenders <= 4 { (0..contenders).collect() } else { vec![0, contenders / 2] }
}

/// Where a number of examples stands: by its logarithm, since going from one to two is worth more than from nine to ten.
/// A single number stands in the middle, with the contenders side by side.
fn across(shot: usize, shots: &[usize], contender: usize, contenders: usize) -> f64 {
    let place = |shot: usize| (shot as f64).ln();
    let (first, last) = (place(shots[0]), place(shots[shots.len() - 1]));
    if shots.len() == 1 {
        let beside = contender as f64 - (contenders as f64 - 1.0) / 2.0;
        return (LEFT + RIGHT) / 2.0 + 130.0 * beside;
    }
    LEFT + 20.0 + (RIGHT - LEFT - 40.0) * (place(shot) - first) / (last - first)
}

/// The axis of the share sorted right.
struct Scale {
    low: f64,
    high: f64,
    step: f64,
}

impl Scale {
    /// Round numbers around what is to be shown, at most nine of them.
    fn over(low: f64, high: f64) -> Self {
        let around = |step: f64| {
            let bottom = ((low / step).floor() * step).min(100.0 - step);
            let top = ((high / step).ceil() * step).max(bottom + step);
            Self { low: bottom, high: top, step }
        };
        let few = |scale: &Self| (scale.high - scale.low) / scale.step <= 8.0;
        [1.0, 2.0, 5.0, 10.0].into_iter().map(around).find(few).unwrap_or_else(|| around(20.0))
    }

    fn down(&self, value: f64) -> f64 {
        BOTTOM - (BOTTOM - TOP) * (value - self.low) / (self.high - self.low)
    }
}

fn axes(svg: &mut String, scale: &Scale, shots: &[usize], axis: &str) {
    let steps = ((scale.high - scale.low) / scale.step).round() as usize;
    for step in 0..=steps {
        let value = scale.low + scale.step * step as f64;
        let y = scale.down(value);
        let _ = writeln!(
            svg,
            "<line class=\"grid\" x1=\"{LEFT}\" x2=\"{RIGHT}\" y1=\"{y:.1}\" y2=\"{y:.1}\"/>\
             <text class=\"faint\" x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"end\">{value:.0} %</text>",
            LEFT - 8.0,
            y + 5.0
        );
    }
    let mut free_from = 0.0;
    for &shot in shots {
        let x = across(shot, shots, 0, 1);
        if x >= free_from {
            let y = BOTTOM + 22.0;
            let _ = writeln!(svg, "<text class=\"faint\" x=\"{x:.1}\" y=\"{y}\" text-anchor=\"middle\">{shot}</text>");
            free_from = x + LABEL_GAP + 6.0;
        }
    }
    let (x, y) = ((LEFT + RIGHT) / 2.0, BOTTOM + 48.0);
    let _ = writeln!(svg, "<text x=\"{x}\" y=\"{y}\" text-anchor=\"middle\">{}</text>", escaped(axis));
}

/// A contender's name, and where it stands at the right.
struct Label<'a> {
    name: &'a str,
    height: f64,
}

fn contender_line(svg: &mut String, scale: &Scale, contender: usize, line: &[Point], label: &Label) {
    let at = |x: f64, value: f64| format!("{x:.1},{:.1}", scale.down(value));
    let means: Vec<String> = line.iter().map(|point| at(point.x, point.mean)).collect();
    let _ = writeln!(svg, "<g class=\"k{}\">", contender % 4);
    if let [only] = line {
        let (x, top, bottom) = (only.x, scale.down(only.high), scale.down(only.low));
        let (from, across, height) = (x - 7.0, 14.0, bottom - top);
        let _ = writeln!(
            svg,
            "<rect class=\"band\" x=\"{from:.1}\" y=\"{top:.1}\" width=\"{across}\" height=\"{height:.1}\"/>\
             <text class=\"name\" x=\"{:.1}\" y=\"{:.1}\">{}</text>",
            x + 12.0,
            scale.down(only.mean) + 5.0,
            escaped(label.name)
        );
    } else {
        let upper = line.iter().map(|point| at(point.x, point.high));
        let lower = line.iter().rev().map(|point| at(point.x, point.low));
        let outline: Vec<String> = upper.chain(lower).collect();
        let end = line.last().map_or((RIGHT, BOTTOM), |point| (point.x, scale.down(point.mean)));
        let _ = writeln!(
            svg,
            "<polygon class=\"band\" points=\"{}\"/>\n<polyline class=\"line\" points=\"{}\"/>\n\
             <line class=\"leader\" x1=\"{:.1}\" y1=\"{:.1}\" x2=\"{:.1}\" y2=\"{:.1}\"/>\
             <text class=\"name\" x=\"{:.1}\" y=\"{:.1}\">{}</text>",
            outline.join(" "),
            means.join(" "),
            end.0 + 6.0,
            end.1,
            RIGHT + 6.0,
            label.height,
            RIGHT + 10.0,
            label.height + 5.0,
            escaped(label.name)
        );
    }
    for point in line {
        let _ = writeln!(svg, "{}", mark(contender, point.x, scale.down(point.mean)));
    }
    svg.push_str("</g>\n");
}

/// A circle, square, triangle or diamond.
fn mark(contender: usize, x: f64, y: f64) -> String {
    let corners: &[(f64, f64)] = match contender % 4 {
        0 => return format!("<circle class=\"mark\" cx=\"{x:.1}\" cy=\"{y:.1}\" r=\"5\"/>"),
        1 => &[(-4.0, -4.0), (4.0, -4.0), (4.0, 4.0), (-4.0, 4.0)],
        2 => &[(0.0, -5.0), (5.0, 4.0), (-5.0, 4.0)],
        _ => &[(0.0, -6.0), (5.0, 0.0), (0.0, 6.0), (-5.0, 0.0)],
    };
    let points: Vec<String> = corners.iter().map(|(dx, dy)| format!("{:.1},{:.1}", x + dx, y + dy)).collect();
    format!("<polygon class=\"mark\" points=\"{}\"/>", points.join(" "))
}

/// Heights as near to these as they can be without labels on top of each other or below the axis.
fn apart(heights: Vec<f64>) -> Vec<f64> {
    let mut order: Vec<usize> = (0..heights.len()).collect();
    order.sort_by(|&a, &b| heights[a].total_cmp(&heights[b]));
    let mut placed = heights;
    let mut floor = f64::NEG_INFINITY;
    for &label in &order {
        placed[label] = placed[label].max(floor);
        floor = placed[label] + LABEL_GAP;
    }
    let mut ceiling = BOTTOM;
    for &label in order.iter().rev() {
        placed[label] = placed[label].min(ceiling);
        ceiling = placed[label] - LABEL_GAP;
    }
    placed
}

/// The picture in words: every number in it.
fn description(report: &Report) -> String {
    let shots = report.design.shots();
    let mut text = format!(
        "Share of {} sorted right, in %, with 95 % intervals, over {} draws of {} categories.",
        report.noun, report.episodes, report.ways
    );
    for (contender, name) in report.contenders.iter().enumerate() {
        let numbers: Vec<String> = shots
            .iter()
            .enumerate()
            .map(|(at, &shot)| {
                let found = report.summary.accuracy(contender, at);
                format!("{:.1} ± {:.1} with {}", 100.0 * found.mean, 100.0 * found.half_width, examples(shot))
            })
            .collect();
        let _ = write!(text, " {name}: {}.", numbers.join(", "));
    }
    text
}

fn escaped(text: &str) -> String {
    text.replace('&', "&amp;").replace('<', "&lt;").replace('>', "&gt;").replace('"', "&quot;")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_axis_holds_what_is_shown() {
        for (low, high) in [(72.3, 94.1), (0.0, 100.0), (99.8, 100.0), (100.0, 100.0), (0.0, 0.0), (20.0, 20.0)] {
            let scale = Scale::over(low, high);
            assert!(scale.low <= low && scale.high >= high && scale.low < scale.high && scale.high <= 100.0);
            assert!((scale.high - scale.low) / scale.step <= 8.0, "{low} {high}");
        }
    }

    #[test]
    fn labels_keep_their_distance() {
        for heights in [vec![100.0, 101.0, 99.0, 240.0], vec![BOTTOM; 4], vec![TOP; 4], vec![200.0]] {
            let mut placed = apart(heights);
            placed.sort_by(f64::total_cmp);
            assert!(placed.windows(2).all(|pair| pair[1] - pair[0] >= LABEL_GAP - 1e-9));
            assert!(placed.iter().all(|&height| (TOP - 1e-9..=BOTTOM + 1e-9).contains(&height)));
        }
    }
}
