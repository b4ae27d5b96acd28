"""The only folder that imports the geometry kernel and the mesh libraries."""
