"""The field solver: mesh, layered-medium kernels, moments, far field."""
