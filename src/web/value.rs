//! Free-form values between JavaScript and JSON, every bit of a number kept.
//!
//! serde-wasm-bindgen turns `-0` into the integer 0 and keeps NaN; a link may do
//! neither.

use js_sys::{Array, Object, Reflect};
use serde_json::{Map, Number, Value};
use wasm_bindgen::{JsCast, JsValue};

use crate::error::{Error, Result};

/// Deeper nesting is refused: a configuration is flat.
const DEEPEST: usize = 32;

/// From JavaScript. `undefined` members are left out.
///
/// # Errors
/// `bad-configuration` for what JSON can't hold: functions, NaN, cycles.
pub fn from_js(value: &JsValue) -> Result<Value> {
    convert(value, "configuration", 0)
}

fn convert(value: &JsValue, path: &str, depth: usize) -> Result<Value> {
    let refuse = |what: &str| {
        Err(Error::new("bad-configuration", format!("A configuration can't hold {what}.")).at_field(path))
    };
    if depth > DEEPEST {
        return refuse("values nested this deep");
    }
    if value.is_null() {
        return Ok(Value::Null);
    }
    if let Some(flag) = value.as_bool() {
        return Ok(Value::Bool(flag));
    }
    if let Some(number) = value.as_f64() {
        return match Number::from_f64(number) {
            Some(number) => Ok(Value::Number(number)),
            None => refuse("a number that is not finite"),
        };
    }
    if let Some(text) = value.as_string() {
        return Ok(Value::String(text));
    }
    if Array::is_array(value) {
        let array: &Array = value.unchecked_ref();
        return array
            .iter()
            .enumerate()
            .map(|(k, item)| convert(&item, &format!("{path}[{k}]"), depth + 1))
            .collect::<Result<_>>()
            .map(Value::Array);
    }
    if value.is_object() && !value.is_function() {
        let mut map = Map::new();
        for entry in Object::entries(value.unchecked_ref()).iter() {
            let entry: Array = entry.unchecked_into();
            let key = entry.get(0).as_string().unwrap_or_default();
            let item = entry.get(1);
            if !item.is_undefined() {
                let item = convert(&item, &format!("{path}.{key}"), depth + 1)?;
                map.insert(key, item);
            }
        }
        return Ok(Value::Object(map));
    }
    refuse("such a value")
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
