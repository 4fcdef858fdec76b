//! The report's figures, as SVG. Plain numbers in, one file a figure out.

use plotters::coord::Shift;
use plotters::prelude::*;
use std::error::Error;
use std::ops::Range;
use std::path::Path;

/// Colours that stay apart for colour-blind readers (Okabe & Ito 2008).
const BLUE: RGBColor = RGBColor(0, 114, 178);
const VERMILION: RGBColor = RGBColor(213, 94, 0);
const GREY: RGBColor = RGBColor(140, 140, 140);
const SAND: RGBColor = RGBColor(240, 228, 200);
const AMBER: RGBColor = RGBColor(230, 159, 0);
const INK: RGBColor = RGBColor(40, 40, 40);

const FONT: &str = "sans-serif";
type Drawn = Result<(), Box<dyn Error>>;
type Canvas<'a> = DrawingArea<SVGBackend<'a>, Shift>;

/// A curve with its name in the legend. Colour tells the axis, dashes tell the still eye, so that
/// nothing hangs on colour alone.
pub struct Curve<'a> {
    pub name: &'a str,
    pub axis: Axis,
    pub still: bool,
    pub x: Vec<f64>,
    pub y: Vec<f64>,
}

/// What a curve is about.
#[derive(Clone, Copy)]
pub enum Axis {
    Both,
    Horizontal,
    Vertical,
}

impl Curve<'_> {
    fn colour(&self) -> RGBColor {
        match (self.axis, self.still) {
            (Axis::Both, true) => GREY,
            (Axis::Both, false) | (Axis::Horizontal, _) => BLUE,
            (Axis::Vertical, _) => VERMILION,
        }
    }

    /// The points that a log axis can show.
    fn points(&self) -> Vec<(f64, f64)> {
        let points = self.x.iter().copied().zip(self.y.iter().copied());
        points.filter(|(x, y)| *x > 0.0 && *y > 0.0).collect()
    }
}

fn canvas(path: &Path, size: (u32, u32)) -> Result<Canvas<'_>, Box<dyn Error>> {
    let root = SVGBackend::new(path, size).into_drawing_area();
    root.fill(&WHITE)?;
    Ok(root)
}

/// Title, margins and room for the axes' labels.
fn framed<'a, 'b>(root: &'a Canvas<'b>, title: &str) -> ChartBuilder<'a, 'b, SVGBackend<'b>> {
    let mut chart = ChartBuilder::on(root);
    chart.caption(title, (FONT, 18).into_font().color(&INK));
    chart.margin(14).x_label_area_size(44).y_label_area_size(76);
    chart
}

/// Both axes over time; events are bands behind the curves, missing samples are breaks in them.
pub fn trace(
    path: &Path,
    title: &str,
    interval: f64,
    axes: [&[f64]; 2],
    events: &[Range<usize>],
) -> Drawn {
    const WIDTH: u32 = 1100;
    let root = canvas(path, (WIDTH, 560))?;
    root.titled(title, (FONT, 18).into_font().color(&INK))?;
    let panels = root.margin(28, 0, 0, 0).split_evenly((2, 1));
    let duration = interval * axes[0].len() as f64;
    for ((panel, values), (name, colour)) in
        panels.iter().zip(axes).zip([("horizontal (deg)", BLUE), ("vertical (deg)", VERMILION)])
    {
        let range = spread(values.iter().copied());
        let mut chart = ChartBuilder::on(panel)
            .margin_left(14)
            .margin_right(18)
            .margin_top(8)
            .x_label_area_size(42)
            .y_label_area_size(64)
            .build_cartesian_2d(0.0..duration, range.clone())?;
        chart.draw_series(events.iter().map(|event| {
            // A band at least one pixel wide, so that a 20 ms event shows in a minute.
            let (start, end) = (interval * event.start as f64, interval * event.end as f64);
            let end = end.max(start + duration / f64::from(WIDTH));
            Rectangle::new([(start, range.start), (end, range.end)], AMBER.mix(0.45).filled())
        }))?;
        chart
            .configure_mesh()
            .disable_x_mesh()
            .light_line_style(WHITE)
            .bold_line_style(GREY.mix(0.25))
            .x_desc("time (s)")
            .y_desc(name)
            .x_label_formatter(&plain)
            .y_label_formatter(&plain)
            .label_style((FONT, 13))
            .axis_desc_style((FONT, 14))
            .draw()?;
        for piece in outline(values, interval, 2 * WIDTH as usize) {
            chart.draw_series(LineSeries::new(piece, colour))?;
        }
    }
    root.present()?;
    Ok(())
}

/// Velocity of every sample, of the samples in events, and the threshold ellipse.
pub fn velocity_plane(
    path: &Path,
    title: &str,
    velocity: [&[f64]; 2],
    events: &[Range<usize>],
    threshold: [f64; 2],
) -> Drawn {
    let root = canvas(path, (640, 640))?;
    let inside = |i: usize| events.iter().any(|event| event.contains(&i));
    let finite = |v: &f64| if v.is_finite() { v.abs() } else { 0.0 };
    let reach = velocity.iter().flat_map(|axis| axis.iter().map(finite)).fold(0.0, f64::max);
    let reach = 1.05 * reach.max(1.2 * threshold[0].max(threshold[1]));
    let mut chart = framed(&root, title).build_cartesian_2d(-reach..reach, -reach..reach)?;
    mesh(&mut chart, "horizontal velocity (deg/s)", "vertical velocity (deg/s)")?;
    let [vx, vy] = velocity;
    // One dot a pixel is enough for the cloud.
    let mut seen = std::collections::HashSet::new();
    let mut cloud = Vec::new();
    for (i, (x, y)) in vx.iter().zip(vy).enumerate() {
        let cell = ((x / reach * 280.0).round() as i32, (y / reach * 280.0).round() as i32);
        if x.is_finite() && y.is_finite() && !inside(i) && seen.insert(cell) {
            cloud.push((*x, *y));
        }
    }
    chart
        .draw_series(cloud.into_iter().map(|at| Circle::new(at, 1, GREY.mix(0.6).filled())))?
        .label("samples")
        .legend(|(x, y)| Circle::new((x + 10, y), 2, GREY.filled()));
    for (k, event) in events.iter().enumerate() {
        let path = event.clone().filter_map(|i| Some((*vx.get(i)?, *vy.get(i)?)));
        let path = path.filter(|(x, y)| x.is_finite() && y.is_finite());
        let drawn = chart.draw_series(LineSeries::new(path, BLUE.mix(0.7).stroke_width(1)))?;
        if k == 0 {
            drawn.label("events").legend(|(x, y)| PathElement::new([(x, y), (x + 20, y)], BLUE));
        }
    }
    let ellipse = (0..=180).map(|k| {
        let angle = f64::from(k) * std::f64::consts::TAU / 180.0;
        (threshold[0] * angle.cos(), threshold[1] * angle.sin())
    });
    chart
        .draw_series(LineSeries::new(ellipse, VERMILION.stroke_width(2)))?
        .label("threshold")
        .legend(|(x, y)| PathElement::new([(x, y), (x + 20, y)], VERMILION.stroke_width(2)));
    legend(&mut chart, SeriesLabelPosition::UpperRight)?;
    root.present()?;
    Ok(())
}

/// Peak velocity over amplitude, both on log axes.
pub fn main_sequence(path: &Path, title: &str, amplitude: &[f64], peak: &[f64]) -> Drawn {
    let root = canvas(path, (640, 520))?;
    let points: Vec<(f64, f64)> = amplitude
        .iter()
        .zip(peak)
        .map(|(a, p)| (60.0 * a, *p))
        .filter(|(a, p)| *a > 0.0 && *p > 0.0)
        .collect();
    let x = decades(points.iter().map(|p| p.0));
    let y = decades(points.iter().map(|p| p.1));
    let mut chart = framed(&root, title).build_cartesian_2d(x.log_scale(), y.log_scale())?;
    mesh(&mut chart, "amplitude (arcmin)", "peak velocity (deg/s)")?;
    chart.draw_series(points.into_iter().map(|at| Circle::new(at, 3, BLUE.mix(0.7).filled())))?;
    root.present()?;
    Ok(())
}

/// Spectral densities on log axes, with the band of interest behind them.
pub fn spectrum(path: &Path, title: &str, band: [f64; 2], curves: &[Curve]) -> Drawn {
    let root = canvas(path, (760, 520))?;
    let all: Vec<(f64, f64)> = curves.iter().flat_map(Curve::points).collect();
    let x = extent(all.iter().map(|p| p.0));
    let y = decades(all.iter().map(|p| p.1));
    let mut chart =
        framed(&root, title).build_cartesian_2d(x.clone().log_scale(), y.clone().log_scale())?;
    let band = [band[0].max(x.start), band[1].min(x.end)];
    if band[0] < band[1] {
        let corners = [(band[0], y.start), (band[1], y.end)];
        chart.draw_series(std::iter::once(Rectangle::new(corners, SAND.filled())))?;
    }
    mesh(&mut chart, "frequency (Hz)", "density (deg²/Hz)")?;
    draw_curves(&mut chart, curves, false)?;
    legend(&mut chart, SeriesLabelPosition::UpperRight)?;
    root.present()?;
    Ok(())
}

/// Deviations over averaging time, both on log axes.
pub fn allan(path: &Path, title: &str, curves: &[Curve]) -> Drawn {
    let root = canvas(path, (760, 520))?;
    let all: Vec<(f64, f64)> = curves.iter().flat_map(Curve::points).collect();
    let x = extent(all.iter().map(|p| p.0));
    let y = decades(all.iter().map(|p| p.1));
    let mut chart = framed(&root, title).build_cartesian_2d(x.log_scale(), y.log_scale())?;
    mesh(&mut chart, "averaging time (s)", "overlapping Allan deviation (deg)")?;
    draw_curves(&mut chart, curves, true)?;
    legend(&mut chart, SeriesLabelPosition::LowerLeft)?;
    root.present()?;
    Ok(())
}

/// Rate of false alarms over λ with intervals, and the rate that was found at its λ.
pub fn false_alarms(
    path: &Path,
    title: &str,
    lambda: &[f64],
    rate: &[[f64; 3]],
    found: Option<(f64, f64)>,
) -> Drawn {
    let root = canvas(path, (640, 520))?;
    let largest = found.map_or(0.0, |found| found.1);
    let smallest = rate.iter().map(|r| r[2]).fold(f64::INFINITY, f64::min);
    let y =
        decades(rate.iter().flatten().copied().chain([largest]).filter(|r| *r > 0.2 * smallest));
    let x = spread(lambda.iter().copied().chain(found.map(|found| found.0)));
    let mut chart = framed(&root, title).build_cartesian_2d(x, y.clone().log_scale())?;
    mesh(&mut chart, "λ", "events a second")?;
    let bars = lambda.iter().zip(rate).map(|(l, [low, _, high])| {
        PathElement::new([(*l, low.max(y.start)), (*l, high.max(y.start))], GREY.stroke_width(2))
    });
    chart
        .draw_series(bars)?
        .label("false alarms, 95 % interval")
        .legend(|(x, y)| PathElement::new([(x, y), (x + 20, y)], GREY.stroke_width(2)));
    let dots = lambda.iter().zip(rate).filter(|(_, r)| r[1] > 0.0);
    chart.draw_series(dots.map(|(l, r)| Circle::new((*l, r[1]), 3, GREY.filled())))?;
    if let Some(found) = found {
        chart
            .draw_series(std::iter::once(TriangleMarker::new(found, 7, BLUE.filled())))?
            .label("found in the recording")
            .legend(|(x, y)| TriangleMarker::new((x + 10, y), 6, BLUE.filled()));
    }
    legend(&mut chart, SeriesLabelPosition::UpperRight)?;
    root.present()?;
    Ok(())
}

/// Share of known movements that were found again over their amplitude, with intervals and the fitted
/// curve.
pub fn recovery(
    path: &Path,
    title: &str,
    points: &[(f64, [f64; 3])],
    fitted: impl Fn(f64) -> Option<f64>,
) -> Drawn {
    let root = canvas(path, (640, 520))?;
    let x = extent(points.iter().map(|point| point.0));
    let mut chart = framed(&root, title)
        .build_cartesian_2d((x.start / 1.1..x.end * 1.1).log_scale(), -0.02..1.02)?;
    mesh(&mut chart, "amplitude (arcmin)", "share found")?;
    let curve = (0..=200).filter_map(|k| {
        let amplitude = x.start * (x.end / x.start).powf(f64::from(k) / 200.0);
        fitted(amplitude).map(|p| (amplitude, p))
    });
    chart.draw_series(LineSeries::new(curve, VERMILION.stroke_width(2)))?;
    chart.draw_series(points.iter().map(|(amplitude, [low, _, high])| {
        PathElement::new([(*amplitude, *low), (*amplitude, *high)], BLUE.stroke_width(2))
    }))?;
    let dot = |(amplitude, p): &(f64, [f64; 3])| Circle::new((*amplitude, p[1]), 4, BLUE.filled());
    chart.draw_series(points.iter().map(dot))?;
    root.present()?;
    Ok(())
}

type Chart<'a, 'b, X, Y> = ChartContext<'a, SVGBackend<'b>, Cartesian2d<X, Y>>;

fn mesh<X, Y>(chart: &mut Chart<'_, '_, X, Y>, x: &str, y: &str) -> Drawn
where
    X: Ranged<ValueType = f64> + plotters::coord::ranged1d::ValueFormatter<f64>,
    Y: Ranged<ValueType = f64> + plotters::coord::ranged1d::ValueFormatter<f64>,
{
    chart
        .configure_mesh()
        .light_line_style(WHITE.mix(0.0))
        .bold_line_style(GREY.mix(0.25))
        .x_desc(x)
        .y_desc(y)
        .x_label_formatter(&plain)
        .y_label_formatter(&plain)
        .label_style((FONT, 13))
        .axis_desc_style((FONT, 14))
        .draw()?;
    Ok(())
}

fn legend<'a, 'b: 'a, X, Y>(chart: &mut Chart<'a, 'b, X, Y>, position: SeriesLabelPosition) -> Drawn
where
    X: Ranged<ValueType = f64>,
    Y: Ranged<ValueType = f64>,
{
    chart
        .configure_series_labels()
        .position(position)
        .background_style(WHITE.mix(0.85))
        .border_style(GREY.mix(0.5))
        .label_font((FONT, 13))
        .margin(8)
        .draw()?;
    Ok(())
}

fn draw_curves<'a, 'b: 'a, X, Y>(
    chart: &mut Chart<'a, 'b, X, Y>,
    curves: &[Curve],
    dots: bool,
) -> Drawn
where
    X: Ranged<ValueType = f64>,
    Y: Ranged<ValueType = f64>,
{
    for curve in curves {
        let (points, colour, still) = (curve.points(), curve.colour(), curve.still);
        let style = colour.stroke_width(2);
        let drawn = if still {
            chart.draw_series(DashedLineSeries::new(points.iter().copied(), 6, 4, style))?
        } else {
            chart.draw_series(LineSeries::new(points.iter().copied(), style))?
        };
        drawn.label(curve.name).legend(move |(x, y)| {
            let end = if still { x + 9 } else { x + 22 };
            PathElement::new([(x, y), (end, y)], style)
        });
        if dots {
            let dot = |at: &(f64, f64)| Circle::new(*at, 3, colour.filled());
            chart.draw_series(points.iter().map(dot))?;
        }
    }
    Ok(())
}

/// A number as a reader writes it: plain from a thousandth to ten thousand, else a power.
fn plain(value: &f64) -> String {
    match value.abs() {
        size if size < 1e-12 => "0".into(),
        size if (1e-3..1e4).contains(&size) => format!("{}", (value * 1e6).round() / 1e6),
        _ => format!("{value:.0e}"),
    }
}

/// Smallest to largest value with a little air; a unit range if there is none.
fn spread(values: impl Iterator<Item = f64>) -> Range<f64> {
    let range = extent(values);
    let air = 0.05 * (range.end - range.start);
    range.start - air..range.end + air
}

fn extent(values: impl Iterator<Item = f64>) -> Range<f64> {
    let (low, high) = values
        .filter(|v| v.is_finite())
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), v| (l.min(v), h.max(v)));
    if low < high {
        low..high
    } else if low.is_finite() {
        // A single value.
        let half = if low.abs() > 0.0 { 0.1 * low.abs() } else { 0.5 };
        low - half..low + half
    } else {
        0.1..1.0
    }
}

/// Positive values to whole decades.
fn decades(values: impl Iterator<Item = f64>) -> Range<f64> {
    let range = extent(values);
    10_f64.powf(range.start.log10().floor())..10_f64.powf(range.end.log10().ceil())
}

/// The curve's outline: least and greatest value in each of `columns` stretches, in pieces between
/// missing samples, so that no spike is lost and no gap is bridged.
fn outline(values: &[f64], interval: f64, columns: usize) -> Vec<Vec<(f64, f64)>> {
    let step = values.len().div_ceil(columns).max(1);
    let mut pieces = vec![Vec::new()];
    for (k, chunk) in values.chunks(step).enumerate() {
        for part in chunk.split_inclusive(|v| v.is_nan()) {
            let present = || part.iter().copied().filter(|v| !v.is_nan());
            let time = interval * (k * step) as f64;
            if let (Some(piece), true) = (pieces.last_mut(), present().next().is_some()) {
                piece.push((time, present().fold(f64::INFINITY, f64::min)));
                piece.push((time, present().fold(f64::NEG_INFINITY, f64::max)));
            }
            if part.iter().any(|v| v.is_nan()) && pieces.last().is_some_and(|p| !p.is_empty()) {
                pieces.push(Vec::new());
            }
        }
    }
    pieces
}
