"""Whether the exported tool is sound, fills its block, and opens: asked of the files, not of what made them."""
