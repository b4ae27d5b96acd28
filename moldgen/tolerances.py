"""Every epsilon of the project, with its meaning and its reason. Lengths in mm, angles in rad.

The figures marked (measured) come from trials on real parts exported by several CAD systems.
"""

from __future__ import annotations

from typing import Final

# --- faces against the pull -----------------------------------------------------------------------------------------
SIGN_NOISE: Final = 0.02
"""Overhang (projected opposite-sign area / extent of that region) below which the sign of n.d is noise (measured)."""

ISLAND_OVERHANG: Final = 0.06
"""An island of faces whose overhang stays below this may change sides to join its neighbours."""

VERTICAL_SINE: Final = 1e-5
"""|n.d| below which a triangle counts as parallel to the pull."""

# --- trapped volume -------------------------------------------------------------------------------------------------
NOISE_THICKNESS: Final = 0.03
"""Trapped pieces and overlaps thinner than this (2V/A) are tessellation noise (measured)."""

RUB_THICKNESS: Final = 0.1
"""Trapped pieces between NOISE_THICKNESS and this rub on opening: reported; thicker ones are undercuts."""

OPEN_OVERLAP: Final = 0.03
"""Largest thickness of an overlap between two bodies that a proof accepts."""

EROSION: Final = 0.012
"""How far one of two bodies is eroded before their overlap is asked for; well under OPEN_OVERLAP, and added to the
thickness of what remains."""

SMALL_VOLUME: Final = 1e-6
"""mm^3: overlaps with less volume are ignored before their thickness is asked for."""

# --- meshes ---------------------------------------------------------------------------------------------------------
MESH_DEFLECTION: Final = 0.05
MESH_ANGLE: Final = 0.2
"""Working mesh: sag and angle between neighbouring segments."""

PROOF_DEFLECTION: Final = 0.02
PROOF_ANGLE: Final = 0.3
"""Mesh of the proofs. The sag must stay under OPEN_OVERLAP, or walls without draft seem to overlap: at 0.05 a good part
failed falsely (measured). The angle only binds below a radius of 1.8 mm, where it sags less still; at 0.12 the proofs
took three times as long and gave the same figures."""

# --- topology -------------------------------------------------------------------------------------------------------
SHORT_EDGE: Final = 0.01
"""Splitting tools shorter than this are dropped: one of 0.001 mm among 38 hung the splitter for ever (measured)."""

ON_PLANE: Final = 1e-6
"""A vertex this close to the parting plane lies on it."""

MAX_EDGE_TOLERANCE: Final = 2e-2
"""Largest edge tolerance met in real exports that can still be honoured (measured)."""

# --- volumes --------------------------------------------------------------------------------------------------------
BALANCE: Final = 1e-6
"""Relative volume balance cavity + core + part = block that a proof accepts."""

SAME_SURFACE: Final = 1e-4
"""A spline that keeps this close to a plane, cylinder, cone, sphere or torus all over is read as that (our choice: a
hundredth of the 0.01 mm that two writings of one shell may differ by, and the smallest gap that sewing closes)."""

HEAL_VOLUME: Final = 2e-4
"""Relative volume change that healing may cause before it is refused."""
