"""Charts: one file per figure and one for the style they share."""
