"""What a survey comes to: figures, tables, folders and pages together, for the commands and for Python."""
