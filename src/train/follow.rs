use super::{Element, Train};
use crate::error::{Error, Note, Place, Result, Severity};
use crate::mueller::Mueller;
use crate::state::Stokes;
use crate::tolerance;

/// An element that takes more than this share of the light is worth a note.
const WORTH_SAYING: f64 = 0.01;

/// The way of one state through a train.
#[derive(Debug, Clone, PartialEq)]
pub struct Followed {
    /// After every element, disabled ones too.
    pub steps: Vec<Step>,
    /// The matrix of the whole.
    pub mueller: Mueller,
    /// Where light is lost, where it depolarizes, where the order matters; at `[k]`.
    pub notes: Vec<Note>,
}

/// What an element leaves.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Step {
    /// The state; all zeros where no light is left.
    pub stokes: Stokes,
    /// Its intensity over that of the source.
    pub power: f64,
}

/// Follows a state through a train. It may be partly polarized or unpolarized.
///
/// # Errors
/// `bad-source` for a state without light, or more polarized than light can be; those of
/// the elements.
pub fn follow(source: &Stokes, train: &Train) -> Result<Followed> {
    if source.intensity() <= 0.0 || source.physical().is_none() {
        return Err(Error::new(
            "bad-source",
            "The source must have some light, and S0 must not be below the length of the rest.",
        )
        .at_field("source"));
    }
    let mut mueller = Mueller::identity();
    let mut steps = Vec::with_capacity(train.elements().len());
    let mut notes = Vec::new();
    let mut state = *source;
    // The last element in the beam, whose exchange with the next one may matter.
    let mut last: Option<(usize, Mueller)> = None;
    for (k, element) in train.elements().iter().enumerate() {
        if !element.disabled() {
            let matrix = train.matrix_of(k)?;
            mueller = matrix * mueller;
            if mueller.largest() > tolerance::LARGEST_NUMBER {
                return Err(Error::new(
                    "too-large",
                    "The elements of the train multiply to numbers beyond 1e150.",
                )
                .at_field(format!("[{k}]")));
            }
            let after = lit(&matrix.apply(&state), source);
            let title = element.title(k);
            notes.extend(loss(&state, &after, &title, k));
            if depolarizes(&matrix) {
                notes.push(depolarization(&state, &after, &title, k));
            }
            if let Some((before, other)) = last
                && !commute(&other, &matrix)
            {
                notes.push(order(train.elements(), before, k));
            }
            last = Some((k, matrix));
            state = after;
        }
        steps.push(Step {
            stokes: state,
            power: state.intensity() / source.intensity(),
        });
    }
    if steps
        .iter()
        .any(|step| !step.power.is_finite() || step.stokes.physical().is_none())
    {
        notes.push(note(
            Severity::Warning,
            "not-physical",
            "A state on the way is more polarized than light can be: a measured element is not realizable.".to_owned(),
            steps
                .iter()
                .position(|step| step.stokes.physical().is_none()),
        ));
    }
    Ok(Followed {
        steps,
        mueller,
        notes,
    })
}

/// Blocked light has no state, however it rounds.
fn lit(state: &Stokes, source: &Stokes) -> Stokes {
    if state.vector().amax() <= tolerance::ZERO * source.intensity() {
        Stokes::from_vector(nalgebra::Vector4::zeros())
    } else {
        *state
    }
}

fn loss(before: &Stokes, after: &Stokes, title: &str, k: usize) -> Option<Note> {
    if before.intensity() <= 0.0 {
        return None;
    }
    let left = after.intensity() / before.intensity();
    if left <= 0.0 {
        return Some(note(
            Severity::Warning,
            "no-light-left",
            format!("No light is left after {title}."),
            Some(k),
        ));
    }
    if left > 1.0 + WORTH_SAYING {
        return Some(note(
            Severity::Warning,
            "light-gained",
            format!(
                "{title} makes {} times the light of what it gets.",
                number(left)
            ),
            Some(k),
        ));
    }
    (1.0 - left > WORTH_SAYING).then(|| {
        note(
            Severity::Information,
            "light-lost",
            format!(
                "{title} takes {} % of the light that it gets.",
                number(100.0 * (1.0 - left))
            ),
            Some(k),
        )
    })
}

/// Whether the matrix is that of no single Jones matrix: for one, the squares of the
/// elements add to 4 M00² (Gil & Bernabéu 1985).
fn depolarizes(matrix: &Mueller) -> bool {
    let scale = matrix.largest();
    let squares: f64 = matrix
        .row_major()
        .iter()
        .map(|element| (element / scale).powi(2))
        .sum();
    let pure = 4.0 * (matrix.m00() / scale).powi(2);
    scale > 0.0 && (squares - pure).abs() > tolerance::NOT_DETERMINED
}

fn depolarization(before: &Stokes, after: &Stokes, title: &str, k: usize) -> Note {
    let sentence = match (
        before.degree_of_polarization(),
        after.degree_of_polarization(),
    ) {
        (Some(before), Some(after)) => format!(
            "{title} depolarizes: the degree of polarization goes from {} to {}.",
            number(before),
            number(after)
        ),
        _ => format!("{title} depolarizes."),
    };
    note(Severity::Information, "depolarizes", sentence, Some(k))
}

fn commute(first: &Mueller, second: &Mueller) -> bool {
    let scale = first.largest() * second.largest();
    (*second * *first).distance(&(*first * *second)) <= tolerance::COMMUTING * scale
}

fn order(elements: &[Element], first: usize, second: usize) -> Note {
    let title = |k: usize| elements.get(k).map_or(String::new(), |one| one.title(k));
    note(
        Severity::Information,
        "order-matters",
        format!(
            "The order of {} and {} matters.",
            title(first),
            title(second)
        ),
        Some(second),
    )
}

/// Three significant digits, without trailing zeros.
fn number(value: f64) -> String {
    let digits = if value.abs() >= 100.0 {
        0
    } else if value.abs() >= 10.0 {
        1
    } else if value.abs() >= 1.0 {
        2
    } else {
        3
    };
    let text = format!("{value:.digits$}");
    if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        text
    }
}

fn note(severity: Severity, code: &'static str, message: String, at: Option<usize>) -> Note {
    // A sentence begins with a capital letter, also where it begins with a name.
    let mut letters = message.chars();
    let message = letters
        .next()
        .map(|first| first.to_uppercase().chain(letters).collect())
        .unwrap_or_default();
    Note {
        severity,
        code,
        message,
        at: at.map(|k| Place::Field(format!("[{k}]"))),
    }
}
