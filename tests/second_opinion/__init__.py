"""A second opinion on a tool: judged again from tool.step, with nothing of moldgen's own code.

`judge.judge(folder)` answers. It shares neither reader, mesh, erosion nor sweep with `moldgen.proof`, so a mistake
there does not repeat itself here:

- reader: the names and places in the assembly of tool.step; of manifest.json only the steps and who moves with whom
- mesh: half the sag (0.01 mm), faces joined along their shared edges; a doubtful overlap is asked for once more
  with meshes four times as fine, and then of the surfaces themselves
- shrinking: each vertex moves by the least squares answer to "all planes around me go in by 0.015 mm"
- sweep: triangle by triangle, none left out: a body on a straight way covers the place where it *ends* and the prisms
  over the triangles that *trail*; each prism is asked on its own whether it meets anything, and only those that do are
  joined, to measure how deep. That is exact, so there are no samples that something could slip between.
"""
