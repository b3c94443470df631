//! A fitted model as a Python text that computes its matrix again, with NumPy alone.

use std::fmt::Write;

use crate::convention::Convention;
use crate::fit::{Fit, Model, Name, Side};

const HEAD: &str = "import numpy as np

# Light: S3 = 2 Im(Ex* Ey); angles in radians, counter-clockwise from x, facing the source.
A = np.array([[1, 0, 0, 1], [1, 0, 0, -1], [0, 1, 1, 0], [0, 1j, -1j, 0]])
PAULI = [np.diag([1, -1]), np.array([[0, 1], [1, 0]]), np.array([[0, -1j], [1j, 0]])]


def mueller(jones):
    jones = np.asarray(jones, dtype=complex)
    return (A @ np.kron(jones, jones.conj()) @ np.linalg.inv(A)).real


def turned(jones, azimuth):
    c, s = np.cos(azimuth), np.sin(azimuth)
    frame = np.array([[c, s], [-s, c]])
    return frame.T @ jones @ frame


def along(vector):
    return sum(component * pauli for component, pauli in zip(vector, PAULI))

";

/// The text; its last line prints the fitted matrix in the person's convention.
#[must_use]
pub fn python_recipe(fit: &Fit, convention: &Convention) -> String {
    let mut text = format!(
        "# Halfshade {}: a fitted model and the matrix that it gives.\n{HEAD}\n",
        env!("CARGO_PKG_VERSION")
    );
    // A text can always be written to.
    let _ = body(&mut text, fit);
    let signs = convention.element_signs();
    let k: Vec<String> = (0..4).map(|i| format!("{}", signs[i])).collect();
    let _ = writeln!(
        text,
        "K = np.diag([{}])  # the convention asked for",
        k.join(", ")
    );
    text.push_str("M = K @ M @ K\nprint(M)\n");
    text
}

fn body(text: &mut String, fit: &Fit) -> std::fmt::Result {
    let value = |name: Name| {
        fit.parameters
            .iter()
            .find(|parameter| parameter.name == name)
            .map_or(0.0, |parameter| parameter.value)
    };
    let vector = |name: fn(usize) -> Name| {
        let parts: Vec<String> = (0..3).map(|k| format!("{:?}", value(name(k)))).collect();
        format!("np.array([{}])", parts.join(", "))
    };
    let scalar =
        |text: &mut String, key: &str, name: Name| writeln!(text, "{key} = {:?}", value(name));
    match fit.model {
        Model::LinearRetarder | Model::LinearDiattenuator | Model::AlignedDiattenuatingRetarder => {
            scalar(text, "transmittance", Name::Transmittance)?;
            scalar(text, "diattenuation", Name::Diattenuation)?;
            scalar(text, "retardance", Name::Retardance)?;
            scalar(text, "axis", Name::Axis)?;
            text.push_str(
                "bright = np.sqrt(1 + diattenuation) * np.exp(0.5j * retardance)
dark = np.sqrt(1 - diattenuation) * np.exp(-0.5j * retardance)
jones = turned(np.sqrt(transmittance) * np.diag([bright, dark]), axis)
M = mueller(jones)
",
            );
        }
        Model::EllipticalRetarder => {
            scalar(text, "transmittance", Name::Transmittance)?;
            writeln!(
                text,
                "vector = {}  # retardance times axis",
                vector(Name::RetarderVector)
            )?;
            text.push_str(
                "retardance = np.linalg.norm(vector)
half = 0.5 * retardance
jones = np.cos(half) * np.eye(2) + 0.5j * np.sinc(half / np.pi) * along(vector)
M = transmittance * mueller(jones)
",
            );
        }
        Model::EllipticalDiattenuator => {
            scalar(text, "transmittance", Name::Transmittance)?;
            writeln!(
                text,
                "D = {}  # the diattenuation vector",
                vector(Name::DiattenuationVector)
            )?;
            text.push_str(
                "q = np.sqrt(max(0.0, 1 - D @ D))
M = np.block([[np.ones((1, 1)), D[None]], [D[:, None], q * np.eye(3) + np.outer(D, D) / (1 + q)]])
M = transmittance * M
",
            );
        }
        _ => {
            let parts = fit.jones_matrices();
            text.push_str("M = np.zeros((4, 4))\n");
            for jones in parts {
                let entries: Vec<String> = jones
                    .iter()
                    .map(|entry| format!("complex({:?}, {:?})", entry.re, entry.im))
                    .collect();
                writeln!(
                    text,
                    "M += mueller([[{}, {}], [{}, {}]])",
                    entries[0], entries[1], entries[2], entries[3]
                )?;
            }
        }
    }
    match fit.model {
        Model::Pure | Model::RankTwo | Model::RankThree | Model::RankFour => Ok(()),
        Model::PureLinearCircular => {
            let (l, c) = (
                value(Name::DepolarizationLinear),
                value(Name::DepolarizationCircular),
            );
            series(text, fit.side, &format!("[1, {l:?}, {l:?}, {c:?}]"))
        }
        Model::PureDiagonal => {
            let d = [0, 1, 2].map(|k| value(Name::Depolarization(k)));
            series(
                text,
                fit.side,
                &format!("[1, {:?}, {:?}, {:?}]", d[0], d[1], d[2]),
            )
        }
        _ => {
            scalar(text, "alpha", Name::Alpha)?;
            if fit.side == Some(Side::Parallel) {
                text.push_str("first = M[0, 0]\nM = (1 - alpha) * M\nM[0, 0] = first\n");
                Ok(())
            } else {
                series(text, fit.side, "[1, 1 - alpha, 1 - alpha, 1 - alpha]")
            }
        }
    }
}

fn series(text: &mut String, side: Option<Side>, diagonal: &str) -> std::fmt::Result {
    writeln!(text, "depolarizer = np.diag({diagonal})")?;
    text.push_str(if side == Some(Side::Before) {
        "M = M @ depolarizer\n"
    } else {
        "M = depolarizer @ M\n"
    });
    Ok(())
}
