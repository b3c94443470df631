//! Plain values between JavaScript and JSON, every bit of a number kept.
//!
//! serde-wasm-bindgen turns `-0` into the integer 0, keeps NaN, and passes over
//! members that a type does not name: requests and links may have none of these.

use js_sys::{Array, ArrayBuffer, Object, Reflect};
use serde_json::{Map, Number, Value};
use wasm_bindgen::JsValue;

use crate::error::{Error, Result};

/// Deeper nesting is refused: requests and configurations are flat.
const DEEPEST: usize = 32;

/// From JavaScript. `undefined` members are left out.
///
/// # Errors
/// `not-finite` for a number that is not, `bad-request` for what is no plain value:
/// functions, cycles; at the path of the value.
pub fn from_js(value: &JsValue) -> Result<Value> {
    convert(value, "", 0)
}

fn convert(value: &JsValue, path: &str, depth: usize) -> Result<Value> {
    let refuse = |code, sentence: &str| {
        let error = Error::new(code, sentence);
        Err(if path.is_empty() {
            error
        } else {
            error.at_field(path)
        })
    };
    if depth > DEEPEST {
        return refuse("bad-request", "This is nested too deeply.");
    }
    if value.is_null() {
        return Ok(Value::Null);
    }
    if let Some(flag) = value.as_bool() {
        return Ok(Value::Bool(flag));
    }
    if let Some(number) = value.as_f64() {
        return match number_of(number) {
            Some(number) => Ok(Value::Number(number)),
            None => refuse("not-finite", "This is not a finite number."),
        };
    }
    if let Some(text) = value.as_string() {
        return Ok(Value::String(text));
    }
    if Array::is_array(value) || ArrayBuffer::is_view(value) {
        let length = Reflect::get(value, &JsValue::from_str("length"))
            .ok()
            .and_then(|length| length.as_f64())
            .unwrap_or_default() as u32;
        return (0..length)
            .map(|k| {
                let inner = format!("{path}[{k}]");
                let item = Reflect::get_u32(value, k).map_err(|_| unreadable(&inner))?;
                convert(&item, &inner, depth + 1)
            })
            .collect::<Result<_>>()
            .map(Value::Array);
    }
    if value.is_object() && !value.is_function() {
        let mut map = Map::new();
        // Reflection hands on what a getter or a proxy throws, as a value.
        for key in Reflect::own_keys(value)
            .map_err(|_| unreadable(path))?
            .iter()
        {
            let name = key.as_string().unwrap_or_default();
            let inner = if path.is_empty() {
                name.clone()
            } else {
                format!("{path}.{name}")
            };
            let item = Reflect::get(value, &key).map_err(|_| unreadable(&inner))?;
            if !item.is_undefined() {
                map.insert(name, convert(&item, &inner, depth + 1)?);
            }
        }
        return Ok(Value::Object(map));
    }
    refuse("bad-request", "This is not a plain value.")
}

fn unreadable(path: &str) -> Error {
    let error = Error::new("bad-request", "Reading this value throws an error.");
    if path.is_empty() {
        error
    } else {
        error.at_field(path)
    }
}

/// Whole numbers as such, but for -0, which only a double can be.
fn number_of(number: f64) -> Option<Number> {
    const LARGEST_WHOLE: f64 = 9_007_199_254_740_992.0;
    let whole = number.fract() == 0.0 && number.abs() < LARGEST_WHOLE;
    if whole && !(number == 0.0 && number.is_sign_negative()) {
        return Some(Number::from(number as i64));
    }
    if !number.is_finite() {
        return None;
    }
    // The shortest decimal that reads back as the same bits. `Number::from_f64` would
    // bring a second printer with tables of its own.
    format!("{number:?}").parse().ok()
}

/// To JavaScript: fresh plain objects.
pub fn to_js(value: &Value) -> JsValue {
    match value {
        Value::Null => JsValue::NULL,
        Value::Bool(flag) => JsValue::from_bool(*flag),
        Value::Number(number) => number.as_f64().map_or(JsValue::NULL, JsValue::from_f64),
        Value::String(text) => JsValue::from_str(text),
        Value::Array(items) => items.iter().map(to_js).collect::<Array>().into(),
        Value::Object(map) => {
            let object = Object::new();
            for (key, item) in map {
                // Setting a member of a fresh object does not fail.
                let _ = Reflect::set(&object, &JsValue::from_str(key), &to_js(item));
            }
            object.into()
        }
    }
}
