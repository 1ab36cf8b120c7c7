"""Part data: ratings and models by part number, each figure with its source."""
