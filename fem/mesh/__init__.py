"""Shapes, meshes and the names of their parts."""
