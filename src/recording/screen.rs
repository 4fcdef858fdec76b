use crate::input::positive;
use crate::{Error, Result};

/// A flat screen seen by an eye straight in front of its centre: positions on it become degrees.
///
/// ```text
/// θ = atan( (p − p₀) · s / d )   p pixel, p₀ centre, s pixel pitch (m), d eye–screen distance (m)
/// ```
///
/// each axis on its own. This is the exact angle along an axis through the centre; the small-angle
/// scale `s/d` that is often used in its place is 0.25 % too large at 5° and 2.3 % at 15°. Pixel
/// coordinates run from 0 at the left (top) edge to the resolution at the right (bottom) edge, so that
/// the centre is half the resolution; signs are kept, so that y grows downward when pixel rows do.
///
/// # Source
/// Plane geometry; check values in the tests.
///
/// # Example
/// ```
/// use fixational::ScreenGeometry;
/// let screen = ScreenGeometry::new([0.386, 0.290], [1024.0, 768.0], 0.6)?;
/// let [x, y] = screen.pixels_to_degrees([1024.0, 384.0]);
/// assert!((x - 17.83125).abs() < 5e-6 && y == 0.0);
/// let [px, py] = screen.degrees_to_pixels([x, y]);
/// assert!((px - 1024.0).abs() < 1e-9 && (py - 384.0).abs() < 1e-9);
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
pub struct ScreenGeometry {
    size: [f64; 2],
    resolution: [f64; 2],
    distance: f64,
}

impl ScreenGeometry {
    /// A screen of `size` metres and `resolution` pixels (both width, height), `distance` metres from
    /// the eye.
    ///
    /// # Errors
    /// [`Error::Parameter`] for a number that is not finite and above zero.
    pub fn new(size: [f64; 2], resolution: [f64; 2], distance: f64) -> Result<Self> {
        let [width, height] = size;
        let [columns, rows] = resolution;
        positive("screen width", width)?;
        positive("screen height", height)?;
        positive("screen columns", columns)?;
        positive("screen rows", rows)?;
        positive("screen distance", distance)?;
        Ok(Self { size, resolution, distance })
    }

    /// Screen position in pixels to degrees from the centre.
    #[must_use]
    pub fn pixels_to_degrees(&self, [column, row]: [f64; 2]) -> [f64; 2] {
        let [columns, rows] = self.resolution;
        let [sx, sy] = self.pitch();
        [self.angle((column - columns / 2.0) * sx), self.angle((row - rows / 2.0) * sy)]
    }

    /// Degrees from the centre to a screen position in pixels: the inverse of
    /// [`pixels_to_degrees`](Self::pixels_to_degrees). NaN at 90° and beyond, where no screen is.
    #[must_use]
    pub fn degrees_to_pixels(&self, [x, y]: [f64; 2]) -> [f64; 2] {
        let [columns, rows] = self.resolution;
        let [sx, sy] = self.pitch();
        [self.extent(x) / sx + columns / 2.0, self.extent(y) / sy + rows / 2.0]
    }

    /// Screen position in centimetres from the centre to degrees.
    #[must_use]
    pub fn centimetres_to_degrees(&self, [x, y]: [f64; 2]) -> [f64; 2] {
        [self.angle(x / 100.0), self.angle(y / 100.0)]
    }

    /// Degrees to centimetres from the centre: the inverse of
    /// [`centimetres_to_degrees`](Self::centimetres_to_degrees). NaN at 90° and beyond.
    #[must_use]
    pub fn degrees_to_centimetres(&self, [x, y]: [f64; 2]) -> [f64; 2] {
        [self.extent(x) * 100.0, self.extent(y) * 100.0]
    }

    /// The small-angle scale at the centre, degrees a pixel on each axis: `180/π · s/d`.
    ///
    /// For comparison only: it is the exact slope at the centre and too large everywhere else.
    #[must_use]
    pub fn degrees_per_pixel(&self) -> [f64; 2] {
        self.pitch().map(|s| (s / self.distance).to_degrees())
    }

    /// Angle that something `centimetres` wide spans at the centre of the screen, degrees:
    /// `2 · atan(S/(2d))`.
    #[must_use]
    pub fn extent_degrees(&self, centimetres: f64) -> f64 {
        2.0 * self.angle(centimetres / 200.0)
    }

    /// Pixel pitch, metres.
    fn pitch(&self) -> [f64; 2] {
        let ([width, height], [columns, rows]) = (self.size, self.resolution);
        [width / columns, height / rows]
    }

    /// Metres from the centre to degrees.
    fn angle(&self, metres: f64) -> f64 {
        metres.atan2(self.distance).to_degrees()
    }

    /// Degrees to metres from the centre.
    fn extent(&self, degrees: f64) -> f64 {
        if degrees.abs() < 90.0 { degrees.to_radians().tan() * self.distance } else { f64::NAN }
    }
}

/// Positions in pixels to degrees by one stated scale, for recordings that come without a geometry.
///
/// Divides by `pixels_per_degree` and subtracts nothing: the origin stays where it was. Exact only
/// where the scale was measured; see [`ScreenGeometry`] for the whole screen.
///
/// # Errors
/// [`Error::Parameter`] unless `pixels_per_degree` is finite and above zero.
///
/// # Example
/// ```
/// let mut x = [0.0, 35.0, 70.0];
/// fixational::recording::scale_to_degrees(&mut x, 35.0)?;
/// assert_eq!(x, [0.0, 1.0, 2.0]);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn scale_to_degrees(positions: &mut [f64], pixels_per_degree: f64) -> Result<()> {
    if !(pixels_per_degree.is_finite() && pixels_per_degree > 0.0) {
        let (name, allowed) = ("pixels_per_degree", "finite, > 0");
        return Err(Error::Parameter { name, value: pixels_per_degree, allowed });
    }
    for position in positions {
        *position /= pixels_per_degree;
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn screen() -> ScreenGeometry {
        ScreenGeometry::new([0.386, 0.290], [1024.0, 768.0], 0.6).unwrap()
    }

    /// The BIDS specification's example screen, worked through by plane geometry.
    #[test]
    fn the_example_screen_has_the_derived_angles() {
        let screen = screen();
        let [half_width, half_height] = screen.pixels_to_degrees([1024.0, 768.0]);
        assert!((half_width - 17.83125).abs() < 5e-6, "{half_width}");
        assert!((half_height - 13.58599).abs() < 5e-6, "{half_height}");
        let centre = screen.pixels_to_degrees([512.5, 384.0])[0]
            - screen.pixels_to_degrees([511.5, 384.0])[0];
        assert!((centre - 0.0359964).abs() < 5e-8, "{centre}");
        let outermost = half_width - screen.pixels_to_degrees([1023.0, 384.0])[0];
        assert!((outermost - 0.0326271).abs() < 5e-8, "{outermost}");
        assert!((screen.degrees_per_pixel()[0] - 0.0359964).abs() < 5e-8);
    }

    /// Small-angle error tan θ/θ − 1, derived: 0.0406 % at 2° … 4.2698 % at 20°.
    #[test]
    fn the_small_angle_scale_errs_as_derived() {
        let screen = screen();
        for (degrees, percent) in
            [(2.0, 0.0406), (5.0, 0.2546), (10.0, 1.0279), (15.0, 2.3491), (20.0, 4.2698)]
        {
            let pixels = screen.degrees_to_pixels([degrees, 0.0])[0] - 512.0;
            let small_angle = pixels * screen.degrees_per_pixel()[0];
            let error = 100.0 * (small_angle / degrees - 1.0);
            assert!((error - percent).abs() < 5e-5, "{degrees}°: {error} %");
        }
    }

    /// O'Shea 1991: at arm's length a thumb spans about 2°, a thumbnail 1.5°, an index fingernail 1°.
    /// Common practice: 1 cm at 57.3 cm is 1°.
    #[test]
    fn a_thumbnail_at_arms_length_spans_one_to_two_degrees() {
        let arm = ScreenGeometry::new([0.5, 0.3], [1920.0, 1080.0], 0.60).unwrap();
        let thumbnail = arm.extent_degrees(1.6);
        assert!((1.0..2.0).contains(&thumbnail), "{thumbnail}");
        let rule = ScreenGeometry::new([0.5, 0.3], [1920.0, 1080.0], 0.573).unwrap();
        assert!((rule.extent_degrees(1.0) - 1.0).abs() < 1e-4);
        assert!((rule.centimetres_to_degrees([1.0, 0.0])[0] - 0.99982).abs() < 1e-4);
    }

    proptest! {
        #[test]
        fn there_and_back(x in -80.0..80.0_f64, y in -80.0..80.0_f64) {
            let screen = screen();
            for [bx, by] in [
                screen.pixels_to_degrees(screen.degrees_to_pixels([x, y])),
                screen.centimetres_to_degrees(screen.degrees_to_centimetres([x, y])),
            ] {
                prop_assert!((bx - x).abs() < 1e-11 && (by - y).abs() < 1e-11);
            }
        }
    }

    #[test]
    fn absurd_screens_and_angles() {
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            assert!(ScreenGeometry::new([bad, 0.3], [1024.0, 768.0], 0.6).is_err());
            assert!(ScreenGeometry::new([0.4, bad], [1024.0, 768.0], 0.6).is_err());
            assert!(ScreenGeometry::new([0.4, 0.3], [bad, 768.0], 0.6).is_err());
            assert!(ScreenGeometry::new([0.4, 0.3], [1024.0, bad], 0.6).is_err());
            assert!(ScreenGeometry::new([0.4, 0.3], [1024.0, 768.0], bad).is_err());
            assert!(scale_to_degrees(&mut [1.0], bad).is_err());
        }
        assert!(screen().degrees_to_pixels([90.0, 0.0])[0].is_nan());
        assert!(screen().pixels_to_degrees([f64::NAN, 0.0])[0].is_nan());
    }
}
