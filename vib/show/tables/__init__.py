"""The nouns as blocks: one file per answer."""
