"""A labelled layout becomes a scene, and the scene SVG, PDF and PNG."""
