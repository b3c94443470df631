//! Halfshade's engine: measured Mueller matrices, checked and explained.
//!
//! A measured 4×4 Mueller matrix is noisy, partly depolarized and often not
//! physical. The engine says whether it can be physical and how sure that is
//! ([`coherency`]), what the element does to light ([`figures`], [`decompose`]),
//! reads matrices from pasted text ([`text`]), keeps a session in a link ([`link`])
//! and draws ([`plot`]). It does no input or output, reads no clock, and draws
//! random numbers only from a seed that it was given.
//!
//! # The canonical convention
//!
//! Right-handed axes x, y, z, with z along propagation; the observer faces the
//! source. Angles are radians, counter-clockwise from x. Time dependence
//! exp(+iωt); the fast axis of a retarder is advanced in phase. `S3 = 2 Im(Ex* Ey)`,
//! so that S3 > 0 turns clockwise for the observer. Foreign conventions are
//! converted at the boundary only ([`convention`]).
//!
//! # The map, in reading order
//!
//! Each module uses only what stands above it.

#![warn(missing_docs)]
#![forbid(unsafe_code)]

pub mod error;
pub mod json;
pub mod tolerance;

pub mod linalg;

pub mod stats;

pub mod state;

pub mod mueller;

pub mod convention;

pub mod noise;

pub mod coherency;

pub mod decompose;

pub mod figures;

pub mod fit;

pub mod examine;

pub mod train;

pub mod text;

pub mod link;

pub mod plot;

pub mod web;
