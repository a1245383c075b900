"""An `Estimate` made readable."""
