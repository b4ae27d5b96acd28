"""Frozen dataclasses that the stages hand on. Shapes are opaque here: only `moldgen.kernel` looks inside."""
