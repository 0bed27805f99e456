//! The plot: four panels over one time axis, as SVG or PNG.

use std::fmt;
use std::path::{Path, PathBuf};

use plotters::coord::Shift;
use plotters::prelude::*;
use plotters::style::register_font;
use plotters::style::text_anchor::{HPos, Pos, VPos};

use crate::chart::{Curve, FONT, Failure, Layout, Panel, Pen, Swatch};
use crate::replay::Outcome;
use crate::track::{Point, RunPoint, Track};
use crate::{units, words};

// Colours that the colour-blind can tell apart: Okabe and Ito 2008, Color Universal Design (from memory).
const BLUE: RGBColor = RGBColor(0, 114, 178);
const VERMILION: RGBColor = RGBColor(213, 94, 0);
const GREEN: RGBColor = RGBColor(0, 158, 115);
const PURPLE: RGBColor = RGBColor(160, 80, 130);
const SLATE: RGBColor = RGBColor(110, 118, 126);

const SIZE: (u32, u32) = (1000, 1060);
const HEAD: i32 = 50;

/// Pixels, or an SVG's whole units, for each pixel of the layout.
const FINENESS: u32 = 2;

/// Where to draw to; the extension says how.
#[derive(Clone, Debug)]
pub(crate) struct PlotFile {
    path: PathBuf,
    kind: Kind,
}

#[derive(Clone, Copy, Debug)]
enum Kind {
    Svg,
    Png,
}

impl PlotFile {
    /// Refuses what cannot be drawn before any work is done.
    pub(crate) fn parse(text: &str) -> Result<Self, String> {
        let path = PathBuf::from(text);
        let kind = match path.extension().and_then(|e| e.to_str()).map(str::to_ascii_lowercase).as_deref() {
            Some("svg") => Kind::Svg,
            Some("png") => Kind::Png,
            _ => return Err("the file's name must end in .svg or .png".to_owned()),
        };
        let folder = path.parent().filter(|folder| !folder.as_os_str().is_empty()).unwrap_or(Path::new("."));
        if !folder.is_dir() {
            return Err(format!("there is no folder {}", folder.display()));
        }
        Ok(Self { path, kind })
    }
}

impl fmt::Display for PlotFile {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.path.display().fmt(f)
    }
}

/// What the plot is about.
pub(crate) struct Subject<'a> {
    pub(crate) title: &'a str,
    pub(crate) outcome: &'a Outcome,
    /// Lowest and highest usable level, V.
    pub(crate) usable_v: (f64, f64),
}

/// Draws `track` into `file`.
pub(crate) fn draw(file: &PlotFile, track: &Track, subject: &Subject<'_>) -> Result<(), Failure> {
    // A machine may have no fonts at all: the program brings its own.
    for (style, font) in [(FontStyle::Normal, dejavu::sans::regular()), (FontStyle::Bold, dejavu::sans::bold())] {
        register_font(FONT, style, font).map_err(|_| "the built-in font cannot be read")?;
    }
    let size = (SIZE.0 * FINENESS, SIZE.1 * FINENESS);
    let scale = FINENESS.cast_signed();
    match file.kind {
        Kind::Svg => {
            let mut drawing = String::new();
            draw_on(SVGBackend::with_string(&mut drawing, size).into_drawing_area(), scale, track, subject)?;
            // Drawn finely, shown at its size.
            let drawn = format!("width=\"{}\" height=\"{}\"", size.0, size.1);
            let shown = format!("width=\"{}\" height=\"{}\"", SIZE.0, SIZE.1);
            std::fs::write(&file.path, drawing.replacen(&drawn, &shown, 1))?;
            Ok(())
        }
        Kind::Png => draw_on(BitMapBackend::new(&file.path, size).into_drawing_area(), scale, track, subject),
    }
}

fn draw_on<'a, B: DrawingBackend + 'a>(
    area: DrawingArea<B, Shift>,
    scale: i32,
    track: &Track,
    subject: &Subject<'_>,
) -> Result<(), Failure>
where
    B::ErrorType: 'static,
{
    let layout = Layout { scale, left: 84, labels: 72, right: 22, strip: 34, bottom: 42 };
    area.fill(&WHITE)?;
    let points = track.points();
    let times = match (points.first(), points.last()) {
        (Some(first), Some(last)) if last.time_s > first.time_s => (first.time_s, last.time_s),
        _ => return Err("the trace has too few rows to draw".into()),
    };
    let (head, body) = area.split_vertically(layout.px(HEAD));
    draw_head(&head, layout, subject)?;
    let panels = [level(&points, subject), effective(&points), drift(&points), integral(&points, subject.outcome.unit)];
    // The lowest panel also holds the time axis.
    let height = (body.dim_in_pixel().1.cast_signed() - layout.px(layout.bottom)) / 4;
    let areas = body.split_by_breakpoints([] as [i32; 0], [height, 2 * height, 3 * height]);
    for (index, (mut panel, area)) in panels.into_iter().zip(&areas).enumerate() {
        panel.shades = shades(track, times);
        if index == 0 {
            panel.legend.extend(shade_legend(track));
        }
        panel.draw(area, layout, times, index == 3)?;
    }
    area.present()?;
    Ok(())
}

fn draw_head<'a, B: DrawingBackend + 'a>(
    head: &DrawingArea<B, Shift>,
    layout: Layout,
    subject: &Subject<'_>,
) -> Result<(), Failure>
where
    B::ErrorType: 'static,
{
    let left = Pos::new(HPos::Left, VPos::Center);
    let x = layout.px(layout.left);
    head.draw(&Text::new(subject.title, (x, layout.px(18)), layout.bold(16).pos(left)))?;
    head.draw(&Text::new(summary(subject.outcome), (x, layout.px(40)), layout.text(13).pos(left)))?;
    Ok(())
}

/// The first run's result in one line.
fn summary(outcome: &Outcome) -> String {
    let Some(run) = outcome.runs.first() else { return "no complete run".to_owned() };
    let latest = run.latest();
    let which = if outcome.runs.len() > 1 { "first run: " } else { "" };
    let result = units::with_uncertainty(latest.value, 2.0 * latest.u, outcome.unit);
    let trust = words::trust_name(run.trust).replace('_', " ");
    let off = units::two_digits(run.at_stop.value + run.drift_removed - latest.value, outcome.unit);
    format!("{which}{result} (U = 2 u), trust: {trust}, resets: {}; without drift correction off by {off}", run.resets)
}

/// Zeros and resets, the latter wide enough to be seen.
fn shades(track: &Track, (start, end): (f64, f64)) -> Vec<(f64, f64, RGBAColor)> {
    let least_s = 3.0 * (end - start) / f64::from(SIZE.0);
    let zeros = track.zeros().iter().map(|&(from, to)| (from, to, zero_shade()));
    let resets = track.resets().iter().map(|&(from, to)| {
        let missing = (least_s - (to - from)).max(0.0);
        ((from - 0.5 * missing).max(start), (to + 0.5 * missing).min(end), reset_shade())
    });
    zeros.chain(resets).collect()
}

/// Of a long trace there may be too many to be shaded.
fn shade_legend(track: &Track) -> Vec<(&'static str, Swatch)> {
    let zero = (!track.zeros().is_empty()).then_some(("zero", Swatch::Area(zero_shade())));
    let reset = (!track.resets().is_empty()).then_some(("reset", Swatch::Area(reset_shade())));
    zero.into_iter().chain(reset).collect()
}

fn zero_shade() -> RGBAColor {
    SLATE.mix(0.12)
}

fn reset_shade() -> RGBAColor {
    VERMILION.mix(0.28)
}

fn pen(colour: RGBColor) -> Pen {
    Pen { colour, width: 1, dashed: false }
}

fn level(points: &[Point], subject: &Subject<'_>) -> Panel {
    let (low, high) = subject.usable_v;
    let (first, last) = (points.first().map_or(0.0, |p| p.time_s), points.last().map_or(0.0, |p| p.time_s));
    let rail = Pen { colour: SLATE, width: 1, dashed: true };
    Panel {
        title: "Level",
        quantity: "level",
        unit: "V".to_owned(),
        range: (low, high),
        shades: Vec::new(),
        bands: Vec::new(),
        curves: vec![
            (vec![(first, low), (last, low)], rail),
            (vec![(first, high), (last, high)], rail),
            (points.iter().map(|p| (p.time_s, p.level_v)).collect(), pen(BLUE)),
        ],
        legend: vec![("level", Swatch::Line(pen(BLUE))), ("end of the usable range", Swatch::Line(rail))],
    }
}

fn effective(points: &[Point]) -> Panel {
    let baseline = Pen { colour: VERMILION, width: 2, dashed: false };
    let effective: Curve = points.iter().filter_map(|p| Some((p.time_s, p.effective_v?))).collect();
    let mut curves: Vec<(Curve, Pen)> =
        by_run(points, |run| run.baseline_v).into_iter().map(|curve| (curve, baseline)).collect();
    let range = span(effective.iter().chain(curves.iter().flat_map(|(curve, _)| curve)).map(|&(_, y)| y));
    curves.insert(0, (effective, pen(BLUE)));
    Panel {
        title: "Effective level and baseline",
        quantity: "level",
        unit: "V".to_owned(),
        range,
        shades: Vec::new(),
        bands: Vec::new(),
        curves,
        legend: vec![
            ("level, resets taken out", Swatch::Line(pen(BLUE))),
            ("baseline: the level with no input", Swatch::Line(baseline)),
        ],
    }
}

fn drift(points: &[Point]) -> Panel {
    // Before the first zero has settled the band is what the data sheet allows: it may leave the panel.
    let mut spreads: Vec<f64> = points.iter().map(|p| p.drift_u).collect();
    spreads.sort_by(f64::total_cmp);
    let usual = spreads.get(spreads.len() / 2).copied().unwrap_or(0.0);
    let shown: Vec<&Point> = points.iter().filter(|p| p.drift_u <= 6.0 * usual).collect();
    let limits = shown.iter().flat_map(|p| [p.drift_v_per_s - 2.0 * p.drift_u, p.drift_v_per_s + 2.0 * p.drift_u]);
    let band: Vec<_> = points
        .iter()
        .map(|p| (p.time_s, p.drift_v_per_s - 2.0 * p.drift_u, p.drift_v_per_s + 2.0 * p.drift_u))
        .collect();
    Panel {
        title: "Drift",
        quantity: "drift",
        unit: "V/s".to_owned(),
        range: span(limits),
        shades: Vec::new(),
        bands: vec![(band, GREEN.mix(0.25))],
        curves: vec![(shown.iter().map(|p| (p.time_s, p.drift_v_per_s)).collect(), pen(GREEN))],
        legend: vec![("drift", Swatch::Line(pen(GREEN))), ("± 2 u", Swatch::Area(GREEN.mix(0.25)))],
    }
}

fn integral(points: &[Point], unit: &'static str) -> Panel {
    let dashed = Pen { colour: VERMILION, width: 1, dashed: true };
    let values = by_run(points, |run| run.value);
    let low = by_run(points, |run| run.value - 2.0 * run.u);
    let high = by_run(points, |run| run.value + 2.0 * run.u);
    let uncorrected = by_run(points, |run| run.uncorrected);
    let all = low.iter().chain(&high).chain(&uncorrected).flatten().map(|&(_, y)| y);
    let range = span(all);
    let band = |(low, high): (&Curve, &Curve)| {
        let outline = low.iter().zip(high).map(|(&(x, low), &(_, high))| (x, low, high)).collect();
        (outline, PURPLE.mix(0.3))
    };
    let bands = low.iter().zip(&high).map(band).collect();
    let solid = Pen { colour: PURPLE, width: 2, dashed: false };
    let curves = values.into_iter().map(|curve| (curve, solid));
    let curves = curves.chain(uncorrected.into_iter().map(|curve| (curve, dashed))).collect();
    Panel {
        title: "Integral of the running run",
        quantity: "integral",
        unit: unit.to_owned(),
        range,
        shades: Vec::new(),
        bands,
        curves,
        legend: vec![
            ("integral", Swatch::Line(solid)),
            ("± 2 u", Swatch::Area(PURPLE.mix(0.3))),
            ("without drift correction", Swatch::Line(dashed)),
        ],
    }
}

/// One curve for each run.
fn by_run(points: &[Point], value: impl Fn(&RunPoint) -> f64) -> Vec<Curve> {
    let mut curves: Vec<(u32, Curve)> = Vec::new();
    for (time_s, run) in points.iter().filter_map(|p| Some((p.time_s, p.run?))) {
        match curves.last_mut() {
            Some((number, curve)) if *number == run.number => curve.push((time_s, value(&run))),
            _ => curves.push((run.number, vec![(time_s, value(&run))])),
        }
    }
    curves.into_iter().map(|(_, curve)| curve).collect()
}

/// Lowest and highest of `values`; 0 and 1 if there are none.
fn span(values: impl Iterator<Item = f64>) -> (f64, f64) {
    let (low, high) = values
        .filter(|value| value.is_finite())
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), value| (low.min(value), high.max(value)));
    if low <= high { (low, high) } else { (0.0, 1.0) }
}
