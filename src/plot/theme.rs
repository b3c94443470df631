//! The colours of a plot.

/// Red, green and blue, 0 to 255.
pub type Rgb = (u8, u8, u8);

/// The colours of a plot; the same names as the custom properties of the page.
///
/// Text in `ink` and `mute` has a contrast of at least 4.5 : 1 on `background` and
/// `panel`, marks in `accent` at least 3 : 1. A page in forced colours fills the
/// fields with the system's own.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Theme {
    /// Behind everything.
    pub background: Rgb,
    /// Inside open marks and of the ball.
    pub panel: Rgb,
    /// Text and main lines.
    pub ink: Rgb,
    /// Secondary text, axes.
    pub mute: Rgb,
    /// Graticule.
    pub line: Rgb,
    /// What was measured.
    pub accent: Rgb,
    /// The hatching of the forbidden side.
    pub hatch: Rgb,
}

impl Theme {
    /// Dark on light, for the screen.
    pub fn light() -> Self {
        Self {
            background: (0xf6, 0xf6, 0xf2),
            panel: (0xff, 0xff, 0xff),
            ink: (0x1c, 0x22, 0x26),
            mute: (0x5d, 0x66, 0x6c),
            line: (0xc4, 0xc9, 0xc6),
            accent: (0x0b, 0x5f, 0x73),
            hatch: (0xc9, 0xcb, 0xc3),
        }
    }

    /// Light on dark, for the screen.
    pub fn dark() -> Self {
        Self {
            background: (0x14, 0x18, 0x1a),
            panel: (0x1b, 0x20, 0x23),
            ink: (0xe8, 0xeb, 0xe9),
            mute: (0x9a, 0xa5, 0xa8),
            line: (0x50, 0x5b, 0x60),
            accent: (0x6f, 0xc3, 0xd6),
            hatch: (0x3b, 0x44, 0x48),
        }
    }

    /// The light colours on white, for paper and exports.
    pub fn print() -> Self {
        Self {
            background: (0xff, 0xff, 0xff),
            ..Self::light()
        }
    }
}
