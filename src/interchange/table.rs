use super::{FileError, FileProblem, PositionUnit, TimeUnit};
use crate::input::{positive, refuse_infinite};
use crate::recording::scale_to_degrees;
use crate::{Result, ScreenGeometry};
use std::fmt;
use std::path::PathBuf;

/// What a file held, before any conditioning: one eye, in the file's own unit and order.
///
/// Row `i` of the file is sample `i`. Nothing is put in order, filled, resampled or dropped. A sample
/// that is missing in one axis is made missing in both, and counted.
///
/// # Example
/// A recording in pixels becomes degrees by the geometry of its screen:
/// ```
/// use fixational::ScreenGeometry;
/// use fixational::interchange::{DelimitedFormat, PositionUnit, read_delimited};
/// let folder = tempfile::tempdir()?;
/// let path = folder.path().join("gaze.csv");
/// std::fs::write(&path, "time,x,y\n0.000,512,384\n0.002,1024,384\n0.004,,384\n")?;
///
/// let table = read_delimited(&path, &DelimitedFormat::default().position_unit(PositionUnit::Pixel))?;
/// assert_eq!((table.len(), table.missing(), table.half_missing), (3, 1, 1));
///
/// // Pixels are no angles: without a scale there is no answer.
/// assert!(table.clone().into_degrees().unwrap_err().to_string().contains("give the screen's size"));
///
/// let screen = ScreenGeometry::new([0.386, 0.290], [1024.0, 768.0], 0.6)?;
/// let table = table.into_degrees_on_screen(&screen)?;
/// assert_eq!((table.x[0], table.unit), (0.0, PositionUnit::Degree));
/// assert!((table.x[1] - 17.83125).abs() < 5e-6);
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct GazeTable {
    /// The file.
    pub source: PathBuf,
    /// The sidecars that described it, the nearest last; none for delimited text.
    pub sidecars: Vec<PathBuf>,
    /// Names of all its columns, those that were not read too.
    pub columns: Vec<String>,
    /// Timestamps in seconds (NaN where missing), if the file has them. The quotient of the file's
    /// number and the unit, rounded once.
    pub time: Option<Vec<f64>>,
    /// Unit of the timestamps in the file.
    pub time_unit: Option<TimeUnit>,
    /// Horizontal positions in `unit`; NaN where missing.
    pub x: Vec<f64>,
    /// Vertical positions in `unit`; NaN where missing.
    pub y: Vec<f64>,
    /// Unit of `x` and `y`.
    pub unit: PositionUnit,
    /// Pupil sizes as in the file, if it has them; NaN where missing.
    pub pupil: Option<Vec<f64>>,
    /// Unit of the pupil sizes, where the sidecar gives one.
    pub pupil_unit: Option<String>,
    /// Sampling rate that the sidecar states, Hz. The timestamps may say otherwise.
    pub stated_rate: Option<f64>,
    /// Time of the first sample that the sidecar states, s.
    pub start_time: Option<f64>,
    /// The eye.
    pub eye: Option<RecordedEye>,
    /// What the positions are positions of.
    pub coordinates: Option<CoordinateSystem>,
    /// Samples in which one axis alone was missing.
    pub half_missing: usize,
    /// Samples that are missing because an axis had a value that was stated to mean a loss. One axis
    /// is enough: such a sample is counted in `half_missing` too.
    pub marked_missing: usize,
}

/// Which eye was recorded (BIDS `RecordedEye`).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum RecordedEye {
    /// The left eye.
    Left,
    /// The right eye.
    Right,
    /// Both eyes as one.
    Cyclopean,
}

/// What positions are positions of (BIDS `SampleCoordinateSystem`).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum CoordinateSystem {
    /// Where the eye looks on the screen.
    GazeOnScreen,
    /// The eye in its orbit.
    EyeInHead,
    /// Where the eye looks in space.
    GazeInWorld,
    /// Something else, described in words.
    Custom,
}

impl GazeTable {
    /// Number of samples, the missing ones included.
    #[must_use]
    pub fn len(&self) -> usize {
        self.x.len()
    }

    /// Whether there is no sample. A table that was read has one.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.x.is_empty()
    }

    /// Number of missing samples.
    #[must_use]
    pub fn missing(&self) -> usize {
        self.x.iter().filter(|x| x.is_nan()).count()
    }

    /// The table in degrees, if its unit is one of angle: radian `· 180/π`, arcmin `/ 60`, degrees as
    /// they are.
    ///
    /// # Errors
    /// [`FileProblem::NeedsScale`] for pixels, centimetres and millimetres; [`Error::Infinite`] where
    /// the degrees are too many for a number.
    ///
    /// [`Error::Infinite`]: crate::Error::Infinite
    pub fn into_degrees(mut self) -> Result<Self> {
        let convert: fn(f64) -> f64 = match self.unit {
            PositionUnit::Degree => |degrees| degrees,
            PositionUnit::Radian => f64::to_degrees,
            PositionUnit::Arcmin => |minutes| minutes / 60.0,
            unit => return Err(self.refuse(FileProblem::NeedsScale { unit })),
        };
        for position in self.x.iter_mut().chain(&mut self.y) {
            *position = convert(*position);
        }
        self.in_degrees()
    }

    /// The table in degrees from the centre of `screen`.
    ///
    /// Pixels count from the screen's left (top) edge, as [`ScreenGeometry::pixels_to_degrees`] has
    /// it; centimetres and millimetres from its centre. Angles become degrees without the screen, as
    /// by [`into_degrees`](Self::into_degrees).
    ///
    /// # Errors
    /// [`FileProblem::NotOnScreen`] if positions that are no angles are stated to be something else
    /// than gaze on a screen.
    pub fn into_degrees_on_screen(mut self, screen: &ScreenGeometry) -> Result<Self> {
        let convert: fn(&ScreenGeometry, [f64; 2]) -> [f64; 2] = match self.unit {
            PositionUnit::Pixel => ScreenGeometry::pixels_to_degrees,
            PositionUnit::Centimetre => ScreenGeometry::centimetres_to_degrees,
            PositionUnit::Millimetre => {
                |screen, [x, y]| screen.centimetres_to_degrees([x / 10.0, y / 10.0])
            }
            PositionUnit::Degree | PositionUnit::Radian | PositionUnit::Arcmin => {
                return self.into_degrees();
            }
        };
        if let Some(system) = self.coordinates.filter(|s| *s != CoordinateSystem::GazeOnScreen) {
            return Err(self.refuse(FileProblem::NotOnScreen { system }));
        }
        for (x, y) in self.x.iter_mut().zip(&mut self.y) {
            [*x, *y] = convert(screen, [*x, *y]);
        }
        self.in_degrees()
    }

    /// The table in degrees by one stated scale, for pixels that come without a geometry. The origin
    /// stays where it was. Angles become degrees without the scale, as by
    /// [`into_degrees`](Self::into_degrees).
    ///
    /// # Errors
    /// [`Error::Parameter`] unless `pixels_per_degree` is finite and above zero;
    /// [`FileProblem::NeedsScale`] for centimetres and millimetres; [`Error::Infinite`] where the
    /// degrees are too many for a number.
    ///
    /// # Example
    /// ```
    /// use fixational::interchange::{DelimitedFormat, PositionUnit, read_delimited};
    /// let folder = tempfile::tempdir()?;
    /// let path = folder.path().join("gaze.csv");
    /// std::fs::write(&path, "x,y\n70,-35\n")?;
    /// let pixels = DelimitedFormat::default().position_unit(PositionUnit::Pixel);
    /// let table = read_delimited(&path, &pixels)?.into_degrees_by_scale(35.0)?;
    /// assert_eq!((table.x[0], table.y[0]), (2.0, -1.0));
    /// # Ok::<(), Box<dyn std::error::Error>>(())
    /// ```
    ///
    /// [`Error::Infinite`]: crate::Error::Infinite
    /// [`Error::Parameter`]: crate::Error::Parameter
    pub fn into_degrees_by_scale(mut self, pixels_per_degree: f64) -> Result<Self> {
        positive("pixels_per_degree", pixels_per_degree)?;
        if self.unit != PositionUnit::Pixel {
            return self.into_degrees();
        }
        scale_to_degrees(&mut self.x, pixels_per_degree)?;
        scale_to_degrees(&mut self.y, pixels_per_degree)?;
        self.in_degrees()
    }

    fn in_degrees(mut self) -> Result<Self> {
        refuse_infinite("x", &self.x)?;
        refuse_infinite("y", &self.y)?;
        self.unit = PositionUnit::Degree;
        Ok(self)
    }

    fn refuse(&self, problem: FileProblem) -> crate::Error {
        FileError::new(&self.source, problem).into_error()
    }
}

impl RecordedEye {
    pub(super) const RULE: &str = "must be \"left\", \"right\" or \"cyclopean\"";

    pub(super) fn parse(text: &str) -> Option<Self> {
        match text {
            "left" => Some(Self::Left),
            "right" => Some(Self::Right),
            "cyclopean" => Some(Self::Cyclopean),
            _ => None,
        }
    }
}

impl CoordinateSystem {
    pub(super) const RULE: &str =
        "must be \"gaze-on-screen\", \"eye-in-head\", \"gaze-in-world\" or \"custom\"";

    pub(super) fn parse(text: &str) -> Option<Self> {
        match text {
            "gaze-on-screen" => Some(Self::GazeOnScreen),
            "eye-in-head" => Some(Self::EyeInHead),
            "gaze-in-world" => Some(Self::GazeInWorld),
            "custom" => Some(Self::Custom),
            _ => None,
        }
    }
}

impl fmt::Display for RecordedEye {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Self::Left => "left",
            Self::Right => "right",
            Self::Cyclopean => "cyclopean",
        })
    }
}

impl fmt::Display for CoordinateSystem {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Self::GazeOnScreen => "gaze-on-screen",
            Self::EyeInHead => "eye-in-head",
            Self::GazeInWorld => "gaze-in-world",
            Self::Custom => "custom",
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::Error;

    fn table(unit: PositionUnit, x: &[f64], y: &[f64]) -> GazeTable {
        GazeTable {
            source: PathBuf::from("gaze.tsv"),
            sidecars: Vec::new(),
            columns: Vec::new(),
            time: None,
            time_unit: None,
            x: x.to_vec(),
            y: y.to_vec(),
            unit,
            pupil: None,
            pupil_unit: None,
            stated_rate: None,
            start_time: None,
            eye: None,
            coordinates: None,
            half_missing: 0,
            marked_missing: 0,
        }
    }

    fn screen() -> ScreenGeometry {
        ScreenGeometry::new([0.386, 0.290], [1024.0, 768.0], 0.6).unwrap()
    }

    #[test]
    fn angles_become_degrees_by_definition() {
        for (unit, x, y) in [
            (PositionUnit::Degree, 90.0, -0.5),
            (PositionUnit::Radian, std::f64::consts::FRAC_PI_2, -0.5_f64.to_radians()),
            (PositionUnit::Arcmin, 5400.0, -30.0),
        ] {
            let nan = f64::NAN;
            for degrees in [
                table(unit, &[x, nan], &[y, nan]).into_degrees().unwrap(),
                table(unit, &[x, nan], &[y, nan]).into_degrees_on_screen(&screen()).unwrap(),
                table(unit, &[x, nan], &[y, nan]).into_degrees_by_scale(35.0).unwrap(),
            ] {
                assert_eq!(degrees.unit, PositionUnit::Degree);
                assert!((degrees.x[0] - 90.0).abs() < 1e-13 && (degrees.y[0] + 0.5).abs() < 1e-15);
                assert!(degrees.x[1].is_nan() && degrees.y[1].is_nan());
                assert_eq!((degrees.len(), degrees.missing(), degrees.is_empty()), (2, 1, false));
            }
        }
    }

    /// The BIDS specification's example screen: half width 17.83125°, half height 13.58599°, by plane
    /// geometry.
    #[test]
    fn a_screen_turns_pixels_and_lengths_into_degrees() {
        for (unit, x, y) in [
            (PositionUnit::Pixel, 1024.0, 768.0),
            (PositionUnit::Centimetre, 19.3, 14.5),
            (PositionUnit::Millimetre, 193.0, 145.0),
        ] {
            let mut given = table(unit, &[x], &[y]);
            given.coordinates = Some(CoordinateSystem::GazeOnScreen);
            let degrees = given.into_degrees_on_screen(&screen()).unwrap();
            assert_eq!(degrees.unit, PositionUnit::Degree);
            assert!((degrees.x[0] - 17.83125).abs() < 5e-6, "{unit}: {}", degrees.x[0]);
            assert!((degrees.y[0] - 13.58599).abs() < 5e-6, "{unit}: {}", degrees.y[0]);
        }
        let scaled = table(PositionUnit::Pixel, &[70.0], &[-35.0]).into_degrees_by_scale(35.0);
        let scaled = scaled.unwrap();
        assert_eq!((scaled.x[0], scaled.y[0], scaled.unit), (2.0, -1.0, PositionUnit::Degree));
    }

    #[test]
    fn what_is_needed_is_said() {
        assert_eq!(
            table(PositionUnit::Pixel, &[1.0], &[1.0]).into_degrees().unwrap_err().to_string(),
            "gaze.tsv: positions are in pixels; give the screen's size, resolution and distance, or a \
             scale in pixels per degree"
        );
        let sentence = "gaze.tsv: positions are in centimetres; give the screen's geometry with its \
                        distance";
        let lengths = table(PositionUnit::Centimetre, &[1.0], &[1.0]);
        assert_eq!(lengths.clone().into_degrees().unwrap_err().to_string(), sentence);
        assert_eq!(lengths.into_degrees_by_scale(30.0).unwrap_err().to_string(), sentence);
        for (system, name) in [
            (CoordinateSystem::EyeInHead, "eye-in-head"),
            (CoordinateSystem::GazeInWorld, "gaze-in-world"),
            (CoordinateSystem::Custom, "custom"),
        ] {
            let mut pixels = table(PositionUnit::Pixel, &[1.0], &[1.0]);
            pixels.coordinates = Some(system);
            assert_eq!(
                pixels.clone().into_degrees_on_screen(&screen()).unwrap_err().to_string(),
                format!(
                    "gaze.tsv: positions are {name}; a screen's geometry holds for gaze-on-screen only"
                )
            );
            assert!(pixels.into_degrees_by_scale(30.0).is_ok()); // the caller's own scale
        }
    }

    #[test]
    fn absurd_scales_and_angles() {
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            for unit in [PositionUnit::Pixel, PositionUnit::Degree] {
                let error = table(unit, &[1.0], &[1.0]).into_degrees_by_scale(bad).unwrap_err();
                assert!(matches!(error, Error::Parameter { name: "pixels_per_degree", .. }));
            }
        }
        let error = table(PositionUnit::Radian, &[0.0, 1e308], &[0.0, 0.0]).into_degrees();
        assert!(matches!(error, Err(Error::Infinite { what: "x", index: 1, .. })));
        let error = table(PositionUnit::Pixel, &[0.0], &[-1e308]).into_degrees_by_scale(1e-300);
        assert!(matches!(error, Err(Error::Infinite { what: "y", index: 0, .. })));
    }
}
