//! The wasm-bindgen surface: names and types for JavaScript, no arithmetic.

mod asking;
#[cfg(feature = "photo")]
mod photo;
mod sorter;
mod starter;
#[cfg(feature = "text")]
mod text;
mod trust;

use wasm_bindgen::prelude::*;

use crate::Error;

/// An `Error` named `KenspeckleError` with a `code` that programs can test and a message for people.
fn js_error(code: &str, message: &str) -> JsValue {
    let error = js_sys::Error::new(message);
    error.set_name("KenspeckleError");
    // Setting a property on a fresh `Error` can't fail.
    let _ = js_sys::Reflect::set(&error, &"code".into(), &code.into());
    error.into()
}

/// Turns a failure into a thrown `Error`.
trait OrThrow<T> {
    fn or_throw(self) -> Result<T, JsValue>;
}

impl<T> OrThrow<T> for Result<T, Error> {
    fn or_throw(self) -> Result<T, JsValue> {
        self.map_err(|error| js_error(error.code(), &error.to_string()))
    }
}
