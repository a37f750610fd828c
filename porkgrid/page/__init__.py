"""The review page: surveys as one HTML file that opens from disk, to look at and to ask "what if" of."""
