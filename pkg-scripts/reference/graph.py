"""An ONNX graph under construction."""

import numpy as np
from onnx import helper


class Graph:
    """An ONNX graph under construction."""

    def __init__(self):
        self.nodes, self.initializers, self.names = [], [], set()

    def node(self, op, inputs, output, **attributes):
        self.nodes.append(helper.make_node(op, inputs, [output], name=output, **attributes))
        return output

    def constant(self, name, values):
        if name not in self.names:
            self.names.add(name)
            kind = helper.np_dtype_to_tensor_dtype(values.dtype)
            self.initializers.append(helper.make_tensor(name, kind, values.shape, values.astype(values.dtype.newbyteorder("<")).tobytes(), raw=True))
        return name


def store_f32(graph, name, values):
    """Stores a weight or bias as it is."""
    return graph.constant(name, values.astype(np.float32))
