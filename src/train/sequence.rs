use nalgebra::Matrix4;

use super::{Definition, Element, Role};
use crate::error::{self, Error, Result};
use crate::mueller::Mueller;
use crate::tolerance;

/// Elements in the order in which light meets them.
#[derive(Debug, Clone, PartialEq)]
pub struct Train(Vec<Element>);

/// One parameter of a train.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Place {
    /// Position of the element.
    pub element: usize,
    /// Position of the parameter in it.
    pub parameter: usize,
}

impl Train {
    /// Longer trains are refused.
    pub const MOST_ELEMENTS: usize = 500;

    /// Checks every element and every tie; errors stand at paths such as
    /// `[2].parameters.axis`.
    ///
    /// # Errors
    /// `too-large` for a train that is too long; `bad-tie` for a tie to nothing, to a tied
    /// parameter, or with a factor of zero; `bad-bounds` for bounds that leave no room or
    /// leave the value out; those of the elements themselves.
    pub fn new(elements: Vec<Element>) -> Result<Self> {
        if elements.len() > Self::MOST_ELEMENTS {
            return Err(Error::new(
                "too-large",
                format!("A train has at most {} elements.", Self::MOST_ELEMENTS),
            ));
        }
        let train = Self(elements);
        for (k, element) in train.0.iter().enumerate() {
            for (i, (parameter, definition)) in element
                .parameters()
                .iter()
                .zip(element.definitions())
                .enumerate()
            {
                let place = Place {
                    element: k,
                    parameter: i,
                };
                let value = train.value(place);
                if !(value.is_finite() && value.abs() <= tolerance::LARGEST_NUMBER) {
                    return Err(train.error(
                        place,
                        "",
                        "bad-parameter",
                        "This value must be a finite number.",
                    ));
                }
                train.check_role(place, &parameter.role, value, definition)?;
            }
            let values = train.values_of(k);
            element
                .matrix(&values)
                .and_then(|matrix| {
                    check_order(element, &values)?;
                    Mueller::from_row_major(&matrix.row_major())
                })
                .map_err(|error| located(error, k))?;
        }
        Ok(train)
    }

    /// A train of one measured element.
    #[must_use]
    pub fn of_one(element: Element) -> Self {
        Self(vec![element])
    }

    /// The elements.
    #[must_use]
    pub fn elements(&self) -> &[Element] {
        &self.0
    }

    /// The value of a parameter, that of a tie where it is tied; zero where there is none.
    #[must_use]
    pub fn value(&self, place: Place) -> f64 {
        let own = |place: Place| {
            let parameter = self.0.get(place.element)?.parameters().get(place.parameter);
            parameter.copied()
        };
        match own(place) {
            None => 0.0,
            Some(parameter) => match parameter.role {
                Role::Tied {
                    element,
                    parameter,
                    factor,
                    offset,
                } => own(Place { element, parameter })
                    .map_or(0.0, |other| factor * other.value + offset),
                _ => parameter.value,
            },
        }
    }

    /// The values of all parameters of one element.
    #[must_use]
    pub fn values_of(&self, element: usize) -> Vec<f64> {
        let count = self
            .0
            .get(element)
            .map_or(0, |element| element.parameters().len());
        (0..count)
            .map(|parameter| self.value(Place { element, parameter }))
            .collect()
    }

    /// The free parameters on which the light depends: those of elements in the beam, and
    /// those that one of these is tied to.
    #[must_use]
    pub fn free(&self) -> Vec<Place> {
        let used = |place: Place| {
            self.0.iter().enumerate().any(|(k, element)| {
                !element.disabled()
                    && (k == place.element
                        || element.parameters().iter().any(|parameter| {
                            matches!(parameter.role, Role::Tied { element, parameter, .. }
                                if element == place.element && parameter == place.parameter)
                        }))
            })
        };
        self.places()
            .filter(|place| {
                self.0[place.element]
                    .parameters()
                    .get(place.parameter)
                    .is_some_and(|parameter| matches!(parameter.role, Role::Free { .. }))
            })
            .filter(|&place| used(place))
            .collect()
    }

    /// What a parameter is.
    #[must_use]
    pub fn definition(&self, place: Place) -> Option<&'static Definition> {
        self.0
            .get(place.element)?
            .definitions()
            .get(place.parameter)
    }

    /// The parameter in words: `retardance of film (element 2)`.
    #[must_use]
    pub fn title(&self, place: Place) -> String {
        match (self.0.get(place.element), self.definition(place)) {
            (Some(element), Some(definition)) => {
                format!("{} of {}", definition.words, element.title(place.element))
            }
            _ => String::new(),
        }
    }

    /// The same train with other values of some parameters.
    #[must_use]
    pub fn with_values(&self, places: &[Place], values: &[f64]) -> Self {
        let mut train = self.clone();
        for (&place, &value) in places.iter().zip(values) {
            train.set_value(place, value);
        }
        train
    }

    pub(super) fn set_value(&mut self, place: Place, value: f64) {
        if let Some(element) = self.0.get_mut(place.element) {
            element.set_value(place.parameter, value);
        }
    }

    /// The matrix of one element; the identity where it is disabled.
    ///
    /// # Errors
    /// Those of the element.
    pub fn matrix_of(&self, element: usize) -> Result<Mueller> {
        match self.0.get(element) {
            Some(one) if !one.disabled() => one
                .matrix(&self.values_of(element))
                .map_err(|error| located(error, element)),
            _ => Ok(Mueller::identity()),
        }
    }

    /// The matrix of the whole.
    ///
    /// # Errors
    /// Those of the elements; `too-large` where the product is out of range.
    pub fn mueller(&self) -> Result<Mueller> {
        let mut product = Mueller::identity();
        for k in 0..self.0.len() {
            product = checked(self.matrix_of(k)? * product)?;
        }
        Ok(product)
    }

    /// The matrix of the whole and its derivatives with respect to parameters that are
    /// not tied, by the product rule; parameters that are tied to one count with it.
    ///
    /// # Errors
    /// As [`Train::mueller`].
    pub fn derivatives(&self, places: &[Place]) -> Result<(Mueller, Vec<[f64; 16]>)> {
        let count = self.0.len();
        let values: Vec<Vec<f64>> = (0..count).map(|k| self.values_of(k)).collect();
        let mut matrices = Vec::with_capacity(count);
        let mut before = Vec::with_capacity(count + 1);
        let mut product = Mueller::identity();
        for k in 0..count {
            before.push(*product.matrix());
            let matrix = self.matrix_of(k)?;
            product = checked(matrix * product)?;
            matrices.push(*matrix.matrix());
        }
        let mut after: Vec<Matrix4<f64>> = vec![Matrix4::identity(); count];
        for k in (1..count).rev() {
            after[k - 1] = after[k] * matrices[k];
        }
        let mut derivatives = Vec::with_capacity(places.len());
        for &place in places {
            let mut sum = Matrix4::<f64>::zeros();
            for (k, element) in self.0.iter().enumerate() {
                if element.disabled() {
                    continue;
                }
                for (i, parameter) in element.parameters().iter().enumerate() {
                    let factor = match parameter.role {
                        Role::Tied {
                            element,
                            parameter,
                            factor,
                            ..
                        } if element == place.element && parameter == place.parameter => factor,
                        Role::Tied { .. } => continue,
                        _ if k == place.element && i == place.parameter => 1.0,
                        _ => continue,
                    };
                    let change = element
                        .derivative(&values[k], i)
                        .map_err(|error| located(error, k))?;
                    sum += after[k] * change * before[k] * factor;
                }
            }
            derivatives.push(std::array::from_fn(|k| sum[(k / 4, k % 4)]));
        }
        Ok((product, derivatives))
    }

    /// All parameters.
    pub(super) fn places(&self) -> impl Iterator<Item = Place> + '_ {
        self.0.iter().enumerate().flat_map(|(k, element)| {
            (0..element.parameters().len()).map(move |parameter| Place {
                element: k,
                parameter,
            })
        })
    }

    fn check_role(
        &self,
        place: Place,
        role: &Role,
        value: f64,
        definition: &Definition,
    ) -> Result<()> {
        match *role {
            Role::Fixed => Ok(()),
            Role::Free { low, high } => {
                for (name, bound) in [(".low", low), (".high", high)] {
                    if bound.is_some_and(|bound| {
                        !bound.is_finite() || bound < definition.low || bound > definition.high
                    }) {
                        return Err(self.error(
                            place,
                            name,
                            "bad-bounds",
                            "This bound is outside of what the parameter can be.",
                        ));
                    }
                }
                let (low, high) = (
                    low.unwrap_or(f64::NEG_INFINITY),
                    high.unwrap_or(f64::INFINITY),
                );
                if low >= high {
                    return Err(self.error(
                        place,
                        ".high",
                        "bad-bounds",
                        "The upper bound must be above the lower one.",
                    ));
                }
                if !(low..=high).contains(&value) {
                    return Err(self.error(
                        place,
                        ".value",
                        "bad-bounds",
                        "The value must lie within the bounds.",
                    ));
                }
                Ok(())
            }
            Role::Tied {
                element,
                parameter,
                factor,
                offset,
            } => {
                let other = self
                    .0
                    .get(element)
                    .and_then(|other| other.parameters().get(parameter));
                let sentence = match other {
                    None => "There is no such parameter to be tied to.",
                    Some(other) if matches!(other.role, Role::Tied { .. }) => {
                        "A parameter can't be tied to one that is tied itself."
                    }
                    Some(_) if !(factor.is_finite() && factor != 0.0) => {
                        "The factor of a tie must be a number other than zero."
                    }
                    Some(_) if !offset.is_finite() => {
                        "The offset of a tie must be a finite number."
                    }
                    Some(_) => return Ok(()),
                };
                Err(self.error(place, ".tie", "bad-tie", sentence))
            }
        }
    }

    fn error(&self, place: Place, part: &str, code: &'static str, sentence: &str) -> Error {
        let name = self
            .definition(place)
            .map_or("", |definition| definition.name);
        Error::new(code, sentence).at_field(format!("[{}].parameters.{name}{part}", place.element))
    }
}

/// A person who swaps the two transmittances has made a slip; a fit has not.
fn check_order(element: &Element, values: &[f64]) -> Result<()> {
    let free = |parameter: usize| {
        element
            .parameters()
            .get(parameter)
            .is_some_and(|one| !matches!(one.role, Role::Fixed))
    };
    match (element.kind(), values) {
        (super::Kind::LinearDiattenuator, &[max, min, _]) if max < min && !free(0) && !free(1) => {
            Err(Error::new(
                "bad-parameter",
                "The largest transmittance must not be below the smallest.",
            )
            .at_field("transmittanceMin"))
        }
        _ => Ok(()),
    }
}

/// A product of finite matrices may be out of range.
fn checked(product: Mueller) -> Result<Mueller> {
    if product.largest() <= tolerance::LARGEST_NUMBER {
        Ok(product)
    } else {
        Err(Error::new(
            "too-large",
            "The elements of the train multiply to numbers beyond 1e150.",
        ))
    }
}

/// At the element of the train.
fn located(error: Error, element: usize) -> Error {
    let path = match &error.at {
        Some(error::Place::Field(field)) if field.starts_with('[') => return error,
        Some(error::Place::Field(field)) => format!("[{element}].parameters.{field}"),
        _ => format!("[{element}]"),
    };
    error.at_field(path)
}
