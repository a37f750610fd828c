"""Pure functions of arrays and numbers: no files, no printing, no dates as text."""
