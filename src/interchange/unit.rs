use std::fmt;

/// Unit of gaze positions in a file.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum PositionUnit {
    /// Pixels of the screen, from 0 at its left (top) edge.
    Pixel,
    /// Degrees of visual angle.
    Degree,
    /// Radians.
    Radian,
    /// Minutes of arc, 1/60°.
    Arcmin,
    /// Centimetres on the screen, from its centre.
    Centimetre,
    /// Millimetres on the screen, from its centre.
    Millimetre,
}

/// Unit of timestamps in a file.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum TimeUnit {
    /// Seconds.
    Second,
    /// Milliseconds.
    Millisecond,
    /// Microseconds.
    Microsecond,
}

impl PositionUnit {
    pub(super) const KNOWN: &str = "pixel (px), degree (deg, °), radian (rad), arcmin, cm, mm";

    /// The unit that a sidecar's `Units` names, exactly as written.
    pub(super) fn parse(text: &str) -> Option<Self> {
        match text.trim() {
            "pixel" | "pixels" | "px" => Some(Self::Pixel),
            "degree" | "degrees" | "deg" | "°" => Some(Self::Degree),
            "radian" | "radians" | "rad" => Some(Self::Radian),
            "arcmin" | "arcminute" | "arcminutes" => Some(Self::Arcmin),
            "cm" | "centimeter" | "centimetre" => Some(Self::Centimetre),
            "mm" | "millimeter" | "millimetre" => Some(Self::Millimetre),
            _ => None,
        }
    }
}

impl TimeUnit {
    pub(super) const KNOWN: &str = "s (second), ms (millisecond), us or µs (microsecond)";

    /// How many of this unit a second has: what turns a time in seconds into the file's own number.
    ///
    /// # Example
    /// ```
    /// use fixational::interchange::TimeUnit;
    /// assert_eq!(0.5 * TimeUnit::Second.per_second(), 0.5);
    /// assert_eq!(0.5 * TimeUnit::Millisecond.per_second(), 500.0);
    /// assert_eq!(0.5 * TimeUnit::Microsecond.per_second(), 500_000.0);
    /// ```
    #[must_use]
    pub fn per_second(self) -> f64 {
        match self {
            Self::Second => 1.0,
            Self::Millisecond => 1e3,
            Self::Microsecond => 1e6,
        }
    }

    /// The unit that a sidecar's `Units` names. The micro sign (U+00B5) and the Greek mu (U+03BC) look
    /// alike and mean the same.
    pub(super) fn parse(text: &str) -> Option<Self> {
        match text.trim() {
            "s" | "sec" | "second" | "seconds" => Some(Self::Second),
            "ms" | "msec" | "millisecond" | "milliseconds" => Some(Self::Millisecond),
            "us" | "\u{b5}s" | "\u{3bc}s" | "usec" | "microsecond" | "microseconds" => {
                Some(Self::Microsecond)
            }
            _ => None,
        }
    }

    /// As BIDS writes it.
    pub(super) fn symbol(self) -> &'static str {
        match self {
            Self::Second => "s",
            Self::Millisecond => "ms",
            Self::Microsecond => "us",
        }
    }
}

impl fmt::Display for PositionUnit {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Self::Pixel => "pixels",
            Self::Degree => "degrees",
            Self::Radian => "radians",
            Self::Arcmin => "minutes of arc",
            Self::Centimetre => "centimetres",
            Self::Millimetre => "millimetres",
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn units_by_their_names() {
        for (text, unit) in [
            ("pixel", PositionUnit::Pixel),
            ("px", PositionUnit::Pixel),
            ("degree", PositionUnit::Degree),
            ("deg", PositionUnit::Degree),
            ("°", PositionUnit::Degree),
            ("rad", PositionUnit::Radian),
            ("radian", PositionUnit::Radian),
            ("arcmin", PositionUnit::Arcmin),
            (" cm ", PositionUnit::Centimetre),
            ("mm", PositionUnit::Millimetre),
        ] {
            assert_eq!(PositionUnit::parse(text), Some(unit), "{text}");
        }
        for (text, unit) in [
            ("s", TimeUnit::Second),
            ("ms", TimeUnit::Millisecond),
            ("us", TimeUnit::Microsecond),
            ("\u{b5}s", TimeUnit::Microsecond),
            ("\u{3bc}s", TimeUnit::Microsecond),
        ] {
            assert_eq!(TimeUnit::parse(text), Some(unit), "{text}");
            assert_eq!(TimeUnit::parse(unit.symbol()), Some(unit), "{text}");
        }
        for text in ["", "furlong", "Ms", "DEG", "m"] {
            assert!(PositionUnit::parse(text).is_none() && TimeUnit::parse(text).is_none());
        }
    }
}
