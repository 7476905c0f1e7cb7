"""The part: wire grades, geometry, stress."""
