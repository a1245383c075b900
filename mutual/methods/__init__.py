"""Measuring methods, one file each. A method is only a forward model: it never imports the engine."""
