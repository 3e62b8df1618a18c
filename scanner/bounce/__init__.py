"""The dynamics: the next chord, the reflection, the tangent map, and orbits bounce by bounce."""

from scanner.bounce.trace import trace

__all__ = ["trace"]
