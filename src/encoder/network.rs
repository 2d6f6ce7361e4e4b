//! Runs the photo encoder's ONNX file.

use std::sync::Arc;

use rten::{Dimension, Model, ModelOptions, NodeId, RunOptions, ThreadPool, Value, op_registry};

use super::{EncoderError, one_thread};

/// Pixels to a side of the network's input.
pub(super) const SIDE: usize = 224;

/// A network from `1 × 3 × SIDE × SIDE` to `1 × dimension`. Clones share the weights.
#[derive(Clone)]
pub(super) struct Network {
    model: Arc<Model>,
    input: NodeId,
    output: NodeId,
    dimension: usize,
    threads: Arc<ThreadPool>,
}

impl Network {
    pub(super) fn from_bytes(file: &[u8]) -> Result<Self, EncoderError> {
        // `Cast` and `DequantizeLinear` unpack the stored weights once, while loading.
        let operators = op_registry!(Add, Cast, Clip, Conv, DequantizeLinear, Flatten, GlobalAveragePool);
        let model = ModelOptions::with_ops(operators)
            .prepack_weights(true)
            .load(file.to_vec())
            .map_err(|error| EncoderError::EncoderFile(format!("it is damaged or no ONNX network ({error})")))?;
        let (input, output) = match (model.input_ids(), model.output_ids()) {
            (&[input], &[output]) => (input, output),
            (inputs, outputs) => {
                return Err(EncoderError::EncoderFile(format!(
                    "it has {} inputs and {} outputs instead of one each",
                    inputs.len(),
                    outputs.len()
                )));
            }
        };
        let wanted = [1, 3, SIDE, SIDE].map(Dimension::Fixed);
        let shape = |node| model.node_info(node).and_then(|info| info.shape());
        if shape(input).as_deref() != Some(wanted.as_slice()) {
            return Err(EncoderError::EncoderFile(format!("its input is not of shape 1 × 3 × {SIDE} × {SIDE}")));
        }
        let dimension = match shape(output).as_deref() {
            Some([Dimension::Fixed(1), Dimension::Fixed(dimension @ 1..)]) => *dimension,
            _ => return Err(EncoderError::EncoderFile("its output is not one row of numbers".into())),
        };
        Ok(Self { model: Arc::new(model), input, output, dimension, threads: one_thread() })
    }

    pub(super) fn dimension(&self) -> usize {
        self.dimension
    }

    /// Gives this clone a thread of its own, so that clones run side by side.
    pub(super) fn detach(&mut self) {
        self.threads = one_thread();
    }

    /// Runs the network on `3 × SIDE × SIDE` normalised values.
    pub(super) fn run(&self, values: Vec<f32>) -> Result<Vec<f32>, EncoderError> {
        let broken = |reason: String| EncoderError::EncoderFile(reason);
        let input = Value::from_shape(&[1, 3, SIDE, SIDE], values).map_err(|error| broken(error.to_string()))?;
        let options = RunOptions::default().with_thread_pool(Some(Arc::clone(&self.threads)));
        let [output] = self
            .model
            .run_n(vec![(self.input, input.into())], [self.output], Some(options))
            .map_err(|error| broken(error.to_string()))?;
        let (_, embedding): ([usize; 2], Vec<f32>) =
            output.into_shape_vec().map_err(|error| broken(error.to_string()))?;
        if embedding.len() != self.dimension || !embedding.iter().all(|value| value.is_finite()) {
            return Err(broken("its output is not the numbers it announces".into()));
        }
        Ok(embedding)
    }
}
