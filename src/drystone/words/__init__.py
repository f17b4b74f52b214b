"""Floor 0: the vocabulary, split by topic so that a new word reruns only the steps that use it."""
