"""Published physical-organic models and their constants, each with its source. Knows no structures."""
