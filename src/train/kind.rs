use std::f64::consts::{FRAC_PI_2, FRAC_PI_4};

use crate::convention::{Convention, TimeSign};
use crate::tolerance;

/// What an element of a train is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kind {
    /// See [`crate::mueller::elements::linear_diattenuator`].
    LinearDiattenuator,
    /// See [`crate::mueller::elements::linear_retarder`].
    LinearRetarder,
    /// See [`crate::mueller::elements::circular_retarder`].
    CircularRetarder,
    /// See [`crate::mueller::elements::elliptical_retarder`].
    EllipticalRetarder,
    /// See [`crate::mueller::elements::elliptical_diattenuator`]; the favoured state by its
    /// azimuth and ellipticity.
    EllipticalDiattenuator,
    /// See [`crate::mueller::elements::aligned_diattenuating_retarder`].
    AlignedDiattenuatingRetarder,
    /// See [`crate::mueller::elements::rotator`].
    Rotator,
    /// See [`crate::mueller::elements::isotropic_reflector`].
    IsotropicReflector,
    /// See [`crate::mueller::elements::fresnel_reflection`].
    FresnelReflection,
    /// See [`crate::mueller::elements::fresnel_transmission`].
    FresnelTransmission,
    /// See [`crate::mueller::elements::isotropic_depolarizer`].
    IsotropicDepolarizer,
    /// See [`crate::mueller::elements::diagonal_depolarizer`].
    DiagonalDepolarizer,
    /// Sixteen measured numbers, perhaps with their noise.
    Measured,
}

/// How a number behaves: its unit, its period, and what a convention makes of it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Quantity {
    /// No unit.
    Number,
    /// A transmittance or reflectance: no unit, and what multiplies does so here.
    Power,
    /// A retardance or an angle of incidence, in radians, the same in every convention.
    Angle,
    /// An azimuth in radians, period π.
    Azimuth,
    /// An ellipticity in radians, with the sign of S3.
    Ellipticity,
    /// An angle of rotation in radians, counter-clockwise.
    Rotation,
    /// A retardance in radians whose sign is that of S3.
    CircularRetardance,
    /// A phase in radians whose sign is that of the time dependence.
    Phase,
}

impl Quantity {
    /// Whether it is in radians.
    #[must_use]
    pub fn is_angle(self) -> bool {
        !matches!(self, Self::Number | Self::Power)
    }

    /// The sign between the canonical convention and this one.
    #[must_use]
    pub fn sign(self, convention: &Convention) -> f64 {
        let time = match convention.time {
            TimeSign::Plus => 1.0,
            TimeSign::Minus => -1.0,
        };
        match self {
            Self::Number | Self::Power | Self::Angle => 1.0,
            Self::Azimuth | Self::Rotation => convention.rotation(1.0),
            Self::Ellipticity | Self::CircularRetardance => convention.circular(1.0),
            Self::Phase => time,
        }
    }
}

/// One parameter of a kind.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Definition {
    /// As in the interface, without the unit.
    pub name: &'static str,
    /// As people say it.
    pub words: &'static str,
    /// How it behaves.
    pub quantity: Quantity,
    /// The smallest value that an element can have.
    pub low: f64,
    /// The largest one.
    pub high: f64,
    /// After this much the element is the same again; infinite for none.
    pub period: f64,
}

const TURN: f64 = std::f64::consts::TAU;
const HALF_TURN: f64 = std::f64::consts::PI;
const NONE: f64 = f64::INFINITY;
const LARGEST: f64 = tolerance::LARGEST_NUMBER;

const fn define(
    name: &'static str,
    words: &'static str,
    quantity: Quantity,
    low: f64,
    high: f64,
    period: f64,
) -> Definition {
    Definition {
        name,
        words,
        quantity,
        low,
        high,
        period,
    }
}

const fn power(name: &'static str, words: &'static str) -> Definition {
    define(name, words, Quantity::Power, 0.0, LARGEST, NONE)
}

const fn angle(
    name: &'static str,
    words: &'static str,
    quantity: Quantity,
    period: f64,
) -> Definition {
    define(name, words, quantity, -LARGEST, LARGEST, period)
}

const AXIS: Definition = angle("axis", "axis", Quantity::Azimuth, HALF_TURN);
const AZIMUTH: Definition = angle("azimuth", "azimuth", Quantity::Azimuth, HALF_TURN);
const PLANE: Definition = angle("plane", "plane of incidence", Quantity::Azimuth, HALF_TURN);
const RETARDANCE: Definition = angle("retardance", "retardance", Quantity::Angle, TURN);
const TRANSMITTANCE: Definition = power("transmittance", "transmittance");
const ELLIPTICITY: Definition = define(
    "ellipticity",
    "ellipticity",
    Quantity::Ellipticity,
    -FRAC_PI_4,
    FRAC_PI_4,
    NONE,
);

const fn index(name: &'static str, words: &'static str) -> Definition {
    let largest = tolerance::LARGEST_INDEX;
    define(name, words, Quantity::Number, 1.0 / largest, largest, NONE)
}

const fn diagonal(name: &'static str, words: &'static str) -> Definition {
    define(name, words, Quantity::Number, -1.0, 1.0, NONE)
}

const LINEAR_DIATTENUATOR: [Definition; 3] = [
    power("transmittanceMax", "largest transmittance"),
    power("transmittanceMin", "smallest transmittance"),
    AXIS,
];
const LINEAR_RETARDER: [Definition; 2] = [RETARDANCE, AXIS];
const CIRCULAR_RETARDER: [Definition; 1] = [angle(
    "retardance",
    "retardance",
    Quantity::CircularRetardance,
    TURN,
)];
const ELLIPTICAL_RETARDER: [Definition; 3] = [RETARDANCE, AZIMUTH, ELLIPTICITY];
const ELLIPTICAL_DIATTENUATOR: [Definition; 4] = [
    TRANSMITTANCE,
    define(
        "diattenuation",
        "diattenuation",
        Quantity::Number,
        0.0,
        1.0,
        NONE,
    ),
    AZIMUTH,
    ELLIPTICITY,
];
const ALIGNED: [Definition; 4] = [
    TRANSMITTANCE,
    define(
        "diattenuation",
        "diattenuation",
        Quantity::Number,
        -1.0,
        1.0,
        NONE,
    ),
    RETARDANCE,
    AXIS,
];
const ROTATOR: [Definition; 1] = [angle("angle", "angle", Quantity::Rotation, HALF_TURN)];
const REFLECTOR: [Definition; 4] = [
    define("psi", "angle Ψ", Quantity::Angle, 0.0, FRAC_PI_2, NONE),
    angle("delta", "phase Δ", Quantity::Phase, TURN),
    power("reflectance", "reflectance"),
    PLANE,
];
const FRESNEL: [Definition; 5] = [
    index("indexBefore", "index before it"),
    index("indexAfter", "index behind it"),
    define(
        "absorption",
        "absorption",
        Quantity::Number,
        0.0,
        tolerance::LARGEST_INDEX,
        NONE,
    ),
    define(
        "incidence",
        "angle of incidence",
        Quantity::Angle,
        0.0,
        // Below a right angle, where nothing is left.
        FRAC_PI_2 - 1e-9,
        NONE,
    ),
    PLANE,
];
const ISOTROPIC_DEPOLARIZER: [Definition; 1] = [define(
    "alpha",
    "depolarization α",
    Quantity::Number,
    -LARGEST,
    LARGEST,
    NONE,
)];
const DIAGONAL_DEPOLARIZER: [Definition; 3] = [
    diagonal("d1", "share d1"),
    diagonal("d2", "share d2"),
    diagonal("d3", "share d3"),
];

impl Kind {
    /// All of them, in the order of the interface.
    pub const ALL: [Self; 13] = [
        Self::LinearDiattenuator,
        Self::LinearRetarder,
        Self::CircularRetarder,
        Self::EllipticalRetarder,
        Self::EllipticalDiattenuator,
        Self::AlignedDiattenuatingRetarder,
        Self::Rotator,
        Self::IsotropicReflector,
        Self::FresnelReflection,
        Self::FresnelTransmission,
        Self::IsotropicDepolarizer,
        Self::DiagonalDepolarizer,
        Self::Measured,
    ];

    /// As the interface says it.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::LinearDiattenuator => "linearDiattenuator",
            Self::LinearRetarder => "linearRetarder",
            Self::CircularRetarder => "circularRetarder",
            Self::EllipticalRetarder => "ellipticalRetarder",
            Self::EllipticalDiattenuator => "ellipticalDiattenuator",
            Self::AlignedDiattenuatingRetarder => "alignedDiattenuatingRetarder",
            Self::Rotator => "rotator",
            Self::IsotropicReflector => "isotropicReflector",
            Self::FresnelReflection => "fresnelReflection",
            Self::FresnelTransmission => "fresnelTransmission",
            Self::IsotropicDepolarizer => "isotropicDepolarizer",
            Self::DiagonalDepolarizer => "diagonalDepolarizer",
            Self::Measured => "measured",
        }
    }

    /// As people say it.
    #[must_use]
    pub fn words(self) -> &'static str {
        match self {
            Self::LinearDiattenuator => "linear diattenuator",
            Self::LinearRetarder => "linear retarder",
            Self::CircularRetarder => "circular retarder",
            Self::EllipticalRetarder => "elliptical retarder",
            Self::EllipticalDiattenuator => "elliptical diattenuator",
            Self::AlignedDiattenuatingRetarder => "diattenuating retarder",
            Self::Rotator => "rotator",
            Self::IsotropicReflector => "reflector",
            Self::FresnelReflection => "reflecting surface",
            Self::FresnelTransmission => "transmitting surface",
            Self::IsotropicDepolarizer => "isotropic depolarizer",
            Self::DiagonalDepolarizer => "diagonal depolarizer",
            Self::Measured => "measured element",
        }
    }

    /// Its parameters, in the order in which an element holds them.
    #[must_use]
    pub fn definitions(self) -> &'static [Definition] {
        match self {
            Self::LinearDiattenuator => &LINEAR_DIATTENUATOR,
            Self::LinearRetarder => &LINEAR_RETARDER,
            Self::CircularRetarder => &CIRCULAR_RETARDER,
            Self::EllipticalRetarder => &ELLIPTICAL_RETARDER,
            Self::EllipticalDiattenuator => &ELLIPTICAL_DIATTENUATOR,
            Self::AlignedDiattenuatingRetarder => &ALIGNED,
            Self::Rotator => &ROTATOR,
            Self::IsotropicReflector => &REFLECTOR,
            Self::FresnelReflection | Self::FresnelTransmission => &FRESNEL,
            Self::IsotropicDepolarizer => &ISOTROPIC_DEPOLARIZER,
            Self::DiagonalDepolarizer => &DIAGONAL_DEPOLARIZER,
            Self::Measured => &[],
        }
    }
}
