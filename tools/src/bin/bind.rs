//! Makes the JavaScript bindings of the WebAssembly module: `bind MODULE.wasm OUT_DIR`.
//!
//! It takes the generator from the same lock file as the `wasm-bindgen` runtime, so the two can't drift apart.

use std::{env, process::ExitCode};

use wasm_bindgen_cli_support::Bindgen;

fn main() -> ExitCode {
    let args: Vec<String> = env::args().skip(1).collect();
    let [module, out] = args.as_slice() else {
        eprintln!("usage: bind MODULE.wasm OUT_DIR");
        return ExitCode::from(2);
    };
    let mut bindgen = Bindgen::new();
    let made = bindgen
        .input_path(module)
        .out_name("kenspeckle")
        .web(true)
        .and_then(|b| b.typescript(true).remove_name_section(true).generate(out));
    match made {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("bind: {error:#}");
            ExitCode::FAILURE
        }
    }
}
