//! The size of a plot, checked.

use crate::error::{Error, Result};

/// Units of a drawing area in one CSS pixel.
pub const UNITS: f64 = 16.0;

/// Where a plot goes: its size in CSS pixels, and the device's pixel ratio.
///
/// The ratio matters on a canvas only. Sizes from 40 to 8192 pixels and ratios
/// from 0.25 to 8 are accepted.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Surface {
    /// CSS pixels.
    pub width: f64,
    /// CSS pixels.
    pub height: f64,
    /// Device pixels in one CSS pixel.
    pub ratio: f64,
}

impl Surface {
    /// The size in units of a drawing area, if it can be drawn on.
    ///
    /// # Errors
    ///
    /// `plot-size` when the size or the ratio is out of range or not a number.
    pub fn in_units(&self) -> Result<(u32, u32)> {
        let side = 40.0..=8192.0;
        for (value, field) in [(self.width, "width"), (self.height, "height")] {
            if !side.contains(&value) {
                return Err(Error::new(
                    "plot-size",
                    format!("A plot is 40 to 8192 pixels wide and high, not {value}."),
                )
                .at_field(field));
            }
        }
        if !(0.25..=8.0).contains(&self.ratio) {
            return Err(Error::new(
                "plot-size",
                format!("The pixel ratio is between 0.25 and 8, not {}.", self.ratio),
            )
            .at_field("ratio"));
        }
        Ok((
            (self.width * UNITS).round() as u32,
            (self.height * UNITS).round() as u32,
        ))
    }

    /// The size in device pixels.
    ///
    /// # Errors
    ///
    /// As [`Surface::in_units`].
    pub fn in_device_pixels(&self) -> Result<(u32, u32)> {
        self.in_units()?;
        Ok((
            (self.width * self.ratio).round() as u32,
            (self.height * self.ratio).round() as u32,
        ))
    }
}
