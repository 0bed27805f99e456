//! One panel of the plot: its scale, ticks, title, legend, curves and bands.

use std::ops::Range;

use plotters::coord::Shift;
use plotters::coord::ranged1d::{DefaultFormatting, KeyPointHint};
use plotters::prelude::*;
use plotters::style::text_anchor::{HPos, Pos, VPos};

use crate::units;

/// The font that is registered under this name, and that an SVG asks its viewer for.
pub(crate) const FONT: &str = "sans-serif";

pub(crate) const INK: RGBColor = RGBColor(45, 50, 56);
const GRID: RGBColor = RGBColor(226, 229, 232);

/// A pen: colour, width in pixels, dashed or not.
#[derive(Clone, Copy)]
pub(crate) struct Pen {
    pub(crate) colour: RGBColor,
    pub(crate) width: u32,
    pub(crate) dashed: bool,
}

/// What a legend shows beside its text.
#[derive(Clone, Copy)]
pub(crate) enum Swatch {
    Line(Pen),
    Area(RGBAColor),
}

/// Curves that belong together: x, y.
pub(crate) type Curve = Vec<(f64, f64)>;

/// An area between a lower and an upper curve: x, lower, upper.
pub(crate) type Band = Vec<(f64, f64, f64)>;

/// What a panel draws, in SI units.
pub(crate) struct Panel {
    pub(crate) title: &'static str,
    /// What the vertical axis shows.
    pub(crate) quantity: &'static str,
    pub(crate) unit: String,
    /// Lowest and highest value to be shown.
    pub(crate) range: (f64, f64),
    /// Upright areas over the whole height: from, to, colour.
    pub(crate) shades: Vec<(f64, f64, RGBAColor)>,
    pub(crate) bands: Vec<(Band, RGBAColor)>,
    pub(crate) curves: Vec<(Curve, Pen)>,
    pub(crate) legend: Vec<(&'static str, Swatch)>,
}

/// Sizes in pixels, all multiplied by `scale`.
#[derive(Clone, Copy)]
pub(crate) struct Layout {
    pub(crate) scale: i32,
    pub(crate) left: i32,
    /// Part of `left` beside the axis, for its labels and name.
    pub(crate) labels: i32,
    pub(crate) right: i32,
    pub(crate) strip: i32,
    pub(crate) bottom: i32,
}

impl Layout {
    pub(crate) fn px(self, size: i32) -> i32 {
        size * self.scale
    }

    pub(crate) fn text(self, size: i32) -> TextStyle<'static> {
        (FONT, self.px(size)).into_font().color(&INK)
    }

    pub(crate) fn bold(self, size: i32) -> TextStyle<'static> {
        FontDesc::new(FontFamily::SansSerif, f64::from(self.px(size)), FontStyle::Bold).color(&INK)
    }

    fn stroke(self, pen: Pen) -> ShapeStyle {
        pen.colour.stroke_width(pen.width * self.scale.unsigned_abs())
    }
}

/// A drawing error, whatever drew.
pub(crate) type Failure = Box<dyn std::error::Error>;

type Area<'a, B> = DrawingArea<B, Shift>;

impl Panel {
    /// Draws the panel into `area`. `times` is the time axis; only the lowest panel writes it out.
    pub(crate) fn draw<'a, B: DrawingBackend + 'a>(
        &self,
        area: &Area<'a, B>,
        layout: Layout,
        times: (f64, f64),
        lowest: bool,
    ) -> Result<(), Failure>
    where
        B::ErrorType: 'static,
    {
        let (strip, body) = area.split_vertically(layout.px(layout.strip));
        self.draw_strip(&strip, layout)?;
        let (low, high) = padded(self.range);
        let (factor, symbol) = units::prefix(low.abs().max(high.abs()));
        let (low, high) = (low / factor, high / factor);
        let (x_axis, y_axis) = (Axis::new(times.0, times.1, 9.0), Axis::new(low, high, 6.0));
        let (x_places, y_places) = (x_axis.places, y_axis.places);
        let mut chart = ChartBuilder::on(&body)
            // The axis's name stands upright and needs half its height beyond the label area.
            .margin_left(layout.px(layout.left - layout.labels))
            .margin_right(layout.px(layout.right))
            .set_label_area_size(LabelAreaPosition::Left, layout.px(layout.labels))
            .set_label_area_size(LabelAreaPosition::Bottom, if lowest { layout.px(layout.bottom) } else { 0 })
            .build_cartesian_2d(x_axis, y_axis)?;
        for &(from, to, colour) in &self.shades {
            chart.draw_series(std::iter::once(Rectangle::new([(from, low), (to, high)], colour.filled())))?;
        }
        let x_label = |time: &f64| format!("{time:.x_places$}");
        let y_label = |value: &f64| format!("{:.y_places$}", value + 0.0);
        chart
            .configure_mesh()
            .light_line_style(TRANSPARENT)
            .bold_line_style(GRID.stroke_width(layout.scale.unsigned_abs()))
            .axis_style(INK.stroke_width(layout.scale.unsigned_abs()))
            .label_style(layout.text(12))
            .axis_desc_style(layout.text(13))
            .x_label_formatter(&x_label)
            .y_label_formatter(&y_label)
            .x_labels(20)
            .y_labels(20)
            .x_desc(if lowest { "time since the first row / s" } else { "" })
            .y_desc(format!("{} / {symbol}{}", self.quantity, self.unit))
            .draw()?;
        let grid = Grid::new(&chart.plotting_area().dim_in_pixel(), times, (low, high));
        for (band, colour) in &self.bands {
            let upper = band.iter().map(|&(x, _, upper)| (x, (upper / factor).clamp(low, high)));
            let lower = band.iter().map(|&(x, lower, _)| (x, (lower / factor).clamp(low, high)));
            let mut outline = grid.thin(upper);
            let mut back = grid.thin(lower);
            back.reverse();
            outline.append(&mut back);
            chart.draw_series(std::iter::once(Polygon::new(outline, *colour)))?;
        }
        let visible = |&(_, y): &(f64, f64)| (low..=high).contains(&(y / factor));
        for (curve, pen) in &self.curves {
            let style = layout.stroke(*pen);
            for part in curve.split(|point| !visible(point)).filter(|part| !part.is_empty()) {
                let points = grid.thin(part.iter().map(|&(x, y)| (x, y / factor)));
                if pen.dashed {
                    let (dash, gap) = (layout.px(7), layout.px(5));
                    chart.draw_series(DashedLineSeries::new(points, dash, gap, style))?;
                } else {
                    chart.draw_series(LineSeries::new(points, style))?;
                }
            }
        }
        Ok(())
    }

    /// Title on the left, legend on the right, above the panel.
    fn draw_strip<'a, B: DrawingBackend + 'a>(&self, strip: &Area<'a, B>, layout: Layout) -> Result<(), Failure>
    where
        B::ErrorType: 'static,
    {
        let middle = layout.px(layout.strip) - layout.px(11);
        let left = Pos::new(HPos::Left, VPos::Center);
        strip.draw(&Text::new(self.title, (layout.px(layout.left), middle), layout.bold(13).pos(left)))?;
        let (width, _) = strip.dim_in_pixel();
        let style = layout.text(12).pos(left);
        let mut x = width.cast_signed() - layout.px(layout.right);
        for &(text, swatch) in self.legend.iter().rev() {
            let (text_width, _) = strip.estimate_text_size(text, &style)?;
            x -= text_width.cast_signed();
            strip.draw(&Text::new(text, (x, middle), style.clone()))?;
            let (from, to) = (x - layout.px(30), x - layout.px(6));
            match swatch {
                Swatch::Area(colour) => {
                    let corners = [(from, middle - layout.px(5)), (to, middle + layout.px(5))];
                    strip.draw(&Rectangle::new(corners, colour.filled()))?;
                }
                Swatch::Line(pen) => {
                    let dash = if pen.dashed { layout.px(9) } else { to - from };
                    let mut at = from;
                    while at < to {
                        let end = (at + dash).min(to);
                        strip.draw(&PathElement::new(vec![(at, middle), (end, middle)], layout.stroke(pen)))?;
                        at = end + layout.px(5);
                    }
                }
            }
            x = from - layout.px(16);
        }
        Ok(())
    }
}

/// A little room above and below; never an empty range.
fn padded((low, high): (f64, f64)) -> (f64, f64) {
    let span = high - low;
    let room = if span > 0.0 { 0.06 * span } else { (0.1 * high.abs()).max(1e-18) };
    (low - room, high + room)
}

/// An axis with round ticks of our own choice.
struct Axis {
    low: f64,
    high: f64,
    ticks: Vec<f64>,
    /// Decimals that the ticks need.
    places: usize,
}

impl Axis {
    fn new(low: f64, high: f64, count: f64) -> Self {
        let (ticks, places) = ticks(low, high, count);
        Self { low, high, ticks, places }
    }
}

impl Ranged for Axis {
    type FormatOption = DefaultFormatting;
    type ValueType = f64;

    fn map(&self, value: &f64, (from, to): (i32, i32)) -> i32 {
        from + ((value - self.low) / (self.high - self.low) * f64::from(to - from)).round() as i32
    }

    fn key_points<Hint: KeyPointHint>(&self, hint: Hint) -> Vec<f64> {
        if hint.weight().allow_light_points() { Vec::new() } else { self.ticks.clone() }
    }

    fn range(&self) -> Range<f64> {
        self.low..self.high
    }
}

/// About `count` round values within `low` and `high`, and the decimals that they need.
fn ticks(low: f64, high: f64, count: f64) -> (Vec<f64>, usize) {
    let rough = (high - low) / count;
    let decade = 10_f64.powf(rough.log10().floor());
    let step = [1.0, 2.0, 5.0].into_iter().map(|digit| digit * decade).find(|step| *step >= rough);
    let step = step.unwrap_or(10.0 * decade);
    let first = (low / step).ceil();
    let last = (high / step + 1e-9).floor();
    let number = (last - first).clamp(0.0, 50.0) as u32;
    let places = (-(step.log10() + 1e-9).floor()).max(0.0) as usize;
    ((0..=number).map(|i| (first + f64::from(i)) * step).collect(), places)
}

/// The pixels of a panel, so that a curve holds no point that cannot be seen.
struct Grid {
    x: (f64, f64),
    y: (f64, f64),
}

impl Grid {
    fn new((width, height): &(u32, u32), x: (f64, f64), y: (f64, f64)) -> Self {
        let per_unit = |pixels: u32, (low, high): (f64, f64)| (low, f64::from(pixels) / (high - low));
        Self { x: per_unit(*width, x), y: per_unit(*height, y) }
    }

    /// Leaves out points within a straight line of pixels.
    fn thin(&self, points: impl Iterator<Item = (f64, f64)>) -> Curve {
        let mut kept: Vec<((f64, f64), (i64, i64))> = Vec::new();
        for (x, y) in points {
            let pixel = (((x - self.x.0) * self.x.1).round() as i64, ((y - self.y.0) * self.y.1).round() as i64);
            if let [.., (_, a), (_, b)] = kept.as_slice() {
                let (along, next) = ((b.0 - a.0, b.1 - a.1), (pixel.0 - b.0, pixel.1 - b.1));
                let straight = along.0 * next.1 == along.1 * next.0;
                let onward = along.0 * next.0 + along.1 * next.1 >= 0;
                if straight && onward {
                    kept.pop();
                }
            }
            kept.push(((x, y), pixel));
        }
        kept.into_iter().map(|(point, _)| point).collect()
    }
}
