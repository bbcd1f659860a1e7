"""Finding runs by structure, transformation, words and conditions."""
