"""Where bodies are: names, constants, kernels, small-body elements, epochs and state tables."""
