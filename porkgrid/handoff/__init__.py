"""What leaves for detailed analysis: the full-force check and the files it is handed on in."""
