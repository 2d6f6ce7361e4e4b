"""EfficientNet-Lite0 (Tan & Le 2019; Lite variant 2020) as a plain list of convolutions, and as an ONNX graph."""

from dataclasses import dataclass
from math import ceil

import numpy as np
from onnx import TensorProto, helper
from scipy.stats import norm

from graph import Graph, store_f32

SIDE = 224
FEATURES = 1280
CLASSES = 1000
BATCH_NORM_EPSILON = 1e-3
OPSET = 13
# (repeats, kernel, stride, expansion, output channels) of each stage.
STAGES = [(1, 3, 1, 1, 16), (2, 3, 2, 6, 24), (2, 5, 2, 6, 40), (3, 3, 2, 6, 80), (3, 5, 1, 6, 112), (4, 5, 2, 6, 192), (1, 3, 1, 6, 320)]


@dataclass
class Conv:
    """A convolution with its batch normalisation folded in, and what batch normalisation says about its input."""

    name: str
    weight: np.ndarray  # float64, output channels × input channels of the group × k × k
    bias: np.ndarray  # float64, output channels
    stride: int
    pads: list  # top, left, bottom, right
    groups: int
    relu6: bool
    residual: bool  # add the block's input to the output
    opens_block: bool  # the input is what a later residual adds
    input_mean: np.ndarray  # float64, input channels
    input_variance: np.ndarray

    @property
    def pointwise(self):
        return self.weight.shape[2:] == (1, 1)


def clipped_moments(mean, variance):
    """Mean and variance of a normal variable clipped to 0…6."""
    # A dead channel has variance 0: the tiny floor keeps it a constant.
    deviation = np.sqrt(np.maximum(variance, 1e-20))
    low, high = (0 - mean) / deviation, (6 - mean) / deviation
    inside = norm.cdf(high) - norm.cdf(low)
    first = mean * inside + deviation * (norm.pdf(low) - norm.pdf(high)) + 6 * norm.sf(high)
    # ∫ (mean + deviation·t)² φ(t) dt between the bounds, with ∫ t φ = φ(low) − φ(high) and ∫ t² φ by parts.
    t_squared = inside + low * norm.pdf(low) - high * norm.pdf(high)
    second = mean**2 * inside + 2 * mean * deviation * (norm.pdf(low) - norm.pdf(high)) + deviation**2 * t_squared + 36 * norm.sf(high)
    return first, np.maximum(second - first**2, 0)


def same_pads(side, kernel, stride):
    """TensorFlow's SAME padding: the smaller half first, so asymmetric at stride 2."""
    total = max((ceil(side / stride) - 1) * stride + kernel - side, 0)
    first, last = total // 2, total - total // 2
    return [first, first, last, last]


def convolutions(tensors):
    """The network's convolutions in order, without the classifier."""
    layers = []
    side = SIDE
    mean, variance = np.zeros(3), np.full(3, 0.25)

    def add(name, conv, bn, stride=1, groups=1, relu6=True, residual=False, opens_block=False):
        nonlocal side, mean, variance
        weight = tensors[f"{conv}.weight"].astype(np.float64)
        gamma, beta, running_mean, running_variance = (
            tensors[f"{bn}.{part}"].astype(np.float64) for part in ("weight", "bias", "running_mean", "running_var")
        )
        factor = gamma / np.sqrt(running_variance + BATCH_NORM_EPSILON)
        layers.append(
            Conv(
                name=name,
                weight=weight * factor[:, None, None, None],
                bias=beta - running_mean * factor,
                stride=stride,
                pads=same_pads(side, weight.shape[2], stride),
                groups=groups,
                relu6=relu6,
                residual=residual,
                opens_block=opens_block,
                input_mean=mean,
                input_variance=variance,
            )
        )
        side = ceil(side / stride)
        # Batch normalisation gives its output the mean beta and the deviation gamma, up to the epsilon.
        mean, variance = beta, gamma**2 * running_variance / (running_variance + BATCH_NORM_EPSILON)
        if relu6:
            mean, variance = clipped_moments(mean, variance)

    add("stem", "_conv_stem", "_bn0", stride=2)
    block = 0
    for repeats, kernel, first_stride, expansion, channels in STAGES:
        for repeat in range(repeats):
            source = f"_blocks.{block}"
            stride = first_stride if repeat == 0 else 1
            before = (mean, variance)
            width = len(mean) * expansion
            if expansion > 1:
                add(f"block{block}.expand", f"{source}._expand_conv", f"{source}._bn0", opens_block=True)
            add(f"block{block}.depthwise", f"{source}._depthwise_conv", f"{source}._bn1", stride, groups=width, opens_block=expansion == 1)
            residual = repeat > 0
            add(f"block{block}.project", f"{source}._project_conv", f"{source}._bn2", relu6=False, residual=residual)
            if residual:
                mean, variance = mean + before[0], variance + before[1]
            assert len(mean) == channels
            block += 1
    add("head", "_conv_head", "_bn1")
    assert len(mean) == FEATURES
    return layers


def model(layers, store_weight=store_f32, store_bias=store_f32, classifier=None, description=""):
    """The ONNX model: `photo` (1×3×224×224, value (v − 127) / 128) to `embedding` (1×1280), or to `logits` (1×1000).

    `store_weight(graph, name, values)` and `store_bias` add one constant and return the name of its float32 value.
    """
    graph = Graph()
    low, high = graph.constant("zero", np.float32(0)), graph.constant("six", np.float32(6))
    value = block_input = "photo"
    for layer in layers:
        if layer.opens_block:
            block_input = value
        inputs = [
            value,
            store_weight(graph, f"{layer.name}.weight", layer.weight),
            store_bias(graph, f"{layer.name}.bias", layer.bias),
        ]
        kernel = list(layer.weight.shape[2:])
        value = graph.node(
            "Conv", inputs, layer.name, kernel_shape=kernel, strides=[layer.stride] * 2, pads=layer.pads, group=layer.groups
        )
        if layer.relu6:
            value = graph.node("Clip", [value, low, high], f"{layer.name}.clip")
        if layer.residual:
            value = graph.node("Add", [value, block_input], f"{layer.name}.sum")
    value = graph.node("GlobalAveragePool", [value], "pool")
    output, width = ("embedding", FEATURES) if classifier is None else ("logits", CLASSES)
    value = graph.node("Flatten", [value], "embedding", axis=1)
    if classifier is not None:
        weight, bias = classifier
        value = graph.node("Gemm", [value, store_f32(graph, "classifier.weight", weight), store_f32(graph, "classifier.bias", bias)], output, transB=1)
    made = helper.make_graph(
        graph.nodes,
        "efficientnet-lite0",
        [helper.make_tensor_value_info("photo", TensorProto.FLOAT, [1, 3, SIDE, SIDE])],
        [helper.make_tensor_value_info(output, TensorProto.FLOAT, [1, width])],
        graph.initializers,
        doc_string=description,
    )
    return helper.make_model(made, opset_imports=[helper.make_opsetid("", OPSET)], ir_version=8, producer_name="kenspeckle")
