//! Runs the text encoder's ONNX file.

use std::sync::Arc;

use rten::{Dimension, Model, ModelOptions, NodeId, RunOptions, ThreadPool, Value, op_registry};

use super::{EncoderError, one_thread};

/// The metadata field with the tokens, one a line in the order of the table's rows.
const VOCABULARY: &str = "vocabulary";

/// A network from the tokens of one text to a row of features each. Clones share the weights.
#[derive(Clone)]
pub(super) struct Language {
    model: Arc<Model>,
    tokens: NodeId,
    positions: NodeId,
    features: NodeId,
    dimension: usize,
    threads: Arc<ThreadPool>,
}

impl Language {
    /// The network in the file, and its vocabulary.
    pub(super) fn from_bytes(file: Vec<u8>) -> Result<(Self, String), EncoderError> {
        // `DequantizeLinear` and most of `Cast` unpack the stored weights once, while loading.
        let operators = op_registry!(
            Add,
            Cast,
            DequantizeLinear,
            Gather,
            Gelu,
            LayerNormalization,
            MatMul,
            Mul,
            Reshape,
            Softmax,
            Transpose
        );
        let model = ModelOptions::with_ops(operators)
            .prepack_weights(true)
            .load(file)
            .map_err(|error| EncoderError::EncoderFile(format!("it is damaged or no ONNX network ({error})")))?;
        let (tokens, positions, features) = match (model.input_ids(), model.output_ids()) {
            (&[tokens, positions], &[features]) => (tokens, positions, features),
            (inputs, outputs) => {
                return Err(EncoderError::EncoderFile(format!(
                    "it has {} inputs and {} outputs instead of two and one",
                    inputs.len(),
                    outputs.len()
                )));
            }
        };
        let dimension = match model.node_info(features).and_then(|info| info.shape()).as_deref() {
            Some([_, Dimension::Fixed(dimension @ 1..)]) => *dimension,
            _ => return Err(EncoderError::EncoderFile("its output is not a row of numbers for each token".into())),
        };
        let vocabulary = model
            .metadata()
            .get(VOCABULARY)
            .ok_or_else(|| EncoderError::EncoderFile("there is no vocabulary in it".into()))?
            .to_owned();
        let model = Arc::new(model);
        Ok((Self { model, tokens, positions, features, dimension, threads: one_thread() }, vocabulary))
    }

    pub(super) fn dimension(&self) -> usize {
        self.dimension
    }

    /// Gives this clone a thread of its own, so that clones run side by side.
    pub(super) fn detach(&mut self) {
        self.threads = one_thread();
    }

    /// The features of the tokens, one row of `dimension` numbers after the other.
    pub(super) fn run(&self, tokens: Vec<i32>) -> Result<Vec<f32>, EncoderError> {
        let broken = |reason: String| EncoderError::EncoderFile(reason);
        let length = tokens.len();
        let column = |values: Vec<i32>| Value::from_shape(&[length], values).map_err(|error| broken(error.to_string()));
        let positions = column((0..).take(length).collect())?;
        let tokens = column(tokens)?;
        let options = RunOptions::default().with_thread_pool(Some(Arc::clone(&self.threads)));
        let inputs = vec![(self.tokens, tokens.into()), (self.positions, positions.into())];
        let [output] =
            self.model.run_n(inputs, [self.features], Some(options)).map_err(|error| broken(error.to_string()))?;
        let (_, features): ([usize; 2], Vec<f32>) =
            output.into_shape_vec().map_err(|error| broken(error.to_string()))?;
        if features.len() != length * self.dimension || !features.iter().all(|value| value.is_finite()) {
            return Err(broken("its output is not the numbers it announces".into()));
        }
        Ok(features)
    }
}
