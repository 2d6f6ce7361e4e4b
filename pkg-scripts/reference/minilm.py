"""all-MiniLM-L6-v2 (Reimers & Gurevych 2019; Wang et al. 2020) as an ONNX graph, its constants as they are or stored small."""

import json
import math
import struct

import numpy as np
from onnx import TensorProto, helper

from compress import channel_scales, quantise
from graph import Graph, store_f32

WIDTH = 384
LAYERS = 6
HEADS = 12
LONGEST = 256  # tokens of one part of a note, the two at its ends included
EPSILON = 1e-12
OPSET = 20  # the first with Gelu
UNUSED = "[unused"


def read_tensors(data):
    """The float32 tensors of a safetensors file: a length, a JSON header, the values (safetensors 0.x, its README)."""
    (length,) = struct.unpack("<Q", data[:8])
    header = json.loads(data[8 : 8 + length])
    tensors = {}
    for name, about in header.items():
        if name == "__metadata__" or about["dtype"] != "F32":
            continue
        start, end = about["data_offsets"]
        tensors[name] = np.frombuffer(data[8 + length + start : 8 + length + end], "<f4").reshape(about["shape"])
    return tensors


def read_vocabulary(tokenizer):
    """The tokens in the order of the table's rows, from tokenizer.json."""
    rows = json.loads(tokenizer)["model"]["vocab"]
    tokens = sorted(rows, key=rows.get)
    if [rows[token] for token in tokens] != list(range(len(tokens))) or any("\n" in token for token in tokens):
        raise ValueError("the vocabulary's rows are not 0, 1, 2 … or a token holds a line break")
    return tokens


class Float:
    """Keeps every constant as float32."""

    table = linear = vector = staticmethod(store_f32)

    @staticmethod
    def embed(graph, name, values, rows):
        return graph.node("Gather", [store_f32(graph, name, values), rows], f"{name}.rows", axis=0)


class Small:
    """Stores the token table as int8 with a scale a row, the layers as int8 with a scale an output, the rest as f16."""

    @staticmethod
    def embed(graph, name, values, rows):
        # The rows are looked up before they are unpacked, so the table stays int8 in memory.
        scale = channel_scales(values.astype(np.float64))
        stored = graph.constant(f"{name}.int8", quantise(values, scale))
        steps = graph.node("Gather", [stored, rows], f"{name}.int8.rows", axis=0)
        scales = graph.node("Gather", [graph.constant(f"{name}.scale", scale[:, None]), rows], f"{name}.scale.rows", axis=0)
        return graph.node("Mul", [graph.node("Cast", [steps], f"{name}.steps", to=TensorProto.FLOAT), scales], f"{name}.rows")

    @staticmethod
    def linear(graph, name, values):
        outputs = values.T.astype(np.float64)
        scale = channel_scales(outputs)
        steps = np.ascontiguousarray(quantise(outputs, scale).T)
        inputs = [graph.constant(f"{name}.int8", steps), graph.constant(f"{name}.scale", scale)]
        return graph.node("DequantizeLinear", inputs, name, axis=1)

    @staticmethod
    def vector(graph, name, values):
        return graph.node("Cast", [graph.constant(f"{name}.f16", values.astype(np.float16))], name, to=TensorProto.FLOAT)

    table = vector


def model(tensors, vocabulary, storage, description=""):
    """The ONNX model: `tokens` and `positions` (rows of the two tables, as many as tokens) to `features` (tokens × 384).

    The mean over the tokens, at unit length, is the embedding. One note at a time: nothing is padded, so nothing is
    masked. The vocabulary travels in the file's metadata, one token a line in the order of the rows.
    """
    # Rows that no text leads to are left out.
    kept = [row for row, token in enumerate(vocabulary) if not token.startswith(UNUSED)]
    graph = Graph()

    def shape(name, *sizes):
        return graph.constant(name, np.array(sizes, np.int64))

    def norm(value, source, name):
        parts = [storage.vector(graph, f"{name}.{part}", tensors[f"{source}.{part}"]) for part in ("weight", "bias")]
        return graph.node("LayerNormalization", [value, *parts], name, axis=-1, epsilon=EPSILON)

    def linear(value, weight, bias, name):
        # Torch keeps a weight as outputs × inputs.
        product = graph.node("MatMul", [value, storage.linear(graph, f"{name}.weight", np.ascontiguousarray(weight.T))], f"{name}.product")
        return graph.node("Add", [product, storage.vector(graph, f"{name}.bias", bias)], name)

    rows = storage.embed(graph, "token", tensors["embeddings.word_embeddings.weight"][kept], "tokens")
    # Every token of a note is of type 0.
    places = tensors["embeddings.position_embeddings.weight"][:LONGEST] + tensors["embeddings.token_type_embeddings.weight"][0]
    places = graph.node("Gather", [storage.table(graph, "position", places), "positions"], "position.rows", axis=0)
    value = norm(graph.node("Add", [rows, places], "sum"), "embeddings.LayerNorm", "sum.norm")
    for layer in range(LAYERS):
        source, name = f"encoder.layer.{layer}", f"layer{layer}"

        def part(path):
            return tensors[f"{source}.{path}.weight"], tensors[f"{source}.{path}.bias"]

        asked, known, said = (part(f"attention.self.{role}") for role in ("query", "key", "value"))
        # The attention's division by √32 goes into the query.
        divisor = np.float32(math.sqrt(WIDTH / HEADS))
        weight = np.concatenate([asked[0] / divisor, known[0], said[0]])
        bias = np.concatenate([asked[1] / divisor, known[1], said[1]])
        both = linear(value, weight, bias, f"{name}.attention.input")
        both = graph.node("Reshape", [both, shape("heads", -1, 3, HEADS, WIDTH // HEADS)], f"{name}.attention.heads")
        both = graph.node("Transpose", [both], f"{name}.attention.roles", perm=[1, 2, 0, 3])
        query, key, content = (
            graph.node("Gather", [both, graph.constant(f"role{role}", np.int64(role))], f"{name}.attention.{what}", axis=0)
            for role, what in enumerate(("query", "key", "value"))
        )
        key = graph.node("Transpose", [key], f"{name}.attention.key.turned", perm=[0, 2, 1])
        weights = graph.node("Softmax", [graph.node("MatMul", [query, key], f"{name}.attention.logits")], f"{name}.attention.weights", axis=-1)
        content = graph.node("MatMul", [weights, content], f"{name}.attention.mixed")
        content = graph.node("Transpose", [content], f"{name}.attention.turned", perm=[1, 0, 2])
        content = graph.node("Reshape", [content, shape("width", -1, WIDTH)], f"{name}.attention.joined")
        content = linear(content, *part("attention.output.dense"), f"{name}.attention.output")
        value = graph.node("Add", [value, content], f"{name}.attention.sum")
        value = norm(value, f"{source}.attention.output.LayerNorm", f"{name}.attention.norm")
        inner = graph.node("Gelu", [linear(value, *part("intermediate.dense"), f"{name}.wide")], f"{name}.gelu")
        value = graph.node("Add", [value, linear(inner, *part("output.dense"), f"{name}.narrow")], f"{name}.sum")
        last = layer + 1 == LAYERS
        value = norm(value, f"{source}.output.LayerNorm", "features" if last else f"{name}.norm")

    made = helper.make_graph(
        graph.nodes,
        "all-minilm-l6-v2",
        [helper.make_tensor_value_info(name, TensorProto.INT32, ["length"]) for name in ("tokens", "positions")],
        [helper.make_tensor_value_info("features", TensorProto.FLOAT, ["length", WIDTH])],
        graph.initializers,
        doc_string=description,
    )
    made = helper.make_model(made, opset_imports=[helper.make_opsetid("", OPSET)], ir_version=10, producer_name="kenspeckle")
    helper.set_model_props(made, {"vocabulary": "\n".join(vocabulary[row] for row in kept)})
    return made
