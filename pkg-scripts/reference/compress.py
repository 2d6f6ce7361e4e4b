"""Stores the network's constants small, as plain ONNX: int8 with a scale per output channel, or f16."""

from dataclasses import replace

import numpy as np

# The 1×1 weights of the first blocks are few and every later layer amplifies their error: at f16 they cost 20 kB and
# halve the distance to the float network.
SMALLEST_INT8 = 8192
# Clipping candidates: the full range down to 40 % of it.
CLIPS = np.linspace(1.0, 0.4, 61)


def channel_scales(rows):
    """The int8 step of each row with the least squared error, as float32."""
    widest = np.maximum(np.abs(rows).max(axis=1), 1e-12)
    candidates = (widest[None, :] * CLIPS[:, None] / 127).astype(np.float32)
    errors = np.stack([((dequantise(quantise(rows, scale), scale) - rows) ** 2).sum(axis=1) for scale in candidates])
    return candidates[errors.argmin(axis=0), np.arange(len(rows))]


def quantise(rows, scale):
    return np.clip(np.rint(rows / scale[:, None].astype(np.float64)), -127, 127).astype(np.int8)


def dequantise(steps, scale):
    return steps.astype(np.float64) * scale[:, None].astype(np.float64)


class Storage:
    """Decides how each constant is stored, and adds it to the graph with the operator that makes it float32 again."""

    def __init__(self, layers):
        self.int8 = {}
        self.layers = [self.prepare(layer) for layer in layers]

    def prepare(self, layer):
        """The layer with its bias corrected for the error of its stored weights.

        Nagel, van Baalen, Blankevoort, Welling: Data-Free Quantization Through Weight Equalization and Bias Correction
        (2019), section 4.2: the expected input of a layer follows from the batch normalisation before it, so the mean
        shift of its output is known without any picture and moves into the bias.
        """
        rows = layer.weight.reshape(len(layer.weight), -1)
        if layer.pointwise and rows.size >= SMALLEST_INT8:
            scale = channel_scales(rows)
            steps = quantise(rows, scale)
            self.int8[f"{layer.name}.weight"] = (steps.reshape(layer.weight.shape), scale)
            stored = dequantise(steps, scale)
        else:
            stored = rows.astype(np.float16).astype(np.float64)
        if not layer.pointwise:
            return layer
        return replace(layer, bias=layer.bias - (stored - rows) @ layer.input_mean)

    def weight(self, graph, name, values):
        if name not in self.int8:
            return self.half(graph, name, values)
        steps, scale = self.int8[name]
        inputs = [graph.constant(f"{name}.int8", steps), graph.constant(f"{name}.scale", scale)]
        return graph.node("DequantizeLinear", inputs, name, axis=0)

    def half(self, graph, name, values):
        return graph.node("Cast", [graph.constant(f"{name}.f16", values.astype(np.float16))], name, to=1)
